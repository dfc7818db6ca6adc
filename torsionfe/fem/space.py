"""Degrees of freedom of a mesh for elements of any order."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Ints
from torsionfe.fem.elements import Element, element
from torsionfe.mesh.trimesh import TriMesh

__all__ = ["Space", "space_of"]


@dataclass(frozen=True)
class Space:
    """Continuous piecewise polynomials on a mesh.

    Attributes
    ----------
    mesh : TriMesh
    element : Element
    dofs : ndarray of shape (m, b)
        The degree of freedom of each basis function of each triangle.
    side_dofs : ndarray of shape (s, order + 1)
        The degrees of freedom on each boundary side: its two ends, then the inner ones in its direction.
    size : int
        Number of degrees of freedom.
    """

    mesh: TriMesh
    element: Element
    dofs: Ints
    side_dofs: Ints
    size: int

    @property
    def order(self) -> int:
        """Polynomial degree."""
        return self.element.order


def space_of(mesh: TriMesh, order: int) -> Space:
    """Return the space of the given order on a mesh: corners first, then links, then insides."""
    n, links, m = len(mesh.nodes), len(mesh.links), len(mesh.triangles)
    inner = np.arange(order - 1)
    blocks = [mesh.triangles]
    for k in range(3):
        backwards = mesh.triangles[:, (k + 1) % 3] > mesh.triangles[:, (k + 2) % 3]
        blocks.append(_on_links(n, mesh.triangle_links[:, k], backwards, inner))
    inside = (order - 1) * (order - 2) // 2
    start = n + links * len(inner)
    blocks.append(start + np.arange(m)[:, None] * inside + np.arange(inside))
    on_sides = _on_links(n, mesh.side_link, mesh.sides[:, 0] > mesh.sides[:, 1], inner)
    side_dofs = np.concatenate([mesh.sides, on_sides], axis=1)
    return Space(mesh, element(order), np.concatenate(blocks, axis=1), side_dofs, start + m * inside)


def _on_links(offset: int, link: Ints, backwards: NDArray[np.bool_], inner: Ints) -> Ints:
    """Return the inner degrees of freedom of links, in the direction in which they are walked."""
    along = np.where(backwards[:, None], inner[::-1], inner)
    return np.asarray(offset + link[:, None] * len(inner) + along, dtype=np.int64)
