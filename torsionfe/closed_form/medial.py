"""The medial axis of an outline, exact at every sample: the largest circles that fit inside it.

From each sample of the boundary a circle grows inwards, tangent there, until it touches the boundary a second
time. Its centre is a point of the medial axis (Blum 1967), twice its radius the thickness of the section
there. The touch has a closed form for straight edges, arcs and corners, so that only the spacing of the
samples is approximate, never a thickness. (Circles grown from boundary samples are common practice in
reconstructing surfaces from points; the closed forms are derived below.)
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.outline import arcs
from torsionfe.outline.edges import Edges
from torsionfe.outline.outline import Outline

__all__ = ["Circles", "inscribed_circles"]

_FAN = np.radians(3.0)  # between the samples of a fan
_SHARP = np.radians(5.0)  # a re-entrant corner that turns more gets a fan
_CUSP = np.radians(60.0)  # circles whose two feet are seen at less are left out
_NEAR = 1e-9  # of the size: nearer than this is the same point
_MANY = 300  # edges: beyond, an outline is taken for chords, and samples need not fall on every edge
_PAIRS = 6e6  # of samples and edges, at most
_CHUNK = 400_000


@dataclass(frozen=True)
class Circles:
    """Largest inscribed circles, one a boundary sample, in order along each loop.

    Those whose two feet are close together are left out (in the cusp of a corner blunter than 120 degrees, or
    filling a convex arc): they say nothing of a thickness.

    Attributes
    ----------
    foot, touch : ndarray of shape (n, 2)
        The sample where the circle starts and where it touches next (length).
    centre : ndarray of shape (n, 2)
        On the medial axis (length).
    radius : ndarray of shape (n,)
        Half the thickness (length).
    deviation : ndarray of shape (n,)
        How far foot, centre and touch are from one straight line (radians): 0 between parallel faces, the
        angle between the faces of a taper, 90 degrees on the bisector of a square corner.
    loop, touch_loop : ndarray of shape (n,)
        The loops (0 outer, ``k`` void ``k - 1``) of foot and touch.
    following : ndarray of shape (n,)
        The next sample on the same loop.
    """

    foot: Floats
    touch: Floats
    centre: Floats
    radius: Floats
    deviation: Floats
    loop: Ints
    touch_loop: Ints
    following: Ints

    def __len__(self) -> int:
        return len(self.radius)


def inscribed_circles(outline: Outline, samples: int = 4000) -> Circles:
    """Return the largest inscribed circles at samples spread evenly along the boundary.

    Parameters
    ----------
    outline : Outline
    samples : int
        About how many; they crowd towards the ends of edges, and every sharp re-entrant corner gets a fan.
        Outlines of thousands of edges get fewer.
    """
    edges = outline.edges
    foot, normal, row = _samples(edges, int(min(samples, max(_PAIRS / len(edges), 600))))
    size = outline.size
    per_chunk = max(1, _CHUNK // len(edges))
    parts = [
        _grown(edges, foot[k : k + per_chunk], normal[k : k + per_chunk], row[k : k + per_chunk], size)
        for k in range(0, len(foot), per_chunk)
    ]
    radius, touch, touch_row, filled = (np.concatenate(column) for column in zip(*parts, strict=True))
    # from the depth of a tiny arc a ray may meet nothing
    met = np.isfinite(radius)
    foot, normal, row, radius = foot[met], normal[met], row[met], radius[met]
    touch, touch_row, filled = touch[met], touch_row[met], filled[met]
    centre = foot + radius[:, None] * normal
    back, ahead = foot - centre, touch - centre
    cross = back[:, 0] * ahead[:, 1] - back[:, 1] * ahead[:, 0]
    apart = np.abs(np.arctan2(cross, np.sum(back * ahead, axis=1)))
    # in the cusp of a blunt corner, or where a circle fills its own arc, it spans no two faces
    kept = ~filled & (apart > _CUSP)
    loop = edges.loop[row][kept]
    first = np.flatnonzero(np.diff(loop, prepend=-1))
    following = np.arange(1, len(loop) + 1)
    following[np.append(first[1:], len(loop))[: len(first)] - 1] = first
    return Circles(
        foot=foot[kept],
        touch=touch[kept],
        centre=centre[kept],
        radius=radius[kept],
        deviation=np.pi - apart[kept],
        loop=loop,
        touch_loop=edges.loop[touch_row][kept],
        following=following,
    )


def _samples(edges: Edges, samples: int) -> tuple[Floats, Floats, Ints]:
    """Return feet, inward normals and edge rows: inside the edges, and fanned at re-entrant corners."""
    share = edges.length / edges.length.sum()
    if len(edges) <= _MANY:
        count = np.maximum(16, np.ceil(samples * share)).astype(int)
    else:
        ticks = np.floor(samples * np.append(0.0, np.cumsum(share)) + 0.5)
        count = np.diff(ticks).astype(int)
    rows, within = _spread(count)
    t = 0.5 - 0.5 * np.cos(np.pi * (within + 0.5) / count[rows])
    # corners: the normal turns from that of the edge before to that of the edge after
    turn = np.maximum(edges.interior_angle - np.pi, 0.0)
    fan = np.where(turn > _SHARP, np.ceil(turn / _FAN), 0.0).astype(int)
    corner, step = _spread(fan)
    back = turn[corner] * (1.0 - (step + 0.5) / fan[corner])
    leaving = edges.tangents(corner, np.zeros(len(corner)))
    c, s = np.cos(back), np.sin(back)
    fanned = np.stack([c * leaving[:, 0] - s * leaving[:, 1], s * leaving[:, 0] + c * leaving[:, 1]], axis=1)
    foot = np.concatenate([edges.start[corner], edges.points(rows, t)])
    tangent = np.concatenate([fanned, edges.tangents(rows, t)])
    row = np.concatenate([corner, rows])
    # along each edge the fan at its start comes first
    order = np.lexsort((np.concatenate([step - fan.sum(), within]), row))
    normal = np.stack([-tangent[:, 1], tangent[:, 0]], axis=1)[order]
    return foot[order], normal, row[order]


def _spread(count: Ints) -> tuple[Ints, Ints]:
    """Return the row of each of ``count`` items a row, and its number within the row."""
    rows = np.repeat(np.arange(len(count)), count)
    return rows, np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)


def _grown(
    edges: Edges, p: Floats, n: Floats, row: Ints, size: float
) -> tuple[Floats, Floats, Ints, np.ndarray]:
    """Return radius, touching point, its edge, and whether the circle fills its own arc's circle."""
    straight = np.flatnonzero(edges.bulge == 0.0)
    curved = np.flatnonzero(edges.bulge != 0.0)
    corners = np.flatnonzero(edges.interior_angle > np.pi + 1e-6)
    best, touch, touch_row = np.full(len(p), np.inf), p.copy(), row.copy()
    for rows, touching in ((straight, _to_lines), (curved, _to_arcs), (corners, _to_points)):
        if not len(rows):
            continue
        radius, place = touching(edges, rows, p, n, size)
        winner = np.argmin(radius, axis=1)
        least = radius[np.arange(len(p)), winner]
        nearer = np.flatnonzero(least < best)
        best[nearer] = least[nearer]
        touch_row[nearer] = rows[winner[nearer]]
        touch[nearer] = place(nearer, winner[nearer], least[nearer])
    # a circle on a convex arc grows no further than the arc's own centre
    own = np.where(edges.bulge[row] > 0.0, edges.radius[row], np.inf)
    filled = own <= best * (1.0 + 1e-9)
    best = np.minimum(best, own)
    touch[filled] = p[filled] + 2.0 * best[filled, None] * n[filled]
    return best, touch, np.where(filled, row, touch_row), filled


