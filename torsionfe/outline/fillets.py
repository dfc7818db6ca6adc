"""Corners rounded by tangent arcs: between straight edges, arcs, and one of each.

A fillet of radius ``r`` touches both edges of its corner, so its centre lies ``r`` away from each. With
the vertex as the origin, ``n`` the left normal and ``k`` the signed curvature of an edge there, the points
``x`` at the signed distance ``d`` to the left of the edge fulfil ``x . n = d + k (|x|^2 - d^2) / 2``, whether
it is straight or an arc. Two edges give two such equations; both are linear in ``x`` and ``w = (|x|^2 - d^2)
/ 2``, which leaves one quadratic in ``w``, and of its roots the one that shrinks to the vertex with the
radius.
"""

from __future__ import annotations

import operator
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats, Ints, positive
from torsionfe.errors import OutlineError
from torsionfe.outline.edges import Edges
from torsionfe.outline.validate import CLEARANCE

if TYPE_CHECKING:
    from torsionfe.outline.outline import Outline

__all__ = ["SMOOTH", "fillet", "round_corners", "sharp_corners", "unfilleted"]

#: Two edges that meet within this angle (radians) of straight on are smooth: no corner.
SMOOTH = np.radians(0.1)
_SLACK = 1e-9
_HUGE = 1e9  # of the perimeter: a fillet of such a radius is longer than its edges at any corner that is one


def sharp_corners(edges: Edges) -> Ints:
    """Return the rows of ``edges`` that start at a sharp re-entrant corner (over 180.1 degrees)."""
    return np.flatnonzero(edges.interior_angle > np.pi + SMOOTH)


def fillet(outline: Outline, radius: float, at: Iterable[int] | None = None) -> Outline:
    """Return a copy of an outline with corners rounded by tangent arcs.

    Parameters
    ----------
    outline : Outline
    radius : float
        Radius of every fillet, length.
    at : iterable of int, optional
        Vertices of the outer loop, re-entrant or convex; an empty one changes nothing. By default every
        sharp re-entrant corner of every loop, voids included.

    Raises
    ------
    OutlineError
        A fillet does not fit (the message names the vertex and the largest radius that would); a vertex does
        not exist or is no corner; or, by default, there is no sharp re-entrant corner to round, since a copy
        without the fillet that was asked for would be a silent wrong answer.

    Examples
    --------
    >>> from torsionfe.outline.outline import Outline
    >>> bracket = Outline([(0, 0), (80, 0), (80, 8), (8, 8), (8, 80), (0, 80)])
    >>> round(fillet(bracket, 8.0).area - bracket.area, 3)  # (1 - pi / 4) r^2
    13.735
    """
    size = positive("radius", radius)
    edges = outline.edges
    if at is None:
        rows = [int(row) for row in sharp_corners(edges)]
        if not rows:
            raise OutlineError(
                "the outline has no sharp re-entrant corner to round: name convex corners of the outer loop "
                "by their vertex numbers, filleted(radius, at=[...])"
            )
    else:
        rows = _vertices(outline, at)
    return _rounded(outline, edges, dict.fromkeys(rows, (size, "fillet radius")))


def round_corners(outline: Outline, radii: Mapping[tuple[int, int], tuple[float, str]]) -> Outline:
    """Return a copy with each of some corners rounded by a radius of its own.

    Parameters
    ----------
    outline : Outline
    radii : mapping
        ``(loop, vertex)`` to ``(radius, what the radius is called)``; loop 0 is the outer one, ``k`` the void
        ``k - 1``. A radius of 0 leaves the corner sharp.

    Raises
    ------
    OutlineError
        A radius does not fit, or a corner is none.
    """
    edges = outline.edges
    row_of = {
        (int(loop), int(vertex)): row
        for row, (loop, vertex) in enumerate(zip(edges.loop, edges.vertex, strict=True))
    }
    return _rounded(outline, edges, {row_of[key]: given for key, given in radii.items() if given[0] > 0.0})


def _vertices(outline: Outline, at: Iterable[int]) -> list[int]:
    count = len(outline.vertices)
    try:
        given = [(item, None if isinstance(item, (bool, np.bool_)) else operator.index(item)) for item in at]
    except TypeError:
        raise OutlineError(f"at must be a list of vertex numbers of the outer loop, got {at!r}") from None
    rows = []
    for item, k in given:
        if k is None or not 0 <= k < count:
            raise OutlineError(f"there is no vertex {item!r}: the outer loop has 0 to {count - 1}")
        rows.append(k)
    return sorted(set(rows))


def _refuse_smooth(edges: Edges, rows: Ints) -> None:
    """Raise where the edges run straight on: no circle is tangent to both in one place only."""
    smooth = np.abs(edges.interior_angle[rows] - np.pi) <= SMOOTH
    if not smooth.any():
        return
    row = int(rows[np.argmax(smooth)])
    vertex, place = _vertex(edges, row)
    raise OutlineError(
        f"{vertex} is no corner to round: its edges meet at {np.degrees(edges.interior_angle[row]):.2f} degrees", place
    )


