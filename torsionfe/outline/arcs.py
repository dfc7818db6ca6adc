"""Geometry of edges, straight or circular, as arrays: one row an edge.

An edge runs from ``p`` to ``q`` with the bulge ``b = tan(sweep / 4)``: 0 is straight, positive turns
counter-clockwise on the way from ``p`` to ``q``, 1 is a half circle (the convention of open CAD formats).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats

__all__ = [
    "arc_centre",
    "arc_length",
    "arc_radius",
    "arc_through",
    "point_at",
    "segment_area",
    "sweep",
    "tangent_at",
]


def sweep(bulge: ArrayLike) -> Floats:
    """Return the signed angle in radians that an edge of this bulge turns through."""
    return np.asarray(4.0 * np.arctan(bulge), dtype=float)


def arc_radius(p: Floats, q: Floats, bulge: Floats) -> Floats:
    """Return the radius (length) of each edge; infinity where it is straight."""
    chord = np.hypot(*(q - p).T)
    size = np.abs(bulge)
    with np.errstate(divide="ignore"):
        return np.asarray(np.where(size > 0.0, chord * (1.0 + size**2) / (4.0 * size), np.inf), dtype=float)


def arc_centre(p: Floats, q: Floats, bulge: Floats) -> Floats:
    """Return the centre ``(n, 2)`` of each arc; NaN where the edge is straight."""
    d = q - p
    normal = np.stack([-d[:, 1], d[:, 0]], axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        rise = np.where(bulge != 0.0, (1.0 - bulge**2) / (4.0 * bulge), np.nan)
    return np.asarray(0.5 * (p + q) + normal * rise[:, None], dtype=float)


def arc_length(p: Floats, q: Floats, bulge: Floats) -> Floats:
    """Return the length of each edge along its arc."""
    half = 2.0 * np.arctan(np.abs(bulge))
    return np.asarray(np.hypot(*(q - p).T) / np.sinc(half / np.pi), dtype=float)


def _rotate(vectors: Floats, angle: Floats) -> Floats:
    c, s = np.cos(angle), np.sin(angle)
    x, y = vectors[:, 0], vectors[:, 1]
    return np.stack([c * x - s * y, s * x + c * y], axis=1)


def point_at(p: Floats, q: Floats, bulge: Floats, t: Floats) -> Floats:
    """Return the point ``(n, 2)`` at the fraction ``t`` (by arc length) of each edge.

    The chord form used here stays exact to rounding as the bulge goes to zero.
    """
    half = 2.0 * np.arctan(bulge)
    scale = t * np.sinc(t * half / np.pi) / np.sinc(half / np.pi)
    inner = p + _rotate((q - p) * scale[:, None], (t - 1.0) * half)
    return np.asarray(np.where((t == 1.0)[:, None], q, inner), dtype=float)


def tangent_at(p: Floats, q: Floats, bulge: Floats, t: Floats) -> Floats:
    """Return the unit tangent ``(n, 2)`` at the fraction ``t`` of each edge, in its direction."""
    d = q - p
    return _rotate(d / np.hypot(*d.T)[:, None], (2.0 * t - 1.0) * 2.0 * np.arctan(bulge))


def segment_area(p: Floats, q: Floats, bulge: Floats) -> Floats:
    """Return the signed area (length**2) between each arc and its chord, positive for a positive bulge."""
    angle = sweep(bulge)
    chord2 = np.sum((q - p) ** 2, axis=1)
    small = np.abs(angle) < 1e-2
    safe = np.where(small, 1.0, angle)
    # R^2 (a - sin a) / 2 with R = chord / (2 sin(a/2)); the series serves near zero
    exact = (safe - np.sin(safe)) / (8.0 * np.sin(safe / 2.0) ** 2)
    series = angle / 12.0 * (1.0 + angle**2 / 30.0 + angle**4 / 840.0)
    return np.asarray(chord2 * np.where(small, series, exact), dtype=float)


def arc_through(p: Floats, middle: Floats, q: Floats) -> Floats:
    """Return the bulge of the arc from ``p`` through ``middle`` to ``q``, row by row."""
    a, b = middle - p, q - middle
    cross = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    turn = np.arctan2(cross, np.sum(a * b, axis=1))
    return np.asarray(np.tan(turn / 2.0), dtype=float)
