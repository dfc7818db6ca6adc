"""Thin cells of any outline with voids: the middle line around each void, its area and its walls."""

from __future__ import annotations

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.closed_form.cells import CellWall, ThinCells
from torsionfe.closed_form.medial import Circles, inscribed_circles
from torsionfe.closed_form.strips import WALL_TAPER, find_runs
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline

__all__ = ["cells_around_voids", "middle_line", "thin_cells"]


def thin_cells(outline: Outline) -> ThinCells:
    """Return the cells of an outline with voids, without fins: one cell a void.

    The walls follow the medial axis between a void and its neighbours; where a wall's thickness varies,
    ``int ds/t`` is taken along it. Open fins are left out: `derive_plates` finds those.

    Raises
    ------
    InputError
        The outline has no void.
    """
    circles = inscribed_circles(outline)
    return cells_around_voids(circles, find_runs(circles, WALL_TAPER), len(outline.voids))


def middle_line(circles: Circles, loop: int) -> Ints:
    """Return the samples of a void's loop whose circles touch another loop: their centres are its cell."""
    return np.flatnonzero((circles.loop == loop) & (circles.touch_loop != loop))


def cells_around_voids(circles: Circles, runs: Ints, voids: int) -> ThinCells:
    """Return the cells, from the inscribed circles and their runs of near-constant thickness."""
    if voids == 0:
        raise InputError("the outline has no void, so it has no closed cell")
    areas, walls = [], []
    for loop in range(1, voids + 1):
        rows = middle_line(circles, loop)
        x, y = circles.centre[rows].T
        areas.append(0.5 * abs(float(np.sum(x * np.roll(y, -1) - y * np.roll(x, -1)))))
        walls += _walls(circles, rows, runs, loop)
    return ThinCells(tuple(walls), tuple(areas), source="medial axis of the outline")


def _walls(circles: Circles, rows: Ints, runs: Ints, loop: int) -> list[CellWall]:
    """Return the walls of one cell; a wall between two voids counts with the lower one."""
    line, thickness = circles.centre[rows], 2.0 * circles.radius[rows]
    step = np.hypot(*(np.roll(line, -1, axis=0) - line).T)
    compliance = step / (0.5 * (thickness + np.roll(thickness, -1)))
    other = circles.touch_loop[rows]
    label = _filled(_long_runs(runs[rows], step, thickness), other, thickness)
    walls = []
    for neighbour in np.unique(other):
        if 0 < neighbour < loop:
            continue
        cells = (loop - 1,) if neighbour == 0 else (loop - 1, int(neighbour) - 1)
        for run in dict.fromkeys(label[other == neighbour].tolist()):
            mine = (label == run) & (other == neighbour)
            length, flexibility = float(step[mine].sum()), float(compliance[mine].sum())
            if length > 0.0:
                # no thicker than its mean, whatever the rounding of the sums
                least = min(float(thickness[mine].min()), length / flexibility)
                walls.append(CellWall(length, least, cells, flexibility=flexibility))
    return walls


def _long_runs(runs: Ints, step: Floats, thickness: Floats) -> Ints:
    """Return the runs with those of less than two thicknesses (rounded corners) struck out as -1."""
    label = runs.copy()
    for run in np.unique(runs[runs >= 0]):
        mine = runs == run
        if step[mine].sum() < 2.0 * thickness[mine].mean():
            label[mine] = -1
    return label


def _filled(label: Ints, other: Ints, thickness: Floats) -> Ints:
    """Give each corner sample one of the two runs beside it that face the same neighbour.

    That is the thinner one, whose stress governs there, or the nearer where both are as thick.
    """
    n = len(label)
    filled = label.copy()
    for neighbour in np.unique(other):
        known = np.flatnonzero((label >= 0) & (other == neighbour))
        loose = np.flatnonzero((label < 0) & (other == neighbour))
        if not len(known) or not len(loose):
            continue
        after = np.searchsorted(known, loose)
        ahead, behind = known[after % len(known)], known[after - 1]
        ratio = thickness[ahead] / thickness[behind]
        nearer = (ahead - loose) % n <= (loose - behind) % n
        use_ahead = np.where(np.abs(ratio - 1.0) < 0.01, nearer, ratio < 1.0)
        filled[loose] = label[np.where(use_ahead, ahead, behind)]
    return filled