def _vertex(edges: Edges, row: int) -> tuple[str, tuple[float, float]]:
    """Return the vertex at the start of an edge in words, and where it is."""
    x, y = (float(value) for value in edges.start[row])
    void = f" of void {edges.loop[row] - 1}" if edges.loop[row] else ""
    return f"vertex {edges.vertex[row]}{void} ({x:g}, {y:g})", (x, y)


@dataclass(frozen=True)
class _Cut:
    """Fillets at some corners: what each takes off its edges, and where it touches them."""

    before: Floats  # length taken off the end of the arriving edge
    after: Floats  # length taken off the start of the leaving edge
    first: Floats  # (c, 2) where the fillet leaves the arriving edge
    last: Floats  # (c, 2) where it joins the leaving one
    bulge: Floats


def _normal(tangent: Floats) -> Floats:
    return np.stack([-tangent[:, 1], tangent[:, 0]], axis=1)


def _angle(a: Floats, b: Floats) -> Floats:
    cross = a[:, 0] * b[:, 1] - a[:, 1] * b[:, 0]
    return np.asarray(np.arctan2(cross, np.sum(a * b, axis=1)), dtype=float)


def _along(foot: Floats, tangent: Floats, turned: Floats, curvature: Floats, way: float) -> Floats:
    """Return how far along the edge, in the direction ``way``, the foot lies from the vertex."""
    straight = way * np.sum(foot * tangent, axis=1)
    with np.errstate(divide="ignore", invalid="ignore"):
        round_ = (way * np.sign(curvature) * turned) % (2.0 * np.pi) / np.abs(curvature)
    return np.asarray(np.where(curvature == 0.0, straight, round_), dtype=float)


def _cut(edges: Edges, rows: Ints, radius: Floats) -> _Cut:
    """Return the fillets of ``radius`` at the starts of ``rows``; NaN where no circle touches both edges."""
    before = edges.previous[rows]
    zero, one = np.zeros(len(rows)), np.ones(len(rows))
    tangent_a, tangent_b = edges.tangents(before, one), edges.tangents(rows, zero)
    normal_a, normal_b = _normal(tangent_a), _normal(tangent_b)
    curve = np.sign(edges.bulge) / edges.radius
    k_a, k_b = curve[before], curve[rows]
    side = np.where(edges.interior_angle[rows] > np.pi, -1.0, 1.0)  # the centre: left of the edges or right
    d = side * radius
    inverse = np.linalg.inv(np.stack([normal_a, normal_b], axis=1))
    x0 = np.einsum("cij,cj->ci", inverse, np.stack([d, d], axis=1))
    x1 = np.einsum("cij,cj->ci", inverse, np.stack([k_a, k_b], axis=1))
    # x = x0 + w x1 and |x|^2 = d^2 + 2 w: the root that tends to the vertex with the radius
    b = 1.0 - np.sum(x0 * x1, axis=1)
    c = np.sum(x0 * x0, axis=1) - d * d
    with np.errstate(invalid="ignore"):
        w = c / (b + np.sqrt(b * b - np.sum(x1 * x1, axis=1) * c))
        w = np.where((b > 0.0) & (k_a * d < 1.0) & (k_b * d < 1.0), w, np.nan)
        centre = x0 + w[:, None] * x1
        n_a = (normal_a - k_a[:, None] * centre) / (1.0 - k_a * d)[:, None]
        n_b = (normal_b - k_b[:, None] * centre) / (1.0 - k_b * d)[:, None]
        foot_a, foot_b = centre - d[:, None] * n_a, centre - d[:, None] * n_b
        turn = (side * _angle(n_a, n_b)) % (2.0 * np.pi)
        return _Cut(
            _along(foot_a, tangent_a, _angle(normal_a, n_a), k_a, -1.0),
            _along(foot_b, tangent_b, _angle(normal_b, n_b), k_b, 1.0),
            edges.start[rows] + foot_a,
            edges.start[rows] + foot_b,
            side * np.tan(turn / 4.0),
        )


def _left(edges: Edges, rows: Ints, cut: _Cut) -> Floats:
    """Return what the fillets leave of each edge (length, negative: too much), shape (e,)."""
    left = edges.length.copy()
    np.subtract.at(left, rows, cut.after)
    np.subtract.at(left, edges.previous[rows], cut.before)
    return left


def _misfits(edges: Edges, rows: Ints, radius: Floats) -> Ints:
    """Return which of the corners ``rows`` do not fit (positions in ``rows``)."""
    left = _left(edges, rows, _cut(edges, rows, radius))
    bad = ~(left >= -_SLACK * edges.length)
    return np.flatnonzero(bad[rows] | bad[edges.previous[rows]])


