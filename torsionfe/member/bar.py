"""A bar in torsion: one section, or several in series with torques at stations."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise
from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats, finite, positive
from torsionfe.errors import InputError
from torsionfe.member.properties import TorsionProperties
from torsionfe.text import number, percent, table
from torsionfe.torsion.bounds import Bounds

if TYPE_CHECKING:
    from torsionfe.member.margins import Allowables, MarginTable, TorqueLimits

__all__ = ["Bar", "BarResponse", "PeakShear", "SteppedBar", "TorqueCase"]


@dataclass(frozen=True, slots=True)
class TorqueCase:
    """A named torque, or torques at the stations of a stepped bar, with its factors.

    Attributes
    ----------
    name : str
    torque : float or mapping of int to float
        force * length. A number acts at the last station; a mapping names the station of each torque.
    limit_factor : float
        Times the torque gives the torque to set against yield and twist; 1 by default.
    ultimate_factor : float
        Times the torque gives the torque to set against the ultimate strength; 1.5 by default (common practice
        in aerospace).
    """

    name: str
    torque: float | Mapping[int, float]
    limit_factor: float = 1.0
    ultimate_factor: float = 1.5

    def __post_init__(self) -> None:
        label = f"of case {self.name!r}"
        if isinstance(self.torque, Mapping):
            given = {k: finite(f"torque {label} at station {k!r}", v) for k, v in self.torque.items()}
            object.__setattr__(self, "torque", given)
        else:
            object.__setattr__(self, "torque", finite(f"torque {label}", self.torque))
        for name in ("limit_factor", "ultimate_factor"):
            object.__setattr__(self, name, positive(f"{name} {label}", getattr(self, name)))

    def at_stations(self, count: int) -> Floats:
        """Return the torque at each of ``count`` stations, shape (count,)."""
        torques = np.zeros(count)
        given = self.torque if isinstance(self.torque, Mapping) else {count - 1: self.torque}
        for station, torque in given.items():
            if isinstance(station, bool) or not isinstance(station, int) or not 0 <= station < count:
                raise InputError(f"case {self.name!r}: there is no station {station!r}, only 0 to {count - 1}")
            torques[station] += torque
        return torques


@dataclass(frozen=True, slots=True)
class PeakShear:
    """The largest finite shear stress of a section under a torque.

    Attributes
    ----------
    stress : float
        force / length**2, 0 or more; NaN where the section has no finite peak.
    x, y : float
        Where, in the outline's coordinates; NaN where there is no peak.
    rel_error : float
        Relative error of the stress.
    undefined : str
        Why the strength is not defined: a sharp re-entrant corner, whose stress is unbounded. Empty where it is.
    """

    stress: float
    x: float
    y: float
    rel_error: float
    undefined: str = ""

    @property
    def unfavourable(self) -> float:
        """The stress at the upper end of its error, force / length**2."""
        return self.stress * (1.0 + self.rel_error)


@dataclass(frozen=True)
class Bar:
    """A prismatic bar, free to warp, of one section.

    Parameters
    ----------
    solution : TorsionProperties
        What `torsionfe.solve_torsion` returns.
    length : float
        Length.
    shear_modulus : float
        ``G``, force / length**2.
    name : str
        What tables call it.

    Raises
    ------
    InputError
        A length or shear modulus that is not a finite number above 0; an outline in place of its solution.

    Examples
    --------
    >>> import torsionfe as tf
    >>> from torsionfe.outline import shapes
    >>> bar = Bar(tf.solve_torsion(shapes.round_bar(20.0)), length=500.0, shear_modulus=27e3)
    >>> print(f"{bar.stiffness:.4g} {bar.twist(100e3):.4f}")
    8.482e+05 0.1179
    """

    solution: TorsionProperties
    length: float
    shear_modulus: float
    name: str = ""

    def __post_init__(self) -> None:
        if not hasattr(self.solution, "torsion_constant"):
            kind = type(self.solution).__name__
            raise InputError(f"a torsion solution is needed, got {kind}: call solve_torsion(outline) first")
        label = f" of {self.name!r}" if self.name else ""
        object.__setattr__(self, "length", positive(f"length{label}", self.length))
        object.__setattr__(self, "shear_modulus", positive(f"shear_modulus{label}", self.shear_modulus))

    # --- twist ----------------------------------------------------------------------------------------

    @property
    def stiffness(self) -> float:
        """Torsional spring constant ``G J / L``, force * length / rad."""
        return self.shear_modulus * self.solution.torsion_constant.value / self.length

    @property
    def stiffness_bounds(self) -> Bounds:
        """The spring constant at both ends of the torsion constant's bracket."""
        constant = self.solution.torsion_constant
        return Bounds(constant.lower, constant.upper).scaled(self.shear_modulus / self.length)

    def twist(self, torque: float) -> float:
        """Return the rotation of one end against the other, ``T L / (G J)``, rad; ``torque`` force * length."""
        return finite("torque", torque) / self.stiffness

    def twist_degrees(self, torque: float) -> float:
        """Return the rotation of one end against the other in degrees."""
        return math.degrees(self.twist(torque))

    def twist_bounds(self, torque: float) -> Bounds:
        """Return the twist (rad) at both ends of the torsion constant's bracket."""
        ends = self.stiffness_bounds
        first, second = sorted((finite("torque", torque) / ends.upper, torque / ends.lower))
        return Bounds(first, second)

    def twist_rate(self, torque: float) -> float:
        """Return ``T / (G J)``, rad / length."""
        return self.twist(torque) / self.length

    # --- strength -------------------------------------------------------------------------------------

    def peak_stress(self, torque: float) -> PeakShear:
        """Return the largest finite shear stress, its place and its error; ``torque`` force * length."""
        size = abs(finite("torque", torque))
        spot, corners = self.solution.hot_spot, self.solution.singular_corners
        undefined = ""
        if len(corners):
            more = f" and {len(corners) - 1} more" if len(corners) > 1 else ""
            x, y = corners[0]
            undefined = f"sharp re-entrant corner at ({number(x)}, {number(y)}){more}: fillet it"
        elif spot is None:
            undefined = "the section's solution has no hot spot"
        if spot is None:
            return PeakShear(math.nan, math.nan, math.nan, math.nan, undefined)
        return PeakShear(size * spot.stress_per_torque, spot.x, spot.y, spot.rel_error, undefined)

    def margins(
        self, cases: float | TorqueCase | Sequence[TorqueCase], allowables: Allowables
    ) -> MarginTable:
        """Return the margins of safety of torque cases; see `torsionfe.member.margins.margins`."""
        from torsionfe.member.margins import margins

        return margins(self, cases, allowables)

    def torque_limits(
        self, allowables: Allowables, limit_factor: float = 1.0, ultimate_factor: float = 1.5
    ) -> TorqueLimits:
        """Return the largest torque that meets each allowable; see `torsionfe.member.margins.torque_limits`."""
        from torsionfe.member.margins import torque_limits

        return torque_limits(self, allowables, limit_factor, ultimate_factor)

    def __str__(self) -> str:
        spot = self.solution.hot_spot
        place = f"({number(spot.x)}, {number(spot.y)})" if spot else ""
        peak = f"{number(spot.stress_per_torque)}  +/- {percent(spot.rel_error)}  at {place}" if spot else "none"
        rows = [
            ("length L", f"{number(self.length, 6)}  [length]"),
            ("shear modulus G", f"{number(self.shear_modulus, 6)}  [force/length^2]"),
            ("torsion constant J", f"{self.solution.torsion_constant}  [length^4]"),
            ("spring constant G J / L", f"{self.stiffness_bounds}  [force*length/rad]"),
            ("peak stress per torque", f"{peak}  [1/length^3]"),
        ]
        return table(rows, f"Bar {self.name}".strip())


