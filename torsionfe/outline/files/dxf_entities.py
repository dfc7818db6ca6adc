"""The entities of a DXF drawing that make boundaries, each as edges: straight, arc, or curve as tangent arcs."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import OutlineError, ReadError
from torsionfe.outline.biarcs import Curve, fit_curve
from torsionfe.outline.files.loops import SegmentList

if TYPE_CHECKING:
    from scipy.interpolate import BSpline

__all__ = ["ENTITIES", "FLAT_ONLY", "Pen"]

#: Entities in space, or sealed ones, which a flat boundary must not hold.
FLAT_ONLY = frozenset({
    "3DFACE", "3DSOLID", "BODY", "EXTRUDEDSURFACE", "LOFTEDSURFACE", "MESH", "PLANESURFACE", "REGION",
    "REVOLVEDSURFACE", "SURFACE", "SWEPTSURFACE", "HELIX",
})  # fmt: skip

_UPRIGHT = 1e-9
_CURVE = 1e-5
_ROUND = 1e-12
_ONE_ARC = 1.75 * math.pi
_SPLINE_FRAME = 16
_MOST_DEGREE = 25
_MOST_POINTS = 10_000


@dataclass
class Pen:
    """What the entities are drawn with: edges as they come, and the heights they were drawn at."""

    lines: SegmentList
    curve_tolerance: float | None
    heights: list[tuple[float, float, float]] = field(default_factory=list)

    def path(self, points: Floats, bulges: Floats, heights: Floats | float, closed: bool = False) -> None:
        """Add a path through points ``(n, 2)`` at the heights."""
        self.lines.path(points, bulges, closed)
        z = np.broadcast_to(heights, len(points))
        if not np.isfinite(z).all():
            raise ReadError(f"a height at ({points[0, 0]:g}, {points[0, 1]:g}) is not a finite number", _at(points[0]))
        for k in {int(np.argmin(z)), int(np.argmax(z))}:
            self.heights.append((float(points[k, 0]), float(points[k, 1]), float(z[k])))

    def allowed(self, extent: float) -> float:
        """Return how far arcs may lie from a curve of this extent (length)."""
        return self.curve_tolerance or _CURVE * extent


def _at(point: Floats) -> tuple[float, float]:
    return float(point[0]), float(point[1])


def _side(entity: Any) -> float:
    """Return 1 where the entity's plane is seen from above, -1 from below, where x is mirrored."""
    x, y, z = entity.dxf.get("extrusion", (0.0, 0.0, 1.0))
    length = math.hypot(x, y, z)
    if not 0.0 < length < math.inf or math.hypot(x, y) > _UPRIGHT * length:
        raise ReadError(
            f"a {entity.dxftype()} stands at an angle to the drawing's plane (extrusion {x:g}, {y:g}, {z:g}): turn "
            "it into the plane"
        )
    return math.copysign(1.0, z)


def _line(entity: Any, pen: Pen) -> None:
    ends = np.array([entity.dxf.start, entity.dxf.end], dtype=float)
    pen.path(ends[:, :2], np.zeros(1), ends[:, 2])


def _light_polyline(entity: Any, pen: Pen) -> None:
    side = _side(entity)
    rows = np.array(entity.get_points("xyb"), dtype=float).reshape(-1, 3)
    if len(rows) < 2:
        return
    height = float(entity.dxf.get("elevation", 0.0))
    pen.path(rows[:, :2] * [side, 1.0], side * rows[:, 2], side * height, bool(entity.closed))


def _polyline(entity: Any, pen: Pen) -> None:
    if entity.is_poly_face_mesh or entity.is_polygon_mesh:
        raise ReadError("the drawing holds a mesh in space, which is no flat boundary: choose layers")
    side = _side(entity) if entity.is_2d_polyline else 1.0
    corners = [v for v in entity.vertices if not int(v.dxf.get("flags", 0)) & _SPLINE_FRAME]
    if len(corners) < 2:
        return
    points = np.array([vertex.dxf.location for vertex in corners], dtype=float).reshape(-1, 3)
    bulges = np.array([vertex.dxf.get("bulge", 0.0) for vertex in corners], dtype=float)
    if entity.is_2d_polyline:
        points[:, 2] = entity.dxf.get("elevation", (0.0, 0.0, 0.0))[2]
    else:
        bulges[:] = 0.0
    pen.path(points[:, :2] * [side, 1.0], side * bulges, side * points[:, 2], bool(entity.is_closed))


