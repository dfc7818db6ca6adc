"""The boundary of a draft mesh: nodes on the true edges, and the sides between them, split where asked."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.mesh.delaunay import Bools, cross
from torsionfe.outline import arcs
from torsionfe.outline.edges import Edges
from torsionfe.outline.outline import Outline

__all__ = ["Draft", "draft_of", "invalid_when_bent"]

#: Corners sharper than this (radians), of the material or of the gap, are cut on concentric shells.
_SHARP = np.radians(60.5)
_LARGEST_SWEEP = np.radians(30.0)
#: The bent triangle's Jacobian stays above this part of the straight one's.
_MARGIN = 0.3
_LATTICE = np.array([(6 - i - j, i, j) for i in range(7) for j in range(7 - i)]) / 6.0
_RATES = ((-1.0, 1.0, 0.0), (-1.0, 0.0, 1.0))


@dataclass(frozen=True)
class Draft:
    """A mesh in the making, in coordinates ``(user - centre) * scale`` of about unit size.

    Attributes
    ----------
    centre, scale : ndarray of shape (2,) and float
        From the user's coordinates to the draft's; the scale is a power of two.
    edges : Edges
        The outline's edges, in the draft's coordinates.
    sharp : ndarray of bool, shape (e,)
        Whether the corner at the start of each edge is sharp.
    nodes, free : ndarray of shape (b, 2) and (f, 2)
        Boundary nodes, and nodes inside.
    node_edge, node_t : ndarray of shape (b,)
        The edge that each boundary node lies on, and the fraction of its length (0 to below 1).
    sides : ndarray of shape (s, 2)
        Boundary nodes of each side, the material on the left.
    side_edge, side_span : ndarray of shape (s,) and (s, 2)
        The edge that each side lies on, and from where to where as fractions of its length.
    """

    centre: Floats
    scale: float
    edges: Edges
    sharp: Bools
    nodes: Floats
    node_edge: Ints
    node_t: Floats
    sides: Ints
    side_edge: Ints
    side_span: Floats
    free: Floats

    @property
    def side_bulge(self) -> Floats:
        """``tan(sweep / 4)`` of each side, shape (s,)."""
        share = self.side_span[:, 1] - self.side_span[:, 0]
        return np.asarray(np.tan(np.arctan(self.edges.bulge[self.side_edge]) * share), dtype=float)

    def place(self, points: Floats) -> Floats:
        """Return points (k, 2) in the user's coordinates."""
        return np.asarray(points / self.scale + self.centre)

    def split(self, which: Ints) -> tuple[Draft, Floats, Floats]:
        """Return the draft with the sides ``which`` (k,) split, the new nodes (k, 2), the half chords (k,)."""
        t = self._where(which)
        edge, span, ends = self.side_edge[which], self.side_span[which], self.sides[which]
        points = self.edges.points(edge, t)
        fresh = len(self.nodes) + np.arange(len(which))
        sides, spans = self.sides.copy(), self.side_span.copy()
        sides[which, 1], spans[which, 1] = fresh, t
        chord = self.nodes[ends[:, 1]] - self.nodes[ends[:, 0]]
        half = 0.5 * np.hypot(*chord.T)
        changed = replace(
            self,
            nodes=np.concatenate([self.nodes, points]),
            node_edge=np.concatenate([self.node_edge, edge]),
            node_t=np.concatenate([self.node_t, t]),
            sides=np.concatenate([sides, np.stack([fresh, ends[:, 1]], axis=1)]),
            side_edge=np.concatenate([self.side_edge, edge]),
            side_span=np.concatenate([spans, np.stack([t, span[:, 1]], axis=1)]),
        )
        return changed, points, half

    def _where(self, which: Ints) -> Floats:
        """Return the fractions of their edges' lengths at which to split the sides ``which``.

        The middle, but at a sharp corner a power of two away from it, so that the nodes on both its
        edges lie on shared circles (Ruppert 1995, section 4; Miller, Pav and Walkington 2003).
        """
        edge, span = self.side_edge[which], self.side_span[which]
        middle = span.mean(axis=1)
        after = (span[:, 0] == 0.0) & self.sharp[edge]
        before = (span[:, 1] == 1.0) & self.sharp[self.edges.following[edge]]
        shell = after ^ before
        if not shell.any():
            return np.asarray(middle)
        rows = edge[shell]
        ends = self.nodes[self.sides[which[shell]]]
        chord = np.hypot(*(ends[:, 1] - ends[:, 0]).T)
        reach = np.exp2(np.round(np.log2(0.5 * chord)))
        turn = np.abs(arcs.sweep(self.edges.bulge[rows]))
        with np.errstate(invalid="ignore"):
            bent = 2.0 * np.arcsin(0.5 * reach / self.edges.radius[rows]) / np.where(turn > 0.0, turn, 1.0)
        away = np.where(turn > 0.0, bent, reach / self.edges.length[rows])
        middle[shell] = np.where(after[shell], away, 1.0 - away)
        low, high = span[:, 0], span[:, 1]
        return np.asarray(np.clip(middle, 0.9 * low + 0.1 * high, 0.1 * low + 0.9 * high))