@dataclass(frozen=True)
class SteppedBar:
    """Bars in series. Station ``k`` is where segment ``k`` begins; the last station is the far end.

    Parameters
    ----------
    segments : sequence of Bar
    held : int or sequence of int
        Stations that cannot rotate: station 0 by default, ``(0, n)`` for a bar of ``n`` segments held at both
        ends. Every end stays free to warp.

    Raises
    ------
    InputError
        No segment, or a held station that does not exist.
    """

    segments: tuple[Bar, ...]
    held: tuple[int, ...] = (0,)

    def __init__(self, segments: Sequence[Bar], held: int | Sequence[int] = 0) -> None:
        parts = tuple(segments)
        if not parts or not all(isinstance(part, Bar) for part in parts):
            raise InputError("segments must be one Bar or more")
        stations = (held,) if isinstance(held, int) else tuple(held)
        for station in stations:
            if isinstance(station, bool) or not isinstance(station, int) or not 0 <= station <= len(parts):
                raise InputError(f"held: there is no station {station!r}, only 0 to {len(parts)}")
        if not stations:
            raise InputError("held is empty: at least one station must be kept from rotating")
        object.__setattr__(self, "segments", parts)
        object.__setattr__(self, "held", tuple(sorted(set(stations))))

    @cached_property
    def positions(self) -> Floats:
        """Where each station is along the bar (length), shape (n + 1,)."""
        return np.concatenate([[0.0], np.cumsum([part.length for part in self.segments])])

    @property
    def stiffness(self) -> float:
        """Spring constant from one end to the other, ``1 / sum(L / (G J))``, force * length / rad."""
        return 1.0 / sum(1.0 / part.stiffness for part in self.segments)

    @property
    def stiffness_bounds(self) -> Bounds:
        """The spring constant with every torsion constant at its lower, then at its upper bound."""
        ends = [part.stiffness_bounds for part in self.segments]
        return Bounds(1.0 / sum(1.0 / end.lower for end in ends), 1.0 / sum(1.0 / end.upper for end in ends))

    def response(self, case: float | TorqueCase) -> BarResponse:
        """Return torque diagram, twist and peak stresses under a torque or a case, its factors left out.

        Raises
        ------
        InputError
            A torque at a station that does not exist, or only at held stations.
        """
        load = case if isinstance(case, TorqueCase) else TorqueCase("torque", case)
        applied = load.at_stations(len(self.segments) + 1)
        if applied.any() and not np.delete(applied, self.held).any():
            raise InputError(f"case {load.name!r}: every torque is at a held station, {self.held}: it twists nothing")
        ends = [part.stiffness_bounds for part in self.segments]
        nominal = np.array([part.stiffness for part in self.segments])
        twists, torques = _solve(nominal, applied, self.held)
        spread = np.zeros((2, len(applied)))
        for k, end in enumerate(ends):  # each torsion constant in turn to the worse end of its bracket
            off = [_solve(_with(nominal, k, value), applied, self.held) for value in (end.lower, end.upper)]
            spread[0] += np.max([np.abs(twist - twists) for twist, _ in off], axis=0)
            spread[1, 1:] += np.max([np.abs(torque - torques) for _, torque in off], axis=0)
        peaks = tuple(part.peak_stress(float(t)) for part, t in zip(self.segments, torques, strict=True))
        return BarResponse(self, load, twists, spread[0], torques, spread[1, 1:], peaks)

    def margins(
        self, cases: float | TorqueCase | Sequence[TorqueCase], allowables: Allowables
    ) -> MarginTable:
        """Return the margins of safety of torque cases; see `torsionfe.member.margins.margins`."""
        from torsionfe.member.margins import margins

        return margins(self, cases, allowables)

    def label(self, segment: int) -> str:
        """Return what tables call a segment."""
        return self.segments[segment].name or str(segment)


