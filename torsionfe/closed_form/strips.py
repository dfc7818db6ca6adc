"""Strips: the stretches of an outline's medial axis along which two faces run side by side."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely

from torsionfe.checks import Floats, Ints
from torsionfe.closed_form.medial import Circles

__all__ = ["WALL_TAPER", "Strip", "find_runs", "find_strips"]

#: Slope of one face against the other up to which two faces count as side by side.
WALL_TAPER = 0.2

_SHORTEST = 0.2  # of the thickness: a shorter stretch is no plate
_STRAIGHT = 0.02  # of the thickness: how far a middle line may bow and still count as straight
_SAME = 0.25  # of the thickness: two middle lines as near as this are one
_FACE = np.radians(50.0)  # a face that turns more from sample to sample is two faces
_TURNING = np.radians(12.0)
_TRIM = np.radians(1.0)
_PARALLEL = 1e-6  # radians
_CONSTANT = 1e-6  # of the thickness


@dataclass(frozen=True)
class Strip:
    """One stretch between two faces that run side by side.

    Attributes
    ----------
    line : ndarray of shape (m, 2)
        Its middle line (length): two points if it is straight.
    thickness : float
        Half-way along (length).
    least, most : float
        The smallest and largest along it (length).
    loops : tuple of int
        The loops of its two faces: equal on an open plate, different on the wall of a cell.
    slope : float
        How fast the thickness grows from the line's first point to its last, dimensionless.
    """

    line: Floats
    thickness: float
    least: float
    most: float
    loops: tuple[int, int]
    slope: float = 0.0

    @property
    def curved(self) -> bool:
        """Whether the middle line turns by more than a taper makes it."""
        steps = np.diff(self.line, axis=0)
        turns = np.abs(np.diff(np.unwrap(np.arctan2(steps[:, 1], steps[:, 0]))))
        return bool(turns.sum() > _TURNING)

    @property
    def length(self) -> float:
        """Length of the middle line."""
        return float(np.hypot(*np.diff(self.line, axis=0).T).sum())

    def outward(self, end: int) -> tuple[Floats, Floats]:
        """Return the point at an end (0 or 1) and the unit direction in which the line leaves there."""
        a, b = (self.line[1], self.line[0]) if end == 0 else (self.line[-2], self.line[-1])
        return b, (b - a) / np.hypot(*(b - a))

    def thickness_at(self, end: int) -> float:
        """Return the thickness at an end (0 or 1), length."""
        return self.thickness + (end - 0.5) * self.slope * self.length

    def thickness_beyond(self, reach: tuple[float, float]) -> float:
        """Return the thickness half-way along, once the line is made longer by ``reach`` at its ends."""
        return self.thickness + 0.5 * self.slope * (reach[1] - reach[0])


def find_runs(circles: Circles, taper: float = WALL_TAPER) -> Ints:
    """Return the number of each sample's run, -1 where its faces are not side by side, shape (n,).

    A run is a chain of samples on one face whose circles have nearly opposite feet (to ``taper``, the slope
    of one face against the other) and whose thickness and centres do not jump.
    """
    good = circles.deviation <= np.arctan(taper) + 1e-9
    after = circles.following
    thickness = 2.0 * circles.radius
    stride = np.hypot(*(circles.foot[after] - circles.foot).T)
    jump = np.hypot(*(circles.centre[after] - circles.centre).T)
    joined = good & good[after] & (circles.touch_loop == circles.touch_loop[after])
    normal = circles.centre - circles.foot
    turn = np.sum(normal * normal[after], axis=1) / (circles.radius * circles.radius[after])
    joined &= turn >= np.cos(_FACE)
    joined &= jump <= 3.0 * stride + 0.5 * thickness
    joined &= np.abs(thickness[after] - thickness) <= 2.0 * taper * stride + 0.02 * thickness
    return _chains(good, joined, after)


def _chains(good: np.ndarray, joined: np.ndarray, after: Ints) -> Ints:
    """Return a number per chain of joined samples, -1 for samples that are not good."""
    from scipy.sparse import coo_matrix
    from scipy.sparse.csgraph import connected_components

    rows = np.flatnonzero(joined)
    n = len(good)
    graph = coo_matrix((np.ones(len(rows)), (rows, after[rows])), shape=(n, n))
    number = connected_components(graph, directed=False)[1]
    return np.where(good, number, -1).astype(np.int64)


def find_strips(circles: Circles, runs: Ints) -> list[Strip]:
    """Return the strips, each once though both of its faces have a run: the run with more samples counts."""
    members = [np.flatnonzero(runs == k) for k in np.unique(runs[runs >= 0])]
    strips: list[Strip] = []
    for rows in sorted(members, key=lambda rows: -len(rows)):
        strip = _strip(circles, _in_order(circles, rows)) if len(rows) > 1 else None
        if strip is not None and not _repeats(circles.centre[rows], strip, strips):
            strips.append(strip)
    return strips


def _repeats(centres: Floats, strip: Strip, others: list[Strip]) -> bool:
    """Say whether most of a run's centres lie on the lines of strips already found."""
    if not others:
        return False
    lines = shapely.MultiLineString([other.line for other in others])
    near = shapely.distance(shapely.points(centres), lines) < _SAME * strip.thickness
    return bool(np.count_nonzero(near) > 0.5 * len(centres))


def _in_order(circles: Circles, rows: Ints) -> Ints:
    """Return the samples of a run from its first to its last, though it may pass the loop's end."""
    gaps = np.flatnonzero(circles.following[rows[:-1]] != rows[1:])
    return np.roll(rows, -int(gaps[0] + 1)) if gaps.size else rows


def _strip(circles: Circles, rows: Ints) -> Strip | None:
    deviation = circles.deviation[rows]
    middle = float(np.median(deviation))
    # towards fillets and corners the faces part: parallel faces are kept where they are exactly so
    core = rows[deviation <= middle + min(_TRIM, middle + _PARALLEL)]
    thickness = 2.0 * circles.radius[core]
    line = circles.centre[core]
    step = np.hypot(*np.diff(line, axis=0).T)
    if step.sum() < _SHORTEST * thickness.mean():
        return None
    along = np.append(0.0, np.cumsum(step)) - 0.5 * step.sum()
    slope, middle_thickness = np.polyfit(along, thickness, 1)
    if np.ptp(thickness) < _CONSTANT * thickness[0]:
        slope, middle_thickness = 0.0, float(np.median(thickness))
    ends = line[[0, -1]]
    bow = shapely.distance(shapely.points(line), shapely.LineString(ends)).max()
    if bow <= _STRAIGHT * middle_thickness and np.hypot(*(ends[1] - ends[0])) > 0.5 * step.sum():
        line = ends
    loops = int(circles.loop[core[0]]), int(circles.touch_loop[core[0]])
    least, most = float(thickness.min()), float(thickness.max())
    return Strip(line, float(middle_thickness), least, most, loops, float(slope))