def draft_of(outline: Outline) -> Draft:
    """Return the coarsest draft of an outline: straight edges one side each, arcs one every 30 degrees."""
    edges = outline.edges
    x0, y0, x1, y1 = outline.bounds
    centre = np.array([0.5 * (x0 + x1), 0.5 * (y0 + y1)])
    scale = math.ldexp(1.0, 1 - math.frexp(max(x1 - x0, y1 - y0))[1])
    turn = np.abs(arcs.sweep(edges.bulge))
    count = np.maximum(np.ceil(turn / _LARGEST_SWEEP * (1.0 - 1e-9)), 1.0).astype(np.int64)
    first = np.cumsum(count) - count
    rows = np.repeat(np.arange(len(edges)), count)
    number = np.arange(len(rows))
    t, until = (number - first[rows]) / count[rows], (number - first[rows] + 1) / count[rows]
    ends = np.where(until == 1.0, first[edges.following[rows]], number + 1)
    small = replace(edges, start=(edges.start - centre) * scale, end=(edges.end - centre) * scale)
    return Draft(
        centre=centre,
        scale=scale,
        edges=small,
        sharp=np.abs(edges.interior_angle - np.pi) > np.pi - _SHARP,
        nodes=small.points(rows, t),
        node_edge=rows,
        node_t=t,
        sides=np.stack([number, ends], axis=1),
        side_edge=rows,
        side_span=np.stack([t, until], axis=1),
        free=np.empty((0, 2)),
    )


def invalid_when_bent(corners: Floats, bulges: Floats) -> Bools:
    """Return which triangles fold, or nearly fold, when their sides are bent to the true arcs.

    Parameters
    ----------
    corners : ndarray of shape (k, 3, 2)
        Counter-clockwise.
    bulges : ndarray of shape (k, 3)
        ``tan(sweep / 4)`` of the side opposite to each corner, positive outwards.

    Returns
    -------
    ndarray of bool, shape (k,)

    Notes
    -----
    The map is ``x = sum(l_i v_i) + sum over sides of 4 l1 l2 D(l2 - l1)``, where the side from ``v1`` to
    ``v2`` bulges by ``D(s) = n R sin(a)**2 / (cos(a) + sqrt(1 - s**2 sin(a)**2))``, ``a`` half its sweep
    and ``n`` its outward normal. Its Jacobian is sampled on a lattice.
    """
    e1, e2 = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    # the derivatives by l1 and l2 (l0 = 1 - l1 - l2) at each point of the lattice
    by = [np.repeat(e[:, None], len(_LATTICE), axis=1) for e in (e1, e2)]
    for k in range(3):
        bent = np.flatnonzero(bulges[:, k])
        i, j = (k + 1) % 3, (k + 2) % 3
        chord = corners[bent, j] - corners[bent, i]
        outward = np.stack([chord[:, 1], -chord[:, 0]], axis=1)[:, None]  # n times the chord, 2 R sin(a)
        half = 2.0 * np.arctan(bulges[bent, k])[:, None]
        u, v = _LATTICE[:, i], _LATTICE[:, j]
        root = np.sqrt(1.0 - ((v - u) * np.sin(half)) ** 2)
        rise = 0.5 * np.sin(half) / (np.cos(half) + root)
        slope = rise * (v - u) * np.sin(half) ** 2 / (root * (np.cos(half) + root))
        for rate, grown in zip(_RATES, by, strict=True):
            growth = (rate[i] * v + rate[j] * u) * rise + u * v * slope * (rate[j] - rate[i])
            grown[bent] += 4.0 * growth[..., None] * outward
    return np.asarray(cross(by[0], by[1]).min(axis=1) < _MARGIN * cross(e1, e2))
