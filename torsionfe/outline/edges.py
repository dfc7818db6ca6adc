"""Every edge of an outline in one table, the material always on the left."""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.outline import arcs

if TYPE_CHECKING:
    from torsionfe.outline.outline import Outline

__all__ = ["Edges", "edges_of"]

_GAUSS_X, _GAUSS_W = np.polynomial.legendre.leggauss(32)


@dataclass(frozen=True)
class Edges:
    """The edges of an outline's loops, one row an edge, directed with the material on the left.

    Attributes
    ----------
    start, end : ndarray of shape (e, 2)
        Where each edge begins and ends (length).
    bulge : ndarray of shape (e,)
        ``tan(sweep / 4)`` in the edge's direction; 0 is straight. A fillet's bulge is negative.
    loop : ndarray of shape (e,)
        0 for the outer loop, ``k`` for void ``k - 1``.
    vertex : ndarray of shape (e,)
        The index, in its own loop, of the vertex where the edge starts.
    following, previous : ndarray of shape (e,)
        The row of the edge after and before each edge on its loop.
    """

    start: Floats
    end: Floats
    bulge: Floats
    loop: Ints
    vertex: Ints
    following: Ints
    previous: Ints

    def __len__(self) -> int:
        return len(self.bulge)

    @cached_property
    def length(self) -> Floats:
        """Length of each edge along its arc, shape (e,)."""
        return arcs.arc_length(self.start, self.end, self.bulge)

    @cached_property
    def radius(self) -> Floats:
        """Radius of each edge (length), infinity where straight, shape (e,)."""
        return arcs.arc_radius(self.start, self.end, self.bulge)

    @cached_property
    def loop_area(self) -> Floats:
        """Signed area inside each loop (length**2), negative for voids; shape (loops,)."""
        p, q = self.start - self.start.mean(axis=0), self.end - self.start.mean(axis=0)
        parts = 0.5 * (p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0]) + arcs.segment_area(p, q, self.bulge)
        return np.asarray(np.bincount(self.loop, parts), dtype=float)

    @cached_property
    def interior_angle(self) -> Floats:
        """Angle of the material (radians, 0 to 2 pi) at the start of each edge, shape (e,)."""
        ones = np.ones(len(self))
        leaving = arcs.tangent_at(self.start, self.end, self.bulge, 0.0 * ones)
        arriving = arcs.tangent_at(self.start, self.end, self.bulge, ones)[self.previous]
        cross = arriving[:, 0] * leaving[:, 1] - arriving[:, 1] * leaving[:, 0]
        return np.asarray(np.pi - np.arctan2(cross, np.sum(arriving * leaving, axis=1)), dtype=float)

    def points(self, rows: Ints, t: Floats) -> Floats:
        """Return the points at the fraction ``t`` (by arc length) of the edges ``rows``."""
        return arcs.point_at(self.start[rows], self.end[rows], self.bulge[rows], t)

    def tangents(self, rows: Ints, t: Floats) -> Floats:
        """Return the unit tangents at the fraction ``t`` of the edges ``rows``."""
        return arcs.tangent_at(self.start[rows], self.end[rows], self.bulge[rows], t)

    def moments(self) -> tuple[float, Floats, Floats]:
        """Return the area, centroid and second moments, by Green's theorem with Gauss points.

        Returns
        -------
        area : float
            length**2.
        centroid : ndarray of shape (2,)
        second : ndarray of shape (3,)
            ``int y^2, int x^2, int x y`` about the centroid, length**4.
        """
        origin = self.start.mean(axis=0)
        near = replace(self, start=self.start - origin, end=self.end - origin)  # where points keep their digits
        t = 0.5 * (_GAUSS_X + 1.0)
        rows = np.repeat(np.arange(len(self)), len(t))
        ts = np.tile(t, len(self))
        x, y = near.points(rows, ts).T
        step = near.tangents(rows, ts) * (0.5 * np.tile(_GAUSS_W, len(self)) * near.length[rows])[:, None]
        dx, dy = step.T
        area = 0.5 * float(np.sum(x * dy - y * dx))
        cx, cy = float(np.sum(x * x * dy)) / (2.0 * area), float(np.sum(-y * y * dx)) / (2.0 * area)
        x, y = x - cx, y - cy
        second = np.array([-np.sum(y**3 * dx), np.sum(x**3 * dy), 1.5 * np.sum(x * x * y * dy)]) / 3.0
        return area, origin + np.array([cx, cy]), second


def edges_of(outline: Outline) -> Edges:
    """Return the edge table of an outline: the outer loop first, then its voids in order."""
    blocks = []
    offset = 0
    for number, loop in enumerate((outline, *outline.voids)):
        n = len(loop.vertices)
        index = np.arange(n)
        if number == 0:
            start, end, bulge, vertex = loop.vertices, np.roll(loop.vertices, -1, axis=0), loop.bulges, index
        else:  # walked backwards, so that the material lies on the left
            vertex = -index % n
            start, end = loop.vertices[vertex], loop.vertices[(vertex - 1) % n]
            bulge = -loop.bulges[(vertex - 1) % n]
        after, before = offset + (index + 1) % n, offset + (index - 1) % n
        blocks.append((start, end, bulge, np.full(n, number), vertex, after, before))
        offset += n
    return Edges(*(np.concatenate(parts) for parts in zip(*blocks, strict=True)))
