"""Single edges chained end to end into closed loops.

Every point of a boundary has one edge arriving and one leaving. Ends that coincide are one node; after edges
that lie on each other have been dropped, every node must have two edges. Ends that are left over are joined
in pairs, nearest first, across gaps up to a tolerance; what is still open then is an error that names the
gap.
"""

from __future__ import annotations

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.errors import ReadError
from torsionfe.outline.files.loops import SMALLEST, RawLoop, Segments
from torsionfe.outline.validate import CLEARANCE

__all__ = ["chain", "nodes_of"]

_GAP = 1e-5
_NEIGHBOURS = 8


def chain(segments: Segments, tolerance: float | None = None) -> tuple[list[RawLoop], list[str]]:
    """Return the closed loops that edges make, in the order of their first edges, and notes on the way.

    Parameters
    ----------
    segments : Segments
        In any order and direction.
    tolerance : float, optional
        The largest gap to close (length); by default a hundred-thousandth of the drawing's size.

    Raises
    ------
    ReadError
        An end is open, or more than two edges meet at a point; ``at`` names the place.
    """
    every = np.concatenate([segments.start, segments.end])
    size = float(np.ptp(every, axis=0).max()) if len(every) else 0.0
    if size < SMALLEST:
        raise ReadError("it holds no edge of any length")
    gap = _GAP * size if tolerance is None else tolerance
    label, points = nodes_of(every, CLEARANCE * size)
    ends = np.stack([label[: len(segments)], label[len(segments) :]], axis=1)
    notes: list[str] = []
    rows = _without_specks(segments, ends, CLEARANCE * size, notes)
    rows = _without_twins(segments, ends, rows, 2.0 * CLEARANCE * size, notes)
    _refuse_forks(ends[rows], points)
    ends, points = _across_gaps(ends, rows, points, gap, notes)
    return _walk(ends[rows], segments.bulge[rows], points), notes


def nodes_of(points: Floats, radius: float) -> tuple[Ints, Floats]:
    """Return the node of each point, ``(m,)``, points within ``radius`` being one, and where the nodes are.

    Points are gathered in small cells first, so that a heap of points in one place costs no more than one.
    """
    from scipy.sparse import coo_array
    from scipy.sparse.csgraph import connected_components
    from scipy.spatial import cKDTree

    cell = np.floor((points - points.min(axis=0)) / (0.5 * radius)).astype(np.int64)
    _, first, of_cell = np.unique(cell, axis=0, return_index=True, return_inverse=True)
    pairs = cKDTree(points[first]).query_pairs(2.5 * radius, output_type="ndarray")
    graph = coo_array((np.ones(len(pairs)), (pairs[:, 0], pairs[:, 1])), shape=(len(first), len(first)))
    count, group = connected_components(graph, directed=False)
    label = group[of_cell.ravel()]
    member = np.full(count, len(points))
    np.minimum.at(member, label, np.arange(len(points)))
    return label.astype(np.int64), points[member]


def _without_specks(segments: Segments, ends: Ints, radius: float, notes: list[str]) -> Ints:
    """Return the rows of edges whose two ends are apart."""
    speck = ends[:, 0] == ends[:, 1]
    some = speck & np.any(segments.start != segments.end, axis=1)
    if some.any():
        x, y = segments.start[np.flatnonzero(some)[0]]
        notes.append(f"dropped {some.sum()} edges shorter than {4 * radius:.2g}, the first at ({x:g}, {y:g})")
    return np.flatnonzero(~speck)


def _without_twins(segments: Segments, ends: Ints, rows: Ints, near: float, notes: list[str]) -> Ints:
    """Return the rows without edges that lie on an earlier one, whichever way they run."""
    low, high = ends[rows].min(axis=1), ends[rows].max(axis=1)
    chord = np.hypot(*(segments.end[rows] - segments.start[rows]).T)
    rise = 0.5 * segments.bulge[rows] * chord * np.where(ends[rows, 0] == low, 1.0, -1.0)
    order = np.lexsort([rows, rise, high, low])
    same = (np.diff(low[order]) == 0) & (np.diff(high[order]) == 0) & (np.diff(rise[order]) <= near)
    twin = order[1:][same]
    if len(twin):
        x, y = segments.start[rows[twin.min()]]
        notes.append(f"dropped {len(twin)} edges that lie on another one, the first at ({x:g}, {y:g})")
    return np.delete(rows, twin)


def _refuse_forks(ends: Ints, points: Floats) -> None:
    degree = np.bincount(ends.ravel(), minlength=len(points))
    fork = np.flatnonzero(degree > 2)
    if len(fork):
        x, y = points[fork[0]]
        more = f" (and at {len(fork) - 1} more places)" if len(fork) > 1 else ""
        raise ReadError(
            f"{degree[fork[0]]} edges meet at ({x:g}, {y:g}){more}, where a boundary has two: take away the "
            "lines that are no boundary, or choose layers",
            (float(x), float(y)),
        )


