"""Chains of chords on a loop, and which of them lie on circles.

A chain is a run of straight edges that turn the same way by at most 30 degrees at a time. Its edges are the
chords of one arc, or of several with straight edges between, or of a curve that is no circle. Only an edge
more than three times as long as the two on either side of it is set aside at once, as a straight part
between two arcs or a flat on a round bar.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats
from torsionfe.outline.circle_fit import Circle, fit_circle

__all__ = [
    "CLOSED_SIDES",
    "Chain",
    "Loop",
    "Run",
    "Scale",
    "apart",
    "arcs_in",
    "chains_of",
    "end_angle",
    "tangent_of",
    "turn_of",
    "turning",
    "without_accidents",
]

Flags = NDArray[np.bool_]

#: A chord turns at most this much (radians): 30 degrees, and half a degree for rounded coordinates.
MOST_TURN = np.radians(30.5)
#: A closed loop of chords on one circle is a circle from this many sides on; below, a polygon that is meant.
CLOSED_SIDES = 16
_LONG = 3.0
_HIDDEN = 16.0
_EXACT = 0.01
_TANGENT_JOINT = np.radians(0.05)
_ROUNDS = 100
_FEWEST = 3


@dataclass(frozen=True)
class Scale:
    """How near to a circle is on it: ``limit`` at most, ``noise`` at least (lengths)."""

    limit: float
    noise: float
    share: float = 0.1

    def allowed(self, chord: Floats, radius: float) -> float:
        """Return the distance allowed to the circle, a share of the chords' sagitta within the two ends."""
        sagitta = float(np.median(chord)) ** 2 / (8.0 * radius)
        return max(self.noise, min(self.limit, self.share * sagitta))


@dataclass(frozen=True)
class Loop:
    """A loop as its edges: where they start, how long they are, how much they turn at their starts."""

    points: Floats  # (n, 2)
    straight: Flags  # (n,)
    length: Floats  # (n,) of the chord
    direction: Floats  # (n, 2) of the chord
    turn: Floats  # (n,) between the edge before and this one; NaN beside an arc
    number: int  # 0 for the outer loop, k for void k - 1

    @classmethod
    def of(cls, points: Floats, bulges: Floats, number: int) -> Loop:
        """Return the edges of a loop of vertices ``(n, 2)``, counter-clockwise, and bulges ``(n,)``."""
        step = np.roll(points, -1, axis=0) - points
        length = np.hypot(*step.T)
        direction = step / length[:, None]
        before = np.roll(direction, 1, axis=0)
        cross = before[:, 0] * direction[:, 1] - before[:, 1] * direction[:, 0]
        straight = bulges == 0.0
        turn = np.arctan2(cross, np.sum(before * direction, axis=1))
        turn = np.where(straight & np.roll(straight, 1), turn, np.nan)
        return cls(points, straight, length, direction, turn, number)

    def __len__(self) -> int:
        return len(self.points)

    def is_re_entrant(self, side: float) -> bool:
        """Return whether turns to this side (1 left, -1 right) are re-entrant corners of the material."""
        return (side < 0.0) != (self.number > 0)


@dataclass(frozen=True)
class Chain:
    """Consecutive vertices of a loop with small turns one way between them, ``first`` to ``last``.

    The indices run on past the end of the loop; a closed chain comes back to its first vertex.
    """

    first: int
    last: int
    side: float
    closed: bool


@dataclass(frozen=True)
class Run:
    """Chords ``first`` to ``last`` (vertex indices, running on past the end) on one circle."""

    first: int
    last: int
    side: float
    circle: Circle
    allowed: float
    exact: bool


