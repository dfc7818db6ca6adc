"""GeoJSON (RFC 7946): a Polygon, alone, in a Feature, or in a collection of one.

GeoJSON has no arcs. They are written as chords, fine enough to be restored to the same arcs, and named in a
foreign member (RFC 7946, section 6.1) of the Feature: ``"cross_section": {"unit": "mm", "arcs": [{"ring": 0,
"from": 3, "to": 15, "bulge": -0.41}, ...]}``: the positions from one number to the other of a ring lie on an
arc with that ``tan(sweep / 4)``. Moving, turning or scaling the coordinates leaves it true; where they no
longer fit, the chords are taken and that is told.
"""

from __future__ import annotations

import json
import math
from typing import Any, NoReturn

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import ReadError
from torsionfe.outline import arcs
from torsionfe.outline.files.loops import LARGEST, Found, RawLoop, ReadOptions, closed_loop, too_many
from torsionfe.outline.outline import Outline

__all__ = ["geojson_text", "read_geojson"]

_MEMBER = "cross_section"
_STEP = math.radians(5.0)
_FEWEST = 4
_OFF = 0.02
_WRAPS = {"FeatureCollection": "features", "GeometryCollection": "geometries"}


def read_geojson(text: str, options: ReadOptions) -> Found:
    """Return the rings of the one polygon of a text.

    Raises
    ------
    ReadError
        It is no JSON, holds no polygon or several, or a ring is open.
    """
    parts = sum(text.count(sign) for sign in "[{:")
    if parts > 8 * options.max_edges:
        raise too_many(parts // 8, options.max_edges)
    try:
        found = json.loads(text, parse_constant=_no_constant)
    except ReadError:
        raise
    except (ValueError, RecursionError) as error:
        raise ReadError(f"it is no JSON ({str(error)[:120]})") from error
    polygon, member = _polygon(found)
    coordinates = polygon.get("coordinates")
    if polygon.get("type") == "MultiPolygon":
        coordinates = _only(coordinates, "MultiPolygon")
    if not isinstance(coordinates, list) or not coordinates:
        raise ReadError("the Polygon has no coordinates")
    heights: set[float] = set()
    rings = [_ring(ring, k, heights) for k, ring in enumerate(coordinates)]
    if len(heights) > 1:
        raise ReadError(f"the polygon is not flat: z goes from {min(heights):g} to {max(heights):g}")
    loops, warnings = _with_arcs(rings, member.get("arcs"))
    unit = member.get("unit")
    notes = tuple(f"flattened from z = {z:g}" for z in heights if z)
    return Found(tuple(loops), None if unit is None else str(unit)[:80], notes, tuple(warnings))


def _no_constant(name: str) -> NoReturn:
    raise ReadError(f"{name} is no number of JSON, nor a coordinate")


def _polygon(found: Any) -> tuple[dict[str, Any], dict[str, Any]]:
    """Return the polygon, whatever it is wrapped in, and our foreign member."""
    member: dict[str, Any] = {}
    for _ in range(4):
        if not isinstance(found, dict):
            break
        given = found.get(_MEMBER)
        member = given if isinstance(given, dict) else member
        kind = found.get("type")
        if kind in ("Polygon", "MultiPolygon"):
            return found, member
        if kind == "Feature":
            found = found.get("geometry")
        elif kind in _WRAPS:
            found = _only(found.get(_WRAPS[kind]), str(kind))
        else:
            raise ReadError(f"a Polygon or a Feature with one is needed, got the type {kind!r:.40}")
    raise ReadError("a Polygon or a Feature with one is needed, got none")


def _only(parts: Any, kind: str) -> Any:
    if not isinstance(parts, list) or len(parts) != 1:
        count = len(parts) if isinstance(parts, list) else "no"
        raise ReadError(f"the {kind} holds {count} parts, and a cross-section is one polygon: take one")
    return parts[0]


def _ring(ring: Any, number: int, heights: set[float]) -> Floats:
    """Return the positions of a ring, ``(n, 2)``, the last repeating the first."""
    good = isinstance(ring, list) and all(
        isinstance(position, list)
        and len(position) >= 2
        and all(isinstance(value, (int, float)) and not isinstance(value, bool) for value in position[:3])
        for position in ring
    )
    if not good or len(ring) < 4:
        raise ReadError(f"ring {number} is no list of at least 4 positions of numbers")
    try:
        points = np.array([position[:2] for position in ring], dtype=float)
        heights |= {float(position[2]) for position in ring if len(position) > 2}
    except OverflowError:
        raise ReadError(f"ring {number} has a number too large for a coordinate") from None
    bad = np.flatnonzero(~(np.abs(points) < LARGEST).all(axis=1))
    if len(bad):
        raise ReadError(f"point {bad[0]} of ring {number} is not finite, or above {LARGEST:g}: {points[bad[0]]}")
    if not np.array_equal(points[0], points[-1]):
        (x, y), (u, v) = points[0], points[-1]
        raise ReadError(
            f"ring {number} is open: it starts at ({x:g}, {y:g}) and ends at ({u:g}, {v:g})", (float(x), float(y))
        )
    return points


def _with_arcs(rings: list[Floats], given: Any) -> tuple[list[RawLoop], list[str]]:
    """Return the loops, with the arcs that the foreign member names."""
    wanted: list[list[tuple[int, int, float]]] = [[] for _ in rings]
    for arc in given if isinstance(given, list) else []:
        values: list[Any] = []
        if isinstance(arc, dict):
            values = [arc.get(name) for name in ("ring", "from", "to", "bulge")]
        if not _is_arc(values, rings):
            raise ReadError(f"the file's arc {str(arc)[:80]} names no stretch of a ring")
        wanted[values[0]].append((values[1], values[2], float(values[3])))
    loops, warnings = [], []
    for number, (points, stretches) in enumerate(zip(rings, wanted, strict=True)):
        keep, bulges = np.ones(len(points), dtype=bool), np.zeros(len(points))
        for first, last, bulge in stretches:
            if not keep[first : last + 1].all() or not _fits(points[first : last + 1], bulge):
                x, y = points[first]
                warnings.append(
                    f"the arc at ({x:g}, {y:g}) of ring {number} no longer fits the coordinates, which are taken as "
                    "they are"
                )
                continue
            keep[first + 1 : last] = False
            bulges[first] = bulge
        loops.append(closed_loop(points[keep], bulges[keep]))
    return loops, warnings


def _is_arc(values: list[Any], rings: list[Floats]) -> bool:
    if not values or any(isinstance(value, bool) or not isinstance(value, (int, float)) for value in values):
        return False
    if not all(isinstance(value, int) for value in values[:3]) or not 0 <= values[0] < len(rings):
        return False
    return bool(0 <= values[1] < values[2] < len(rings[values[0]]) and 0.0 < abs(values[3]) < 1e3)


def _fits(points: Floats, bulge: float) -> bool:
    """Return whether positions still lie on the arc from the first to the last."""
    p, q, b = points[:1], points[-1:], np.array([bulge])
    if np.array_equal(p, q):
        return False
    if len(points) == 2:
        return True
    centre, radius = arcs.arc_centre(p, q, b)[0], float(arcs.arc_radius(p, q, b)[0])
    rise = 0.5 * abs(bulge) * float(np.hypot(*(q - p)[0]))
    if np.abs(np.hypot(*(points - centre).T) - radius).max() > _OFF * min(rise, radius):
        return False
    inner = points[1:-1] - points[0]
    chord = (q - p)[0]
    side = chord[0] * inner[:, 1] - chord[1] * inner[:, 0]  # an arc to the left lies right of its chord
    return bool(np.all(side * bulge <= 0.0))


# --- writing -------------------------------------------------------------------------------------------


def geojson_text(outline: Outline, unit: str | None) -> str:
    """Return a Feature with the outline as a Polygon of chords, its arcs and unit in the foreign member."""
    rings, named = [], []
    for number, loop in enumerate((outline, *outline.voids)):
        points, stretches = _chords(loop)
        if number:  # the right-hand rule of RFC 7946: the rings of holes run clockwise
            last = len(points) - 1
            points = points[::-1]
            stretches = [(last - b, last - a, -bulge) for a, b, bulge in reversed(stretches)]
        rings.append(points.tolist())
        named += [{"ring": number, "from": a, "to": b, "bulge": bulge} for a, b, bulge in stretches]
    member = {} if unit is None else {"unit": unit}
    feature = {
        "type": "Feature",
        "properties": {},
        "geometry": {"type": "Polygon", "coordinates": rings},
        _MEMBER: member | {"arcs": named},
    }
    return json.dumps(feature, allow_nan=False) + "\n"


def _chords(loop: Outline) -> tuple[Floats, list[tuple[int, int, float]]]:
    """Return a loop's closed ring of positions and the stretches of it that are arcs."""
    turn = np.abs(arcs.sweep(loop.bulges))
    count = np.where(turn > 0.0, np.maximum(np.ceil(turn / _STEP), _FEWEST), 1).astype(int)
    rows = np.repeat(np.arange(len(count)), count)
    first = np.cumsum(count) - count
    t = (np.arange(count.sum()) - first[rows]) / count[rows]
    p, q = loop.vertices, np.roll(loop.vertices, -1, axis=0)
    points = arcs.point_at(p[rows], q[rows], loop.bulges[rows], t)
    points[first] = p
    stretches = [
        (int(first[k]), int(first[k] + count[k]), float(loop.bulges[k])) for k in np.flatnonzero(loop.bulges)
    ]
    return np.concatenate([points, points[:1]]), stretches
