"""One mesh, solved for both functions and looked at: bounds, boundary stress, peaks and how sure they are."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.torsion.boundary import BoundaryStress, boundary_stress
from torsionfe.torsion.fields import Fields, solve_fields
from torsionfe.torsion.hot_spot import Peak, find_peaks

__all__ = ["Look", "look_at"]

#: The stated error is this many times what samples and last change show: measured on the reference sections,
#: where the true error is then within it at least 95 times in 100 (``benchmarks/peak_honesty.py``).
_CAUTION = 1.3
_OF_CHANGE = 0.7


@dataclass(frozen=True)
class Look:
    """One pass of the adaptive loop.

    Attributes
    ----------
    fields : Fields
    boundary : BoundaryStress
    peak : Peak
    rel_error : ndarray of shape (k,)
        Estimated relative error of each peak.
    """

    fields: Fields
    boundary: BoundaryStress
    peak: Peak
    rel_error: Floats


def look_at(mesh: TriMesh, order: int, before: Peak | None) -> Look:
    """Solve one mesh and look at it, beside the peaks that the mesh ``before`` it showed."""
    fields = solve_fields(mesh, order)
    boundary = boundary_stress(fields.space, fields.omega)
    peak = find_peaks(boundary)
    return Look(fields, boundary, peak, _peak_error(peak, before))


def _peak_error(peak: Peak, before: Peak | None) -> Floats:
    """Return the relative error of each peak: what its samples leave open, and its change since the last mesh."""
    if before is None or not len(before.tau) or not len(peak.tau):
        return np.full(len(peak.tau), 1.0)
    change = abs(peak.tau[0] - before.tau[0]) / peak.tau[0]
    return np.asarray(_CAUTION * np.maximum(peak.doubt, _OF_CHANGE * change))