def _circle(entity: Any, pen: Pen) -> None:
    _round(entity, pen, 0.0, 2.0 * math.pi)


def _arc(entity: Any, pen: Pen) -> None:
    first, last = math.radians(entity.dxf.start_angle), math.radians(entity.dxf.end_angle)
    _round(entity, pen, first, last)


def _round(entity: Any, pen: Pen, first: float, last: float) -> None:
    """Draw an arc counter-clockwise, in two halves if it is nearly a circle, which no bulge can be."""
    side = _side(entity)
    x, y, z = entity.dxf.center
    radius = float(entity.dxf.radius)
    if not (0.0 < radius < math.inf and math.isfinite(first) and math.isfinite(last)):
        raise ReadError(f"the {entity.dxftype()} at ({side * x:g}, {y:g}) has the radius {radius:g}", (side * x, y))
    turn = (last - first) % (2.0 * math.pi)
    if turn <= _ROUND or turn >= 2.0 * math.pi - _ROUND:
        points = np.array([[x - radius, y], [x + radius, y]])
        pen.path(points * [side, 1.0], np.full(2, side), side * z, closed=True)
        return
    parts = 1 if turn <= _ONE_ARC else 2
    angle = np.linspace(first, first + turn, parts + 1)
    points = np.stack([x + radius * np.cos(angle), y + radius * np.sin(angle)], axis=1)
    pen.path(points * [side, 1.0], np.full(parts, side * math.tan(turn / (4.0 * parts))), side * z)


def _ellipse(entity: Any, pen: Pen) -> None:
    side = _side(entity)
    centre, major = np.array(entity.dxf.center, dtype=float), np.array(entity.dxf.major_axis, dtype=float)
    ratio, first, last = float(entity.dxf.ratio), float(entity.dxf.start_param), float(entity.dxf.end_param)
    length = float(np.hypot(major[0], major[1]))
    if not (0.0 < length < math.inf and 0.0 < abs(ratio) < math.inf and math.isfinite(first + last)):
        raise ReadError(f"the ELLIPSE at ({centre[0]:g}, {centre[1]:g}) has no size", _at(centre))
    if abs(major[2]) > _UPRIGHT * length:
        raise ReadError(f"the ELLIPSE at ({centre[0]:g}, {centre[1]:g}) is tilted out of the plane", _at(centre))
    a = major[:2]
    b = side * ratio * np.array([-a[1], a[0]])
    turn = (last - first) % (2.0 * math.pi)
    turn = 2.0 * math.pi if turn <= _ROUND else turn

    def point(t: Floats) -> Floats:
        return np.asarray(centre[:2] + np.cos(t)[:, None] * a + np.sin(t)[:, None] * b, dtype=float)

    def tangent(t: Floats) -> Floats:
        return np.asarray(np.cos(t)[:, None] * b - np.sin(t)[:, None] * a, dtype=float)

    quarters = np.arange(math.ceil(2 * first / math.pi), math.floor(2 * (first + turn) / math.pi) + 1)
    ends = np.asarray(0.5 * math.pi * quarters, dtype=float)
    vertices, bulges = _as_arcs(point, tangent, (first, first + turn), ends, pen.allowed(2.0 * length))
    if turn >= 2.0 * math.pi - _ROUND:
        vertices[-1] = vertices[0]
    pen.path(vertices, bulges, float(centre[2]))


