"""Allowables, margins of safety, and the largest torque that meets each allowable.

Every margin is taken at the unfavourable end: the torsion constant at the lower end of its bracket, the peak
stress at the upper end of its error. A refined mesh can raise a margin; a coarse one never flatters it.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import overload

import numpy as np

from torsionfe.cautions import cautions
from torsionfe.checks import one_of, positive
from torsionfe.errors import InputError
from torsionfe.member.bar import Bar, BarResponse, SteppedBar, TorqueCase
from torsionfe.text import number, table

__all__ = ["Allowables", "Margin", "MarginTable", "TorqueLimits", "margins", "torque_limits"]

#: Shear strength over tensile strength (von Mises 1913, Tresca 1864).
CRITERIA = {"von Mises": 1.0 / math.sqrt(3.0), "Tresca": 0.5}


@dataclass(frozen=True)
class Allowables:
    """What the bar may bear. At least one is needed; those left out are not checked.

    Attributes
    ----------
    shear_yield, shear_ultimate : float, optional
        Strengths in shear, force / length**2.
    twist : float, optional
        Rotation of any station (rad).
    twist_rate : float, optional
        Rotation per length, rad / length.
    basis : str
        Where the strengths come from, in words, for the table.

    Raises
    ------
    InputError
        None given, one that is not above 0, or an ultimate strength below yield.
    """

    shear_yield: float | None = None
    shear_ultimate: float | None = None
    twist: float | None = None
    twist_rate: float | None = None
    basis: str = "strengths given in shear"

    def __post_init__(self) -> None:
        names = ("shear_yield", "shear_ultimate", "twist", "twist_rate")
        for name in names:
            value = getattr(self, name)
            object.__setattr__(self, name, None if value is None else positive(name, value))
        if all(getattr(self, name) is None for name in names):
            raise InputError(f"no allowable is given: set at least one of {', '.join(names)}")
        low, high = self.shear_yield, self.shear_ultimate
        if low is not None and high is not None and high < low:
            raise InputError(f"shear_ultimate {high:g} is below shear_yield {low:g}: are they exchanged?")

    @classmethod
    def from_tension(
        cls,
        tensile_yield: float | None = None,
        tensile_ultimate: float | None = None,
        *,
        criterion: str,
        twist: float | None = None,
        twist_rate: float | None = None,
    ) -> Allowables:
        """Return allowables whose strengths in shear come from tensile strengths.

        Parameters
        ----------
        tensile_yield, tensile_ultimate : float, optional
            force / length**2.
        criterion : {'von Mises', 'Tresca'}
            Shear is ``1 / sqrt 3`` or ``1 / 2`` of tension. For the ultimate strength either is common practice,
            not a law: prefer a measured strength in shear.
        twist, twist_rate : float, optional
            As in the class.
        """
        ratio = CRITERIA[one_of("criterion", criterion, tuple(CRITERIA))]
        values = [
            None if value is None else ratio * positive(name, value)
            for name, value in (("tensile_yield", tensile_yield), ("tensile_ultimate", tensile_ultimate))
        ]
        if values == [None, None]:
            raise InputError("no tensile strength is given: set tensile_yield, tensile_ultimate or both")
        basis = f"strengths in shear from tension by {criterion}, factor {ratio:.4f}"
        return cls(values[0], values[1], twist, twist_rate, basis)


@dataclass(frozen=True)
class Margin:
    """One margin of safety, ``allowable / applied - 1``.

    Attributes
    ----------
    case : str
    segment : str
        Of a stepped bar; empty where the whole bar is meant.
    criterion : str
        ``shear yield``, ``shear ultimate``, ``twist`` or ``twist rate``.
    torque : float
        Torque in the segment (the largest of the bar for ``twist``) without factor, force * length.
    factor : float
        What the torque is multiplied by.
    applied, allowable : float
        Factored stress (force / length**2), twist (rad) or twist rate (rad / length), ``applied`` at the
        unfavourable end of its error.
    margin : float
        NaN where it is not defined, infinity where nothing is applied.
    note : str
        Why the margin is not defined, or where the peak is.
    """

    case: str
    segment: str
    criterion: str
    torque: float
    factor: float
    applied: float
    allowable: float
    margin: float
    note: str = ""

    @property
    def defined(self) -> bool:
        """Whether the margin is a number."""
        return not math.isnan(self.margin)

    @property
    def largest_torque(self) -> float:
        """Torque without factor that leaves no margin, force * length; NaN where that is not defined."""
        return abs(self.torque) * (1.0 + self.margin) if self.torque else math.inf

    def cells(self) -> list[str]:
        """Return the row of a table."""
        largest = number(self.largest_torque) if self.defined else "not defined"
        numbers = [number(self.torque, 6), number(self.factor), number(self.applied), number(self.allowable)]
        return [self.case, self.segment, self.criterion, *numbers, _signed(self.margin), largest, self.note]


@dataclass(frozen=True)
class MarginTable(Sequence[Margin]):
    """Every margin of a bar under its cases. A sequence of `Margin`; ``print`` shows a table with cautions.

    Attributes
    ----------
    rows : tuple of Margin
    allowables : Allowables
    """

    rows: tuple[Margin, ...]
    allowables: Allowables

    @overload
    def __getitem__(self, index: int) -> Margin: ...
    @overload
    def __getitem__(self, index: slice) -> tuple[Margin, ...]: ...
    def __getitem__(self, index: int | slice) -> Margin | tuple[Margin, ...]:
        return self.rows[index]

    def __len__(self) -> int:
        return len(self.rows)

    @property
    def governing(self) -> Margin:
        """The smallest margin; one that is not defined comes first."""
        return min(self.rows, key=lambda row: row.margin if row.defined else -math.inf)

    @property
    def satisfied(self) -> bool:
        """Whether every margin is defined and 0 or more."""
        return all(row.defined and row.margin >= 0.0 for row in self.rows)

    def __str__(self) -> str:
        head = ["case", "segment", "criterion", "torque", "factor", "applied", "allowable", "margin"]
        rows = [[*head, "largest torque", "note"], *(row.cells() for row in self.rows)]
        worst = self.governing
        where = f" in segment {worst.segment}" if worst.segment else ""
        return "\n".join(
            [
                table(rows, "Margins of safety (allowable / applied - 1)", head=True),
                f"governing: case {worst.case}{where}, {worst.criterion}, margin {_signed(worst.margin)}",
                f"applied values at the unfavourable end of their error; {self.allowables.basis}",
                cautions(),
            ]
        )


@dataclass(frozen=True)
class TorqueLimits:
    """The largest torque that meets each allowable. ``float(result)`` is the least of them; NaN if one has none.

    Attributes
    ----------
    rows : tuple of Margin
        For a torque of 1; ``rows[k].largest_torque`` is the limit.
    allowables : Allowables
    """

    rows: tuple[Margin, ...]
    allowables: Allowables

    @property
    def governing(self) -> Margin:
        """The criterion that limits the torque; one that is not defined comes first."""
        return min(self.rows, key=lambda row: row.largest_torque if row.defined else -math.inf)

    def __float__(self) -> float:
        return self.governing.largest_torque

    def __str__(self) -> str:
        rows = [["criterion", "allowable", "factor", "largest torque", "note"]]
        for row in self.rows:
            largest = number(row.largest_torque, 6) if row.defined else "not defined"
            rows.append([row.criterion, number(row.allowable), number(row.factor), largest, row.note])
        lines = [table(rows, "Largest torque, before factors", head=True), self.allowables.basis, cautions()]
        return "\n".join(lines)


def margins(
    bar: Bar | SteppedBar, cases: float | TorqueCase | Sequence[TorqueCase], allowables: Allowables
) -> MarginTable:
    """Return the margins of safety of a bar under torque cases.

    Parameters
    ----------
    bar : Bar or SteppedBar
    cases : float, TorqueCase or sequence of TorqueCase
        A bare number is one case of limit factor 1 and ultimate factor 1.5.
    allowables : Allowables

    Raises
    ------
    InputError
        No case, or a torque where the bar has no station.

    Notes
    -----
    Limit torque is set against yield and twist, ultimate torque against the ultimate strength, each by the
    linear elastic stress. A sharp re-entrant corner in a loaded segment leaves its strength margins undefined.
    """
    stepped = bar if isinstance(bar, SteppedBar) else SteppedBar((bar,))
    given = [cases] if isinstance(cases, TorqueCase) or not isinstance(cases, Sequence) else list(cases)
    if isinstance(cases, str) or not given:
        raise InputError(f"cases must be a torque, a TorqueCase or several, got {cases!r}")
    rows: list[Margin] = []
    for case in given:
        response = stepped.response(case)
        rows += _strength(response, allowables) + _twist(response, allowables)
    return MarginTable(tuple(rows), allowables)


def torque_limits(
    bar: Bar, allowables: Allowables, limit_factor: float = 1.0, ultimate_factor: float = 1.5
) -> TorqueLimits:
    """Return the largest torque, before factors, that meets each allowable.

    Raises
    ------
    InputError
        A factor that is not above 0.
    """
    found = margins(bar, TorqueCase("unit torque", 1.0, limit_factor, ultimate_factor), allowables)
    rows = [
        replace(row, note=f"{number(math.degrees(row.allowable))} degrees") if row.criterion == "twist" else row
        for row in found.rows
    ]
    return TorqueLimits(tuple(rows), allowables)


def _strength(response: BarResponse, allowables: Allowables) -> list[Margin]:
    case, rows = response.case, []
    kinds = [
        ("shear yield", allowables.shear_yield, case.limit_factor),
        ("shear ultimate", allowables.shear_ultimate, case.ultimate_factor),
    ]
    for k, part in enumerate(response.bar.segments):
        torque = float(response.torques[k])
        # the torque of a bar held at several stations has an error of its own
        peak = part.peak_stress(abs(torque) + float(response.torque_errors[k]))
        loaded = abs(torque) + float(response.torque_errors[k]) > 0.0
        reason = peak.undefined or ("" if math.isfinite(peak.rel_error) else "the peak stress has no known error")
        note = f"at ({number(peak.x)}, {number(peak.y)})" if not reason else f"not defined: {reason}"
        for name, allowable, factor in kinds:
            if allowable is None:
                continue
            if not loaded:
                applied, margin, place = 0.0, math.inf, "no torque"
            elif reason:
                applied, margin, place = math.nan, math.nan, note
            else:
                applied, place = peak.unfavourable * factor, note
                margin = _margin(allowable, applied)
            rows.append(Margin(case.name, _label(response, k), name, torque, factor, applied, allowable, margin, place))
    return rows


def _twist(response: BarResponse, allowables: Allowables) -> list[Margin]:
    case, rows = response.case, []
    factor = case.limit_factor
    if allowables.twist is not None:
        applied = float((np.abs(response.twists) + response.twist_errors).max()) * factor
        station = int(np.argmax(np.abs(response.twists)))
        largest = float(response.torques[np.argmax(np.abs(response.torques))])
        margin = _margin(allowables.twist, applied)
        note = f"{number(math.degrees(applied))} degrees at station {station}"
        rows.append(Margin(case.name, "", "twist", largest, factor, applied, allowables.twist, margin, note))
    if allowables.twist_rate is not None:
        for k, part in enumerate(response.bar.segments):
            torque = float(response.torques[k])
            stiffness = part.stiffness_bounds.lower * part.length
            applied = (abs(torque) + float(response.torque_errors[k])) / stiffness * factor
            margin = _margin(allowables.twist_rate, applied)
            label = _label(response, k)
            rate = allowables.twist_rate
            rows.append(Margin(case.name, label, "twist rate", torque, factor, applied, rate, margin))
    return rows


def _label(response: BarResponse, segment: int) -> str:
    return response.bar.label(segment) if len(response.bar.segments) > 1 else response.bar.segments[segment].name


def _margin(allowable: float, applied: float) -> float:
    return allowable / applied - 1.0 if applied != 0.0 else math.inf


def _signed(margin: float) -> str:
    """Return a margin with its sign, rounded down."""
    if not math.isfinite(margin):
        return number(margin)
    return f"{math.floor(margin * 1000.0) / 1000.0:+.3f}"
