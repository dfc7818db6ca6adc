"""Union and difference of two outlines, exact for straight edges and arcs.

Both boundaries are cut where they meet. A piece then lies wholly outside the other outline, wholly inside it, or
on its boundary, which its middle tells; the pieces that bound the result are chained into loops, the material
always on the left. Every piece is a part of an edge that was there before, so arcs stay arcs. The area is
checked against shapely's result for the outlines in chords.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import Any

import numpy as np
import shapely
from scipy.sparse import coo_matrix
from scipy.sparse.csgraph import connected_components
from scipy.spatial import cKDTree

from torsionfe.checks import Floats, Ints
from torsionfe.errors import OutlineError
from torsionfe.outline import arcs
from torsionfe.outline.crossings import crossings, fraction_on, inside
from torsionfe.outline.edges import Edges
from torsionfe.outline.outline import Outline
from torsionfe.outline.validate import CLEARANCE

__all__ = ["difference", "union"]


def union(first: Outline, second: Outline) -> Outline:
    """Return the outline of what lies in either of two outlines.

    Parameters
    ----------
    first, second : Outline
        They must overlap or share part of an edge.

    Raises
    ------
    OutlineError
        The result is in several pieces (their places are named), or touches itself.
    """
    return _combined(first, second, "union")


def difference(first: Outline, second: Outline) -> Outline:
    """Return the outline of what lies in the first outline and not in the second.

    Parameters
    ----------
    first, second : Outline

    Raises
    ------
    OutlineError
        Nothing is left, the result is in several pieces (their places are named), or touches itself.
    """
    return _combined(first, second, "difference")


@dataclass(frozen=True)
class _Pieces:
    """Parts of edges, one row a part, between numbered points."""

    start: Ints
    end: Ints
    bulge: Floats
    edge: Ints  # the row of the first outline's edge, or -1 - the row of the second's
    points: Floats  # (n, 2), shared by all pieces

    def __len__(self) -> int:
        return len(self.bulge)

    @property
    def ends(self) -> tuple[Floats, Floats, Floats]:
        return self.points[self.start], self.points[self.end], self.bulge

    def at(self, t: float) -> tuple[Floats, Floats]:
        """Return the points and the tangents at the fraction ``t`` of every piece."""
        share = np.full(len(self), t)
        return arcs.point_at(*self.ends, share), arcs.tangent_at(*self.ends, share)

    def take(self, rows: Ints) -> _Pieces:
        return _Pieces(self.start[rows], self.end[rows], self.bulge[rows], self.edge[rows], self.points)

    def turned(self) -> _Pieces:
        return _Pieces(self.end, self.start, -self.bulge, self.edge, self.points)

    def joined(self, other: _Pieces) -> _Pieces:
        return _Pieces(
            np.concatenate([self.start, other.start]),
            np.concatenate([self.end, other.end]),
            np.concatenate([self.bulge, other.bulge]),
            np.concatenate([self.edge, other.edge]),
            self.points,
        )


def _combined(first: Outline, second: Outline, what: str) -> Outline:
    for name, given in (("first", first), ("second", second)):
        if not isinstance(given, Outline):
            raise OutlineError(f"the {what} needs two Outlines, the {name} is a {type(given).__name__}")
    size = max(first.size, second.size)
    tolerance = CLEARANCE * size
    a, b = first.edges, second.edges
    pieces_a, pieces_b = _cut(a, b, tolerance)
    pieces_b = replace(pieces_b, edge=-1 - pieces_b.edge)
    kept = _kept(pieces_a, pieces_b, (a, b), tolerance, what)
    if not len(kept):
        x, y = first.vertices[0]
        raise OutlineError(f"nothing is left of the outline at ({x:g}, {y:g}): the other one covers it", (x, y))
    result = _outline([_simplified(loop, tolerance) for loop in _loops(kept, what)], what)
    _check_area(result, first, second, what)
    return result


# --- cutting -------------------------------------------------------------------------------------------


def _cut(a: Edges, b: Edges, tolerance: float) -> tuple[_Pieces, _Pieces]:
    """Return the edges of both outlines cut wherever they meet, over common points."""
    rows_a, rows_b = _near(a, b, tolerance)
    met = crossings(a, b, rows_a, rows_b)
    # where a pair meets, and where an end of one lies on the other
    on_a, on_b = np.tile(rows_a, 6), np.tile(rows_b, 6)
    candidates = np.concatenate([*met, a.start[rows_a], a.end[rows_a], b.start[rows_b], b.end[rows_b]])
    with np.errstate(invalid="ignore"):
        t_a = fraction_on(a, on_a, candidates, tolerance)
        t_b = fraction_on(b, on_b, candidates, tolerance)
    real = np.flatnonzero(np.isfinite(t_a) & np.isfinite(t_b))
    n_a, n_b = len(a), len(b)
    points = np.concatenate([a.start, b.start, candidates[real]])
    number = _clustered(points, tolerance)
    met_number = number[n_a + n_b :]
    return (
        _split(a, number[:n_a], (on_a[real], t_a[real], met_number), points),
        _split(b, number[n_a : n_a + n_b], (on_b[real], t_b[real], met_number), points),
    )


def _near(a: Edges, b: Edges, tolerance: float) -> tuple[Ints, Ints]:
    """Return the pairs of edges whose extents meet."""

    def boxes(edges: Edges) -> Any:
        # an arc lies within half its length of its middle
        middle = arcs.point_at(edges.start, edges.end, edges.bulge, np.full(len(edges), 0.5))
        reach = np.where(edges.bulge == 0.0, 0.0, 0.5 * edges.length)[:, None] + tolerance
        every = np.stack([edges.start, edges.end, middle])
        low = np.where(reach > tolerance, middle - reach, every.min(axis=0) - tolerance)
        high = np.where(reach > tolerance, middle + reach, every.max(axis=0) + tolerance)
        return shapely.box(*low.T, *high.T)

    rows_b, rows_a = shapely.STRtree(boxes(a)).query(boxes(b))
    return np.asarray(rows_a, dtype=np.int64), np.asarray(rows_b, dtype=np.int64)


def _clustered(points: Floats, tolerance: float) -> Ints:
    """Return for each point the first of the points that it coincides with."""
    pairs = cKDTree(points).query_pairs(tolerance, output_type="ndarray")
    n = len(points)
    graph = coo_matrix((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(n, n))
    group = np.asarray(connected_components(graph, directed=False)[1])
    first = np.full(group.max() + 1, n)
    np.minimum.at(first, group, np.arange(n))
    return np.asarray(first[group], dtype=np.int64)


def _split(edges: Edges, corner: Ints, cuts: tuple[Ints, Floats, Ints], points: Floats) -> _Pieces:
    """Return the edges split at the points ``cuts``: edge, fraction, number of the point."""
    e = np.arange(len(edges))
    edge = np.concatenate([e, e, cuts[0]])
    t = np.concatenate([np.zeros(len(e)), np.ones(len(e)), cuts[1]])
    number = np.concatenate([corner, corner[edges.following], cuts[2]])
    ends = np.concatenate([np.full(2 * len(e), -1), np.zeros(len(cuts[0]), dtype=int)])
    # an end of the edge goes before a cut at the same point
    t = np.where((ends == 0) & (number == corner[edge]), 0.0, t)
    t = np.where((ends == 0) & (number == corner[edges.following][edge]), 1.0, t)
    order = np.lexsort((number, t, edge))
    edge, t, number = edge[order], t[order], number[order]
    piece = np.flatnonzero((edge[1:] == edge[:-1]) & (number[1:] != number[:-1]))
    share = (t[1:] - t[:-1])[piece]
    row = edge[piece]
    bulge = np.tan(share * np.arctan(edges.bulge[row]))
    return _Pieces(number[piece], number[piece + 1], bulge, row, points)


# --- choosing ------------------------------------------------------------------------------------------


def _kept(a: _Pieces, b: _Pieces, edges: tuple[Edges, Edges], tolerance: float, what: str) -> _Pieces:
    """Return the pieces that bound the result, the material on their left."""
    (middle_a, along_a), (middle_b, along_b) = a.at(0.5), b.at(0.5)
    gap, twin = (np.asarray(found) for found in cKDTree(middle_b).query(middle_a))
    shared = gap <= 2.0 * tolerance
    along = np.sum(along_a * along_b[twin], axis=1)
    shared_b = np.zeros(len(b), dtype=bool)
    shared_b[twin[shared]] = True
    in_b, in_a = inside(edges[1], middle_a) > 0.5, inside(edges[0], middle_b) > 0.5
    if what == "union":
        mine = np.where(shared, along > 0.0, ~in_b)
        return a.take(np.flatnonzero(mine)).joined(b.take(np.flatnonzero(~shared_b & ~in_a)))
    mine = np.where(shared, along < 0.0, ~in_b)
    return a.take(np.flatnonzero(mine)).joined(b.take(np.flatnonzero(~shared_b & in_a)).turned())


def _loops(pieces: _Pieces, what: str) -> list[_Pieces]:
    """Return the pieces chained into loops; where several go on, the one that turns most to the left."""
    leaving, arriving = pieces.at(0.0)[1], pieces.at(1.0)[1]
    starting: dict[int, list[int]] = {}
    for row, point in enumerate(pieces.start.tolist()):
        starting.setdefault(point, []).append(row)
    loops = []
    while starting:
        rows: list[int] = []
        point = first = next(iter(starting))
        while True:
            if point not in starting:
                raise _too_close(pieces.points[point], what)
            choice = starting[point]
            if rows and len(choice) > 1:
                d = arriving[rows[-1]]
                turn = np.arctan2(d[0] * leaving[choice, 1] - d[1] * leaving[choice, 0], leaving[choice] @ d)
                row = choice.pop(int(np.argmax(turn)))
            else:
                row = choice.pop(0)
            if not choice:
                del starting[point]
            rows.append(row)
            point = int(pieces.end[row])
            if point == first:
                break
        loops.append(pieces.take(np.array(rows)))
    return loops


def _too_close(place: Floats, what: str) -> OutlineError:
    x, y = float(place[0]), float(place[1])
    return OutlineError(
        f"the {what} cannot be told near ({x:g}, {y:g}), where the boundaries nearly run along each other: move one "
        "of the outlines there, so that they clearly overlap, clearly part, or coincide",
        (x, y),
    )


# --- the result ----------------------------------------------------------------------------------------


def _simplified(loop: _Pieces, tolerance: float) -> tuple[Floats, Floats]:
    """Return the loop's vertices and bulges, without the cuts that the result does not need.

    A cut within an edge goes; so does a point where the edges of the two outlines carry on along one line or
    circle. The vertices that an outline had stay.
    """
    p, q, bulge = loop.ends
    curve, turn = np.sign(bulge) / arcs.arc_radius(p, q, bulge), arcs.sweep(bulge)
    arriving, leaving = np.roll(loop.at(1.0)[1], 1, axis=0), loop.at(0.0)[1]
    chord = np.hypot(*(q - p).T)
    near = np.minimum(chord, np.roll(chord, 1))
    # a kink or a change of curvature that moves the shorter edge by less than the tolerance is none
    kink = np.abs(arriving[:, 0] * leaving[:, 1] - arriving[:, 1] * leaving[:, 0]) * near
    bend = np.abs(curve - np.roll(curve, 1)) * near**2
    ahead = np.sum(arriving * leaving, axis=1) > 0.0
    half = np.abs(turn + np.roll(turn, 1)) <= np.pi
    before = np.roll(loop.edge, 1)
    drop = (loop.edge == before) | (
        ((loop.edge < 0) != (before < 0)) & ahead & half & (kink < tolerance) & (bend < tolerance)
    )
    keep = np.flatnonzero(~drop)
    if len(keep) < 2:
        keep = np.arange(len(p))
    sums = np.add.reduceat(np.roll(turn, -keep[0]), keep - keep[0])
    return p[keep], np.tan(sums / 4.0)


def _outline(loops: list[tuple[Floats, Floats]], what: str) -> Outline:
    """Return the outline of the loops: one outer, its voids; or say where the pieces lie."""
    made = [(Outline(*loop), _signed_area(*loop)) for loop in loops]
    outer = [loop for loop, area in made if area > 0.0]
    if len(outer) != 1:
        centres = np.array([loop.centroid for loop in outer])
        centres[np.abs(centres) < 1e-9 * max(loop.size for loop in outer)] = 0.0
        places = ", ".join(f"({x:g}, {y:g})" for x, y in centres[:5])
        more = f" and {len(outer) - 5} more" if len(outer) > 5 else ""
        x, y = centres[-1].tolist()
        raise OutlineError(
            f"the {what} is in {len(outer)} pieces, around {places}{more}: a cross-section is one piece, so move "
            "the outlines or keep one piece",
            (x, y),
        )
    voids = [loop for loop, area in made if area < 0.0]
    return Outline(outer[0].vertices, outer[0].bulges, voids)


def _signed_area(vertices: Floats, bulges: Floats) -> float:
    p = vertices - vertices[0]
    q = np.roll(p, -1, axis=0)
    chords = 0.5 * float(np.sum(p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0]))
    return chords + float(arcs.segment_area(p, q, bulges).sum())


def _check_area(result: Outline, first: Outline, second: Outline, what: str) -> None:
    """Raise unless shapely finds the same area for the outlines in chords."""
    size = max(first.size, second.size)
    shift = first.vertices[0]
    moved = [shapely.transform(item.polygon(1e-6 * size), lambda xy: xy - shift) for item in (first, second)]
    facets = moved[0].union(moved[1]) if what == "union" else moved[0].difference(moved[1])
    if abs(facets.area - result.area) > 1e-5 * size * (first.perimeter + second.perimeter):
        raise _too_close(result.vertices[0], what)
