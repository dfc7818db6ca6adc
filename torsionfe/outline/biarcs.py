"""Curves as tangent arcs: pairs of arcs through points with given directions, as many as a tolerance needs.

Two arcs that meet smoothly join any two points with any two directions there, and of the one-parameter family
the pair with equal tangent lengths is used (Bolton, "Biarc curves", Computer-Aided Design 7, 1975; the closed
form is common knowledge). Directions are continuous everywhere, so the fit makes no corners, and its distance
from a smooth curve falls with the third power of the spacing.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats, Ints, finite_array, positive
from torsionfe.errors import OutlineError
from torsionfe.outline import arcs

__all__ = ["Curve", "biarcs", "fit_curve"]

#: A curve's points or its directions at parameters of shape (n,), as an array of shape (n, 2).
Curve = Callable[[Floats], Floats]

_PROBES = np.arange(1, 12) / 12.0
_MOST_ARCS = 20_000
_DEEPEST = 2.0**-24
_WIDEST = np.pi / 3.0


def biarcs(points: ArrayLike, tangents: ArrayLike) -> tuple[Floats, Floats]:
    """Return the smooth chain of arcs, two a step, through points with given directions.

    Parameters
    ----------
    points : array_like of shape (m, 2)
        Where the chain passes (length), all steps longer than zero.
    tangents : array_like of shape (m, 2)
        The chain's direction at each point, of any length above zero.

    Returns
    -------
    vertices : ndarray of shape (2 m - 1, 2)
        ``points`` and the joints between them; of a closed chain the last vertex repeats the first.
    bulges : ndarray of shape (2 m - 2,)
        ``tan(sweep / 4)`` of each arc.

    Raises
    ------
    OutlineError
        Two consecutive points coincide, or a direction is zero; the error's ``at`` names the place.

    Examples
    --------
    >>> vertices, bulges = biarcs([(1, 0), (0, 1)], [(0, 1), (-1, 0)])
    >>> bulges.round(6).tolist()
    [0.198912, 0.198912]
    """
    p, t = finite_array("points", points, columns=2), finite_array("tangents", tangents, columns=2)
    if len(p) != len(t) or len(p) < 2:
        raise OutlineError(f"2 points or more, each with a tangent, are needed: got {len(p)} and {len(t)}")
    step, length = np.hypot(*np.diff(p, axis=0).T), np.hypot(*t.T)
    bad = np.flatnonzero(np.append(step == 0.0, False) | (length == 0.0))
    if len(bad):
        x, y = p[bad[0]]
        what = "has no direction" if length[bad[0]] == 0.0 else "is followed by the same point"
        raise OutlineError(f"point {bad[0]} ({x:g}, {y:g}) {what}", (float(x), float(y)))
    t /= length[:, None]
    joint = _joints(p[:-1], p[1:], t[:-1], t[1:])
    vertices = np.empty((2 * len(p) - 1, 2))
    vertices[0::2], vertices[1::2] = p, joint
    bulges = np.empty(2 * len(p) - 2)
    bulges[0::2] = np.tan(0.5 * _turn(t[:-1], joint - p[:-1]))
    bulges[1::2] = np.tan(0.5 * _turn(p[1:] - joint, t[1:]))
    return vertices, bulges


def _joints(p: Floats, q: Floats, t: Floats, u: Floats) -> Floats:
    """Return where the two arcs from ``p`` (direction ``t``) to ``q`` (direction ``u``) meet."""
    v, s = q - p, t + u
    vv, vs = np.sum(v * v, axis=1), np.sum(v * s, axis=1)
    # tangents of equal length d from both ends: 2 (1 - t.u) d^2 + 2 v.s d - v.v = 0
    a = np.sum((t - u) ** 2, axis=1)
    d = vv / (vs + np.sqrt(vs * vs + a * vv))
    return np.asarray(0.5 * (p + q) + 0.5 * d[:, None] * (t - u), dtype=float)


def _turn(a: Floats, b: Floats) -> Floats:
    cross = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    return np.asarray(np.arctan2(cross, np.sum(a * b, axis=1)), dtype=float)


def fit_curve(
    point: Curve, tangent: Curve, t0: float, t1: float, tolerance: float, *, breaks: Sequence[float] = ()
) -> tuple[Floats, Floats]:
    """Return a smooth chain of arcs within a tolerance of a smooth curve.

    Parameters
    ----------
    point, tangent : callable
        The curve's points and its directions (of any length above zero) at parameters of shape (n,), each as
        an array of shape (n, 2). The direction must be continuous: split a curve at its kinks.
    t0, t1 : float
        First and last parameter, ``t0 < t1``.
    tolerance : float
        Largest distance between curve and arcs (length), measured at 11 points a step.
    breaks : sequence of float, optional
        Parameters where a step must end (a spline's knots, an ellipse's ends).

    Returns
    -------
    vertices : ndarray of shape (k + 1, 2)
        From the curve's first point to its last, which of a closed curve repeats the first.
    bulges : ndarray of shape (k,)
        Neighbours on one circle, or on one line, are one edge.

    Raises
    ------
    OutlineError
        The curve has a kink, stands still, or needs more than 20,000 arcs.

    Examples
    --------
    >>> half = fit_curve(
    ...     lambda t: np.stack([np.cos(t), np.sin(t)], axis=1),
    ...     lambda t: np.stack([-np.sin(t), np.cos(t)], axis=1), 0.0, np.pi, 1e-6)
    >>> len(half[1])
    1
    """
    off = positive("tolerance", tolerance)
    if not t0 < t1:
        raise OutlineError(f"the parameters must grow along the curve: t0 = {t0:g}, t1 = {t1:g}")
    inner = [value for value in breaks if t0 < value < t1]
    t = np.unique(np.concatenate([np.linspace(t0, t1, 5), np.asarray(inner, dtype=float)]))
    while True:
        points = np.asarray(point(t), dtype=float)
        vertices, bulges = biarcs(points, tangent(t))
        rough = _rough(point, t, vertices, bulges, off)
        if not len(rough):
            return _merged(vertices, bulges)
        fine = rough[np.diff(t)[rough] < (t1 - t0) * _DEEPEST]
        if len(fine) or 2 * (len(t) + len(rough)) > _MOST_ARCS:
            x, y = points[fine[0] if len(fine) else rough[0]]
            why = "has a kink" if len(fine) else f"needs more than {_MOST_ARCS} arcs"
            raise OutlineError(
                f"the curve {why} near ({x:g}, {y:g}): split it there or allow a tolerance above {off:g}",
                (float(x), float(y)),
            )
        t = np.sort(np.concatenate([t, 0.5 * (t[rough] + t[rough + 1])]))


def _rough(point: Curve, t: Floats, vertices: Floats, bulges: Floats, tolerance: float) -> Ints:
    """Return the steps whose arcs are off the curve by more than the tolerance, or turn too far."""
    steps = len(t) - 1
    probe = (t[:-1, None] + np.diff(t)[:, None] * _PROBES).ravel()
    x = np.asarray(point(probe), dtype=float)
    rows = np.repeat(np.arange(steps), len(_PROBES))
    joint = vertices[1::2]
    chord = np.hypot(*np.diff(vertices, axis=0).T).reshape(steps, 2).min(axis=1)
    with np.errstate(invalid="ignore"):  # an arc of no length, where the curve turns back
        across = arcs.tangent_at(vertices[1:-1:2], vertices[2::2], bulges[1::2], np.zeros(steps))
        beyond = np.sum((x - joint[rows]) * across[rows], axis=1) > 0.0
        arc = 2 * rows + beyond
        gap = _distance(x, vertices[:-1][arc], vertices[1:][arc], bulges[arc])
    worst = gap.reshape(steps, -1).max(axis=1)
    turn = np.abs(arcs.sweep(bulges)).reshape(steps, 2).max(axis=1)
    return np.flatnonzero(~(worst <= tolerance) | (turn > _WIDEST) | (chord == 0.0))


def _distance(x: Floats, p: Floats, q: Floats, bulge: Floats) -> Floats:
    """Return the distance of points from the full circle or line of an edge, row by row."""
    # through the circle's power of x over its diameter, which stays exact as the arc goes flat
    c, a = q - p, x - p
    chord = np.hypot(*c.T)
    rise = (c[:, 0] * a[:, 1] - c[:, 1] * a[:, 0]) / chord
    k = 4.0 * bulge / (chord * (1.0 + bulge**2))  # signed curvature, to the left
    power = 0.5 * k * np.sum(a * (a - c), axis=1) - rise * (1.0 - bulge**2) / (1.0 + bulge**2)
    root = np.sqrt(np.maximum(1.0 + 2.0 * k * power, 0.0))
    return np.asarray(2.0 * np.abs(power) / (1.0 + root), dtype=float)


def _merged(vertices: Floats, bulges: Floats) -> tuple[Floats, Floats]:
    """Return the chain with neighbours on one circle, or one line, made one edge of half a turn at most."""
    p, q = vertices[:-1], vertices[1:]
    curve = np.sign(bulges) / arcs.arc_radius(p, q, bulges)
    size = float(np.ptp(vertices, axis=0).max())
    differ = np.abs(np.diff(curve)) > 1e-9 * np.maximum(np.abs(curve[1:]), 1.0 / size)
    run = np.concatenate([[0], np.cumsum(differ)])
    turned = np.cumsum(np.abs(arcs.sweep(bulges)))
    first = np.flatnonzero(np.concatenate([[True], differ]))
    before = (turned - np.abs(arcs.sweep(bulges)))[first][run]
    half = np.floor((turned - before) / np.pi - 1e-9)  # 0 up to half a turn within the run
    new = np.concatenate([[True], differ | (np.diff(half) > 0)])
    at = np.flatnonzero(new)
    sweep = np.add.reduceat(arcs.sweep(bulges), at)
    return np.concatenate([vertices[at], vertices[-1:]]), np.tan(sweep / 4.0)
