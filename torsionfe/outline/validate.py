"""Is this the boundary of a cross-section? Where not: what, where, and what to do."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
import shapely

from torsionfe.checks import Floats, Ints
from torsionfe.errors import OutlineError
from torsionfe.outline import arcs

if TYPE_CHECKING:
    from torsionfe.outline.outline import Outline

__all__ = ["CLEARANCE", "facets", "validate_loop", "validate_voids"]

#: Two points, or two loops, nearer than this fraction of the size count as one.
CLEARANCE = 1e-7
_FACET = 1e-6
_LARGEST_BULGE = 50.0
_FLATTEST = 1e-9  # a bulge below is straight: its arc is nearer to the chord than points that count as one
_LARGEST = 1e40  # length**6 and its inverse must stay finite
_FARTHEST = 1e8  # from the origin, in sizes: beyond, rounding exceeds the clearance
_CUSP = np.radians(0.5)


def facets(vertices: Floats, bulges: Floats, tolerance: float) -> Floats:
    """Return the loop with each arc as chords at most ``tolerance`` (length) off, shape (m, 2)."""
    p, q = vertices, np.roll(vertices, -1, axis=0)
    count = facet_counts(vertices, bulges, tolerance)
    rows = np.repeat(np.arange(len(p)), count)
    within = np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)
    return arcs.point_at(p[rows], q[rows], bulges[rows], within / count[rows])


def facet_counts(vertices: Floats, bulges: Floats, tolerance: float) -> Ints:
    """Return into how many chords `facets` breaks each edge, shape (n,)."""
    turn = np.abs(arcs.sweep(bulges))
    radius = arcs.arc_radius(vertices, np.roll(vertices, -1, axis=0), bulges)
    finite = np.where(turn > 0.0, radius, 1.0)
    step = 2.0 * np.arccos(np.clip(1.0 - tolerance / finite, 0.0, 1.0 - 1e-9))
    # at least one chord per 15 degrees, so that a coarse tolerance keeps the shape
    return np.where(turn > 0.0, np.ceil(turn / np.minimum(step, np.pi / 12.0)), 1.0).astype(np.int64)


def _place(point: Floats) -> tuple[float, float]:
    return float(point[0]), float(point[1])


def _fail(message: str, point: Floats) -> OutlineError:
    x, y = _place(point)
    return OutlineError(message.format(f"({x:g}, {y:g})"), (x, y))


def validate_loop(vertices: Floats, bulges: Floats) -> tuple[Floats, Floats]:
    """Return the loop counter-clockwise, or raise `OutlineError`."""
    n = len(vertices)
    if len(bulges) != n:
        raise OutlineError(f"one bulge an edge is needed: {n} vertices but {len(bulges)} bulges")
    bulges = np.where(np.abs(bulges) < _FLATTEST, 0.0, bulges)
    if n < (2 if np.any(bulges) else 3):
        raise OutlineError(f"a loop needs 3 vertices (2 where an edge is an arc), got {n}")
    steep = np.flatnonzero(np.abs(bulges) > _LARGEST_BULGE)
    if len(steep):
        k = steep[0]
        raise _fail(
            f"the bulge {bulges[k]:g} of edge {k} at {{}} is nearly a full circle (at most "
            f"{_LARGEST_BULGE:g}): split the arc in two",
            vertices[k],
        )
    size = _checked_size(vertices)
    step = np.hypot(*(np.roll(vertices, -1, axis=0) - vertices).T)
    twins = np.flatnonzero(step <= CLEARANCE * size)
    if len(twins):
        k = int(twins[0])
        closing = " (the first vertex is not repeated at the end)" if k == n - 1 else ""
        twin = (k + 1) % n
        raise _fail(f"vertices {k} and {twin} are the same point, {{}}: remove one{closing}", vertices[k])
    area = _signed_area(vertices, bulges)
    ring = facets(vertices, bulges, _FACET * size)
    if shapely.convex_hull(shapely.LinearRing(ring - ring[0])).area <= 1e-12 * size**2:
        raise _fail("the loop encloses no area (near {}): its vertices lie on one line", vertices[0])
    _refuse_crossing(ring, size)
    if area < 0.0:
        order = -np.arange(n) % n
        vertices, bulges = vertices[order], -bulges[(order - 1) % n]
    _refuse_cusps(vertices, bulges)
    _refuse_pinch(vertices, bulges, size)
    return vertices.copy(), np.where(bulges == 0.0, 0.0, bulges)  # no negative zeros


def _checked_size(vertices: Floats) -> float:
    """Return the longer side of the vertices' extent, or raise where numbers cannot hold the outline."""
    far = int(np.abs(vertices).max(axis=1).argmax())
    reach = float(np.abs(vertices[far]).max())
    if reach > _LARGEST:
        raise _fail(f"a vertex at {{}} is too far out (at most {_LARGEST:g}): take a larger unit", vertices[far])
    size = float(np.ptp(vertices, axis=0).max())
    if size == 0.0:
        raise _fail("every vertex is at {}: the outline has no size", vertices[0])
    if size < 1.0 / _LARGEST:
        raise _fail(
            f"the outline at {{}} is {size:g} across (at least {1.0 / _LARGEST:g}): take a smaller unit",
            vertices[0],
        )
    if reach > _FARTHEST * size:
        raise _fail(
            f"the outline is {size:g} across but lies at {{}}, over {_FARTHEST:g} times that from the origin, "
            "where its coordinates lose their digits: move it nearer",
            vertices[far],
        )
    return size


