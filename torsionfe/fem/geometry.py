"""From the reference triangle to the section: straight triangles, and triangles with true arcs.

A side on an arc is carried exactly. With the corner weights ``l``, the map is
``x = sum(l_i v_i) + 4 l_a l_b D(l_b - l_a)`` for each curved side from corner ``a`` to ``b``, where

    D(s) = n (c / 2) sin(h) / (cos(h) + sqrt(1 - s^2 sin(h)^2))

is the distance from chord to arc divided by ``1 - s^2`` (``c`` chord, ``h`` half the sweep, ``n`` the normal
on the arc's side). ``D`` is smooth, so the elements keep their order, and the meshed outline *is* the outline:
this is the blending of Gordon and Hall (1973), Numer. Math. 21, 109-129, in its triangle form
(Szabo and Babuska, *Finite Element Analysis*, 1991, sec. 6.1).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.errors import MeshError
from torsionfe.fem.elements import Rule, rule
from torsionfe.mesh.trimesh import TriMesh

__all__ = ["Patch", "inverted", "patches", "reference_map", "side_curve"]

_SLOPES = np.array([[-1.0, -1.0], [1.0, 0.0], [0.0, 1.0]])  # gradients of the corner weights


@dataclass(frozen=True)
class Patch:
    """Triangles of one kind with their geometry at quadrature points.

    Attributes
    ----------
    triangles : ndarray of shape (k,)
        Which triangles of the mesh.
    rule : Rule
        Quadrature with ``q`` points.
    points : ndarray of shape (k, q, 2)
        Where the quadrature points lie (length).
    inverse : ndarray of shape (k, 1 or q, 2, 2)
        ``inverse[..., r, x]``: derivative of reference coordinate ``r`` by ``x``; one for straight triangles.
    weights : ndarray of shape (k, q)
        Quadrature weights times the Jacobian (length**2).
    """

    triangles: Ints
    rule: Rule
    points: Floats
    inverse: Floats
    weights: Floats


def _corner_weights(points: Floats) -> Floats:
    return np.stack([1.0 - points.sum(axis=-1), points[..., 0], points[..., 1]], axis=-1)


def side_curve(mesh: TriMesh, rows: Ints, t: Floats) -> tuple[Floats, Floats]:
    """Return points and derivatives by ``t`` along boundary sides, ``t`` in 0..1 the chord fraction.

    Parameters
    ----------
    mesh : TriMesh
    rows : ndarray of shape (k,)
        Which sides.
    t : ndarray of shape (q,)

    Returns
    -------
    points, derivatives : ndarray of shape (k, q, 2)
    """
    p, q = mesh.nodes[mesh.sides[rows, 0]], mesh.nodes[mesh.sides[rows, 1]]
    s = np.broadcast_to(2.0 * t - 1.0, (len(rows), len(t)))
    rise, slope = _rise(q - p, mesh.side_bulge[rows], s)
    bump = (1.0 - s**2)[..., None]
    points = p[:, None] + (q - p)[:, None] * t[:, None] + bump * rise
    return points, (q - p)[:, None] + 2.0 * (bump * slope - 2.0 * s[..., None] * rise)


def _rise(chord: Floats, bulge: Floats, s: Floats) -> tuple[Floats, Floats]:
    """Return ``D(s)`` and ``dD/ds``, shape (k, q, 2), for chords (k, 2) and ``s`` (k, q)."""
    sine = 2.0 * bulge / (1.0 + bulge**2)
    cosine = (1.0 - bulge**2) / (1.0 + bulge**2)
    normal = 0.5 * np.stack([chord[:, 1], -chord[:, 0]], axis=1) * sine[:, None]
    root = np.sqrt(1.0 - (s * sine[:, None]) ** 2)
    below = cosine[:, None] + root
    slope = s * (sine**2)[:, None] / (root * below**2)
    return normal[:, None] / below[..., None], normal[:, None] * slope[..., None]


def patches(mesh: TriMesh, order: int) -> list[Patch]:
    """Return the mesh's triangles in patches: the straight ones, and those with a side on an arc.

    Quadrature is exact for the straight ones and good to rounding for the curved ones (sides that sweep 30
    degrees at most).
    """
    curved_sides = np.flatnonzero(mesh.side_bulge)
    curved = np.zeros(len(mesh.triangles), dtype=bool)
    curved[mesh.side_triangle[0][curved_sides]] = True
    result = []
    if not curved.all():
        result.append(_straight(mesh, np.flatnonzero(~curved), rule(2 * order)))
    if curved.any():
        result.append(_curved(mesh, np.flatnonzero(curved), curved_sides, order))
    return result


def reference_map(mesh: TriMesh, which: Ints, reference: Floats) -> tuple[Floats, Floats]:
    """Return points and Jacobians of triangles at reference points, arcs carried exactly.

    Parameters
    ----------
    mesh : TriMesh
    which : ndarray of shape (k,)
        Triangles, in rising order.
    reference : ndarray of shape (q, 2) or (k, q, 2)
        Reference points, the same or separate ones for each triangle.

    Returns
    -------
    points : ndarray of shape (k, q, 2)
    jacobian : ndarray of shape (k, q, 2, 2)
        ``jacobian[..., x, r]``: derivative of coordinate ``x`` by reference coordinate ``r``.
    """
    at = _corner_weights(np.broadcast_to(reference, (len(which), *reference.shape[-2:])))
    corners = mesh.nodes[mesh.triangles[which]]
    points = at @ corners
    jacobian = np.repeat(np.einsum("cr,kcx->kxr", _SLOPES, corners)[:, None], at.shape[1], axis=1)
    place = np.full(len(mesh.triangles), -1)
    place[which] = np.arange(len(which))
    triangle, opposite = mesh.side_triangle
    arc_sides = np.flatnonzero((mesh.side_bulge != 0.0) & (place[triangle] >= 0))
    for k in range(3):
        side = arc_sides[opposite[arc_sides] == k]
        if len(side):
            row = place[triangle[side]]
            shift, bend = _bent(mesh, side, at[row], k)
            points[row] += shift
            jacobian[row] += bend
    return points, jacobian


def _bent(mesh: TriMesh, side: Ints, at: Floats, opposite: int) -> tuple[Floats, Floats]:
    """Return what the arcs of some sides add to points (k, q, 2) and Jacobians (k, q, 2, 2)."""
    a, b = (opposite + 1) % 3, (opposite + 2) % 3
    chord = mesh.nodes[mesh.sides[side, 1]] - mesh.nodes[mesh.sides[side, 0]]
    rise, slope = _rise(chord, mesh.side_bulge[side], at[..., b] - at[..., a])
    bump = 4.0 * at[..., a] * at[..., b]
    d_bump = 4.0 * (at[..., a, None] * _SLOPES[b] + at[..., b, None] * _SLOPES[a])
    bend = rise[..., None] * d_bump[..., None, :] + (bump[..., None] * slope)[..., None] * (_SLOPES[b] - _SLOPES[a])
    return bump[..., None] * rise, bend


def inverted(jacobian: Floats) -> tuple[Floats, Floats]:
    """Return the inverse ``(..., r, x)`` and the determinant ``(...)`` of Jacobians ``(..., x, r)``."""
    a, b, c, d = (jacobian[..., x, r] for x in range(2) for r in range(2))
    det = a * d - b * c
    return np.stack([d, -b, -c, a], axis=-1).reshape(jacobian.shape) / det[..., None, None], det


def _straight(mesh: TriMesh, which: Ints, quadrature: Rule) -> Patch:
    corners = mesh.nodes[mesh.triangles[which]]
    inverse, det = inverted(np.stack([corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]], axis=2))
    points = _corner_weights(quadrature.points) @ corners
    return Patch(which, quadrature, points, inverse[:, None], det[:, None] * quadrature.weights)


def _curved(mesh: TriMesh, which: Ints, sides: Ints, order: int) -> Patch:
    sweep = 4.0 * np.arctan(np.abs(mesh.side_bulge[sides]).max())
    quadrature = rule(2 * order + (8 if sweep > 0.3 else 6 if sweep > 0.1 else 4))
    points, jacobian = reference_map(mesh, which, quadrature.points)
    inverse, det = inverted(jacobian)
    if det.min() <= 0.0:
        x, y = mesh.nodes[mesh.triangles[which[np.argmin(det.min(axis=1))]]].mean(axis=0)
        raise MeshError(f"the arc at ({x:g}, {y:g}) bends its triangle inside out: split that arc", (x, y))
    return Patch(which, quadrature, points, inverse, det * quadrature.weights)
