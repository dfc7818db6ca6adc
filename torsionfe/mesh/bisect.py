"""Local refinement by newest-vertex bisection; new boundary nodes lie on the true arcs.

Source: Mitchell, W. F. (1991), "Adaptive refinement for arbitrary finite-element spaces with hierarchical
bases", J. Comput. Appl. Math. 36, 65-78. Shapes stay within four similarity classes of each first triangle.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats, Ints
from torsionfe.mesh.trimesh import TriMesh

__all__ = ["bisect"]


def bisect(mesh: TriMesh, marked: NDArray[np.bool_]) -> tuple[TriMesh, Ints]:
    """Return the mesh with the marked triangles halved, and as few others as conformity asks.

    Parameters
    ----------
    mesh : TriMesh
    marked : ndarray of bool, shape (m,)
        Which triangles to bisect.

    Returns
    -------
    finer : TriMesh
    parent : ndarray of shape (m_finer,)
        The triangle of ``mesh`` that each new triangle is a part of.
    """
    cut = _close(mesh, marked)
    middle = np.full(len(mesh.links), -1)
    middle[cut] = len(mesh.nodes) + np.arange(np.count_nonzero(cut))
    nodes = np.concatenate([mesh.nodes, mesh.nodes[mesh.links[cut]].mean(axis=1)])
    sides, side_edge, side_span = _split_sides(mesh, middle, nodes)
    triangles, parent = _split_triangles(mesh, middle)
    history = np.concatenate([mesh.born, mesh.links[cut]])
    return TriMesh(nodes, triangles, sides, side_edge, side_span, mesh.edges, history), parent


def _close(mesh: TriMesh, marked: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return which links to cut: a triangle with a cut link must have its own first link cut."""
    first, second, third = mesh.triangle_links.T
    cut = np.zeros(len(mesh.links), dtype=bool)
    cut[first[marked]] = True
    while True:
        hanging = (cut[second] | cut[third]) & ~cut[first]
        if not hanging.any():
            return cut
        cut[first[hanging]] = True


def _split_sides(mesh: TriMesh, middle: Ints, nodes: Floats) -> tuple[Ints, Ints, Floats]:
    """Return the boundary sides after the cut, moving each new node onto its arc in ``nodes``."""
    new = middle[mesh.side_link]
    halved = new >= 0
    a, b = mesh.sides[halved].T
    rows, (t0, t1) = mesh.side_edge[halved], mesh.side_span[halved].T
    half, m = 0.5 * (t0 + t1), new[halved]
    nodes[m] = mesh.edges.points(rows, half)
    kept = ~halved
    sides = np.concatenate([mesh.sides[kept], np.stack([a, m], axis=1), np.stack([m, b], axis=1)])
    spans = np.concatenate([mesh.side_span[kept], np.stack([t0, half], axis=1), np.stack([half, t1], axis=1)])
    return sides, np.concatenate([mesh.side_edge[kept], rows, rows]), spans


def _split_triangles(mesh: TriMesh, middle: Ints) -> tuple[Ints, Ints]:
    """Return the triangles after the cut (newest node first) and the parent of each."""
    m, on_ab, on_ca = middle[mesh.triangle_links[:, [0, 2, 1]]].T
    a, b, c = mesh.triangles.T
    whole = m < 0
    parts = [(mesh.triangles[whole], np.flatnonzero(whole))]

    def keep(rows: NDArray[np.bool_], *corners: Ints) -> None:
        parts.append((np.stack([corner[rows] for corner in corners], axis=1), np.flatnonzero(rows)))

    keep(~whole & (on_ab < 0), m, a, b)
    keep(~whole & (on_ca < 0), m, c, a)
    keep(~whole & (on_ab >= 0), on_ab, m, a)
    keep(~whole & (on_ab >= 0), on_ab, b, m)
    keep(~whole & (on_ca >= 0), on_ca, m, c)
    keep(~whole & (on_ca >= 0), on_ca, a, m)
    return np.concatenate([p[0] for p in parts]), np.concatenate([p[1] for p in parts])
