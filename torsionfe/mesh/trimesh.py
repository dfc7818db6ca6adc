"""The triangle mesh of an outline: nodes, triangles, and the boundary sides with their true arcs."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.outline import arcs
from torsionfe.outline.edges import Edges

__all__ = ["TriMesh"]


@dataclass(frozen=True)
class TriMesh:
    """A conforming triangulation of an outline.

    Attributes
    ----------
    nodes : ndarray of shape (n, 2)
        Coordinates (length). Nodes on the boundary lie on the true edges and arcs.
    triangles : ndarray of shape (m, 3)
        Node numbers, counter-clockwise. The side opposite to the first node is the next to be bisected.
    sides : ndarray of shape (s, 2)
        Node numbers of each boundary side, directed with the material on the left.
    side_edge : ndarray of shape (s,)
        The row of the outline's edge table that the side lies on.
    side_span : ndarray of shape (s, 2)
        Where on that edge the side begins and ends, as fractions of the edge's length.
    edges : Edges
        The outline's edge table.
    history : ndarray of shape (n, 2), optional
        The ends of the link that bisection made each node the middle of; -1 for the nodes of the first mesh,
        which come first.
    """

    nodes: Floats
    triangles: Ints
    sides: Ints
    side_edge: Ints
    side_span: Floats
    edges: Edges
    history: Ints | None = None

    @property
    def born(self) -> Ints:
        """The ``history``, or that of a mesh which was never bisected."""
        return np.full((len(self.nodes), 2), -1) if self.history is None else self.history

    @cached_property
    def vertex_nodes(self) -> Ints:
        """The node where each edge of the outline starts, shape (e,)."""
        opening = self.side_span[:, 0] == 0.0
        nodes = np.empty(len(self.edges), dtype=np.int64)
        nodes[self.side_edge[opening]] = self.sides[opening, 0]
        return nodes

    @cached_property
    def _linked(self) -> tuple[Ints, Ints, Ints]:
        """Links (node pairs, low first), the links of each triangle, and how often each is used."""
        a, b = self.triangles[:, [1, 2, 0]].ravel(), self.triangles[:, [2, 0, 1]].ravel()
        key = np.minimum(a, b) * np.int64(len(self.nodes)) + np.maximum(a, b)
        unique, inverse, uses = np.unique(key, return_inverse=True, return_counts=True)
        links = np.stack(np.divmod(unique, len(self.nodes)), axis=1)
        return links, inverse.reshape(-1, 3), uses

    @property
    def links(self) -> Ints:
        """Node pairs of the mesh, each once, the lower number first; shape (l, 2)."""
        return self._linked[0]

    @property
    def triangle_links(self) -> Ints:
        """The link opposite to each node of each triangle, shape (m, 3)."""
        return self._linked[1]

    @cached_property
    def side_link(self) -> Ints:
        """The link of each boundary side, shape (s,)."""
        n = np.int64(len(self.nodes))
        key = self.sides.min(axis=1) * n + self.sides.max(axis=1)
        return np.asarray(np.searchsorted(self.links[:, 0] * n + self.links[:, 1], key))

    @cached_property
    def side_triangle(self) -> tuple[Ints, Ints]:
        """The triangle of each boundary side, and which of its nodes is opposite; both of shape (s,)."""
        where = np.full(len(self.links), -1)
        where[self.triangle_links.ravel()] = np.arange(self.triangle_links.size)
        triangle, opposite = np.divmod(where[self.side_link], 3)
        return triangle, opposite

    def unknowns(self, order: int) -> int:
        """Return how many degrees of freedom elements of an order have on this mesh."""
        m = len(self.triangles)
        links = (3 * m + len(self.sides)) // 2
        return len(self.nodes) + links * (order - 1) + m * (order - 1) * (order - 2) // 2

    @cached_property
    def side_bulge(self) -> Floats:
        """``tan(sweep / 4)`` of each boundary side, shape (s,); 0 is straight."""
        share = self.side_span[:, 1] - self.side_span[:, 0]
        return np.asarray(np.tan(np.arctan(self.edges.bulge[self.side_edge]) * share), dtype=float)

    @cached_property
    def side_loop(self) -> Ints:
        """The loop of each boundary side: 0 outer, ``k`` for void ``k - 1``; shape (s,)."""
        return self.edges.loop[self.side_edge]

    @cached_property
    def areas(self) -> Floats:
        """Area of each straight-sided triangle (length**2), shape (m,)."""
        a, b, c = (self.nodes[self.triangles[:, k]] for k in range(3))
        u, v = b - a, c - a
        return np.asarray(0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]), dtype=float)

    @cached_property
    def angles(self) -> Floats:
        """Corner angles of each straight-sided triangle (radians), shape (m, 3)."""
        p = self.nodes[self.triangles]
        u, v = np.roll(p, -1, axis=1) - p, np.roll(p, 1, axis=1) - p
        cross = u[..., 0] * v[..., 1] - u[..., 1] * v[..., 0]
        return np.asarray(np.arctan2(cross, np.sum(u * v, axis=2)), dtype=float)

    @cached_property
    def side_lengths(self) -> Floats:
        """Length of each boundary side along its arc, shape (s,)."""
        p, q = self.nodes[self.sides[:, 0]], self.nodes[self.sides[:, 1]]
        return arcs.arc_length(p, q, self.side_bulge)

    def __repr__(self) -> str:
        return (
            f"<TriMesh {len(self.nodes)} nodes, {len(self.triangles)} triangles, "
            f"smallest angle {np.degrees(self.angles.min()):.1f} degrees>"
        )
