"""Where edges of two outlines meet, and whether points lie inside an outline: exact for lines and arcs."""

from __future__ import annotations

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.outline import arcs
from torsionfe.outline.edges import Edges

__all__ = ["crossings", "fraction_on", "inside"]


def _cross(a: Floats, b: Floats) -> Floats:
    return np.asarray(a[..., 0] * b[..., 1] - a[..., 1] * b[..., 0], dtype=float)


def crossings(a: Edges, b: Edges, rows_a: Ints, rows_b: Ints) -> Floats:
    """Return where the lines or circles of pairs of edges meet, up to twice a pair.

    Parameters
    ----------
    a, b : Edges
    rows_a, rows_b : ndarray of shape (n,)
        The pairs.

    Returns
    -------
    ndarray of shape (2, n, 2)
        NaN where there is no such point. Lines or circles that only touch, or miss each other, give the points
        nearest to both: whether a point lies on an edge is for `fraction_on` to say.
    """
    found = np.full((2, len(rows_a), 2), np.nan)
    bent_a, bent_b = a.bulge[rows_a] != 0.0, b.bulge[rows_b] != 0.0
    flat = ~bent_a & ~bent_b
    found[0, flat] = _lines(a, b, rows_a[flat], rows_b[flat])
    mixed = bent_a & ~bent_b
    found[:, mixed] = _line_and_circle(b, a, rows_b[mixed], rows_a[mixed])
    mixed = ~bent_a & bent_b
    found[:, mixed] = _line_and_circle(a, b, rows_a[mixed], rows_b[mixed])
    bent = bent_a & bent_b
    found[:, bent] = _circles(a, b, rows_a[bent], rows_b[bent])
    return found


def _lines(a: Edges, b: Edges, rows_a: Ints, rows_b: Ints) -> Floats:
    p, d = a.start[rows_a], a.end[rows_a] - a.start[rows_a]
    q, e = b.start[rows_b], b.end[rows_b] - b.start[rows_b]
    sine = _cross(d, e)
    flat = np.abs(sine) <= 1e-12 * a.length[rows_a] * b.length[rows_b]
    t = _cross(q - p, e) / np.where(flat, np.nan, sine)
    return p + t[:, None] * d


def _line_and_circle(line: Edges, arc: Edges, rows_line: Ints, rows_arc: Ints) -> Floats:
    p = line.start[rows_line]
    along = (line.end[rows_line] - p) / line.length[rows_line][:, None]
    centre = arcs.arc_centre(arc.start[rows_arc], arc.end[rows_arc], arc.bulge[rows_arc])
    foot = p + np.sum((centre - p) * along, axis=1)[:, None] * along
    radius, gap = arc.radius[rows_arc], np.hypot(*(centre - foot).T)
    reach = np.sqrt(np.maximum((radius - gap) * (radius + gap), 0.0))[:, None] * along
    return np.stack([foot - reach, foot + reach])


def _circles(a: Edges, b: Edges, rows_a: Ints, rows_b: Ints) -> Floats:
    c1 = arcs.arc_centre(a.start[rows_a], a.end[rows_a], a.bulge[rows_a])
    c2 = arcs.arc_centre(b.start[rows_b], b.end[rows_b], b.bulge[rows_b])
    r1, r2 = a.radius[rows_a], b.radius[rows_b]
    apart = np.hypot(*(c2 - c1).T)
    same = apart <= 1e-12 * (r1 + r2)  # concentric: they coincide or never meet
    apart = np.where(same, np.nan, apart)
    along = (c2 - c1) / apart[:, None]
    # to the radical line, from the first centre; (r1 - r2) (r1 + r2) keeps the digits
    x = 0.5 * (apart + (r1 - r2) * (r1 + r2) / apart)
    y = np.sqrt(np.maximum((r1 - x) * (r1 + x), 0.0))
    foot, across = c1 + x[:, None] * along, np.stack([-along[:, 1], along[:, 0]], axis=1)
    return np.stack([foot - y[:, None] * across, foot + y[:, None] * across])


def fraction_on(edges: Edges, rows: Ints, points: Floats, tolerance: float) -> Floats:
    """Return at which fraction (0 to 1, by length) of its edge each point lies; NaN where it is off.

    Parameters
    ----------
    edges : Edges
    rows : ndarray of shape (n,)
        One edge a point.
    points : ndarray of shape (n, 2)
    tolerance : float
        Largest distance from the edge (length); beyond an end by less than it counts as the end.
    """
    p, q, b = edges.start[rows], edges.end[rows], edges.bulge[rows]
    bent = b != 0.0
    chord = q - p
    straight = np.sum((points - p) * chord, axis=1) / np.sum(chord * chord, axis=1)
    with np.errstate(invalid="ignore"):
        centre = arcs.arc_centre(p, q, b)
        turn, out, first = arcs.sweep(b), points - centre, p - centre
        half = 0.5 * turn
        # measured from the arc's middle, so that both ends are equally far from the cut
        middle = np.arctan2(_cross(first, out), np.sum(first * out, axis=1)) - half
        middle = (middle + np.pi) % (2.0 * np.pi) - np.pi
        round_ = 0.5 + middle / np.where(bent, turn, 1.0)
    t = np.clip(np.where(bent, round_, straight), 0.0, 1.0)
    gap = np.hypot(*(arcs.point_at(p, q, b, t) - points).T)
    return np.where(gap <= tolerance, t, np.nan)


def inside(edges: Edges, points: Floats) -> Floats:
    """Return how often each point is wound round by the edges: 1 in the material, 0 elsewhere, shape (n,)."""
    a, b = edges.start[None] - points[:, None], edges.end[None] - points[:, None]
    left = _cross(a, b) + 0.0  # of the chord; a point on it (no negative zero) counts as left of it
    angle = np.arctan2(left, np.sum(a * b, axis=2))
    bent = np.flatnonzero(edges.bulge)
    if len(bent):
        p, q, bulge = edges.start[bent], edges.end[bent], edges.bulge[bent]
        centre, radius = arcs.arc_centre(p, q, bulge), edges.radius[bent]
        side = np.sign(bulge)
        within = np.hypot(*np.moveaxis(points[:, None] - centre, 2, 0)) < radius
        belly = (left[:, bent] >= 0.0) == (side < 0.0)  # beyond the chord, on the arc's side
        angle[:, bent] += 2.0 * np.pi * side * (within & belly)
    return np.asarray(angle.sum(axis=1) / (2.0 * np.pi), dtype=float)
