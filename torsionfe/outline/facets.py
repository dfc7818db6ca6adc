"""Arcs restored from chains of chords.

Files and polygons often carry a fillet as a chain of short chords. Solved as drawn, every chord end is a weak
re-entrant corner, where the stress has no bound: the peak reads high, and higher the finer the mesh (measured
on a fillet: 15 % at 8 chords, 5 % at 16). A chain whose vertices lie on one circle becomes the arc it was
drawn from, tangent to the straight edges beside it where the chain was; any other stays and is told of.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from torsionfe.checks import Floats, positive
from torsionfe.errors import InputError, OutlineError
from torsionfe.outline import arcs as arc_geometry
from torsionfe.outline.chains import (
    CLOSED_SIDES,
    Chain,
    Flags,
    Loop,
    Run,
    Scale,
    apart,
    arcs_in,
    chains_of,
    tangent_of,
    turn_of,
    without_accidents,
)
from torsionfe.outline.chord_arcs import arc_of, circle_of
from torsionfe.outline.circle_fit import fit_circle
from torsionfe.outline.fillets import SMOOTH
from torsionfe.outline.outline import Outline
from torsionfe.text import number, percent, table

__all__ = ["ChordChain", "RestoredArc", "RestoredArcs", "restore_arcs"]

_TOLERANCE = 1e-5
_COARSEST = 5e-4
_WEAK = np.radians(25.0)
_LISTED = 12


@dataclass(frozen=True)
class RestoredArc:
    """An arc that a chain of chords was restored to.

    Attributes
    ----------
    loop : int
        0 for the outer loop, ``k`` for void ``k - 1``.
    start, end : tuple of float
        Where it begins and ends (length).
    centre : tuple of float
    radius : float
        Length.
    sweep : float
        Angle in radians, positive counter-clockwise.
    chords : int
        How many chords it replaces.
    deviation : float
        Largest distance of the chords' ends from the arc, length.
    re_entrant : bool
        Whether the material lies outside the circle, as on a fillet.
    kinks : tuple of float
        Turns in radians, positive counter-clockwise, from the edge before it and to the edge after it: 0
        where it is tangent.
    """

    loop: int
    start: tuple[float, float]
    end: tuple[float, float]
    centre: tuple[float, float]
    radius: float
    sweep: float
    chords: int
    deviation: float
    re_entrant: bool
    kinks: tuple[float, float]

    @property
    def weak_corners(self) -> tuple[tuple[float, float], ...]:
        """Ends at which the arc of a fillet just misses being tangent: weak re-entrant corners."""
        ends = zip((self.start, self.end), self.kinks, strict=True)
        sense = math.copysign(1.0, self.sweep)
        return tuple(at for at, kink in ends if self.re_entrant and SMOOTH < sense * kink < _WEAK)


@dataclass(frozen=True)
class ChordChain:
    """A chain of chords that was left as drawn.

    Attributes
    ----------
    loop : int
        0 for the outer loop, ``k`` for void ``k - 1``.
    start, middle, end : tuple of float
        Where it begins, passes and ends (length).
    chords : int
    turn : float
        The largest angle between two of its chords, radians.
    re_entrant : bool
        Whether its corners are re-entrant, as on a fillet.
    why : str
        Why it was left.
    """

    loop: int
    start: tuple[float, float]
    middle: tuple[float, float]
    end: tuple[float, float]
    chords: int
    turn: float
    re_entrant: bool
    why: str

    def __str__(self) -> str:
        x, y = self.middle
        effect = (
            "each chord end is a weak re-entrant corner: the peak stress there reads high (measured on a "
            "fillet: 15 % at 8 chords, 5 % at 16) and grows with every refinement of the mesh"
            if self.re_entrant
            else "its corners point outwards: no false peak, but a little area is missing"
        )
        return (
            f"{self.chords} chords near ({x:g}, {y:g}) on {_name(self.loop)} turn by up to "
            f"{np.degrees(self.turn):.3g} degrees each and stay as drawn, since {self.why}; {effect}"
        )


@dataclass(frozen=True)
class RestoredArcs:
    """An outline with its arcs restored, and what was found on the way.

    Attributes
    ----------
    outline : Outline
    arcs : tuple of RestoredArc
    chains_left : tuple of ChordChain
        Chains of small turns that lie on no circle.
    tolerance : float
        The largest distance between chord ends and arc that was allowed, length.
    """

    outline: Outline
    arcs: tuple[RestoredArc, ...]
    chains_left: tuple[ChordChain, ...]
    tolerance: float

    @property
    def arcs_restored(self) -> int:
        """How many chains became arcs."""
        return len(self.arcs)

    @property
    def warnings(self) -> tuple[str, ...]:
        """What of the outline will still make a false peak of stress, and where."""
        kinked = [
            f"the arc of radius {arc.radius:g} restored on {_name(arc.loop)} is not quite tangent at "
            f"({x:g}, {y:g}): a weak re-entrant corner stays there, of "
            f"{180.0 + np.degrees(max(map(abs, arc.kinks))):.2f} degrees, at which the stress reads high"
            for arc in self.arcs
            for x, y in arc.weak_corners
        ]
        return (*map(str, self.chains_left), *kinked)

    def __str__(self) -> str:
        rows = [["loop", "centre", "radius", "sweep, degrees", "chords", "deviation / radius"]]
        for arc in self.arcs[:_LISTED]:
            rows.append([
                _name(arc.loop),
                f"({arc.centre[0]:.6g}, {arc.centre[1]:.6g})",
                number(arc.radius, 6),
                f"{np.degrees(arc.sweep):.4g}",
                str(arc.chords),
                percent(arc.deviation / arc.radius),
            ])
        title = f"{len(self.arcs)} arcs restored, {len(self.chains_left)} chains left"
        more = [f"... and {len(self.arcs) - _LISTED} more"] if len(self.arcs) > _LISTED else []
        left = [f"left: {warning}" for warning in self.warnings[:_LISTED]]
        return "\n".join([table(rows if self.arcs else [], title, head=True), *more, *left])


def restore_arcs(outline: Outline, tolerance: float | None = None) -> RestoredArcs:
    """Return an outline with chains of chords made arcs again where their ends lie on one circle.

    A chain is at least 3 straight edges that turn the same way by at most 30 degrees at a time; its first and
    last chord may be shorter. A closed loop on one circle becomes that circle from 16 sides on: below, it is
    a polygon that is meant (a hexagon, a 12-sided nut), and stays. Where the chords set off along the
    straight edges beside them, the arc is tangent to those, and its ends move along them. Chains along an
    ellipse or another curve stay, and are listed.

    Parameters
    ----------
    outline : Outline
    tolerance : float, optional
        How far (length) the ends of chords may lie from the arc. By default a hundred-thousandth of the size,
        but at most a tenth of the chords' sagitta; what the coordinates were rounded to, if at least to two
        decimals, is allowed for.

    Returns
    -------
    RestoredArcs

    Examples
    --------
    >>> import shapely
    >>> faceted = shapely.box(0, 0, 40, 20).buffer(5, quad_segs=8)
    >>> result = restore_arcs(Outline.from_polygon(faceted))
    >>> result.arcs_restored, round(result.arcs[0].radius, 12), len(result.outline.vertices)
    (4, 5.0, 8)
    """
    if not isinstance(outline, Outline):
        raise InputError(f"an Outline is needed, got {type(outline).__name__}")
    scale = _scale(outline, None if tolerance is None else positive("tolerance", tolerance))
    loops = [
        _restored(Loop.of(loop.vertices, loop.bulges, k), loop.bulges, scale)
        for k, loop in enumerate((outline, *outline.voids))
    ]
    found = tuple(arc for loop in loops for arc in loop.arcs)
    left = tuple(chain for loop in loops for chain in loop.left)
    if not found:
        return RestoredArcs(outline, (), left, scale.limit)
    try:
        outer, *voids = (Outline(loop.points, loop.bulges) for loop in loops)
        result = Outline(outer.vertices, outer.bulges, voids)
    except OutlineError as error:
        why = f"as arcs they would spoil the outline ({error})"
        return RestoredArcs(outline, (), left + tuple(_given_up(arc, why) for arc in found), scale.limit)
    return RestoredArcs(result, found, left, scale.limit)


def _name(loop: int) -> str:
    return "the outer loop" if loop == 0 else f"void {loop - 1}"


def _place(point: Floats) -> tuple[float, float]:
    return float(point[0]), float(point[1])


def _given_up(arc: RestoredArc, why: str) -> ChordChain:
    centre, start = np.array(arc.centre), np.array(arc.start)
    c, s = np.cos(0.5 * arc.sweep), np.sin(0.5 * arc.sweep)
    middle = centre + np.array([[c, -s], [s, c]]) @ (start - centre)
    turn = abs(arc.sweep) / arc.chords
    return ChordChain(arc.loop, arc.start, _place(middle), arc.end, arc.chords, turn, arc.re_entrant, why)


def _scale(outline: Outline, tolerance: float | None) -> Scale:
    if tolerance is not None:
        return Scale(tolerance, tolerance)
    size = outline.size
    every = np.concatenate([loop.vertices.ravel() for loop in (outline, *outline.voids)])
    noise = max(1e-9 * size, 4e-16 * float(np.abs(every).max()))
    for decimals in range(2, 9):
        step = 10.0**-decimals
        if np.abs(np.round(every, decimals) - every).max() <= 1e-3 * step:
            # half a step each way off, so up to 0.71 of a step from the true point
            noise = max(noise, min(0.8 * step, _COARSEST * size))
            break
    return Scale(max(_TOLERANCE * size, noise), noise)


@dataclass(frozen=True)
class _Restored:
    """A loop after its chains were looked at."""

    points: Floats
    bulges: Floats
    arcs: tuple[RestoredArc, ...]
    left: tuple[ChordChain, ...]


def _restored(loop: Loop, bulges: Floats, scale: Scale) -> _Restored:
    chains = chains_of(loop, scale)
    runs = apart(loop, [run for chain in chains for run in arcs_in(loop, chain, scale)])
    runs = without_accidents(loop, runs, scale)
    left = tuple(_left(loop, chains, runs, scale))
    if runs and runs[0].last - runs[0].first == len(loop):
        points, arc = _circle(loop, runs[0])
        return _Restored(points, np.full(2, runs[0].side), (arc,), left)
    return _Restored(*_with_arcs(loop, runs, bulges), left)


# --- chains that stay ----------------------------------------------------------------------------------


def _left(loop: Loop, chains: list[Chain], runs: list[Run], scale: Scale) -> list[ChordChain]:
    """Return the stretches of at least three small turns that no arc explains."""
    n = len(loop)
    explained = np.zeros(n, dtype=bool)
    for run in runs:
        explained[np.arange(run.first, run.last + 1) % n] = True
    left = []
    for chain in chains:
        if chain.closed and not runs:
            left.append(_chord_chain(loop, chain, _why_closed(loop, scale)))
            continue
        inside = np.arange(chain.first + 1, chain.last)
        change = np.diff(np.concatenate([[True], explained[inside % n], [True]]).astype(int))
        for a, b in zip(np.flatnonzero(change < 0), np.flatnonzero(change > 0), strict=True):
            within = inside[a:b] % n
            told = abs(loop.turn[within].sum()) > 4.0 * scale.noise / loop.length[within].min()
            if b - a >= 3 and told:
                part = Chain(chain.first + int(a), chain.first + int(b) + 1, chain.side, False)
                left.append(_chord_chain(loop, part, _why(scale)))
    return left


def _why(scale: Scale) -> str:
    return f"their ends lie on no common circle within {scale.limit:.3g}"


def _why_closed(loop: Loop, scale: Scale) -> str:
    circle = fit_circle(loop.points)
    if len(loop) >= CLOSED_SIDES or circle is None or circle.deviation(loop.points) > scale.limit:
        return _why(scale)
    return f"a closed polygon of {len(loop)} sides is taken as meant (it is a circle from {CLOSED_SIDES} on)"


def _chord_chain(loop: Loop, chain: Chain, why: str) -> ChordChain:
    first, last = chain.first, chain.last
    turns = np.abs(loop.turn[np.arange(first + 1, last) % len(loop)])
    start, middle, end = (_place(loop.points[k % len(loop)]) for k in (first, (first + last) // 2, last))
    re_entrant = loop.is_re_entrant(chain.side)
    return ChordChain(loop.number, start, middle, end, last - first, float(turns.max()), re_entrant, why)


# --- arcs put in their place ---------------------------------------------------------------------------


def _circle(loop: Loop, run: Run) -> tuple[Floats, RestoredArc]:
    """Return the ends (2, 2) of the two half arcs of a loop that is one circle, the first vertex first."""
    circle = run.circle
    spoke = loop.points[0] - circle.centre
    spoke = spoke * (circle.radius / np.hypot(*spoke))
    points = circle.centre + np.array([spoke, -spoke])
    arc = RestoredArc(
        loop=loop.number,
        start=_place(points[0]),
        end=_place(points[0]),
        centre=_place(circle.centre),
        radius=circle.radius,
        sweep=2.0 * math.pi * run.side,
        chords=len(loop),
        deviation=circle.deviation(loop.points),
        re_entrant=loop.is_re_entrant(run.side),
        kinks=(0.0, 0.0),
    )
    return points, arc


def _with_arcs(
    loop: Loop, runs: list[Run], bulges: Floats
) -> tuple[Floats, Floats, tuple[RestoredArc, ...]]:
    """Return the vertices and bulges of a loop with its runs as arcs, and what those are."""
    n = len(loop)
    points, new = loop.points.copy(), bulges.copy()
    keep, taken = np.ones(n, dtype=bool), np.zeros(n, dtype=bool)
    for run in runs:
        taken[np.arange(run.first, run.last) % n] = True
    for run in runs:
        a, b = run.first % n, run.last % n
        points[a], points[b], new[a] = arc_of(loop, run, taken)
        keep[np.arange(run.first + 1, run.last) % n] = False
    arcs = tuple(_described(loop, points, float(new[run.first % n]), run, taken) for run in runs)
    return points[keep], new[keep], arcs


def _described(loop: Loop, points: Floats, bulge: float, run: Run, taken: Flags) -> RestoredArc:
    n = len(loop)
    a, b = run.first % n, run.last % n
    circle = circle_of(points[a], points[b], bulge)
    placed = replace(run, circle=circle)
    kinks = []
    for vertex, edge, way in ((a, (a - 1) % n, -1), (b, b, 1)):
        straight = loop.straight[edge] and not taken[edge]
        kink = way * turn_of(tangent_of(placed, points[vertex]), loop.direction[edge]) if straight else 0.0
        kinks.append(0.0 if abs(kink) < 1e-9 else float(kink))
    return RestoredArc(
        loop=loop.number,
        start=_place(points[a]),
        end=_place(points[b]),
        centre=_place(circle.centre),
        radius=circle.radius,
        sweep=float(arc_geometry.sweep(bulge)),
        chords=run.last - run.first,
        deviation=circle.deviation(loop.points[np.arange(run.first, run.last + 1) % n]),
        re_entrant=loop.is_re_entrant(run.side),
        kinks=(kinks[0], kinks[1]),
    )