def chains_of(loop: Loop, scale: Scale) -> list[Chain]:
    """Return the chains of at least three edges, in order."""
    n = len(loop)
    shorter = np.minimum(loop.length, np.roll(loop.length, 1))
    chord = loop.straight & ~_long(loop, scale)
    smooth = chord & np.roll(chord, 1) & (np.abs(loop.turn) <= MOST_TURN)
    # on a straight line, unless the rounding of coordinates may have made it look so
    bent = np.abs(loop.turn) * shorter > 2e-9 * float(np.ptp(loop.points, axis=0).max())
    smooth &= bent | (4.0 * scale.noise > 1e-3 * shorter)
    sign = np.where(smooth, turning(loop, scale), 0.0)
    if smooth.all() and not (sign.min() < 0.0 < sign.max()):
        return [Chain(0, n, float(np.sign(sign.sum()) or 1.0), True)]
    chains = []
    for first, last in _stretches(smooth):
        for a, b, side in _one_way(sign, first, last):
            net = float(loop.turn[np.arange(a, b + 1) % n].sum())
            way = side or float(np.sign(net)) * (abs(net) > MOST_TURN)
            if b - a + 2 >= _FEWEST and way:
                chains.append(Chain(a - 1, b + 1, way, False))
    return chains


def turning(loop: Loop, scale: Scale) -> Floats:
    """Return the way that the loop turns at each vertex, 0 where rounding could make it up: (n,)."""
    shorter = np.minimum(loop.length, np.roll(loop.length, 1))
    told = np.abs(loop.turn) * shorter > 4.0 * scale.noise
    return np.where(told, np.sign(loop.turn), 0.0)


def _long(loop: Loop, scale: Scale) -> Flags:
    """Return which edges are over three times as long as each of the two on either side.

    Where rounding hides the turns, being longer than the two on one side is enough: a straight edge and a few
    chords of an arc would pass for an arc of a large radius.
    """
    length = loop.length
    after = np.maximum(np.roll(length, -1), np.roll(length, -2))
    before = np.maximum(np.roll(length, 1), np.roll(length, 2))
    weight = np.abs(loop.turn) * np.minimum(length, np.roll(length, 1))
    hidden = weight < _HIDDEN * scale.noise  # at the start of each edge
    hidden_after = np.roll(hidden, -2)
    hidden_before = np.roll(hidden, 1)
    long_after, long_before = length > _LONG * after, length > _LONG * before
    either = (long_after & hidden_after) | (long_before & hidden_before)
    return np.asarray((long_after & long_before) | either, dtype=bool)


def _stretches(smooth: Flags) -> list[tuple[int, int]]:
    """Return the first and last index of each stretch of smooth vertices, running on past the end."""
    n = len(smooth)
    if smooth.all():
        return [(0, n - 1)]
    gap = int(np.flatnonzero(~smooth)[0])
    turned = np.roll(smooth, -gap).astype(int)
    change = np.diff(np.concatenate([turned, [0]]))
    starts, ends = np.flatnonzero(change == 1) + 1, np.flatnonzero(change == -1)
    return [(gap + int(a), gap + int(b)) for a, b in zip(starts, ends, strict=True)]


def _one_way(sign: Floats, first: int, last: int) -> Iterator[tuple[int, int, float]]:
    """Split a stretch of vertices where the turns change their sign."""
    signs = sign[np.arange(first, last + 1) % len(sign)]
    told = np.flatnonzero(signs)
    if not len(told):
        yield first, last, 0.0
        return
    cuts = told[1:][np.diff(signs[told]) != 0.0]
    starts = [0, *(int(cut) for cut in cuts)]
    ends = [int(cut) - 1 for cut in cuts] + [last - first]
    for a, b in zip(starts, ends, strict=True):
        inside = signs[a : b + 1]
        yield first + a, first + b, float(np.sign(inside.sum()))


def arcs_in(loop: Loop, chain: Chain, scale: Scale) -> list[Run]:
    """Return the runs of a chain that lie on circles, each as long as it can be, in order."""
    if chain.closed:
        found = _on_circle(np.vstack([loop.points, loop.points[:1]]), chain.side, scale)
        if found is not None:
            return [Run(0, len(loop), chain.side, *found)] if len(loop) >= CLOSED_SIDES else []
        start = _opening(loop, chain, scale)
        chain = Chain(start, start + len(loop), chain.side, False)
    index = np.arange(chain.first, chain.last + 1) % len(loop)
    points = loop.points[index]
    hopeful = _hopeful(points, chain.side, scale)
    runs = []
    at = 0
    while at + _FEWEST < len(points):
        grown = _best(points, at, chain.side, scale) if hopeful[at] else None
        if grown is None:
            at += 1
            continue
        end, circle, allowed, exact = grown
        runs.append(Run(chain.first + at, chain.first + end, chain.side, circle, allowed, exact))
        at = end
    return runs