_Touching = tuple[Floats, Callable[[Ints, Ints, Floats], Floats]]


def _to_lines(edges: Edges, rows: Ints, p: Floats, n: Floats, size: float) -> _Touching:
    """Return the radius (n, e) of the circles that touch straight edges, and the places of given ones.

    With ``m`` the edge's inward normal: ``m . (p + r n - a) = r``.
    """
    a, d = edges.start[rows], edges.end[rows] - edges.start[rows]
    length = np.hypot(*d.T)
    d = d / length[:, None]
    m = np.stack([-d[:, 1], d[:, 0]], axis=1)
    x, y = p[:, :1] - a[:, 0], p[:, 1:] - a[:, 1]
    radius = _ratio(x * m[:, 0] + y * m[:, 1], 1.0 - n @ m.T, size)
    along = x * d[:, 0] + y * d[:, 1] + _finite(radius) * (n @ d.T)
    on = (along >= -_NEAR * size) & (along <= length + _NEAR * size)

    def place(i: Ints, k: Ints, r: Floats) -> Floats:
        return np.asarray(p[i] + r[:, None] * (n[i] - m[k]), dtype=float)

    return np.where(on, radius, np.inf), place


def _to_arcs(edges: Edges, rows: Ints, p: Floats, n: Floats, size: float) -> _Touching:
    """Return the radius (n, e) of the circles that touch arcs, and the places of given ones.

    The distance of the centres is ``R - r`` inside a convex arc, ``R + r`` outside a re-entrant one; both
    squared are linear in ``r``.
    """
    start, end, bulge = edges.start[rows], edges.end[rows], edges.bulge[rows]
    centre, big, turn = arcs.arc_centre(start, end, bulge), edges.radius[rows], arcs.sweep(bulge)
    inside = np.sign(bulge)
    x, y = p[:, :1] - centre[:, 0], p[:, 1:] - centre[:, 1]
    opening = 2.0 * (big + inside * (x * n[:, :1] + y * n[:, 1:]))
    radius = _ratio(inside * (big**2 - x**2 - y**2), opening, size, size)
    grown = _finite(radius)
    first = np.arctan2(*(start - centre).T[::-1])
    ahead = (np.arctan2(y + grown * n[:, 1:], x + grown * n[:, :1]) - first) * inside
    slack = _NEAR * size / big
    on = (ahead + slack) % (2.0 * np.pi) <= np.abs(turn) + 2.0 * slack

    def place(i: Ints, k: Ints, r: Floats) -> Floats:
        reach = p[i] + r[:, None] * n[i] - centre[k]
        return np.asarray(centre[k] + reach * (big[k] / np.hypot(*reach.T))[:, None], dtype=float)

    return np.where(on, radius, np.inf), place


def _to_points(edges: Edges, rows: Ints, p: Floats, n: Floats, size: float) -> _Touching:
    """Return the radius (n, e) of the circles through corners: ``|p + r n - q| = r``."""
    q = edges.start[rows]
    x, y = q[:, 0] - p[:, :1], q[:, 1] - p[:, 1:]
    radius = _ratio(x**2 + y**2, 2.0 * (x * n[:, :1] + y * n[:, 1:]), size, size)
    return radius, lambda i, k, r: q[k]


def _ratio(above: Floats, opening: Floats, size: float, scale: float = 1.0) -> Floats:
    """Return ``above / opening`` where both are clearly positive, infinity elsewhere."""
    touching = (above > _NEAR * size * scale) & (opening > 1e-12 * scale)
    return np.asarray(np.where(touching, above / np.where(touching, opening, 1.0), np.inf), dtype=float)


def _finite(radius: Floats) -> Floats:
    return np.where(np.isfinite(radius), radius, 0.0)
