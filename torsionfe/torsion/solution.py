"""The result: torsion constant with its bounds, the stress field, the hot spot, and how they were reached."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats, finite, finite_array, positive
from torsionfe.errors import InputError
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.outline.fillets import sharp_corners
from torsionfe.outline.outline import Outline
from torsionfe.text import number, percent, table
from torsionfe.torsion.boundary import BoundaryStress
from torsionfe.torsion.bounds import Bounds
from torsionfe.torsion.corners import CornerStress, corner_strengths, exponents
from torsionfe.torsion.fields import Fields
from torsionfe.torsion.frame import Frame
from torsionfe.torsion.hot_spot import HotSpot, plateau_share, tied_peaks
from torsionfe.torsion.look import Look
from torsionfe.torsion.recover import locate, stress_at_reference
from torsionfe.torsion.warping import Warping, normalised_warping

if TYPE_CHECKING:
    from matplotlib.axes import Axes

__all__ = ["Pass", "TorsionSolution"]

#: Re-entrant corners below this interior angle (radians) may be chord ends of a fillet that was an arc.
_CHORDS = math.radians(210.0)
#: What floating-point rounding may take from the bounds: they are widened by it (measured: below 1e-13).
_ROUNDING = 1e-12


@dataclass(frozen=True, slots=True)
class Pass:
    """One pass of the adaptive loop.

    Attributes
    ----------
    unknowns, triangles : int
        Degrees of freedom and elements of the mesh.
    lower, upper : float
        Bounds of the torsion constant, length**4.
    stress_per_torque : float
        Peak shear stress for unit torque, 1/length**3; NaN where no finite peak exists.
    rel_error : float
        Its estimated relative error.
    """

    unknowns: int
    triangles: int
    lower: float
    upper: float
    stress_per_torque: float
    rel_error: float


@dataclass(frozen=True, eq=False, repr=False)
class TorsionSolution:
    """Saint-Venant's torsion of a section, solved.

    Attributes
    ----------
    outline : Outline
        The section.
    torsion_constant : Bounds
        ``J``, length**4, between proven bounds.
    hot_spots : tuple of HotSpot
        The largest finite shear stress, and every place that equals it within its error.
    singular_corners : ndarray of shape (k, 2)
        Sharp re-entrant corners, where the elastic stress is unbounded.
    converged : bool
        Whether both tolerances were met.
    shortfall : str
        What is still wider than asked, in words; empty where nothing is.
    passes : tuple of Pass
        The adaptive loop, coarse to fine.
    frame, fields, boundary
        The solver's coordinates, both functions and the boundary stress in them: for plots and further work.
    """

    outline: Outline
    frame: Frame
    fields: Fields
    boundary: BoundaryStress
    torsion_constant: Bounds
    hot_spots: tuple[HotSpot, ...]
    singular_corners: Floats
    converged: bool
    shortfall: str
    passes: tuple[Pass, ...]

    @classmethod
    def of(
        cls, outline: Outline, frame: Frame, look: Look, passes: tuple[Pass, ...], shortfall: str
    ) -> TorsionSolution:
        """Return the result of the last look, in the outline's own coordinates and unit."""
        bounds = Bounds(look.fields.lower * (1.0 - _ROUNDING), look.fields.upper * (1.0 + _ROUNDING))
        spots = []
        for k in tied_peaks(look.boundary, look.peak, look.rel_error):
            x, y = (float(value) for value in frame.outward_points(look.peak.points[k]))
            per_torque = float(look.peak.tau[k]) / bounds.value / frame.scale**3
            spots.append(HotSpot(x, y, per_torque, float(look.rel_error[k]) + 0.5 * bounds.rel_gap))
        return cls(
            outline=outline,
            frame=frame,
            fields=look.fields,
            boundary=look.boundary,
            torsion_constant=bounds.scaled(frame.scale**4),
            hot_spots=tuple(spots),
            singular_corners=outline.edges.start[sharp_corners(outline.edges)],
            converged=not shortfall,
            shortfall=shortfall,
            passes=passes,
        )

    # --- numbers --------------------------------------------------------------------------------------

    @property
    def hot_spot(self) -> HotSpot | None:
        """The largest finite shear stress; None where every flank rises into a sharp re-entrant corner."""
        return self.hot_spots[0] if self.hot_spots else None

    @property
    def section_modulus(self) -> float:
        """``W_t = T / tau_max``, length**3, of the hot spot; NaN where there is none."""
        return 1.0 / self.hot_spot.stress_per_torque if self.hot_spot else math.nan

    @property
    def order(self) -> int:
        """Degree of the elements."""
        return self.fields.space.order

    @cached_property
    def mesh(self) -> TriMesh:
        """The last mesh, in the outline's coordinates."""
        return self.frame.outward(self.fields.space.mesh)

    @cached_property
    def _warping(self) -> Warping:
        return normalised_warping(self.fields)

    @property
    def warping_constant(self) -> float:
        """``C_w``, length**6, about the centre of twist."""
        return self._warping.constant * self.frame.scale**6

    @property
    def warping_extremes(self) -> tuple[float, float]:
        """Least and largest normalised warping function, length**2."""
        low, high = self._warping.extremes
        return low * self.frame.scale**2, high * self.frame.scale**2

    @property
    def centre_of_twist(self) -> tuple[float, float]:
        """Centre of twist (Trefftz), in the outline's coordinates."""
        x, y = self.frame.outward_points(self._warping.centre)
        return float(x), float(y)

    def twist_rate(self, torque: float, shear_modulus: float) -> float:
        """Return ``T / (G J)``, rad/length.

        Parameters
        ----------
        torque : float
            force * length.
        shear_modulus : float
            force / length**2.
        """
        return finite("torque", torque) / (positive("shear_modulus", shear_modulus) * self.torsion_constant.value)

    def stress_at(self, points: ArrayLike, torque: float = 1.0) -> Floats:
        """Return the shear stress ``(tau_zx, tau_zy)`` at points of the section.

        Parameters
        ----------
        points : array_like of shape (n, 2)
        torque : float
            force * length.

        Returns
        -------
        ndarray of shape (n, 2)
            force / length**2.

        Raises
        ------
        InputError
            A point lies outside the material.
        """
        where = np.atleast_2d(np.asarray(points, dtype=float)) if np.ndim(points) == 1 else points
        given = finite_array("points", where, columns=2)
        scale = finite("torque", torque) * self.frame.scale / self.torsion_constant.value
        inside = self.frame.inward_points(given)
        triangle, reference = locate(self.fields.space.mesh, inside)
        if (triangle < 0).any():
            k = int(np.argmax(triangle < 0))
            raise InputError(f"points[{k}] = ({given[k, 0]:g}, {given[k, 1]:g}) lies outside the material")
        return stress_at_reference(self.fields, triangle, reference) * scale

    @cached_property
    def corner_stresses(self) -> tuple[CornerStress, ...]:
        """The singular stress at each of the `singular_corners`, in their order: ranks designs with sharp corners."""
        rows, strength, rel_error = corner_strengths(self.fields)
        edges, bounds = self.outline.edges, Bounds(self.fields.lower, self.fields.upper)
        angles, powers = edges.interior_angle[rows], exponents(edges, rows)
        per_torque = strength / bounds.value * self.frame.scale ** (-2.0 - powers)
        return tuple(
            CornerStress(*(float(value) for value in values))
            for values in zip(
                *edges.start[rows].T, angles, powers, per_torque, rel_error + 0.5 * bounds.rel_gap, strict=True
            )
        )

    # --- words and pictures ---------------------------------------------------------------------------

    def __repr__(self) -> str:
        return f"<TorsionSolution J = {self.torsion_constant}, {self.fields.space.size} unknowns>"

    def __str__(self) -> str:
        return table(self._rows(), title="Torsion of the section")

    def _rows(self) -> list[tuple[str, str]]:
        bounds = self.torsion_constant
        rows = [
            ("torsion constant J", f"{bounds}  [length^4]"),
            ("width of the bracket", percent(bounds.rel_gap)),
        ]
        if self.hot_spot is None:
            rows.append(("hot spot", "none: every flank rises into a sharp re-entrant corner"))
        for spot in self.hot_spots[:4]:
            rows.append(
                (
                    "hot spot, stress per torque",
                    f"{number(spot.stress_per_torque)}  +/- {percent(spot.rel_error)}  [1/length^3] "
                    f"at ({number(spot.x)}, {number(spot.y)})",
                )
            )
        if len(self.hot_spots) > 4:
            rows.append(("", f"and {len(self.hot_spots) - 4} more of equal stress"))
        share = plateau_share(self.boundary, self.hot_spot_height)
        if self.hot_spot and share > 0.25:
            rows.append(("", f"{percent(share)} of the boundary is within 1 % of it"))
        if self.hot_spot:
            rows.append(("section modulus W_t", f"{number(self.section_modulus)}  [length^3]"))
        rows.extend(self._corner_rows())
        rows.append(("mesh", f"{len(self.mesh.triangles)} triangles of order {self.order}, {len(self.passes)} passes"))
        if self.shortfall:
            rows.append(("NOT CONVERGED", self.shortfall))
        return rows

    def _corner_rows(self) -> list[tuple[str, str]]:
        rows = []
        for corner in self.corner_stresses[:6]:
            term = f"{number(corner.intensity)} r^{corner.exponent - 1.0:.3f} per torque"
            place = f"({number(corner.x)}, {number(corner.y)})"
            rows.append(("sharp re-entrant corner", f"{place}: stress unbounded, as {term}; fillet it"))
        if len(self.corner_stresses) > 6:
            rows.append(("", f"and {len(self.corner_stresses) - 6} more"))
        weak = sum(corner.angle < _CHORDS for corner in self.corner_stresses)
        if weak >= 3:
            rows.append(("", f"{weak} turn by 30 degrees or less, as the chords of a fillet do: see restore_arcs"))
        return rows

    @property
    def hot_spot_height(self) -> float:
        """Peak shear stress for ``G theta' = 1`` in the solver's unit (length); NaN where there is none."""
        if self.hot_spot is None:
            return math.nan
        j = Bounds(self.fields.lower, self.fields.upper).value
        return self.hot_spot.stress_per_torque * j * self.frame.scale**3

    def plot(self, ax: Axes | None = None, **options: Any) -> Any:
        """Draw the shear stress contours; see `torsionfe.output.contour.plot_stress`."""
        from torsionfe.output.contour import plot_stress

        return plot_stress(self, ax=ax, **options)

    def _repr_html_(self) -> str:
        from torsionfe.output.notebook import rich_html

        return rich_html("Torsion of the section", self._rows(), self.plot)
