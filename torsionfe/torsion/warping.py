"""Warping constant and centre of twist from the warping function.

Trefftz's conditions (Trefftz 1935, Z. angew. Math. Mech. 15, 220-225): about the centre of twist the warping function
satisfies ``int w = int w x = int w y = 0``, and ``C_w = int w**2``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats
from torsionfe.fem.geometry import reference_map
from torsionfe.torsion.fields import Fields

__all__ = ["Warping", "dof_points", "normalised_warping"]


@dataclass(frozen=True)
class Warping:
    """The warping function about the centre of twist, in the solver's coordinates.

    Attributes
    ----------
    centre : ndarray of shape (2,)
        Centre of twist.
    omega : ndarray of shape (n,)
        Normalised warping function at the degrees of freedom, length**2.
    constant : float
        Warping constant, length**6.
    extremes : tuple of float
        Least and largest value of ``omega``, length**2; they lie on the boundary.
    """

    centre: Floats
    omega: Floats
    constant: float
    extremes: tuple[float, float]


def normalised_warping(fields: Fields) -> Warping:
    """Return the warping function about the centre of twist."""
    space = fields.space
    moments, products = np.zeros((3, 3)), np.zeros(3)
    for patch in fields.system.patches:
        basis = np.concatenate([np.ones((*patch.weights.shape, 1)), patch.points], axis=2)
        omega = fields.omega[space.dofs[patch.triangles]] @ space.element.values(patch.rule.points).T
        moments += np.einsum("kqi,kqj,kq->ij", basis, basis, patch.weights)
        products += np.einsum("kqi,kq,kq->i", basis, omega, patch.weights)
    # w = omega - (c0 + c1 x + c2 y), orthogonal to 1, x and y; a pole at (a, b) adds -b x + a y
    c0, c1, c2 = np.linalg.solve(moments, products)
    nodes = dof_points(fields)
    omega = fields.omega - (c0 + c1 * nodes[:, 0] + c2 * nodes[:, 1])
    constant = 0.0
    for patch in fields.system.patches:
        values = fields.omega[space.dofs[patch.triangles]] @ space.element.values(patch.rule.points).T
        rest = values - (c0 + patch.points @ np.array([c1, c2]))
        constant += float(np.sum(rest**2 * patch.weights))
    edge = omega[np.unique(space.side_dofs)]
    return Warping(np.array([-c2, c1]), omega, constant, (float(edge.min()), float(edge.max())))


def dof_points(fields: Fields) -> Floats:
    """Return where each degree of freedom sits, shape (n, 2), on the true arcs."""
    space = fields.space
    every = np.arange(len(space.mesh.triangles))
    result = np.empty((space.size, 2))
    result[space.dofs.ravel()] = reference_map(space.mesh, every, space.element.nodes)[0].reshape(-1, 2)
    return result
