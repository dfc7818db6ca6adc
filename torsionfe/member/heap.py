"""The sand heap on an outline: the volume under the steepest surface of slope 1 that a plastic section can hold.

The heap's height ``d`` is the distance to the outer loop, where crossing a void costs nothing: each void is a
plateau (Nadai 1923, Z. angew. Math. Mech. 3, 442-454; voids: Sadowsky 1941, from memory). The volume is summed
along the normals of the boundary, exactly up to the quadrature along it:

    int d = closed integral over ds of  int_0^l (d_k + t) (1 - t / R) dt,

with a fan of rays at each re-entrant corner. The cells of all rays must tile the section, which checks the sum.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.errors import SolveError
from torsionfe.member.reach import Boundary, Rays
from torsionfe.outline import arcs
from torsionfe.outline.edges import edges_of
from torsionfe.outline.outline import Outline

__all__ = ["SandHeap", "sand_heap"]

_GAUSS_X, _GAUSS_W = np.polynomial.legendre.leggauss(5)
_NEAR_END = 0.02
# fractions of a panel where cells are measured: five Gauss points, then its two ends, a little inside
_NODES = np.concatenate([0.5 * (_GAUSS_X + 1.0), [0.001, 0.999]])
_TO_ENDS = np.linalg.solve(np.vander(_NODES[:5]).T, np.vander(_NODES[5:], 5).T).T
_TOLERANCE = 1e-9
_DEEPEST = 24
_PIECES = 48
_TILING = 1e-8
_WORST = 1e-4
_FAN = 1e-9


@dataclass(frozen=True)
class SandHeap:
    """The heap's measures.

    Attributes
    ----------
    volume : float
        ``int d + sum d_k A_k``, length**3.
    plateaus : ndarray of shape (voids,)
        Height ``d_k`` of each void, length.
    rel_error : float
        What the quadrature, and the cells' failure to tile the section, leave open in the volume.
    """

    volume: float
    plateaus: Floats
    rel_error: float


@dataclass(frozen=True)
class _Sources:
    """Where rays start: edges along their normals, re-entrant corners as fans; one row a source.

    ``fan`` is 1 for a corner; ``row`` its row in the edge table; ``bend`` the curvature ``1 / R`` (positive for
    a convex arc), ``extent`` the edge's length or the fan's angle.
    """

    boundary: Boundary
    row: Ints
    fan: Ints
    extent: Floats
    bend: Floats

    def rays(self, which: Ints, at: Floats) -> Rays:
        """Return the rays of the sources ``which`` at the fractions ``at`` of their extent."""
        b, row, fan = self.boundary, self.row[which], self.fan[which]
        place = np.where(fan == 1, 0.0, at)
        p, q, bulge = b.start[row], b.end[row], b.bulge[row]
        tangent = arcs.tangent_at(p, q, bulge, place)
        # a fan turns counter-clockwise from the following edge's normal to the previous edge's
        turn = np.where(fan == 1, at * self.extent[which], 0.0)
        c, s = np.cos(turn), np.sin(turn)
        x, y = -tangent[:, 1], tangent[:, 0]
        previous, following = b.edges.previous[row], b.edges.following[row]
        with np.errstate(divide="ignore"):
            furthest = np.where(self.bend[which] > 0.0, 1.0 / np.abs(self.bend[which]), np.inf)
        return Rays(
            start=arcs.point_at(p, q, bulge, place),
            direction=np.stack([c * x - s * y, s * x + c * y], axis=1),
            offset=b.height[row],
            furthest=furthest,
            skip_edges=np.stack([row, np.where(fan == 1, previous, row)], axis=1),
            skip_points=np.stack([row, np.where(fan == 1, row, following)], axis=1),
        )

    def cells(self, which: Ints, at: Floats) -> Floats:
        """Return the volume and the area of the material along each ray, per extent; shape (n, 2)."""
        rays = self.rays(which, at)
        t = self.boundary.lengths(rays)
        flat = np.where(self.fan[which] == 1, 0.0, 1.0)
        slope = np.where(self.fan[which] == 1, 1.0, -self.bend[which])
        area = t * (flat + 0.5 * slope * t)
        rise = t**2 * (flat / 2.0 + slope * t / 3.0)
        return np.stack([rays.offset * area + rise, area], axis=1) * self.extent[which][:, None]


def sand_heap(outline: Outline) -> SandHeap:
    """Return the volume under the sand heap of an outline with voids.

    Raises
    ------
    SolveError
        The cells do not tile the section: the outline has detail below the rounding of its coordinates.
    """
    from scipy.sparse.csgraph import shortest_path

    x0, y0, x1, y1 = outline.bounds
    size = max(x1 - x0, y1 - y0)
    flat = Boundary.of(edges_of(outline), np.array([x0 + x1, y0 + y1]) / 2.0, size)
    plateaus = shortest_path(flat.loop_distances())[0]
    sources = _sources(flat.raised(plateaus[flat.edges.loop]))
    area = outline.area / size**2
    for pieces in (_PIECES, 4 * _PIECES, 16 * _PIECES):
        (heap, tiled), error = _integrate(sources, pieces)
        missing = abs(tiled - area)
        if missing <= _TILING * area:
            break
    holes = np.array([void.area for void in outline.voids]) / size**2
    volume = float(heap + plateaus[1:] @ holes)
    # what is missing can be no higher than the heap's top, which is below twice its mean height or so
    rel_error = error / volume + missing / area
    if not rel_error < _WORST:
        raise SolveError(
            f"the sand heap's cells cover {tiled * size**2:g} of the section's {area * size**2:g} (length**2): "
            "the outline has edges too short for its size; simplify it there"
        )
    return SandHeap(volume * size**3, plateaus[1:] * size, float(rel_error))


def _sources(boundary: Boundary) -> _Sources:
    edges = boundary.edges
    rows = np.arange(len(edges))
    length = arcs.arc_length(boundary.start, boundary.end, boundary.bulge)
    bend = np.sign(boundary.bulge) / arcs.arc_radius(boundary.start, boundary.end, boundary.bulge)
    opening = edges.interior_angle - np.pi
    corners = np.flatnonzero(opening > _FAN)
    return _Sources(
        boundary=boundary,
        row=np.concatenate([rows, corners]),
        fan=np.repeat([0, 1], [len(rows), len(corners)]),
        extent=np.concatenate([length, opening[corners]]),
        bend=np.concatenate([bend, np.zeros(len(corners))]),
    )


def _integrate(sources: _Sources, pieces: int) -> tuple[Floats, float]:
    """Sum the cells by Gauss panels, halved until each settles; return the sums and the error left."""
    share = np.where(sources.fan == 1, sources.extent / np.pi, sources.extent / sources.extent.max())
    count = np.maximum(1, np.ceil(pieces / 4.0 * share)).astype(int)
    which = np.repeat(np.arange(len(count)), count)
    left = (np.arange(count.sum()) - np.repeat(np.cumsum(count) - count, count)) / count[which]
    width = 1.0 / count[which]
    value, _ = _panels(sources, which, left, width)
    allowed = _TOLERANCE * value.sum(axis=0) / max(16, len(count))
    total, error = np.zeros(2), 0.0
    for depth in range(_DEEPEST):
        which, width = np.repeat(which, 2), np.repeat(width / 2.0, 2)
        left = np.repeat(left, 2)
        left[1::2] += width[1::2]
        halves, kink = _panels(sources, which, left, width)
        change = np.abs(halves[::2] + halves[1::2] - value)
        # a layer that begins beyond the last Gauss point shows only at the panel's end
        doubt = np.maximum(np.repeat(change, 2, axis=0), kink)
        open_ = (doubt > allowed).any(axis=1) & (depth < _DEEPEST - 1)
        total += halves[~open_].sum(axis=0)
        error += 0.5 * float(doubt[~open_, 0].sum())
        which, left, width, value = which[open_], left[open_], width[open_], halves[open_]
        if not len(which):
            break
    return total, error


def _panels(sources: _Sources, which: Ints, left: Floats, width: Floats) -> tuple[Floats, Floats]:
    """Return volume and area of each panel, and what its ends say is missing from them; both (n, 2)."""
    at = left[:, None] + width[:, None] * _NODES
    rows = np.repeat(which, len(_NODES))
    cells = sources.cells(rows, at.ravel()).reshape(len(which), len(_NODES), 2)
    inner, ends = cells[:, :5], cells[:, 5:]
    value = np.einsum("g,pgk->pk", 0.5 * _GAUSS_W, inner) * width[:, None]
    off = np.abs(np.einsum("eg,pgk->pek", _TO_ENDS, inner) - ends).max(axis=1)
    return value, _NEAR_END * off * width[:, None]
