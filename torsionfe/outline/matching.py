"""Whether two outlines are the same, wherever their loops start and however their voids are ordered."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats
from torsionfe.outline import arcs

if TYPE_CHECKING:
    from torsionfe.outline.outline import Outline

__all__ = ["matches"]


def matches(first: Outline, second: Outline, tolerance: float) -> bool:
    """Return whether two outlines have the same loops.

    Parameters
    ----------
    first, second : Outline
    tolerance : float
        Largest distance between vertices, and between the middles of edges (length).
    """
    if len(first.voids) != len(second.voids) or not _same_loop(first, second, tolerance):
        return False
    left = list(second.voids)
    for void in first.voids:
        twin = next((k for k, other in enumerate(left) if _same_loop(void, other, tolerance)), None)
        if twin is None:
            return False
        left.pop(twin)
    return True


def _same_loop(first: Outline, second: Outline, tolerance: float) -> bool:
    n = len(first.vertices)
    if n != len(second.vertices):
        return False
    a, b = _marks(first), _marks(second)
    starts = np.flatnonzero(np.hypot(*(b[:, :2] - a[0, :2]).T) <= tolerance)
    return any(bool(np.all(_gaps(a, np.roll(b, -start, axis=0)) <= tolerance)) for start in starts)


def _marks(loop: Outline) -> Floats:
    """Return each vertex with the middle of the edge that it starts, shape (n, 4)."""
    p = loop.vertices
    middle = arcs.point_at(p, np.roll(p, -1, axis=0), loop.bulges, np.full(len(p), 0.5))
    return np.concatenate([p, middle], axis=1)


def _gaps(a: Floats, b: Floats) -> Floats:
    d = (a - b).reshape(len(a), 2, 2)
    return np.asarray(np.hypot(d[..., 0], d[..., 1]), dtype=float)