def _refuse_misfits(edges: Edges, rows: Ints, radius: Floats, names: list[str]) -> None:
    """Raise where fillets do not fit, naming the largest of that name that would."""
    asked = radius
    radius = np.minimum(asked, _HUGE * edges.length.sum())  # fits nowhere either, and its square is finite
    misfits = _misfits(edges, rows, radius)
    if not len(misfits):
        return
    worst = int(misfits[np.argmax(radius[misfits])])
    alike = np.array([name == names[worst] for name in names])
    if len(_misfits(edges, rows, np.where(alike, 1e-6, 1.0) * radius)):
        alike[:] = True  # the other radii alone are too much: all of them together
    fits, fails = 0.0, 1.0  # by halving: the share of those radii that still fits
    for _ in range(90):
        middle = 0.5 * (fits + fails)
        good = not len(_misfits(edges, rows, np.where(alike, middle, 1.0) * radius))
        fits, fails = (middle, fails) if good else (fits, middle)
    close = _misfits(edges, rows, np.where(alike, fails, 1.0) * radius)
    worst = next((int(k) for k in close if names[k] == names[worst]), worst)
    row, most = int(rows[worst]), _rounded_down(fits * radius[worst])
    vertex, place = _vertex(edges, row)
    raise OutlineError(
        f"{names[worst]} {asked[worst]:g} does not fit at {vertex}: the edges allow {most:.6g} at most", place
    )


def _rounded_down(value: float) -> float:
    """Return a length with five digits that does not exceed it, so that the number in a message fits."""
    step = 10.0 ** (np.floor(np.log10(value)) - 4) if value > 0.0 else 1.0
    return float(np.floor(value / step * (1.0 + _SLACK)) * step)


def _rounded(outline: Outline, edges: Edges, given: Mapping[int, tuple[float, str]]) -> Outline:
    if not given:
        return outline
    rows = np.array(sorted(given), dtype=np.int64)
    radius = np.array([given[int(row)][0] for row in rows])
    _refuse_smooth(edges, rows)
    _refuse_misfits(edges, rows, radius, [given[int(row)][1] for row in rows])
    return _assemble(outline, edges, rows, _cut(edges, rows, radius))


def _assemble(outline: Outline, edges: Edges, rows: Ints, cut: _Cut) -> Outline:
    """Return the outline with the edges shortened and the fillets between them."""
    from torsionfe.outline.outline import Outline as PlainOutline

    start = edges.start.copy()
    start[rows] = cut.last
    share = np.clip(_left(edges, rows, cut) / edges.length, 0.0, 1.0)
    bulge = np.tan(share * np.arctan(edges.bulge))
    gone = share * edges.length <= CLEARANCE * outline.size  # eaten by its two fillets
    # two rows a corner: the fillet, then what is left of the edge
    points, bulges = np.repeat(start, 2, axis=0), np.repeat(bulge, 2)
    keep = np.ones(2 * len(edges), dtype=bool)
    keep[0::2] = False
    keep[2 * rows] = True
    points[2 * rows], bulges[2 * rows] = cut.first, cut.bulge
    keep[1::2] = ~gone
    loop = np.repeat(edges.loop, 2)
    parts = [(points[keep & (loop == k)], bulges[keep & (loop == k)]) for k in range(len(outline.voids) + 1)]
    return PlainOutline(*parts[0], voids=[PlainOutline(*part) for part in parts[1:]])


def unfilleted(outline: Outline) -> Outline:
    """Return a copy whose fillets are sharp again: re-entrant arcs tangent to a straight edge on both sides.

    Raises
    ------
    OutlineError
        The sharp corners would lie outside the outline's other edges.
    """
    from torsionfe.outline.outline import Outline as PlainOutline

    edges = outline.edges
    straight = edges.bulge == 0.0
    tangent = np.abs(edges.interior_angle - np.pi) <= SMOOTH
    turn = -4.0 * np.arctan(edges.bulge)  # of a fillet: above 0
    round_ = (turn > 0.0) & (turn < 0.95 * np.pi) & straight[edges.previous] & straight[edges.following]
    rows = np.flatnonzero(round_ & tangent & tangent[edges.following])
    start, bulge, keep = edges.start.copy(), edges.bulge.copy(), np.ones(len(edges), dtype=bool)
    reach = edges.radius[rows] * np.tan(0.5 * turn[rows])
    start[edges.following[rows]] = edges.start[rows] + reach[:, None] * edges.tangents(rows, np.zeros(len(rows)))
    keep[rows] = False
    loops = [PlainOutline(start[keep & (edges.loop == k)], bulge[keep & (edges.loop == k)])
             for k in range(len(outline.voids) + 1)]  # fmt: skip
    return PlainOutline(loops[0].vertices, loops[0].bulges, voids=loops[1:])
