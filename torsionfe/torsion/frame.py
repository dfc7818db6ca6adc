"""The solver's own coordinates: centred on the section and scaled to about one.

Sections of a micrometre and of a kilometre, at the origin or far from it, so give the same digits. The scale is
a power of two, so that no coordinate is rounded by it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from torsionfe.checks import Floats
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.outline.outline import Outline

__all__ = ["Frame"]


@dataclass(frozen=True)
class Frame:
    """Where the solver's origin lies, and how long its unit is.

    Attributes
    ----------
    origin : ndarray of shape (2,)
        In the outline's coordinates (length).
    scale : float
        Length of the solver's unit.
    """

    origin: Floats
    scale: float

    @classmethod
    def of(cls, outline: Outline) -> Frame:
        """Return the frame of an outline: the middle of its bounds, the power of two next to its size."""
        x0, y0, x1, y1 = outline.bounds
        exponent = round(math.log2(max(x1 - x0, y1 - y0)))
        return cls(np.array([0.5 * (x0 + x1), 0.5 * (y0 + y1)]), math.ldexp(1.0, exponent))

    def inward_points(self, points: Floats) -> Floats:
        """Return points of the outline in the solver's coordinates."""
        return np.asarray((points - self.origin) / self.scale, dtype=float)

    def outward_points(self, points: Floats) -> Floats:
        """Return points of the solver in the outline's coordinates."""
        return np.asarray(points * self.scale + self.origin, dtype=float)

    def inward(self, mesh: TriMesh) -> TriMesh:
        """Return a mesh of the outline in the solver's coordinates, its boundary nodes on the arcs to the last digit.

        Far from the origin, coordinates are coarse: nodes computed there lie beside the arcs through the vertices.
        """
        moved = _moved(mesh, self.inward_points)
        nodes = moved.nodes.copy()
        nodes[mesh.sides[:, 0]] = moved.edges.points(mesh.side_edge, mesh.side_span[:, 0])
        return replace(moved, nodes=nodes)

    def outward(self, mesh: TriMesh) -> TriMesh:
        """Return a mesh of the solver in the outline's coordinates."""
        return _moved(mesh, self.outward_points)


def _moved(mesh: TriMesh, move) -> TriMesh:  # type: ignore[no-untyped-def]
    edges = replace(mesh.edges, start=move(mesh.edges.start), end=move(mesh.edges.end))
    return replace(mesh, nodes=move(mesh.nodes), edges=edges)