@dataclass(frozen=True, eq=False)
class BarResponse:
    """A stepped bar under one torque case, factors left out. ``print`` shows a table.

    Attributes
    ----------
    bar : SteppedBar
    case : TorqueCase
    twists : ndarray of shape (n + 1,)
        Rotation of each station, rad.
    twist_errors : ndarray of shape (n + 1,)
        What the brackets of the torsion constants leave open in each: all of it for a bar held at one station,
        to first order for one held at several.
    torques : ndarray of shape (n,)
        Torque in each segment (force * length): what acts beyond it, towards the last station.
    torque_errors : ndarray of shape (n,)
        Likewise; 0 for a bar held at one station.
    peaks : tuple of PeakShear
        The peak stress of each segment, with its place.
    """

    bar: SteppedBar
    case: TorqueCase
    twists: Floats
    twist_errors: Floats
    torques: Floats
    torque_errors: Floats
    peaks: tuple[PeakShear, ...]

    @property
    def twists_degrees(self) -> Floats:
        """Rotation of each station, degrees."""
        return np.degrees(self.twists)

    @property
    def reactions(self) -> dict[int, float]:
        """Torque that holds each held station, force * length."""
        before, after = np.concatenate([[0.0], self.torques]), np.concatenate([self.torques, [0.0]])
        applied = self.case.at_stations(len(self.twists))
        return {k: float(before[k] - after[k] - applied[k]) for k in self.bar.held}

    @property
    def governing(self) -> int:
        """The segment of the largest stress; one whose strength is not defined comes first."""
        worst = [
            math.inf if peak.undefined and torque else peak.unfavourable
            for peak, torque in zip(self.peaks, self.torques, strict=True)
        ]
        return int(np.argmax(worst))

    def twist_at(self, positions: float | Sequence[float] | Floats) -> Floats:
        """Return the rotation (rad) at places along the bar; linear between stations."""
        return np.asarray(np.interp(positions, self.bar.positions, self.twists), dtype=float)

    def __str__(self) -> str:
        rows = [["segment", "from", "to", "torque", "twist at end", "degrees", "peak stress", "at"]]
        for k, peak in enumerate(self.peaks):
            place = f"({number(peak.x)}, {number(peak.y)})"
            rows.append(
                [
                    self.bar.label(k),
                    *(number(z, 6) for z in self.bar.positions[k : k + 2]),
                    number(self.torques[k], 6),
                    f"{number(self.twists[k + 1])} rad",
                    number(math.degrees(self.twists[k + 1])),
                    number(peak.stress),
                    place if not peak.undefined else f"{place}; {peak.undefined}",
                ]
            )
        held = ", ".join(f"{station} ({number(torque, 6)})" for station, torque in self.reactions.items())
        return "\n".join(
            [
                table(rows, f"Torque case {self.case.name}", head=True),
                f"held at station (reaction): {held}",
                f"largest stress in segment {self.bar.label(self.governing)}",
            ]
        )


def _with(values: Floats, index: int, value: float) -> Floats:
    changed = values.copy()
    changed[index] = value
    return changed


def _solve(stiffness: Floats, applied: Floats, held: Sequence[int]) -> tuple[Floats, Floats]:
    """Return the rotation of each station and the torque in each segment of springs in series.

    Torques follow from statics outwards of the held stations, and between two of them from the rotations that
    must add up to nothing; an unloaded segment has exactly 0.
    """
    torques, twists = np.zeros(len(stiffness)), np.zeros(len(applied))
    first, last = held[0], held[-1]
    torques[:first] = -np.cumsum(applied[:first])
    torques[last:] = np.cumsum(applied[:last:-1])[::-1]
    for a, b in pairwise(held):
        passed = np.concatenate([[0.0], np.cumsum(applied[a + 1 : b])])
        weight = 1.0 / stiffness[a:b]
        torques[a:b] = weight @ passed / weight.sum() - passed
    steps = torques / stiffness
    for a, b in zip(held, (*held[1:], len(stiffness)), strict=True):
        twists[a + 1 : b + 1] = np.cumsum(steps[a:b])
    twists[:first] = -np.cumsum(steps[:first][::-1])[::-1]
    twists[list(held)] = 0.0
    return twists, torques
