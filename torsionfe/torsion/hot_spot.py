"""The hot spot: the largest finite shear stress, where it sits, and how sure we are of it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats, Ints
from torsionfe.outline.fillets import sharp_corners
from torsionfe.torsion.boundary import BoundaryStress

__all__ = ["HotSpot", "Peak", "find_peaks", "heights", "plateau_share", "tied_peaks"]

_FIT_DEGREE = 3
_RISE = 0.02  # a rise this small on the way down from a corner is noise of the mesh
_TIE = 0.02  # peaks this close to the largest compete for it


@dataclass(frozen=True, slots=True)
class HotSpot:
    """The largest finite shear stress of the section.

    Attributes
    ----------
    x, y : float
        Where, on the boundary (length).
    stress_per_torque : float
        Shear stress for unit torque, 1/length**3.
    rel_error : float
        Estimated relative error of the stress.
    """

    x: float
    y: float
    stress_per_torque: float
    rel_error: float


@dataclass(frozen=True)
class Peak:
    """Local peaks of the boundary stress on one mesh, the largest first, for ``G theta' = 1``.

    Attributes
    ----------
    tau : ndarray of shape (k,)
        Shear stress (length), positive.
    points : ndarray of shape (k, 2)
    doubt : ndarray of shape (k,)
        Relative disagreement of the samples around each peak.
    side : ndarray of shape (k,)
        Row of the boundary stress's sides that holds each.
    size : ndarray of shape (k,)
        Length of that side.
    """

    tau: Floats
    points: Floats
    doubt: Floats
    side: Ints
    size: Floats


def find_peaks(stress: BoundaryStress) -> Peak:
    """Return the local peaks within a few percent of the largest, singular corners left out."""
    size = np.abs(stress.tau)
    height = np.where(_near_corner(stress)[:, None], 0.0, size).max(axis=1)
    if height.max(initial=0.0) == 0.0:
        return Peak(np.empty(0), np.empty((0, 2)), np.empty(0), np.empty(0, dtype=np.int64), np.empty(0))
    top = _summits(stress, height)
    tau, place, scatter = _fitted(stress, size, top)
    edge = stress.edge[top]
    points = stress.mesh.edges.points(edge, np.clip(place / stress.mesh.edges.length[edge], 0.0, 1.0))
    doubt = np.maximum(scatter, 0.5 * np.abs(tau - height[top])) / tau
    order = np.argsort(-tau, kind="stable")
    return Peak(tau[order], points[order], doubt[order], top[order], stress.length[top[order]])


def heights(stress: BoundaryStress, sides: Ints) -> Floats:
    """Return the largest size of the stress on some sides, taken as that of a peak is; shape (k,)."""
    return _fitted(stress, np.abs(stress.tau), sides)[0]


def _loop_neighbours(stress: BoundaryStress) -> tuple[Ints, Ints]:
    """Return, for each side in walking order, the one before and the one after on its loop."""
    loop = stress.mesh.edges.loop[stress.edge]
    index = np.arange(len(loop))
    first = np.searchsorted(loop, loop, side="left")
    last = np.searchsorted(loop, loop, side="right") - 1
    return np.where(index == first, last, index - 1), np.where(index == last, first, index + 1)


def _summits(stress: BoundaryStress, height: Floats) -> Ints:
    """Return the sides that hold a local maximum which competes for the largest stress."""
    before, after = _loop_neighbours(stress)
    local = (height >= height[before]) & (height > height[after])
    # a plateau (a round bar) has no summit of its own: its first highest side stands for it
    local[np.argmax(height)] = True
    return np.flatnonzero(local & (height >= (1.0 - _TIE) * height.max()))


def _near_corner(stress: BoundaryStress) -> NDArray[np.bool_]:
    """Return which sides carry the flank of a singular corner: from it, down to where the stress rises again."""
    edges = stress.mesh.edges
    blocked = np.zeros(len(stress.sides), dtype=bool)
    height = np.abs(stress.tau).max(axis=1)
    before, after = _loop_neighbours(stress)
    opening = np.searchsorted(stress.edge, np.arange(len(edges)))  # first side of each edge
    for corner in sharp_corners(edges):
        for start, onward in ((opening[corner], after), (before[opening[corner]], before)):
            blocked[_flank(start, onward, height)] = True
    return blocked


def _flank(start: int, onward: Ints, height: Floats) -> list[int]:
    """Return the sides walked from a corner while the stress falls."""
    walked = [int(start)]
    lowest = height[start]
    for step in range(len(height)):
        following = int(onward[walked[-1]])
        # the two sides at the corner are within its reach whatever they read
        if step > 1 and height[following] > (1.0 + _RISE) * lowest:
            break
        walked.append(following)
        lowest = min(lowest, height[following])
    return walked


def _fitted(stress: BoundaryStress, size: Floats, top: Ints) -> tuple[Floats, Floats, Floats]:
    """Return the peak on each side of ``top``, its arc length, and the scatter of the samples about the fit.

    A parabola or cubic goes through the samples of the side and its neighbours on the same edge: the stress is
    smooth along an edge, not across a change of curvature.
    """
    before, after = _loop_neighbours(stress)
    window = np.stack([before[top], top, after[top]], axis=1)
    same = stress.edge[window] == stress.edge[top][:, None]
    scale = stress.length[top][:, None]
    at = ((stress.position[window] - stress.start[top][:, None, None]) / scale[..., None]).reshape(len(top), -1)
    values = size[window].reshape(len(top), -1)
    weight = np.repeat(same, size.shape[1], axis=1).astype(float)
    # two samples fewer than would fit exactly, so that noise is smoothed and seen
    degree = np.clip(weight.sum(axis=1) - 2, 0, _FIT_DEGREE)
    powers = np.arange(_FIT_DEGREE + 1)
    basis = np.where(powers <= degree[:, None, None], at[..., None] ** powers, 0.0) * weight[..., None]
    coefficients = (np.linalg.pinv(basis) @ (values * weight)[..., None])[..., 0]
    scatter = np.abs((basis @ coefficients[..., None])[..., 0] - values * weight).max(axis=1)
    grid = np.linspace(0.0, 1.0, 65)
    curve = coefficients @ (grid ** powers[:, None])
    best = np.argmax(curve, axis=1)
    return curve[np.arange(len(top)), best], stress.start[top] + grid[best] * stress.length[top], scatter


def tied_peaks(stress: BoundaryStress, peak: Peak, rel_error: Floats) -> list[int]:
    """Return the peaks that equal the largest within their error, one for each separate place."""
    if not len(peak.tau):
        return []
    tie = max(2.0 * float(rel_error[0]), 1e-3)
    floor = (1.0 - tie) * peak.tau[0]
    equal = np.flatnonzero(peak.tau >= floor)
    region = _regions(stress, np.abs(stress.tau).max(axis=1) >= floor)
    seen: set[int] = set()
    chosen = []
    for k in equal:
        place = int(region[peak.side[k]])
        if place not in seen:
            seen.add(place)
            chosen.append(int(k))
    return chosen


def _regions(stress: BoundaryStress, high: NDArray[np.bool_]) -> Ints:
    """Return a number for each side: the same for sides joined along the loop by sides that are all high."""
    before, _ = _loop_neighbours(stress)
    number: Ints = np.cumsum(~(high & high[before]), dtype=np.int64)
    # a stretch that passes the loop's first side has its end joined to its beginning
    loop = stress.mesh.edges.loop[stress.edge]
    for first in np.flatnonzero(np.diff(loop, prepend=-1)):
        last = before[first]
        if high[first] and high[last]:
            number[number == number[last]] = number[first]
    return number


def plateau_share(stress: BoundaryStress, height: float) -> float:
    """Return the share of the boundary's length whose stress is within one percent of ``height``."""
    near = np.abs(stress.tau).mean(axis=1) >= 0.99 * height
    return float(stress.length[near].sum() / stress.length.sum())
