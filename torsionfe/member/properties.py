"""What a bar needs to know of its section: the part of a torsion solution that this package reads."""

from __future__ import annotations

from typing import Protocol

from torsionfe.checks import Floats
from torsionfe.outline.outline import Outline

__all__ = ["Bracket", "PeakStress", "TorsionProperties"]


class Bracket(Protocol):
    """A value between a lower and an upper bound."""

    @property
    def value(self) -> float:
        """The best single number."""

    @property
    def lower(self) -> float:
        """The true value is not below it."""

    @property
    def upper(self) -> float:
        """The true value is not above it."""

    @property
    def rel_gap(self) -> float:
        """``(upper - lower) / value``."""


class PeakStress(Protocol):
    """The largest finite shear stress and its place."""

    @property
    def x(self) -> float:
        """Where (length)."""

    @property
    def y(self) -> float:
        """Where (length)."""

    @property
    def stress_per_torque(self) -> float:
        """Shear stress for unit torque, 1/length**3."""

    @property
    def rel_error(self) -> float:
        """Its relative error, the share of the torsion constant's bracket included."""


class TorsionProperties(Protocol):
    """A section in torsion. `torsionfe.torsion.solution.TorsionSolution` is one; any object like it serves."""

    @property
    def outline(self) -> Outline:
        """The section."""

    @property
    def torsion_constant(self) -> Bracket:
        """``J``, length**4."""

    @property
    def hot_spot(self) -> PeakStress | None:
        """The largest finite shear stress; None where there is none."""

    @property
    def singular_corners(self) -> Floats:
        """Sharp re-entrant corners, where the elastic stress is unbounded; shape (k, 2)."""

    @property
    def section_modulus(self) -> float:
        """``W_t = T / tau_max``, length**3; NaN where there is no finite peak."""

    @property
    def warping_constant(self) -> float:
        """``C_w``, length**6, about the centre of twist."""

    @property
    def warping_extremes(self) -> tuple[float, float]:
        """Least and largest normalised warping function, length**2."""

    @property
    def centre_of_twist(self) -> tuple[float, float]:
        """Centre of twist, in the outline's coordinates."""
