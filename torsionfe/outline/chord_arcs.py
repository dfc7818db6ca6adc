"""The arc that a run of chords was drawn from, tangent to the edges beside it where the chords were."""

from __future__ import annotations

import numpy as np

from torsionfe.checks import Floats
from torsionfe.outline import arcs as arc_geometry
from torsionfe.outline.chains import Flags, Loop, Run, end_angle, tangent_of, turn_of
from torsionfe.outline.circle_fit import Circle, Line, fit_circle

__all__ = ["arc_of", "circle_of"]


def arc_of(loop: Loop, run: Run, taken: Flags) -> tuple[Floats, Floats, float]:
    """Return where an arc starts and ends, and its bulge: tangent to its neighbours where the chords were."""
    n = len(loop)
    points = loop.points[np.arange(run.first, run.last + 1) % n]
    before, after = (run.first - 1) % n, run.last % n
    lines: list[Line | None] = [
        Line(loop.points[edge], loop.direction[edge]) if loop.straight[edge] and not taken[edge] else None
        for edge in (before, after)
    ]
    kinks = [
        None if line is None else way * run.side * turn_of(tangent_of(run, points[k]), line.direction)
        for line, way, k in zip(lines, (-1, 1), (0, -1), strict=True)
    ]
    chords = [end_angle(loop, run, way) for way in (-1, 1)]
    if all(k is not None and 0.35 * c < k < 0.65 * c for k, c in zip(kinks, chords, strict=True)):
        # the edges touch the arc and the vertices lie outside it: chords that are tangents
        midpoints = 0.5 * (points[:-1] + points[1:])
        arc = _tangent_arc(midpoints, points, lines, run)
        if arc is not None:
            return arc
    slack = [2.0 * run.allowed / min(loop.length[edge], run.circle.radius) for edge in (before, after)]
    near = [
        line if k is not None and abs(k) <= 0.15 * c + s else None
        for line, k, c, s in zip(lines, kinks, chords, slack, strict=True)
    ]
    for choice in (near, [near[0], None], [None, near[1]]):
        arc = _tangent_arc(points, points, choice, run)
        if arc is not None:
            return arc
    return points[0], points[-1], _bulge(points[0], points[-1], run.circle, run.side)


def _tangent_arc(
    on: Floats, chain: Floats, lines: list[Line | None], run: Run
) -> tuple[Floats, Floats, float] | None:
    """Return the arc nearest to the points ``on``, tangent to the lines, or None where it is too far off."""
    given = [line for line in lines if line is not None]
    circle = fit_circle(on, run.side, given)
    if not given or circle is None:
        return None
    start, end = (
        point if line is None else _foot(circle, line, run.side)
        for point, line in zip((chain[0], chain[-1]), lines, strict=True)
    )
    if lines[0] is not None and lines[1] is not None:
        turn = run.side * turn_of(lines[0].direction, lines[1].direction) % (2.0 * np.pi)
        bulge = run.side * np.tan(0.25 * turn)
    else:  # tangent at one end, through the vertex at the other
        straight = (end - start) / np.hypot(*(end - start))
        ways = (given[0].direction, straight) if lines[1] is None else (straight, given[0].direction)
        bulge = run.side * np.tan(0.5 * (run.side * turn_of(*ways) % (2.0 * np.pi)))
    step = float(np.hypot(*np.diff(chain, axis=0).T).max())
    if max(np.hypot(*(start - chain[0])), np.hypot(*(end - chain[-1]))) > step:
        return None
    true = circle_of(start, end, bulge)
    return (start, end, float(bulge)) if true.deviation(on) <= 2.0 * run.allowed else None


def _foot(circle: Circle, line: Line, side: float) -> Floats:
    along = (circle.centre - line.point) @ line.direction
    return np.asarray(line.point + along * line.direction, dtype=float)


def _bulge(start: Floats, end: Floats, circle: Circle, side: float) -> float:
    turn = side * turn_of(start - circle.centre, end - circle.centre) % (2.0 * np.pi)
    return float(side * np.tan(0.25 * turn))


def circle_of(start: Floats, end: Floats, bulge: float) -> Circle:
    """Return the circle of the arc between two points (2,)."""
    p, q, b = start[None], end[None], np.array([bulge])
    return Circle(arc_geometry.arc_centre(p, q, b)[0], float(arc_geometry.arc_radius(p, q, b)[0]))
