"""A solved mesh that moves with its outline: how fast the torsion constant and the peak stress change.

Moving the boundary outward by ``dn`` changes the torsion constant by ``int tau^2 dn ds`` (Hadamard 1908, *Mém. prés.
par divers savants* 33, no. 4). The same as an integral over the section: let the mesh move with the outline and the
solved functions ride on it. Each bound is an extreme over all functions, so its derivative asks for none of theirs (the
envelope theorem), and the derivatives of both bounds tend to that of ``J`` as the bounds do. This form is the more
accurate of the two on finite elements (Hiptmair, Paganini and Sargheini 2015, BIT 55, 459-485), at sharp re-entrant
corners by far. The inner nodes follow the boundary by Laplace's equation, so that no triangle is bent for nothing.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.errors import InputError
from torsionfe.fem.assembly import System, assemble
from torsionfe.fem.solve import solve_constrained
from torsionfe.fem.space import space_of
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.outline.edges import Edges
from torsionfe.outline.outline import Outline
from torsionfe.torsion.boundary import boundary_stress
from torsionfe.torsion.fields import Fields, carried, solve_warping
from torsionfe.torsion.frame import Frame
from torsionfe.torsion.hot_spot import heights

__all__ = ["Carrier", "bound_rates", "log_heights"]

#: A boundary that moves farther than this (solver's unit), or bends by more than this share of its way, jumps.
_FARTHEST, _BEND = 0.02, 0.05
_ROUNDING = 1e-11


@dataclass(frozen=True)
class Carrier:
    """Carries a mesh to outlines close to its own.

    Attributes
    ----------
    mesh : TriMesh
        In the solver's coordinates.
    frame : Frame
    system : System
        Linear elements on the mesh: what its inner nodes follow the boundary by.
    """

    mesh: TriMesh
    frame: Frame
    system: System

    @classmethod
    def of(cls, mesh: TriMesh, frame: Frame) -> Carrier:
        """Return the carrier of a mesh in the solver's coordinates."""
        return cls(mesh, frame, assemble(space_of(mesh, 1)))

    def pair(self, plus: Outline, minus: Outline) -> tuple[TriMesh, TriMesh]:
        """Return the mesh carried to two outlines, equally far to both sides of its own.

        Raises
        ------
        InputError
            The outlines have other edges than the mesh's own, or are no smooth change of it.
        """
        mesh, nodes = self.mesh, self.mesh.nodes
        edges = [self._edges(outline) for outline in (plus, minus)]
        ahead, back = (_on_boundary(mesh, moved) - nodes for moved in edges)
        way = float(np.abs(ahead - back).max())
        if way > _FARTHEST or float(np.abs(ahead + back).max()) > _BEND * way + _ROUNDING:
            raise InputError("the outline does not change smoothly at this value")
        follow = self._inside(0.5 * (ahead - back))
        return (
            replace(mesh, nodes=nodes + ahead + follow, edges=edges[0]),
            replace(mesh, nodes=nodes + back - follow, edges=edges[1]),
        )

    def _edges(self, outline: Outline) -> Edges:
        own, new = self.mesh.edges, outline.edges
        if not np.array_equal(own.loop, new.loop):
            raise InputError(f"the outline changes its edges at this value, from {len(own)} to {len(new)}")
        return replace(new, start=self.frame.inward_points(new.start), end=self.frame.inward_points(new.end))

    def _inside(self, way: Floats) -> Floats:
        """Return how the inner nodes follow the boundary's way (n, 2): harmonically; zero on the boundary."""
        space = self.system.space
        unknown = np.zeros(space.size, dtype=np.int64)
        unknown[np.unique(self.mesh.sides)] = -1
        unknown[unknown == 0] = np.arange(np.count_nonzero(unknown == 0))
        right = -(self.system.stiffness @ way)
        return np.stack([solve_constrained(space, self.system.stiffness, side, unknown) for side in right.T], axis=1)


def _on_boundary(mesh: TriMesh, edges: Edges) -> Floats:
    """Return the mesh's nodes with those of the boundary on other edges, at the same shares of their lengths."""
    nodes = mesh.nodes.copy()
    for end in range(2):
        nodes[mesh.sides[:, end]] = edges.points(mesh.side_edge, mesh.side_span[:, end])
    return nodes


def bound_rates(fields: Fields, pair: tuple[TriMesh, TriMesh], span: float) -> tuple[float, float]:
    """Return the derivatives of the lower and the upper bound of the torsion constant, without another solve.

    Parameters
    ----------
    fields : Fields
        Solved.
    pair : tuple of TriMesh
        Their mesh, carried ahead and back.
    span : float
        Difference of the dimension between the two.

    Returns
    -------
    lower, upper : float
        In the solver's unit: length**4 over that of the dimension.
    """
    ahead, back = (carried(fields, mesh) for mesh in pair)
    return (ahead.lower - back.lower) / span, (ahead.upper - back.upper) / span


def log_heights(mesh: TriMesh, sides: Ints, order: int) -> Floats:
    """Return the logarithms of some peaks' stress for ``G theta' = 1``, the warping function solved for; shape (k,).

    On a mesh and on the same mesh moved, most of the error is the same and cancels in the difference.

    Parameters
    ----------
    mesh : TriMesh
    sides : ndarray of shape (k,)
        Rows of the boundary stress's sides that hold the peaks.
    order : int
        Degree of the elements.
    """
    return np.asarray(np.log(heights(boundary_stress(*solve_warping(mesh, order)), sides)), dtype=float)