def _spline(entity: Any, pen: Pen) -> None:
    from scipy.interpolate import BSpline

    if max(len(entity.control_points), len(entity.fit_points)) > _MOST_POINTS:
        raise ReadError(f"a SPLINE has over {_MOST_POINTS} points")
    if not 1 <= int(entity.dxf.get("degree", 3)) <= _MOST_DEGREE:
        raise ReadError(f"a SPLINE has the degree {entity.dxf.get('degree')}: 1 to {_MOST_DEGREE} can be read")
    tool = entity.construction_tool()
    control = np.array(list(tool.control_points), dtype=float).reshape(-1, 3)
    knots = np.array(tool.knots(), dtype=float)
    weights = np.array(tool.weights() or np.ones(len(control)), dtype=float)
    if not (np.isfinite(control).all() and np.isfinite(knots).all() and (weights > 0.0).all()):
        raise ReadError("a SPLINE has points, knots or weights that are not finite, or a weight of 0 or less")
    if len(knots) != len(control) + int(tool.degree) + 1 or np.any(np.diff(knots) < 0.0):
        raise ReadError("a SPLINE has knots that do not fit its points", _at(control[0]))
    homogeneous = np.column_stack([control[:, :2] * weights[:, None], weights])
    extent = float(np.ptp(control[:, :2], axis=0).max())
    if extent == 0.0:
        return
    for part_knots, part in _smooth_parts(knots, homogeneous, int(tool.degree)):
        vertices, bulges = _fitted(BSpline(part_knots, part, int(tool.degree)), pen.allowed(extent), extent)
        pen.path(vertices, bulges, float(control[0, 2]))
    for row in (control[np.argmin(control[:, 2])], control[np.argmax(control[:, 2])]):
        pen.heights.append((float(row[0]), float(row[1]), float(row[2])))


def _smooth_parts(knots: Floats, control: Floats, degree: int) -> list[tuple[Floats, Floats]]:
    """Split a spline where a knot is as often repeated as the degree: it may have a corner there."""
    inner = knots[degree + 1 : len(control)]
    values, counts = np.unique(inner[(inner > knots[degree]) & (inner < knots[len(control)])], return_counts=True)
    parts = []
    before, first = np.array([]), 0
    at = 0
    for value in values[counts >= degree]:
        start = int(np.searchsorted(knots, value, "left"))
        end = int(np.searchsorted(knots, value, "right")) - 1
        clamp = np.full(degree + 1, value)
        parts.append((np.concatenate([before, knots[at:start], clamp]), control[first:start]))
        before, at, first = clamp, end + 1, end - degree
    parts.append((np.concatenate([before, knots[at:]]), control[first:]))
    return parts


def _fitted(spline: BSpline, tolerance: float, extent: float) -> tuple[Floats, Floats]:
    """Return a smooth part of a spline (in homogeneous coordinates) as tangent arcs."""
    degree, count = int(spline.k), len(spline.c)
    t0, t1 = float(spline.t[degree]), float(spline.t[count])
    slope = spline.derivative()
    step = 1e-6 * (t1 - t0)

    def point(t: Floats) -> Floats:
        x = spline(t)
        return np.asarray(x[:, :2] / x[:, 2:], dtype=float)

    if degree == 1:
        return point(spline.t[1:-1]), np.zeros(count - 1)

    def tangent(t: Floats) -> Floats:
        x, dx = spline(t), slope(t)
        direct = (dx[:, :2] * x[:, 2:] - x[:, :2] * dx[:, 2:]) / x[:, 2:] ** 2
        # where the curve stands still for a moment, it goes where it is a moment later or earlier
        still = np.hypot(*direct.T) * (t1 - t0) <= 1e-9 * extent
        around = point(np.minimum(t + step, t1)) - point(np.maximum(t - step, t0))
        return np.asarray(np.where(still[:, None], around, direct), dtype=float)

    return _as_arcs(point, tangent, (t0, t1), spline.t, tolerance)


def _as_arcs(
    point: Curve, tangent: Curve, reach: tuple[float, float], breaks: Floats, tolerance: float
) -> tuple[Floats, Floats]:
    """Return a curve as tangent arcs, its parameter from 0 to 1 so that breaks a rounding apart are one."""
    t0, span = reach[0], reach[1] - reach[0]
    inner = np.unique(np.round((breaks - t0) / span, 12))
    try:
        return fit_curve(
            lambda u: point(t0 + span * u),
            lambda u: tangent(t0 + span * u),
            0.0,
            1.0,
            tolerance,
            breaks=inner[(inner > 0.0) & (inner < 1.0)].tolist(),
        )
    except OutlineError as error:
        place = error.at or _at(point(np.array([t0]))[0])
        raise ReadError(f"a curve at ({place[0]:g}, {place[1]:g}) is not smooth ({error})", place) from error


#: How each kind of entity is drawn.
ENTITIES: dict[str, Callable[[Any, Pen], None]] = {
    "LINE": _line,
    "LWPOLYLINE": _light_polyline,
    "POLYLINE": _polyline,
    "CIRCLE": _circle,
    "ARC": _arc,
    "ELLIPSE": _ellipse,
    "SPLINE": _spline,
}
