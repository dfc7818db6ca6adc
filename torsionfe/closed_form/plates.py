"""The hand method: a section as thin rectangles, its torsion constants and the stress of each plate."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import overload

import numpy as np

from torsionfe.checks import Floats, finite, positive
from torsionfe.closed_form.rectangle import (
    RULES,
    THIN_FROM,
    CoefficientTable,
    rectangle_coefficients,
    rectangle_series,
)
from torsionfe.errors import InputError
from torsionfe.text import number, percent, table

__all__ = ["Plate", "PlateSet", "PlateSum", "plate_sum"]


@dataclass(frozen=True, slots=True)
class Plate:
    """One thin rectangle of the hand method.

    Parameters
    ----------
    width, thickness : float
        ``b`` and ``t``, both above 0 (length).
    name : str
        What tables call it, such as ``'web'``.

    Raises
    ------
    InputError
        A size that is not a finite number above 0.
    """

    width: float
    thickness: float
    name: str = ""

    def __post_init__(self) -> None:
        label = f" of plate {self.name!r}" if self.name else ""
        object.__setattr__(self, "width", positive(f"width{label}", self.width))
        object.__setattr__(self, "thickness", positive(f"thickness{label}", self.thickness))

    @property
    def ratio(self) -> float:
        """``b / t``, dimensionless."""
        return self.width / self.thickness

    @property
    def area(self) -> float:
        """``b t``, length**2."""
        return self.width * self.thickness

    def label(self, index: int) -> str:
        """Return what a note calls the plate at this place of a list."""
        return f"plate {index} ({self.name})" if self.name else f"plate {index}"

    def cells(self, index: int) -> list[str]:
        """Return name, ``b``, ``t`` and ``b / t`` for a row of a table."""
        sizes = [number(self.width, 6), number(self.thickness, 6), number(self.ratio)]
        return [self.name or str(index), *sizes]


@dataclass(frozen=True)
class PlateSet(Sequence[Plate]):
    """Plates that together stand for a section, and the choice that made them. A sequence of `Plate`.

    Attributes
    ----------
    plates : tuple of Plate
    idealisation : str
        The name of the choice where plates end at a joint, such as ``'centreline'``.
    meaning : str
        The choice in a line.
    notes : tuple of str
        What the reader of the result has to know.
    """

    plates: tuple[Plate, ...]
    idealisation: str = ""
    meaning: str = ""
    notes: tuple[str, ...] = ()

    @overload
    def __getitem__(self, index: int) -> Plate: ...
    @overload
    def __getitem__(self, index: slice) -> tuple[Plate, ...]: ...
    def __getitem__(self, index: int | slice) -> Plate | tuple[Plate, ...]:
        return self.plates[index]

    def __len__(self) -> int:
        return len(self.plates)

    def __iter__(self) -> Iterator[Plate]:
        return iter(self.plates)

    def __str__(self) -> str:
        rows = [["plate", "b", "t", "b/t"]]
        rows += [plate.cells(k) for k, plate in enumerate(self.plates)]
        meaning = f" ({self.meaning})" if self.meaning else ""
        title = f"Plates: {self.idealisation or 'given by hand'}{meaning}"
        return "\n".join([table(rows, title, head=True), *(f"note: {note}" for note in self.notes)])


@dataclass(frozen=True)
class PlateSum:
    """The hand method's answer for a set of plates. ``print`` shows a table.

    Attributes
    ----------
    plates : tuple of Plate
        As summed, the longer side first.
    alpha, beta : ndarray of shape (n,)
        Coefficients of stress and of twist, one a plate.
    torsion_constant_twist : float
        ``sum(beta b t**3)``, for the twist: ``theta' = T / (G J)``, length**4.
    torsion_constant_stress : float
        ``sum(alpha b t**3)``, for the stress: ``tau_i = T t_i / J``, length**4.
    rule : str
        Where the coefficients come from.
    idealisation : str
        Where plates end at a joint; empty if the plates were given by hand.
    notes : tuple of str
        What was changed or stretched: a swap, a stubby plate.
    """

    plates: tuple[Plate, ...]
    alpha: Floats
    beta: Floats
    torsion_constant_twist: float
    torsion_constant_stress: float
    rule: str
    idealisation: str = ""
    notes: tuple[str, ...] = ()

    @cached_property
    def _thickness(self) -> Floats:
        return np.array([plate.thickness for plate in self.plates])

    def peak_stress(self, torque: float) -> Floats:
        """Return the size of the peak shear stress of each plate, ``T t_i / J_stress``, shape (n,).

        Parameters
        ----------
        torque : float
            Force times length; its sign does not matter.
        """
        return np.asarray(abs(finite("torque", torque)) * self._thickness / self.torsion_constant_stress)

    @property
    def governing(self) -> int:
        """Index of the plate with the largest stress (the first where several are equal)."""
        return int(np.argmax(self._thickness))

    @property
    def section_modulus(self) -> float:
        """``W_t = T / tau_max`` of the governing plate, length**3."""
        return self.torsion_constant_stress / float(self._thickness.max())

    def twist_rate(self, torque: float, shear_modulus: float) -> float:
        """Return the rotation per length ``T / (G J_twist)``, rad/length."""
        stiffness = positive("shear_modulus", shear_modulus) * self.torsion_constant_twist
        return finite("torque", torque) / stiffness

    def __str__(self) -> str:
        stress = self.peak_stress(1.0)
        share = self.beta * [p.width * p.thickness**3 for p in self.plates] / self.torsion_constant_twist
        rows = [["plate", "b", "t", "b/t", "alpha", "beta", "share of J", "stress per torque"]]
        for k, plate in enumerate(self.plates):
            coefficients = [f"{self.alpha[k]:.4f}", f"{self.beta[k]:.4f}"]
            rows.append([*plate.cells(k), *coefficients, percent(share[k], 3), number(stress[k])])
        lines = [
            table(rows, "Sum of thin plates", head=True),
            f"J for twist   sum(beta b t^3)   {number(self.torsion_constant_twist, 6)}",
            f"J for stress  sum(alpha b t^3)  {number(self.torsion_constant_stress, 6)}",
            f"governing     {self.plates[self.governing].name or f'plate {self.governing}'}",
            f"coefficients  {RULES.get(self.rule, self.rule)}",
            f"plates        {self.idealisation or 'given by hand'}",
        ]
        return "\n".join([*lines, *(f"note: {note}" for note in self.notes)])


def plate_sum(
    plates: Iterable[Plate], rule: str | CoefficientTable = "series", idealisation: str | None = None
) -> PlateSum:
    """Return both torsion constants and the stress of each plate, by the sum of thin rectangles.

    Parameters
    ----------
    plates : iterable of Plate
        Or a `PlateSet`, which brings the name of its idealisation along. Plates thicker than wide are
        turned, with a note.
    rule : str or CoefficientTable
        Where ``alpha`` and ``beta`` come from: see `rectangle_coefficients`.
    idealisation : str, optional
        A name for the choice of plates, for the printed result.

    Raises
    ------
    InputError
        No plates; an unknown rule; something that is not a `Plate`.

    Examples
    --------
    >>> hand = plate_sum([Plate(70.0, 8.0, "leg"), Plate(70.0, 8.0, "leg")])
    >>> round(hand.torsion_constant_twist, 1), hand.rule
    (22172.3, 'series')
    """
    given = _plates(plates)
    notes = [*getattr(plates, "notes", ())]
    notes += [
        f"{plate.label(k)}: width {plate.width:g} is less than thickness {plate.thickness:g}: swapped"
        for k, plate in enumerate(given)
        if plate.ratio < 1.0
    ]
    turned = [plate if plate.ratio >= 1.0 else _swapped(plate) for plate in given]
    b, t = (np.array([getattr(plate, side) for plate in turned]) for side in ("width", "thickness"))
    found = rectangle_coefficients(np.maximum(b / t, 1.0), rule)
    if rule in ("thin", "third"):
        notes += _stubby(turned, found.beta)
    name = getattr(plates, "idealisation", "") if idealisation is None else idealisation
    return PlateSum(
        plates=tuple(turned),
        alpha=found.alpha,
        beta=found.beta,
        torsion_constant_twist=float(np.sum(found.beta * b * t**3)),
        torsion_constant_stress=float(np.sum(found.alpha * b * t**3)),
        rule=found.rule,
        idealisation=name,
        notes=tuple(notes),
    )


def _swapped(plate: Plate) -> Plate:
    return replace(plate, width=plate.thickness, thickness=plate.width)


def _plates(plates: Iterable[Plate]) -> list[Plate]:
    try:
        given = list(plates)
    except TypeError:
        raise InputError(f"plates must be a sequence of Plate, got {plates!r:.80}") from None
    if not given:
        raise InputError("plates is empty: a sum needs one plate or more")
    for k, plate in enumerate(given):
        if not isinstance(plate, Plate):
            raise InputError(f"plates[{k}] must be a Plate(width, thickness), got {plate!r:.80}")
    return given


def _stubby(plates: list[Plate], beta: Floats) -> list[str]:
    """Return a note for each plate too stubby for a thin-strip rule, with the rule's error there."""
    notes = []
    for k, plate in enumerate(plates):
        if plate.ratio < THIN_FROM:
            exact = rectangle_series(np.array(max(plate.ratio, 1.0)))[1]
            notes.append(
                f"{plate.label(k)}: b/t = {plate.ratio:.3g}, the rule is meant for {THIN_FROM:g} and more; "
                f"its beta is {percent(float(beta[k] / exact) - 1.0)} off the exact one"
            )
    return notes
