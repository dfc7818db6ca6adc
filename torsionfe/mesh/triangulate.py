"""An outline cut into triangles: Delaunay refinement in batches.

Sides that are no edges of the Delaunay triangulation are split; then every triangle with a corner under
25 degrees gets a point near its circumcentre, or, where a side bars the way to that point, splits the side.

References
----------
Ruppert, A Delaunay refinement algorithm for quality 2-dimensional mesh generation, J. Algorithms 18 (1995).
Chew, Guaranteed-quality mesh generation for curved surfaces, 9th Symp. Comput. Geometry (1993).
Shewchuk, Delaunay refinement algorithms for triangular mesh generation, Comput. Geometry 22 (2002).
Miller, Pav and Walkington, When and why Ruppert's algorithm works, 12th Int. Meshing Roundtable (2003).
Üngör, Off-centers: a new type of Steiner points, LATIN (2004).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from scipy.spatial import cKDTree

from torsionfe.checks import Floats, Ints
from torsionfe.errors import MeshError
from torsionfe.mesh.delaunay import BOX, Bools, Web, cross, weave
from torsionfe.mesh.draft import Draft, draft_of, invalid_when_bent
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.outline.edges import Edges
from torsionfe.outline.outline import Outline

__all__ = ["SMALLEST_ANGLE", "triangulate"]

#: Corners of triangles are at least this (radians), but for sharp corners of the outline.
SMALLEST_ANGLE = np.radians(25.0)
# what an outline may cost: nodes, rounds, nodes summed over the rounds, and half the shortest side's length
# as a part of the outline's size
_MOST_NODES = 100_000
_MOST_ROUNDS = 300
_MOST_WORK = 1_500_000
_SHORTEST = 1e-9
#: A free node that sees a side under more than this angle is too near to it.
_LENS = np.cos(np.radians(120.0))
#: A sharp corner excuses angles down to this part of its own.
_FORCED = 0.75
_NONE = np.empty(0, dtype=np.int64)


def triangulate(outline: Outline) -> TriMesh:
    """Return a coarse, graded triangulation of an outline, fit for bending its sides to the arcs.

    Parameters
    ----------
    outline : Outline

    Returns
    -------
    TriMesh
        No angle under 25 degrees but where a sharp corner of the outline forces it; no side sweeps
        more than 30 degrees; each triangle stays valid when its sides are bent to their arcs.

    Raises
    ------
    MeshError
        The outline has details too fine to be meshed within the limits; ``at`` names the place.
    """
    draft = draft_of(outline)
    work = 0
    for _ in range(_MOST_ROUNDS):
        web = weave(draft.nodes, draft.free, draft.sides)
        better, inside = _improve(draft, web)
        if better is draft:
            return _finish(outline.edges, draft, web.triangles[inside] - len(BOX))
        work += len(web.points)
        if work > _MOST_WORK or len(better.nodes) + len(better.free) > _MOST_NODES:
            at = _finest(better, len(draft.sides))
            raise _failure(draft, at, f"walls and details so thin need more than {_MOST_NODES} nodes")
        draft = better
    raise _failure(draft, _finest(draft, 0), f"the triangles have not settled in {_MOST_ROUNDS} rounds")


def _finest(draft: Draft, since: int) -> Floats:
    """Return the middle of the shortest of the sides that were split last."""
    ends = draft.nodes[draft.sides[since:] if since < len(draft.sides) else draft.sides]
    size = np.hypot(*(ends[:, 1] - ends[:, 0]).T)
    return np.asarray(ends[np.argmin(size)].mean(axis=0))


def _failure(draft: Draft, point: Floats, why: str) -> MeshError:
    x, y = (float(value) for value in draft.place(point))
    size = float(np.ptp(draft.nodes, axis=0).max()) / draft.scale
    return MeshError(
        f"no mesh near ({x:g}, {y:g}): {why} (the outline is {size:.3g} across): "
        "thicken the wall, or drop the detail there",
        (x, y),
    )


def _improve(draft: Draft, web: Web) -> tuple[Draft, Ints]:
    """Return a better draft, or the same one if there is nothing to do, and the triangles inside."""
    missing = np.flatnonzero(web.missing())
    if len(missing):
        return _split(draft, missing)[0], _NONE
    side_at = web.side_at()
    inside, outside = web.regions(side_at)
    if (inside & outside).any():
        return _split(draft, _torn(draft, web, inside & outside))[0], _NONE
    kept = np.flatnonzero(inside)
    crowded = _crowded(draft, web)
    bad, points, reach = _bad_triangles(draft, web, kept, side_at)
    if len(bad):
        here, barred = web.walk(bad, points, side_at)
        barred = np.where(barred == -1, _too_near(web, draft, here, points, side_at), barred)
        crowded = np.unique(np.concatenate([crowded, barred[barred >= 0]]))
        if len(crowded) == 0 and (barred != -1).all():
            raise _failure(draft, points[0], "rounding hides the way to a better triangle")
        points, reach = points[barred == -1], reach[barred == -1]
    elif len(crowded) == 0:
        crowded = _folded(draft, web, side_at)
    if len(crowded) == 0 and len(points) == 0:
        return draft, kept
    draft, middles, half = _split(draft, crowded)
    if len(middles):
        distance, nearest = cKDTree(middles).query(points)
        clear = distance >= np.maximum(reach, half[nearest])
        points, reach = points[clear], reach[clear]
    return _insert(draft, points, reach), _NONE


def _split(draft: Draft, which: Ints) -> tuple[Draft, Floats, Floats]:
    """Split sides; free nodes in the circles over them give way (Chew 1993)."""
    if len(which) == 0:
        return draft, np.empty((0, 2)), np.empty(0)
    draft, middles, half = draft.split(which)
    least = int(np.argmin(half))
    if half[least] < _SHORTEST:
        raise _failure(draft, middles[least], f"the nodes would be nearer than {_SHORTEST / draft.scale:.3g}")
    if len(draft.free):
        distance, nearest = cKDTree(middles).query(draft.free)
        draft = replace(draft, free=draft.free[distance >= half[nearest]])
    return draft, middles, half


def _torn(draft: Draft, web: Web, torn: Bools) -> Ints:
    """Return the arcs' sides to split where a region is both inside and outside."""
    at = torn[web.left // 3] | torn[web.right // 3]
    bent = np.flatnonzero(at & (draft.side_bulge != 0.0))
    if len(bent) == 0:
        point = draft.nodes[draft.sides[np.argmax(at), 0]]
        raise _failure(draft, point, "two walls are too near to tell inside from outside")
    return bent


def _crowded(draft: Draft, web: Web) -> Ints:
    """Return the sides that a free node, or on arcs any node, is too near to."""
    apex = web.apex()
    p = web.points[apex]
    a, b = draft.nodes[draft.sides[:, 0]] - p, draft.nodes[draft.sides[:, 1]] - p
    near = (apex >= len(BOX) + len(draft.nodes)) & _wide(a, b)
    # within three sagittas (bulge * chord / 2) of an arc, where the bent triangle is about to fold
    bulge = np.abs(draft.side_bulge)
    near |= (cross(a, b) < 1.5 * bulge * np.sum((b - a) ** 2, axis=1)) & (bulge > 0.0)
    return np.flatnonzero(near)


def _wide(a: Floats, b: Floats) -> Bools:
    dot = np.sum(a * b, axis=1)
    return np.asarray(dot < _LENS * np.sqrt(np.sum(a * a, axis=1) * np.sum(b * b, axis=1)))


def _bad_triangles(draft: Draft, web: Web, kept: Ints, side_at: Ints) -> tuple[Ints, Floats, Floats]:
    """Return the triangles to be improved, the point that would improve each, and its distance from them."""
    corners = web.triangles[kept]
    p = web.points[corners]
    opposite = p[:, [2, 0, 1]] - p[:, [1, 2, 0]]
    length2 = np.sum(opposite**2, axis=2)
    short = np.argmin(length2, axis=1)
    count = np.arange(len(kept))
    least = length2[count, short]
    if not least.all():
        raise _failure(draft, p[np.argmin(least), 0], "rounding lays two nodes on one place")
    others = length2.prod(axis=1) / least
    double = cross(opposite[:, 0], opposite[:, 1])
    bad = np.flatnonzero(double**2 < np.sin(SMALLEST_ANGLE) ** 2 * others)
    if len(bad) == 0:
        return _NONE, np.empty((0, 2)), np.empty(0)
    short = short[bad]
    if draft.sharp.any():
        sine = double[bad] / np.sqrt(others[bad])
        forced = _forced(draft, corners[bad], short, side_at[kept[bad]], sine)
        bad, short = bad[~forced], short[~forced]
    base, tip = opposite[bad, short], p[bad, short]
    start, end = p[bad, (short + 1) % 3], p[bad, (short + 2) % 3]
    length = np.sqrt(least[bad])
    normal = np.stack([-base[:, 1], base[:, 0]], axis=1) / length[:, None]
    # the circumcentre, or nearer: where the shortest side is seen under just over the angle wanted (Üngör 2004)
    centre = np.sum((tip - start) * (tip - end), axis=1) * length / (2.0 * np.maximum(double[bad], 1e-300))
    height = np.minimum(centre, 0.475 * length / np.tan(0.5 * SMALLEST_ANGLE))
    return kept[bad], 0.5 * (start + end) + height[:, None] * normal, np.hypot(height, 0.5 * length)


def _forced(draft: Draft, corners: Ints, short: Ints, side_at: Ints, sine: Floats) -> Bools:
    """Return which triangles have an angle that the outline forces on them.

    Either the smallest angle is the outline's own, between two sides; or the shortest side joins the two
    edges of one sharp corner, equally far from it (Miller, Pav and Walkington 2003).
    """
    count = np.arange(len(corners))
    i, j = (short + 1) % 3, (short + 2) % 3
    first = len(BOX)
    number = len(draft.nodes)
    tip = corners[count, short] - first
    on_tip = (tip >= 0) & (tip < number) & (side_at[count, i] >= 0) & (side_at[count, j] >= 0)
    tip = np.where(on_tip, tip, 0)
    on_tip &= draft.node_t[tip] == 0.0
    angle = draft.edges.interior_angle
    forced = on_tip & (sine > _sine(_FORCED * angle[draft.node_edge[tip]]))
    u, v = corners[count, i] - first, corners[count, j] - first
    rim = (u >= 0) & (v >= 0) & (u < number) & (v < number)
    u, v = np.where(rim, u, 0), np.where(rim, v, 0)
    for a, b in ((u, v), (v, u)):
        for before in _edges_at(draft, a):
            for after in _edges_at(draft, b):
                meet = (draft.edges.following[before] == after) & draft.sharp[after]
                apex = draft.edges.start[after]
                da = np.hypot(*(draft.nodes[a] - apex).T)
                db = np.hypot(*(draft.nodes[b] - apex).T)
                level = np.abs(da - db) < 1e-6 * da
                forced |= rim & meet & level & (sine > _sine(_FORCED * angle[after]))
    return np.asarray(forced)


def _sine(angle: Floats) -> Floats:
    """Return the sine up to a right angle, one beyond."""
    return np.asarray(np.sin(np.minimum(angle, 0.5 * np.pi)))


def _edges_at(draft: Draft, node: Ints) -> tuple[Ints, Ints]:
    """Return the two edges that meet at boundary nodes (twice the same within an edge)."""
    edge = draft.node_edge[node]
    return edge, np.where(draft.node_t[node] == 0.0, draft.edges.previous[edge], edge)


def _too_near(web: Web, draft: Draft, here: Ints, points: Floats, side_at: Ints) -> Ints:
    """Return the side of the triangles ``here`` or next to them that each point is too near to, or -1."""
    around = np.concatenate([here[:, None], web.beyond[here]], axis=1)
    side = side_at[around].reshape(len(here), 12)
    ends = draft.nodes[draft.sides[side]] - points[:, None, None]
    a, b = ends[:, :, 0], ends[:, :, 1]
    cosine = np.sum(a * b, axis=2) / np.sqrt(np.sum(a * a, axis=2) * np.sum(b * b, axis=2))
    cosine[side < 0] = 1.0
    nearest, count = np.argmin(cosine, axis=1), np.arange(len(here))
    return np.asarray(np.where(cosine[count, nearest] < _LENS, side[count, nearest], -1))


def _folded(draft: Draft, web: Web, side_at: Ints) -> Ints:
    """Return the sides on arcs whose triangles would fold when bent."""
    bulge = draft.side_bulge
    curved = bulge != 0.0
    if not curved.any():
        return _NONE
    rows = np.unique(web.left[curved] // 3)
    sides = side_at[rows]
    bulges = np.where(sides >= 0, bulge[sides], 0.0)
    folded = invalid_when_bent(web.points[web.triangles[rows]], bulges)
    return np.unique(sides[folded][bulges[folded] != 0.0])


def _insert(draft: Draft, points: Floats, reach: Floats) -> Draft:
    """Add free nodes, the shortest reach first, none within the reach of one that came before."""
    while len(points) > 1:
        taken = _apart(points, reach)
        points, reach = points[taken], reach[taken]
        if taken.all():
            break
    return replace(draft, free=np.concatenate([draft.free, points]))


def _apart(points: Floats, reach: Floats) -> Bools:
    """Return a set of points of which none is within the reach of one with a shorter reach.

    Luby (1986), with the reach for a priority; a point's eight nearest neighbours stand for all.
    """
    order = np.lexsort((points[:, 1], points[:, 0], reach))
    rank = np.empty(len(points), dtype=np.int64)
    rank[order] = np.arange(len(points))
    k = min(9, len(points))
    # (a point is not always the first among its twins, but a rank below its own is never its own)
    distance, near = (np.asarray(found) for found in cKDTree(points).query(points, k=k))
    rival = (distance < reach[:, None]) & (rank[near] < rank[:, None])
    taken = np.zeros(len(points), dtype=bool)
    alive = np.ones(len(points), dtype=bool)
    for _ in range(3):
        taken |= alive & ~(rival & alive[near]).any(axis=1)
        alive &= ~(rival & taken[near]).any(axis=1)
    return taken


def _finish(edges: Edges, draft: Draft, triangles: Ints) -> TriMesh:
    """Return the draft as a mesh in the user's coordinates."""
    nodes = np.concatenate([edges.points(draft.node_edge, draft.node_t), draft.place(draft.free)])
    # a free node that a bent side has overtaken is in no triangle; boundary nodes come first and all are
    used = np.bincount(triangles.ravel(), minlength=len(nodes)) > 0
    nodes, triangles = nodes[used], (np.cumsum(used) - 1)[triangles]
    p = nodes[triangles]
    opposite = p[:, [2, 0, 1]] - p[:, [1, 2, 0]]
    area = cross(opposite[:, 0], opposite[:, 1])
    if area.min() <= 0.0:
        at = (p[np.argmin(area), 0] - draft.centre) * draft.scale
        raise _failure(draft, at, "rounding turns a triangle over")
    turn = np.argmax(np.sum(opposite**2, axis=2), axis=1)[:, None] + np.arange(3)
    triangles = np.take_along_axis(triangles, turn % 3, axis=1)
    order = np.lexsort((draft.side_span[:, 0], draft.side_edge))
    sides, edge, span = draft.sides[order], draft.side_edge[order], draft.side_span[order]
    return TriMesh(nodes, triangles, sides, edge, span, edges)
