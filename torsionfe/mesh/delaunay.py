"""The Delaunay triangulation of a draft mesh: where its sides are, what lies inside, who sees whom."""

from __future__ import annotations

from contextlib import suppress
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import csr_array
from scipy.sparse.csgraph import connected_components
from scipy.spatial import Delaunay, QhullError

from torsionfe.checks import Floats, Ints

Bools = NDArray[np.bool_]

__all__ = ["BOX", "Bools", "Web", "weave"]

#: Far points round the unit-size draft, so that every side has a triangle on either hand; no two alike,
#: or they would lie on one circle with the corners of a square.
BOX = np.array([[-1.6, -1.7], [1.75, -1.5], [1.45, 1.8], [-1.8, 1.4]])
#: How far points are shaken for the sake of speed, and the evenly spread sequence that tells where to.
_SHAKE = 2e-12
_SEQUENCE = np.array([0.7548776662466927, 0.5698402909980532])
#: So few points seldom need any facet merged, and do better without a look at it.
_FEW = 1000
_FROM = np.array([1, 2, 0])
_TO = np.array([2, 0, 1])


def cross(u: Floats, v: Floats) -> Floats:
    """Return the cross product of plane vectors, row by row."""
    return np.asarray(u[..., 0] * v[..., 1] - u[..., 1] * v[..., 0], dtype=float)


@dataclass(frozen=True)
class Web:
    """A Delaunay triangulation of the box, the boundary nodes and the free nodes, in that order.

    Attributes
    ----------
    points : ndarray of shape (n, 2)
        Every point, the box first.
    triangles, beyond : ndarray of shape (m, 3)
        Points of each triangle, counter-clockwise, and the triangle beyond the side opposite to each.
    left, right : ndarray of shape (s,)
        ``3 * triangle + corner`` of the corner opposite to each boundary side, on its left and right
        hand; -1 where the side is no edge of the triangulation.
    """

    points: Floats
    triangles: Ints
    beyond: Ints
    left: Ints
    right: Ints

    def missing(self) -> Bools:
        """Return which sides are no edges of the triangulation, shape (s,)."""
        return self.left < 0

    def apex(self) -> Ints:
        """Return the point opposite to each side on its left hand, shape (s,)."""
        return np.asarray(self.triangles.ravel()[self.left])

    def side_at(self) -> Ints:
        """Return the boundary side opposite to each corner, -1 where there is none, shape (m, 3)."""
        found = np.full(self.triangles.size, -1)
        count = np.arange(len(self.left))
        found[self.left] = count
        found[self.right] = count
        return found.reshape(-1, 3)

    def regions(self, side_at: Ints) -> tuple[Bools, Bools]:
        """Return which triangles lie on the left of a side, and which on the right, shape (m,) each.

        Regions are connected without crossing a side; a region marked twice shows that the chords
        misrepresent the arcs.
        """
        open_ = (side_at < 0) & (self.beyond >= 0)
        start = np.concatenate([[0], np.cumsum(open_.sum(axis=1))]).astype(np.int32)
        links = self.beyond[open_].astype(np.int32)  # older csgraph takes no other integers
        graph = csr_array((np.ones(len(links)), links, start), shape=(len(open_), len(open_)))
        count, region = connected_components(graph, directed=False)
        inside, outside = np.zeros(count, dtype=bool), np.zeros(count, dtype=bool)
        inside[region[self.left // 3]] = True
        outside[region[self.right // 3]] = True
        return inside[region], outside[region]

    def walk(self, start: Ints, target: Floats, side_at: Ints, steps: int = 200) -> tuple[Ints, Ints]:
        """Walk straight from the middle of triangles ``start`` (k,) towards ``target`` (k, 2).

        Returns
        -------
        triangle, side : ndarray of shape (k,)
            The triangle reached, and the boundary side that bars the way to the target (-1: none, the
            target is in the triangle; -2: lost).
        """
        here = start.copy()
        barred = np.full(len(start), -2)
        origin = self.points[self.triangles[start]].mean(axis=1)
        going = np.arange(len(start))
        for _ in range(steps):
            corners = self.points[self.triangles[here[going]]]
            aim = (target - origin)[going]
            hand = cross(aim[:, None], corners - origin[going, None]) >= 0.0
            # the way leaves by the edge whose first end is on the right of it and whose second on the left
            out = np.argmax(~hand[:, _FROM] & hand[:, _TO], axis=1)
            count = np.arange(len(going))
            a, b = corners[count, _FROM[out]], corners[count, _TO[out]]
            there = cross(b - a, target[going] - a) >= 0.0
            wall = side_at[here[going], out]
            stop = there | (wall >= 0)
            barred[going[stop]] = np.where(there, -1, wall)[stop]
            going, out = going[~stop], out[~stop]
            if len(going) == 0:
                break
            ahead = self.beyond[here[going], out]
            here[going] = np.where(ahead >= 0, ahead, here[going])
        return here, barred


def _delaunay(points: Floats) -> Delaunay:
    """Return the Delaunay triangulation of points of about unit size.

    A shake of 1e-12 spares the merging of facets whose nodes lie on one circle, which takes most of the
    time; where the rounding is too coarse for that, facets are merged after all.
    """
    shaken = points + _SHAKE * (np.arange(len(points))[:, None] * _SEQUENCE % 1.0 - 0.5)
    if len(points) < _FEW:
        with suppress(QhullError):
            return Delaunay(shaken, qhull_options="Qbb Q12 Q0")
    return Delaunay(shaken, qhull_options="Qbb Q12")


def weave(boundary: Floats, free: Floats, sides: Ints) -> Web:
    """Return the Delaunay triangulation of the box, ``boundary`` (b, 2) and ``free`` (f, 2) nodes.

    ``sides`` (s, 2) number boundary nodes, material on the left.
    """
    points = np.concatenate([BOX, boundary, free])
    hull = _delaunay(points)
    triangles = hull.simplices.astype(np.int64)
    last = len(BOX) + len(boundary)
    first, second = triangles[:, _FROM].ravel(), triangles[:, _TO].ravel()
    both = np.flatnonzero((first < last) & (second < last))
    keys = first[both] * last + second[both]
    order = np.argsort(keys)
    keys, both = np.append(keys[order], -1), np.append(both[order], -1)
    a, b = (sides + len(BOX)).T

    def find(wanted: Ints) -> Ints:
        place = np.searchsorted(keys[:-1], wanted)
        return np.asarray(np.where(keys[place] == wanted, both[place], -1))

    left, right = find(a * last + b), find(b * last + a)
    return Web(points, triangles, hull.neighbors.astype(np.int64), np.where(right < 0, -1, left), right)
