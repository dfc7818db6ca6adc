"""Circles through points by least squares of the distances, free or tangent to lines.

The start is the algebraic fit (Kasa 1976), polished by Gauss-Newton steps on the geometric distances; a
tangent line is one linear equation between the centre and the radius, kept exactly by stepping in its null
space.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats

__all__ = ["Circle", "Line", "fit_circle"]

_STEPS = 3


@dataclass(frozen=True)
class Line:
    """A line through a point (2,) with the unit direction (2,)."""

    point: Floats
    direction: Floats

    @property
    def normal(self) -> Floats:
        """The unit normal to the left of the direction, shape (2,)."""
        return np.array([-self.direction[1], self.direction[0]])


@dataclass(frozen=True)
class Circle:
    """A circle: its centre (2,) and radius (length)."""

    centre: Floats
    radius: float

    def deviation(self, points: Floats) -> float:
        """Return the largest distance (length) of the points ``(n, 2)`` from the circle."""
        return float(np.abs(np.hypot(*(points - self.centre).T) - self.radius).max())


def fit_circle(points: Floats, side: float = 1.0, tangents: Sequence[Line] = ()) -> Circle | None:
    """Return the circle nearest to points, tangent to lines where they are given.

    Parameters
    ----------
    points : ndarray of shape (n, 2)
        At least 3 points.
    side : float
        The side of each line that the centre lies on: 1 left of its direction, -1 right.
    tangents : sequence of Line
        At most 2.

    Returns
    -------
    Circle or None
        None where the points lie on a line.
    """
    shift = points.mean(axis=0)
    scale = float(np.abs(points - shift).max())
    if scale == 0.0:
        return None
    x = (points - shift) / scale
    # x^2 + y^2 = 2 a x + 2 b y + c, linear in (a, b, c)
    system = np.column_stack([2.0 * x, np.ones(len(x))])
    (a, b, c), _, rank, _ = np.linalg.lstsq(system, np.sum(x * x, axis=1), rcond=1e-12)
    square = c + a * a + b * b
    if rank < 3 or square <= 0.0:
        return None
    z = np.array([a, b, np.sqrt(square)])
    free = np.eye(3)
    if tangents:
        rows = np.array([[*line.normal, -side] for line in tangents])
        right = np.array([line.normal @ (line.point - shift) / scale for line in tangents])
        z = z - np.linalg.pinv(rows) @ (rows @ z - right)
        free = np.linalg.svd(rows)[2][len(rows) :].T
    for _ in range(_STEPS):
        away = x - z[:2]
        distance = np.hypot(*away.T)
        if distance.min() <= 0.0:
            return None
        slope = np.column_stack([-away / distance[:, None], -np.ones(len(x))]) @ free
        step = np.linalg.lstsq(slope, z[2] - distance, rcond=None)[0]
        z = z + free @ step
        if np.abs(step).max() < 1e-13:
            break
    if not np.isfinite(z).all() or z[2] <= 0.0:
        return None
    return Circle(shift + scale * z[:2], float(scale * z[2]))