def _across_gaps(
    ends: Ints, rows: Ints, points: Floats, gap: float, notes: list[str]
) -> tuple[Ints, Floats]:
    """Join open ends in pairs, nearest first; return the new nodes of the edges and where the nodes are."""
    degree = np.bincount(ends[rows].ravel(), minlength=len(points))
    open_ = np.flatnonzero(degree == 1)
    if not len(open_):
        return ends, points
    partner = _pairs(open_, _short(ends[rows], degree, points, gap), points, gap)
    left = open_[partner[open_] < 0]
    if len(left):
        raise _open_end(left, points, gap)
    first = open_[open_ < partner[open_]]
    second = partner[first]
    width = np.hypot(*(points[second] - points[first]).T)
    worst = int(np.argmax(width))
    moved = points.copy()
    moved[first] = 0.5 * (points[first] + points[second])
    x, y = moved[first[worst]]
    notes.append(f"closed {len(first)} gaps, the widest {width[worst]:.3g} at ({x:g}, {y:g})")
    renamed = np.arange(len(points))
    renamed[second] = first
    return renamed[ends], moved


def _short(ends: Ints, degree: Ints, points: Floats, gap: float) -> set[tuple[int, int]]:
    """Return the open single edges within the gap, whose own two ends must not be joined."""
    lone = (degree[ends] == 1).all(axis=1)
    pairs = ends[lone]
    pairs = pairs[np.hypot(*(points[pairs[:, 1]] - points[pairs[:, 0]]).T) <= gap]
    return {(int(min(a, b)), int(max(a, b))) for a, b in pairs}


def _pairs(open_: Ints, apart: set[tuple[int, int]], points: Floats, gap: float) -> Ints:
    """Return the partner of each node, -1 for none."""
    partner = np.full(len(points), -1)
    if len(open_) < 2:
        return partner
    distance, index = _nearest(points[open_], min(_NEIGHBOURS, len(open_)))
    a = np.repeat(open_, distance.shape[1])
    b = open_[index.ravel()]
    take = (distance.ravel() <= gap) & (a < b)
    order = np.argsort(distance.ravel()[take], kind="stable")
    for one, other in zip(a[take][order], b[take][order], strict=True):
        if partner[one] < 0 and partner[other] < 0 and (int(one), int(other)) not in apart:
            partner[one], partner[other] = other, one
    return partner


def _nearest(points: Floats, count: int) -> tuple[Floats, Ints]:
    """Return the distances to the nearest ``count`` points, itself among them, and which they are."""
    from scipy.spatial import cKDTree

    distance, index = cKDTree(points).query(points, k=np.arange(1, count + 1))
    return np.asarray(distance, dtype=float), np.asarray(index, dtype=np.int64)


def _open_end(left: Ints, points: Floats, gap: float) -> ReadError:
    """Return the error for the ends that are left, naming the two nearest to each other."""
    distance, index = _nearest(points[left], 2)
    away = np.where(index != np.arange(len(left))[:, None], distance, np.inf)
    worst, which = np.unravel_index(np.argmin(away), away.shape)
    x, y = points[left[worst]]
    other = points[left[index[worst, which]]]
    return ReadError(
        f"the boundary is open at ({x:g}, {y:g}): the nearest open end is ({other[0]:g}, {other[1]:g}), "
        f"a gap of {away.min():.4g}, above the tolerance of {gap:.4g} ({len(left)} open ends in all). Close it "
        "in the drawing, take stray lines away, choose layers, or pass a larger tolerance=",
        (float(x), float(y)),
    )


def _walk(ends: Ints, bulge: Floats, points: Floats) -> list[RawLoop]:
    """Return the loops of edges of which two meet at every node, each from its first edge on."""
    order = np.argsort(ends.ravel(), kind="stable")
    edge_at = (order // 2).reshape(-1, 2).tolist()  # the two edges at each node that has any
    of_node = {int(node): k for k, node in enumerate(ends.ravel()[order][::2])}
    pairs = ends.tolist()
    used = np.zeros(len(ends), dtype=bool)
    loops = []
    for first in range(len(pairs)):
        if used[first]:
            continue
        edge, node = first, pairs[first][0]
        nodes, turns = [], []
        while not used[edge]:
            used[edge] = True
            forward = pairs[edge][0] == node
            nodes.append(node)
            turns.append(bulge[edge] if forward else -bulge[edge])
            node = pairs[edge][1 if forward else 0]
            one, other = edge_at[of_node[node]]
            edge = other if one == edge else one
        loops.append(RawLoop(points[nodes], np.array(turns)))
    return loops
