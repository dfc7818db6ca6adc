"""The stress function and the warping function of a meshed outline, and the bounds that they give.

For ``G theta' = 1``: Prandtl's stress function (Prandtl 1903) solves ``-laplace(phi) = 2`` with ``phi = 0`` on
the outer loop and an unknown constant on each void; Saint-Venant's warping function minimises
``int (omega_x - y)^2 + (omega_y + x)^2``. Any trial functions give

    2 L(phi) - int |grad phi|^2  <=  J  <=  int |tau_omega|^2,   L(phi) = 2 int phi + 2 sum phi_k A_k,

and the difference of the two ends is ``int |tau_phi - tau_omega|^2`` exactly (Prager and Synge 1947, Quart. Appl.
Math. 5, 241-269). Elements carry arcs exactly, so the bounds are those of the outline itself.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.fem.assembly import Energies, System, assemble, energies
from torsionfe.fem.solve import solve_constrained
from torsionfe.fem.space import Space, space_of
from torsionfe.mesh.trimesh import TriMesh

__all__ = ["Fields", "carried", "solve_fields", "solve_warping"]


@dataclass(frozen=True)
class Fields:
    """Both solutions on one mesh, for ``G theta' = 1``.

    Attributes
    ----------
    system : System
    phi : ndarray of shape (n,)
        Stress function, length**2.
    omega : ndarray of shape (n,)
        Warping function, length**2, of zero value at the first node.
    energies : Energies
        Integrals over each triangle, length**4.
    lower, upper : float
        Bounds of the torsion constant, length**4.
    """

    system: System
    phi: Floats
    omega: Floats
    energies: Energies
    lower: float
    upper: float

    @property
    def space(self) -> Space:
        """The space of both functions."""
        return self.system.space

    @property
    def gap(self) -> float:
        """``int |tau_phi - tau_omega|^2``, which equals ``upper - lower``; length**4."""
        return float(self.energies.gap.sum())


def solve_fields(mesh: TriMesh, order: int) -> Fields:
    """Solve for both functions with elements of the given order."""
    system = assemble(space_of(mesh, order))
    unknown, source = _stress_function_problem(system)
    phi = solve_constrained(system.space, system.stiffness, source, unknown)
    return _bounded(system, source, phi, _warping(system))


def solve_warping(mesh: TriMesh, order: int) -> tuple[Space, Floats]:
    """Solve for the warping function alone; return it with its space."""
    system = assemble(space_of(mesh, order))
    return system.space, _warping(system)


def _warping(system: System) -> Floats:
    pinned = np.arange(-1, system.space.size - 1)
    return solve_constrained(system.space, system.stiffness, system.twist, pinned)


def carried(fields: Fields, mesh: TriMesh) -> Fields:
    """Return the same functions as trial functions on a mesh whose nodes moved, with the bounds that they give there.

    Parameters
    ----------
    fields : Fields
    mesh : TriMesh
        The triangles of ``fields.space.mesh``; its outline may be another one.
    """
    system = assemble(replace(fields.space, mesh=mesh))
    return _bounded(system, _stress_function_problem(system)[1], fields.phi, fields.omega)


def _bounded(system: System, source: Floats, phi: Floats, omega: Floats) -> Fields:
    """Return both functions with the bounds that they give, solutions or not."""
    parts = energies(system, phi, omega)
    lower = 2.0 * float(source @ phi) - float(parts.phi.sum())
    return Fields(system, phi, omega, parts, lower, float(parts.omega.sum()))


def _stress_function_problem(system: System) -> tuple[Ints, Floats]:
    """Return the unknown of each degree of freedom (one a void, none on the outer loop) and the load."""
    mesh = system.space.mesh
    loop_of = np.full(system.space.size, -1)
    loop_of[system.space.side_dofs] = mesh.side_loop[:, None]
    inside = loop_of < 0
    unknown = np.full(system.space.size, -1)
    unknown[inside] = np.arange(np.count_nonzero(inside))
    source = 2.0 * system.load
    areas = mesh.edges.loop_area
    if len(areas) > 1:
        on_void = loop_of > 0
        unknown[on_void] = np.count_nonzero(inside) + loop_of[on_void] - 1
        # the load of a void's constant may sit on any one of its nodes: they share one unknown
        first = np.array([np.argmax(loop_of == k) for k in range(1, len(areas))])
        source[first] += 2.0 * -areas[1:]
    return unknown, source
