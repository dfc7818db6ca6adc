"""One mesh, solved for both functions and looked at: bounds, boundary stress, peaks and how sure they are."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.torsion.boundary import BoundaryStress, boundary_stress
from torsionfe.torsion.bounds import Bounds
from torsionfe.torsion.fields import Fields, solve_fields
from torsionfe.torsion.hot_spot import Peak, find_peaks
from torsionfe.torsion.pollution import POLLUTION, influence

__all__ = ["OF_GAP", "Look", "Seen", "look_at"]

#: The stated error is this many times what samples and last change show: measured on the reference sections by
#: ``benchmarks/peak_honesty.py``, which says how often the true error is then within it.
_CAUTION = 1.6
_OF_CHANGE = 0.7
#: On meshes of a few elements samples may agree by accident: no less than this many times the bracket's square.
OF_GAP = 2.0
#: The largest so many peaks are asked what reaches them from elsewhere; the others are taken to be like them.
_ASKED = 8


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
    influence : ndarray of shape (min(k, 8), m)
        How much of the largest peaks' error may come from each triangle, relative to the peak.
    """

    fields: Fields
    boundary: BoundaryStress
    peak: Peak
    rel_error: Floats
    influence: Floats


@dataclass(frozen=True)
class Seen:
    """What of a look the next one needs: its peaks and their errors, not its fields."""

    peak: Peak
    rel_error: Floats


def look_at(mesh: TriMesh, order: int, before: Seen | None) -> Look:
    """Solve one mesh and look at it, beside the peaks that the mesh ``before`` it showed."""
    fields = solve_fields(mesh, order)
    boundary = boundary_stress(fields.space, fields.omega)
    peak = find_peaks(boundary)
    coarse = OF_GAP * Bounds(fields.lower, fields.upper).rel_gap ** 2
    reach = POLLUTION * influence(fields, peak.points[:_ASKED]) / peak.tau[:_ASKED, None]
    least = reach.sum(axis=1)
    least = np.append(least, np.full(len(peak.tau) - len(least), least.max(initial=0.0)))
    error = np.maximum(np.maximum(_peak_error(peak, before, order), coarse), least)
    return Look(fields, boundary, peak, error, reach)


def _peak_error(peak: Peak, before: Seen | None, order: int) -> Floats:
    """Return the relative error of each peak: what its samples leave open, and its change since the last mesh.

    A mesh that is no finer about a peak changes little there and proves nothing: the error falls no faster than the
    size of the sides to the power ``order + 1``, the rate of the samples.
    """
    if before is None or not len(before.peak.tau) or not len(peak.tau):
        return np.full(len(peak.tau), 1.0)
    change = abs(peak.tau[0] - before.peak.tau[0]) / peak.tau[0]
    found = _CAUTION * np.maximum(peak.doubt, _OF_CHANGE * change)
    away = np.hypot(*np.moveaxis(peak.points[:, None] - before.peak.points, 2, 0))
    near = away.argmin(axis=1)
    known = before.rel_error[near]
    gain = np.minimum(peak.size / before.peak.size[near], 1.0) ** (order + 1)
    return np.asarray(np.where(known < 1.0, np.maximum(found, gain * known), found))