def _opening(loop: Loop, chain: Chain, scale: Scale) -> int:
    """Return the vertex at which to cut a closed chain: at a place on no circle, or at the longest edge."""
    n = len(loop)
    points = loop.points[np.arange(n + _FEWEST) % n]
    off = np.flatnonzero(~_hopeful(points, chain.side, scale)[:n])
    if len(off):
        return int(off[np.argmax(loop.length[(off + 1) % n])]) + 1
    return int(np.argmax(loop.length)) + 1


def _hopeful(points: Floats, side: float, scale: Scale) -> Flags:
    """Return whether the circle through each three points comes near the fourth: (n,) bool, a first sieve."""
    a, b, c, d = points[:-3], points[1:-2], points[2:-1], points[3:]
    p, q = b - a, c - a
    cross = p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0]
    p2, q2 = np.sum(p * p, axis=1), np.sum(q * q, axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        ux = (q[:, 1] * p2 - p[:, 1] * q2) / (2.0 * cross)
        uy = (p[:, 0] * q2 - q[:, 0] * p2) / (2.0 * cross)
        radius = np.hypot(ux, uy)
        off = np.abs(np.hypot(*(d - a - np.stack([ux, uy], axis=1)).T) - radius)
        sagitta = np.maximum(p2, np.sum((d - c) ** 2, axis=1)) / (8.0 * radius)
        ok = (off <= 12.0 * np.maximum(scale.noise, np.minimum(scale.limit, scale.share * sagitta)))
    # where rounding hides the turn, the fit itself decides
    ok |= ~np.isfinite(off) | (np.abs(cross) < 8.0 * scale.noise * np.sqrt(q2)) | (side * cross < 0.0)
    return np.concatenate([ok, np.zeros(len(points) - len(ok), dtype=bool)])


def _best(points: Floats, at: int, side: float, scale: Scale) -> tuple[int, Circle, float, bool] | None:
    """Return the run from ``at``: the one met exactly, unless that is less than half of what is allowed.

    With the whole allowance a run could reach into the first chords of the next arc.
    """
    loose = _longest(points, at, side, scale)
    if loose is None:
        return None
    strict = _longest(points, at, side, replace(scale, share=_EXACT))
    return strict if strict is not None and 2 * (strict[0] - at) >= loose[0] - at else loose


def _longest(
    points: Floats, at: int, side: float, scale: Scale
) -> tuple[int, Circle, float, bool] | None:
    """Return the last point of the longest run from ``at`` that lies on a circle, by doubling and halving."""
    best: tuple[int, Circle, float, bool] | None = None
    low, high = at + _FEWEST - 1, len(points)  # a run to low may be an arc, one to high may not
    trial = at + _FEWEST
    while low < trial < high:
        run = points[at : trial + 1]
        found = _on_circle(run, side, scale)
        if found is not None:
            best, low = (trial, *found), trial
        elif _is_flat(run, 8.0 * scale.noise):
            low = trial
        else:
            high = trial
        trial = min(2 * trial - at, len(points) - 1) if high == len(points) else (low + high) // 2
    return best


def _is_flat(points: Floats, width: float) -> bool:
    """Return whether the points keep within a strip so narrow that the rounding could have bent it."""
    chord = points[-1] - points[0]
    length = float(np.hypot(*chord))
    rise = (points - points[0]) @ np.array([-chord[1], chord[0]])
    return bool(np.abs(rise).max() <= width * length)


def _on_circle(points: Floats, side: float, scale: Scale) -> tuple[Circle, float, bool] | None:
    """Return the circle that a run of points lies on, what was allowed, and whether it is met exactly."""
    circle = fit_circle(points)
    if circle is None:
        return None
    spoke = points - circle.centre
    cross = spoke[:-1, 0] * spoke[1:, 1] - spoke[:-1, 1] * spoke[1:, 0]
    angle = side * np.arctan2(cross, np.sum(spoke[:-1] * spoke[1:], axis=1))
    if angle.min() <= 0.0 or angle.max() > MOST_TURN or angle.sum() > 2.0 * np.pi + 1e-6:
        return None
    chord = np.hypot(*np.diff(points, axis=0).T)
    allowed = scale.allowed(chord, circle.radius)
    off = circle.deviation(points)
    rise = circle.radius * (1.0 - np.cos(min(0.5 * float(angle.sum()), np.pi)))
    if off > allowed or rise < 8.0 * allowed:
        return None
    sagitta = float(np.median(chord)) ** 2 / (8.0 * circle.radius)
    return circle, allowed, off <= max(scale.noise, _EXACT * sagitta)


# --- runs that are no arcs -------------------------------------------------------------------------------


def apart(loop: Loop, runs: list[Run]) -> list[Run]:
    """Return the runs of which no two share a chord: the longer one stays."""
    taken = np.zeros(len(loop), dtype=bool)
    kept = []
    for run in sorted(runs, key=lambda run: run.first - run.last):
        edges = np.arange(run.first, run.last) % len(loop)
        if not taken[edges].any():
            taken[edges] = True
            kept.append(run)
    return sorted(kept, key=lambda run: run.first % len(loop))


def without_accidents(loop: Loop, runs: list[Run], scale: Scale) -> list[Run]:
    """Return the runs without those that are parts of a curve that is no circle.

    An ellipse has stretches that a circle fits within tolerance. They show by what goes on beside them: more
    chords with small turns instead of a tangent straight edge, or another arc that is not quite tangent.
    """
    told = turning(loop, scale) != 0.0
    for _ in range(_ROUNDS):
        starts = {run.first % len(loop): run for run in runs}
        ends = {run.last % len(loop): run for run in runs}
        kept = [
            run
            for run in runs
            if not _goes_on(loop, run, 1, starts, told) and not _goes_on(loop, run, -1, ends, told)
        ]
        if len(kept) == len(runs):
            return kept
        runs = kept
    return []


def _goes_on(loop: Loop, run: Run, way: int, others: dict[int, Run], told: Flags) -> bool:
    """Return whether the curve goes on past the end of a run (``way`` 1) or before its start (-1)."""
    n = len(loop)
    if run.last - run.first == n:
        return False
    vertex = (run.last if way > 0 else run.first) % n
    other = others.get(vertex)
    chord = end_angle(loop, run, way)
    tangent = tangent_of(run, loop.points[vertex])
    if other is not None:
        kink = abs(turn_of(tangent, tangent_of(other, loop.points[vertex])))
        small = kink < 0.75 * max(chord, end_angle(loop, other, -way))
        return small and not (run.exact and other.exact and kink <= _TANGENT_JOINT)
    edge = vertex if way > 0 else (vertex - 1) % n
    if not loop.straight[edge]:
        return False
    kink = way * run.side * turn_of(tangent, loop.direction[edge])
    beyond = (vertex + way) % n
    small = told[beyond] and abs(loop.turn[beyond]) < 2.0 * chord and beyond not in others
    return bool(small and 0.25 * chord < kink < 0.75 * chord + 0.5 * abs(loop.turn[beyond]))


def tangent_of(run: Run, point: Floats) -> Floats:
    """Return the direction (2,) of a run's circle at a point on it."""
    spoke = (point - run.circle.centre) / np.hypot(*(point - run.circle.centre))
    return np.asarray(run.side * np.array([-spoke[1], spoke[0]]), dtype=float)


def turn_of(a: Floats, b: Floats) -> float:
    """Return the angle (radians) from one direction (2,) to another, positive counter-clockwise."""
    return float(np.arctan2(a[0] * b[1] - a[1] * b[0], a @ b))


def end_angle(loop: Loop, run: Run, way: int) -> float:
    """Return the angle of the longer of the last two chords of a run (the very last may be cut short)."""
    near = np.array([run.last - 1, run.last - 2] if way > 0 else [run.first, run.first + 1]) % len(loop)
    return float(2.0 * np.arcsin(min(loop.length[near].max() / (2.0 * run.circle.radius), 1.0)))
