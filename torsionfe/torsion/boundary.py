"""The shear stress along the boundary, where its peak lies.

``|grad phi|^2`` is subharmonic, so the largest shear stress is on the boundary (Timoshenko and Goodier, ch. 10);
there it is tangential and, for ``G theta' = 1``, equals ``d(omega)/ds + x ty - y tx``. The derivative of a
Lagrange function of order p is most accurate at the p Gauss points of a side, so it is sampled there.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.fem.elements import line_gradient
from torsionfe.fem.geometry import side_curve
from torsionfe.fem.space import Space
from torsionfe.mesh.trimesh import TriMesh

__all__ = ["BoundaryStress", "along_sides", "boundary_stress", "walking_order"]


@dataclass(frozen=True)
class BoundaryStress:
    """Shear stress at the Gauss points of the boundary sides, in walking order, for ``G theta' = 1``.

    Attributes
    ----------
    mesh : TriMesh
    sides : ndarray of shape (s,)
        Sides of the mesh in walking order, loop by loop, the material on the left.
    edge : ndarray of shape (s,)
        The outline edge of each.
    start, length : ndarray of shape (s,)
        Arc length at which each side begins (from the start of its edge), and its own.
    position : ndarray of shape (s, g)
        Arc length of the samples from the start of the edge.
    points : ndarray of shape (s, g, 2)
    tau : ndarray of shape (s, g)
        Shear stress along the walking direction (length).
    """

    mesh: TriMesh
    sides: Ints
    edge: Ints
    start: Floats
    length: Floats
    position: Floats
    points: Floats
    tau: Floats


def walking_order(mesh: TriMesh) -> Ints:
    """Return the boundary sides in the order in which the outline's edges are walked."""
    return np.lexsort((mesh.side_span[:, 0], mesh.side_edge))


def along_sides(space: Space, omega: Floats, sides: Ints, t: Floats) -> tuple[Floats, Floats, Floats]:
    """Return the shear stress along boundary sides from the warping function, for ``G theta' = 1``.

    Parameters
    ----------
    space : Space
    omega : ndarray of shape (n,)
        The warping function, length**2.
    sides : ndarray of shape (k,)
    t : ndarray of shape (g,)
        Fractions of the sides' chords.

    Returns
    -------
    tau : ndarray of shape (k, g)
        Along the walking direction (length).
    points : ndarray of shape (k, g, 2)
    speed : ndarray of shape (k, g)
        ``ds/dt``.
    """
    points, derivative = side_curve(space.mesh, sides, t)
    speed = np.hypot(derivative[..., 0], derivative[..., 1])
    tangent = derivative / speed[..., None]
    slope = omega[space.side_dofs[sides]] @ line_gradient(space.order, t).T
    tau = slope / speed + points[..., 0] * tangent[..., 1] - points[..., 1] * tangent[..., 0]
    return tau, points, speed


def boundary_stress(space: Space, omega: Floats) -> BoundaryStress:
    """Return the shear stress along the boundary from the warping function."""
    mesh = space.mesh
    sides = walking_order(mesh)
    gauss = 0.5 * (1.0 + np.polynomial.legendre.leggauss(space.order)[0])
    tau, points, _ = along_sides(space, omega, sides, gauss)
    edge, span = mesh.side_edge[sides], mesh.side_span[sides]
    total = mesh.edges.length[edge]
    # on an arc the chord fraction and the arc fraction differ by the third order of the sweep
    half = 2.0 * np.arctan(mesh.side_bulge[sides])[:, None]
    safe = np.where(half == 0.0, 1.0, half)
    bent = np.where(half == 0.0, gauss, 0.5 + np.arcsin((2.0 * gauss - 1.0) * np.sin(safe)) / (2.0 * safe))
    position = (span[:, :1] + np.diff(span, axis=1) * bent) * total[:, None]
    length = mesh.side_lengths[sides]
    return BoundaryStress(mesh, sides, edge, span[:, 0] * total, length, position, points, tau)