def _signed_area(vertices: Floats, bulges: Floats) -> float:
    p = vertices - vertices[0]
    q = np.roll(p, -1, axis=0)
    chords = 0.5 * float(np.sum(p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0]))
    return chords + float(arcs.segment_area(p, q, bulges).sum())


def _refuse_crossing(ring: Floats, size: float) -> None:
    """Raise where the loop crosses or touches itself."""
    shift = ring.mean(axis=0)
    polygon = shapely.Polygon(ring - shift)
    if polygon.is_valid:
        return
    reason = shapely.is_valid_reason(polygon)
    place = shift + _reason_point(reason, ring - shift)
    word = "touches" if "Ring Self" in reason else "crosses"
    raise _fail(f"the loop {word} itself at {{}}: reorder or move the vertices there", np.round(place, 12))


def _reason_point(reason: str, ring: Floats) -> Floats:
    try:
        x, y = reason[reason.index("[") + 1 : reason.index("]")].split()[:2]
        return np.array([float(x), float(y)])
    except ValueError:
        return np.asarray(ring[0], dtype=float)


def _refuse_cusps(vertices: Floats, bulges: Floats) -> None:
    """Raise where two edges leave a vertex in nearly the same direction (no material, or a crack)."""
    n = len(vertices)
    q = np.roll(vertices, -1, axis=0)
    leaving = arcs.tangent_at(vertices, q, bulges, np.zeros(n))
    arriving = np.roll(arcs.tangent_at(vertices, q, bulges, np.ones(n)), 1, axis=0)
    cross = arriving[:, 0] * leaving[:, 1] - arriving[:, 1] * leaving[:, 0]
    turn = np.abs(np.arctan2(cross, np.sum(arriving * leaving, axis=1)))
    sharp = np.flatnonzero(turn > np.pi - _CUSP)
    if len(sharp):
        k = int(sharp[0])
        raise _fail(
            f"the edges at vertex {k} {{}} fold back on each other (angle {np.degrees(np.pi - turn[k]):.2g} "
            f"degrees, at least {np.degrees(_CUSP):g} is needed): blunt the tip or round it",
            vertices[k],
        )


def _refuse_pinch(vertices: Floats, bulges: Floats, size: float) -> None:
    """Raise where edges that are not neighbours come as near as to count as touching."""
    n, gap = len(vertices), CLEARANCE * size
    count = facet_counts(vertices, bulges, _FACET * size)
    points = facets(vertices, bulges, _FACET * size) - vertices[0]
    # each edge as a line of its chords, its end repeated from the next edge's start
    edge = np.repeat(np.arange(n), count + 1)
    within = np.arange(len(edge)) - np.repeat(np.cumsum(count + 1) - (count + 1), count + 1)
    first = np.cumsum(count) - count
    lines = shapely.linestrings(points[(first[edge] + within) % len(points)], indices=edge)
    a, b = shapely.STRtree(lines).query(lines, predicate="dwithin", distance=gap)
    # neighbours touch rightly, and so do two edges with nothing but a very short one between them
    step = np.hypot(*(np.roll(vertices, -1, axis=0) - vertices).T)
    ahead = (b - a) % n
    wrong = (ahead > 1) & (ahead < n - 1)
    wrong &= ~((ahead == 2) & (step[(a + 1) % n] < 10.0 * gap))
    wrong &= ~((ahead == n - 2) & (step[(b + 1) % n] < 10.0 * gap))
    if wrong.any():
        k = int(np.flatnonzero(wrong)[0])
        place = np.array(shapely.shortest_line(lines[a[k]], lines[b[k]]).coords[0]) + vertices[0]
        raise _fail(
            f"edges {a[k]} and {b[k]} touch at {{}} (nearer than {gap:g}): move them apart or cut the loop there",
            place,
        )


def validate_voids(outer: Outline, voids: Sequence[Outline]) -> None:
    """Raise `OutlineError` where a void is outside, touching, overlapping, or has voids of its own."""
    size = outer.size
    gap = CLEARANCE * size
    shift = outer.vertices.mean(axis=0)
    shell = shapely.Polygon(facets(outer.vertices - shift, outer.bulges, _FACET * size))
    rings = []
    for k, void in enumerate(voids):
        if not hasattr(void, "bulges"):
            raise OutlineError(f"void {k} must be an Outline, got {type(void).__name__}")
        if void.voids:
            raise _fail(f"void {k} at {{}} has voids of its own: a void is empty", void.vertices[0])
        rings.append(shapely.Polygon(facets(void.vertices - shift, void.bulges, _FACET * size)))
    for k, ring in enumerate(rings):
        if ring.within(shell) and ring.exterior.distance(shell.exterior) > gap:
            continue
        _, near = shapely.shortest_line(shell.exterior, ring.exterior).coords
        place = np.array(near) + shift
        if not shell.intersects(ring):
            raise _fail(f"void {k} at {{}} lies outside the outer loop: move it inside", place)
        if ring.within(shell):
            raise _fail(f"void {k} touches the outer loop at {{}}: leave a wall between them", place)
        raise _fail(f"void {k} crosses the outer loop at {{}}: move or shrink it", place)
    tree = shapely.STRtree(rings)
    first, second = tree.query(rings, predicate="dwithin", distance=gap)
    for a, b in zip(first, second, strict=True):
        if a < b:
            place = np.array(shapely.shortest_line(rings[a], rings[b]).coords[0]) + shift
            raise _fail(f"voids {a} and {b} touch or overlap at {{}}: move them apart or merge them", place)
