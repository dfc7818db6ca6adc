"""The solved fields on fine straight triangles, for plots and viewers that know nothing of curved elements."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache, cached_property
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats, Ints
from torsionfe.fem.elements import element
from torsionfe.fem.geometry import reference_map
from torsionfe.fem.space import space_of
from torsionfe.torsion.fields import Fields
from torsionfe.torsion.recover import stress_in_triangles
from torsionfe.torsion.solution import TorsionSolution
from torsionfe.torsion.warping import normalised_warping

if TYPE_CHECKING:
    from matplotlib.tri import Triangulation

__all__ = ["Samples", "nodal_stress", "sampled", "split_triangle"]

_MOST = 60_000  # triangles
_FINEST = 10  # parts of a side: an arc of 30 degrees is then not told from its chords in print


@dataclass(frozen=True)
class Samples:
    """Fields at the corners of fine triangles, in the outline's coordinates.

    Attributes
    ----------
    points : ndarray of shape (n, 2)
    triangles : ndarray of shape (m, 3)
    parent : ndarray of shape (m,)
        The element that each triangle is a part of.
    stress : ndarray of shape (n, 2)
        ``(tau_zx, tau_zy)`` for unit torque, 1/length**3.
    stress_function, warping : ndarray of shape (n,)
        For ``G theta' = 1`` and unit twist rate, length**2; the warping function is that about the centre of twist.
    """

    points: Floats
    triangles: Ints
    parent: Ints
    stress: Floats
    stress_function: Floats
    warping: Floats

    @cached_property
    def grid(self) -> Triangulation:
        """The triangles as matplotlib takes them."""
        from matplotlib.tri import Triangulation

        return Triangulation(self.points[:, 0], self.points[:, 1], triangles=self.triangles)

    @property
    def magnitude(self) -> Floats:
        """Size of the shear stress for unit torque, 1/length**3, shape (n,)."""
        return np.asarray(np.hypot(self.stress[:, 0], self.stress[:, 1]), dtype=float)


def nodal_stress(fields: Fields) -> Floats:
    """Return the stress at the degrees of freedom for ``G theta' = 1``, the mean of the elements that share each.

    Returns
    -------
    ndarray of shape (n, 2)
        In the solver's unit of length.
    """
    space = fields.space
    stress = stress_in_triangles(fields, space.element.nodes)[1].reshape(-1, 2)
    dofs = space.dofs.ravel()
    count = np.bincount(dofs, minlength=space.size)
    parts = [np.bincount(dofs, stress[:, k], space.size) / count for k in range(2)]
    return np.stack(parts, axis=1)


@cache
def split_triangle(parts: int) -> Ints:
    """Return how the nodes of a Lagrange triangle span ``parts**2`` triangles, shape (parts**2, 3)."""
    steps = np.rint(element(parts).nodes * parts).astype(int)
    place = {(int(i), int(j)): k for k, (i, j) in enumerate(steps)}
    upright = [(i, j) for j in range(parts) for i in range(parts - j)]
    turned = [(i, j) for j in range(parts - 1) for i in range(parts - 1 - j)]
    rows = [(place[i, j], place[i + 1, j], place[i, j + 1]) for i, j in upright]
    rows += [(place[i + 1, j], place[i + 1, j + 1], place[i, j + 1]) for i, j in turned]
    return np.array(rows, dtype=np.int64)


def sampled(
    solution: TorsionSolution, window: tuple[float, float, float, float] | None = None, parts: int | None = None
) -> Samples:
    """Return the fields of a solution on fine triangles.

    Parameters
    ----------
    solution : TorsionSolution
    window : tuple of float, optional
        ``(x_min, y_min, x_max, y_max)`` in the outline's coordinates: only the elements that it touches.
    parts : int, optional
        Into how many parts each side is split; by default up to 10, so that arcs look round and the stress, which
        has a ridge where it passes through zero, looks smooth on few elements.

    Returns
    -------
    Samples
    """
    fields, frame = solution.fields, solution.frame
    mesh, space = fields.space.mesh, fields.space
    which = np.arange(len(mesh.triangles)) if window is None else _touched(solution, window)
    if parts is None:
        parts = int(np.clip(np.sqrt(_MOST / max(len(which), 1)), 1, _FINEST))
    lattice = space_of(mesh, parts)
    reference = lattice.element.nodes
    used, number = np.unique(lattice.dofs[which], return_inverse=True)
    number = number.reshape(len(which), -1)

    def spread(values: Floats) -> Floats:
        """Return values given at each element's lattice, once a point."""
        flat = np.empty((len(used), *values.shape[2:]))
        flat[number.ravel()] = values.reshape(-1, *values.shape[2:])
        return flat

    basis = space.element.values(reference)
    nodal = np.column_stack([nodal_stress(fields), fields.phi, normalised_warping(fields).omega])
    values = spread(np.einsum("qb,mbk->mqk", basis, nodal[space.dofs[which]], optimize=True))
    points = spread(reference_map(mesh, which, reference)[0])
    split = split_triangle(parts)
    per_torque = frame.scale / solution.torsion_constant.value
    return Samples(
        points=frame.outward_points(points),
        triangles=number[:, split].reshape(-1, 3),
        parent=np.repeat(which, len(split)),
        stress=values[:, :2] * per_torque,
        stress_function=values[:, 2] * frame.scale**2,
        warping=values[:, 3] * frame.scale**2,
    )


def _touched(solution: TorsionSolution, window: tuple[float, float, float, float]) -> Ints:
    """Return the elements whose surrounding box, with room for their arcs, touches the window."""
    mesh = solution.mesh
    corners = mesh.nodes[mesh.triangles]
    low, high = corners.min(axis=1), corners.max(axis=1)
    room = 0.3 * (high - low).max(axis=1, keepdims=True)
    near: NDArray[np.bool_] = (low - room <= window[2:]).all(axis=1) & (high + room >= window[:2]).all(axis=1)
    return np.flatnonzero(near)
