"""The shear stress at any point of the section.

The mean of the two stress fields is the centre of Prager and Synge's hypercircle: over the section its error (root of
the integrated square) is half the root of the gap between the bounds, exactly.
"""

from __future__ import annotations

import numpy as np
import shapely

from torsionfe.checks import Floats, Ints
from torsionfe.fem.assembly import turned
from torsionfe.fem.geometry import inverted, reference_map
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.torsion.fields import Fields

__all__ = ["locate", "stress_at_reference", "stress_in_triangles"]

_OUTSIDE = 1e-6  # of a triangle's size


def locate(mesh: TriMesh, points: Floats) -> tuple[Ints, Floats]:
    """Return the triangle of each point (-1 outside the outline) and its reference coordinates.

    Parameters
    ----------
    mesh : TriMesh
    points : ndarray of shape (k, 2)

    Returns
    -------
    triangle : ndarray of shape (k,)
    reference : ndarray of shape (k, 2)
    """
    tree = shapely.STRtree(shapely.polygons(mesh.nodes[mesh.triangles]))
    hits = tree.query_nearest(shapely.points(points), all_matches=False)
    triangle = np.empty(len(points), dtype=np.int64)
    triangle[hits[0]] = hits[1]
    reference = np.full((len(points), 2), 1.0 / 3.0)
    for _ in range(8):  # Newton: one step on straight triangles, a few on curved ones
        order = np.argsort(triangle, kind="stable")
        at, jacobian = _map_each(mesh, triangle, reference, order)
        inverse, _ = inverted(jacobian)
        step = np.einsum("krx,kx->kr", inverse, points - at)
        reference = np.clip(reference + step, -2.0, 3.0)
        if np.abs(step).max(initial=0.0) < 1e-12:
            break
    corner = np.concatenate([1.0 - reference.sum(axis=1, keepdims=True), reference], axis=1)
    return np.where(corner.min(axis=1) < -_OUTSIDE, -1, triangle), reference


def _map_each(mesh: TriMesh, triangle: Ints, reference: Floats, order: Ints) -> tuple[Floats, Floats]:
    """Return point and Jacobian of one reference point a triangle; a triangle may come more than once."""
    unique, inverse = np.unique(triangle, return_inverse=True)
    rank = np.arange(len(order)) - np.searchsorted(triangle[order], triangle[order])
    most = int(rank.max(initial=0)) + 1
    table = np.full((len(unique), most, 2), 1.0 / 3.0)
    table[inverse[order], rank] = reference[order]
    points, jacobian = reference_map(mesh, unique, table)
    place, column = inverse, np.empty_like(rank)
    column[order] = rank
    return points[place, column], jacobian[place, column]


def stress_at_reference(fields: Fields, triangle: Ints, reference: Floats) -> Floats:
    """Return the shear stress for ``G theta' = 1`` at one reference point a row, shape (k, 2)."""
    order = np.argsort(triangle, kind="stable")
    points, jacobian = _map_each(fields.space.mesh, triangle, reference, order)
    inverse, _ = inverted(jacobian)
    slopes = fields.space.element.gradients(reference)
    dofs = fields.space.dofs[triangle]
    grad = [np.einsum("kb,kbr,krx->kx", field[dofs], slopes, inverse) for field in (fields.phi, fields.omega)]
    return np.asarray(0.5 * (np.stack([grad[0][:, 1], -grad[0][:, 0]], axis=1) + grad[1] - turned(points)))


def stress_in_triangles(fields: Fields, reference: Floats) -> tuple[Floats, Floats]:
    """Return points and shear stress for ``G theta' = 1`` at the same reference points of all triangles.

    Parameters
    ----------
    fields : Fields
    reference : ndarray of shape (q, 2)

    Returns
    -------
    points, stress : ndarray of shape (m, q, 2)
    """
    space = fields.space
    every = np.arange(len(space.mesh.triangles))
    points, jacobian = reference_map(space.mesh, every, reference)
    inverse, _ = inverted(jacobian)
    slopes = space.element.gradients(reference)
    grad = [np.einsum("mb,qbr,mqrx->mqx", field[space.dofs], slopes, inverse) for field in (fields.phi, fields.omega)]
    tau_phi = np.stack([grad[0][..., 1], -grad[0][..., 0]], axis=-1)
    return points, 0.5 * (tau_phi + grad[1] - turned(points))
