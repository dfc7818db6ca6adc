"""Stiffness matrix, loads and energies, vectorised over the elements.

The integrals are those of Saint-Venant's torsion (Timoshenko and Goodier, *Theory of Elasticity*, ch. 10): with
``p = (y, -x)``,

    K_ij = int grad N_i . grad N_j,   load_i = int N_i,   twist_i = int p . grad N_i
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats
from torsionfe.fem.elements import Element
from torsionfe.fem.geometry import Patch, patches
from torsionfe.fem.space import Space

if TYPE_CHECKING:
    from scipy.sparse import csr_array

__all__ = ["Energies", "System", "assemble", "energies", "gradients", "turned"]


@dataclass(frozen=True)
class System:
    """The assembled problem on one space.

    Attributes
    ----------
    space : Space
    patches : list of Patch
        Geometry at the quadrature points, kept for the energies.
    stiffness : sparse array of shape (n, n)
        ``int grad N_i . grad N_j``.
    load : ndarray of shape (n,)
        ``int N_i``, length**2.
    twist : ndarray of shape (n,)
        ``int (y dN_i/dx - x dN_i/dy)``, length**2.
    """

    space: Space
    patches: list[Patch]
    stiffness: csr_array
    load: Floats
    twist: Floats


@dataclass(frozen=True)
class Energies:
    """Integrals over each triangle (length**4), each of shape (m,).

    Attributes
    ----------
    phi : ndarray
        ``int |grad phi|^2``.
    omega : ndarray
        ``int |tau_omega|^2``.
    gap : ndarray
        ``int |tau_phi - tau_omega|^2``.
    """

    phi: Floats
    omega: Floats
    gap: Floats


def assemble(space: Space) -> System:
    """Return stiffness and loads of a space, exact on straight triangles, to rounding on curved ones."""
    from scipy.sparse import coo_array

    parts = patches(space.mesh, space.order)
    n = space.size
    index = np.int32 if n < 2**31 else np.int64
    rows, columns, entries = [], [], []
    load, twist = np.zeros(n), np.zeros(n)
    for patch in parts:
        dofs = space.dofs[patch.triangles]
        b = dofs.shape[1]
        entries.append(_stiffness(space.element, patch).ravel())
        rows.append(np.repeat(dofs.astype(index), b, axis=1).ravel())
        columns.append(np.tile(dofs.astype(index), (1, b)).ravel())
        values = space.element.values(patch.rule.points)
        load += np.bincount(dofs.ravel(), (patch.weights @ values).ravel(), n)
        twist += np.bincount(dofs.ravel(), _twist(space.element, patch).ravel(), n)
    where = (np.concatenate(rows), np.concatenate(columns))
    return System(space, parts, coo_array((np.concatenate(entries), where), shape=(n, n)).tocsr(), load, twist)


def _stiffness(element: Element, patch: Patch) -> Floats:
    """Return the element matrices ``(k, b * b)`` as one matrix product over metric and reference parts."""
    slopes = element.gradients(patch.rule.points)
    pairs = np.einsum("qai,qbj->qijab", slopes, slopes)
    # metric[i, j] = sum over x of inverse[i, x] inverse[j, x], symmetric: 3 numbers a point, written out for speed
    (a, e), (c, d) = ([patch.inverse[..., r, x] for x in range(2)] for r in range(2))
    three = np.stack([a * a + e * e, a * c + e * d, c * c + d * d], axis=2)
    parts = np.stack([pairs[:, 0, 0], pairs[:, 0, 1] + pairs[:, 1, 0], pairs[:, 1, 1]], axis=1)
    b = slopes.shape[1]
    if patch.inverse.shape[1] == 1:
        weight = patch.rule.weights
        jacobian = patch.weights[:, 0] / weight[0]
        summed = np.tensordot(weight, parts, axes=1).reshape(3, b * b)
        return np.asarray((three[:, 0] * jacobian[:, None]) @ summed, dtype=float)
    weighted = three * patch.weights[..., None]
    return np.asarray(weighted.reshape(len(three), -1) @ parts.reshape(-1, b * b), dtype=float)


def turned(points: Floats) -> Floats:
    """Return ``(y, -x)`` of points ``(..., 2)``: minus the stress of a section that does not warp."""
    return np.stack([points[..., 1], -points[..., 0]], axis=-1)


def _twist(element: Element, patch: Patch) -> Floats:
    """Return ``int (y, -x) . grad N`` of each element, shape (k, b)."""
    slopes = element.gradients(patch.rule.points)
    x, y = patch.points[..., 0] * patch.weights, patch.points[..., 1] * patch.weights
    along = (y * patch.inverse[..., r, 0] - x * patch.inverse[..., r, 1] for r in range(2))
    return np.asarray(sum(part @ slopes[..., r] for r, part in enumerate(along)), dtype=float)


def gradients(space: Space, patch: Patch, field: Floats) -> Floats:
    """Return the gradient of a field at a patch's quadrature points, shape (k, q, 2)."""
    return np.stack(_slopes(space, patch, field), axis=-1)


def _slopes(space: Space, patch: Patch, field: Floats) -> tuple[Floats, Floats]:
    """Return the derivatives of a field by x and by y at a patch's quadrature points, each of shape (k, q)."""
    slopes = space.element.gradients(patch.rule.points)
    local = field[space.dofs[patch.triangles]]
    u, v = local @ slopes[..., 0].T, local @ slopes[..., 1].T
    inverse = patch.inverse
    return u * inverse[..., 0, 0] + v * inverse[..., 1, 0], u * inverse[..., 0, 1] + v * inverse[..., 1, 1]


def energies(system: System, phi: Floats, omega: Floats) -> Energies:
    """Return the energies of both stress fields, and of their difference, triangle by triangle."""
    m = len(system.space.mesh.triangles)
    result = Energies(np.empty(m), np.empty(m), np.empty(m))
    for patch in system.patches:
        phi_x, phi_y = _slopes(system.space, patch, phi)
        omega_x, omega_y = _slopes(system.space, patch, omega)
        zx, zy = omega_x - patch.points[..., 1], omega_y + patch.points[..., 0]
        for name, x, y in (("phi", phi_y, -phi_x), ("omega", zx, zy), ("gap", phi_y - zx, -phi_x - zy)):
            getattr(result, name)[patch.triangles] = ((x * x + y * y) * patch.weights).sum(axis=1)
    return result
