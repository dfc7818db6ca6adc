"""Where strips meet, and where each then ends: the step from strips to plates."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import shapely
from shapely import LineString, Point, Polygon

from torsionfe.checks import Floats
from torsionfe.closed_form.strips import Strip

__all__ = ["Ending", "endings", "extended", "merged"]

_IN_LINE = np.radians(10.0)  # the two halves of a tapered flange meet at this angle or less
_CROSSING = 0.35  # sine of the smallest angle at which one plate meets another
_FREE = 1.5  # of the thickness: how far a free end may reach beyond the parallel faces
_OUTSIDE = 0.3  # of the thickness: how far outside a rounded corner two middle lines may meet


@dataclass(frozen=True)
class Ending:
    """How one end of a strip ends.

    Attributes
    ----------
    kind : str
        ``'free'``, ``'joint'`` (on another strip), ``'step'`` (the thickness changes) or ``'lost'`` (in a
        region that is no plate).
    to_end : float
        From the strip's end along its line to where the kind says, length.
    to_exit : float
        To where the line leaves the material, length.
    other : int
        The strip that it meets, -1 for none.
    half : float
        Half that strip's thickness, along this line.
    passes : bool
        Whether that strip runs on beyond the joint on both sides.
    at : tuple of float
        The place of the joint.
    """

    kind: str
    to_end: float
    to_exit: float
    other: int = -1
    half: float = 0.0
    passes: bool = False
    at: tuple[float, float] = (0.0, 0.0)


def merged(strips: list[Strip], polygon: Polygon) -> list[tuple[Strip, list[Strip]]]:
    """Return the strips with those joined that lie in one line with material between, such as a tee's flange.

    Each comes with the strips that it was made of.
    """
    groups = [(strip, [strip]) for strip in strips]
    k = 0
    while k < len(groups):
        for j in range(k + 1, len(groups)):
            union = _in_one_line(groups[k][0], groups[j][0], polygon)
            if union is not None:
                groups[k] = union, groups[k][1] + groups[j][1]
                del groups[j]
                break
        else:
            k += 1
    return groups


def _in_one_line(a: Strip, b: Strip, polygon: Polygon) -> Strip | None:
    """Return the two straight strips as one, if they face each other in one line across a joint."""
    if len(a.line) > 2 or len(b.line) > 2:
        return None
    gaps = np.hypot(*(a.line[:, None] - b.line[None]).transpose(2, 0, 1))
    i, j = (int(k) for k in np.unravel_index(np.argmin(gaps), gaps.shape))
    p, out = a.outward(i)
    q, back = b.outward(j)
    facing = a.thickness_at(i), b.thickness_at(j)
    if out @ back > -np.cos(_IN_LINE) or abs(facing[0] / facing[1] - 1.0) > 0.05:
        return None
    half = 0.5 * float((q - p) @ out)
    meet = p + half * out, q + half * back
    if half <= 0.0 or np.hypot(*(meet[1] - meet[0])) > 0.1 * min(facing):
        return None
    gap = LineString([p, q]).buffer(0.49 * min(facing), cap_style="flat")
    if gap.intersection(polygon).area < 0.97 * gap.area:
        return None
    far = a.line[1 - i], b.line[1 - j]
    bow = LineString(far).distance(Point(0.5 * (meet[0] + meet[1])))
    line = np.array(far if bow <= 0.02 * min(facing) else [far[0], 0.5 * (meet[0] + meet[1]), far[1]])
    # each half from the middle of the joint to its far end, which is taken for square
    halves = [_half(a, i, half), _half(b, j, half)]
    thickness = sum(t * width for t, width in halves) / sum(width for _, width in halves)
    loops = a.loops if a.length >= b.length else b.loops
    return Strip(line, thickness, min(a.least, b.least), max(a.most, b.most), loops)


def _half(strip: Strip, end: int, half: float) -> tuple[float, float]:
    """Return thickness and width of a strip that reaches ``half`` beyond its end and to a square far end."""
    beyond = 0.5 * strip.thickness_at(1 - end)
    reach = (half, beyond) if end == 0 else (beyond, half)
    return strip.thickness_beyond(reach), strip.length + sum(reach)


@dataclass(frozen=True)
class _Scene:
    """Every strip, how far each end is from leaving the material, and its line made as long as that."""

    strips: list[Strip]
    reach: list[tuple[float, float]]
    long: list[LineString]
    polygon: Polygon


def endings(strips: list[Strip], polygon: Polygon, size: float) -> list[tuple[Ending, Ending]]:
    """Return how the two ends of every strip end."""
    reach = [(_to_exit(strip, 0, polygon, size), _to_exit(strip, 1, polygon, size)) for strip in strips]
    long = [
        LineString(extended(strip.line, (r[0] + 0.5 * strip.thickness, r[1] + 0.5 * strip.thickness)))
        for strip, r in zip(strips, reach, strict=True)
    ]
    scene = _Scene(strips, reach, long, polygon)
    return [(_ending(k, 0, scene), _ending(k, 1, scene)) for k in range(len(strips))]


def extended(line: Floats, reach: tuple[float, float]) -> Floats:
    """Return the line with its end segments made longer (or, if negative, shorter) by ``reach``."""
    line = line.copy()
    first, last = line[0] - line[1], line[-1] - line[-2]
    start = line[0] + reach[0] * first / np.hypot(*first)
    stop = line[-1] + reach[1] * last / np.hypot(*last)
    if len(line) == 2:
        return np.array([start, stop])
    return np.concatenate([[start], line, [stop]])


def _to_exit(strip: Strip, end: int, polygon: Polygon, size: float) -> float:
    point, direction = strip.outward(end)
    ray = LineString([point, point + 2.0 * size * direction])
    hit = ray.intersection(polygon.boundary)
    return float(Point(point).distance(hit)) if not hit.is_empty else 0.0


def _ending(k: int, end: int, scene: _Scene) -> Ending:
    strip, to_exit = scene.strips[k], scene.reach[k][end]
    point, direction = strip.outward(end)
    # a joint may lie just behind the end of the parallel stretch, where it was cut short
    start = point - 0.25 * min(strip.length, strip.thickness) * direction
    ray = LineString([start, point + (to_exit + 0.5 * strip.thickness) * direction])
    found: list[Ending] = []
    for j, other in enumerate(scene.strips):
        if j == k:
            continue
        for place in shapely.get_coordinates(ray.intersection(scene.long[j])):
            sine = _sine(direction, other, place)
            if sine < _CROSSING or Point(place).distance(scene.polygon) > _OUTSIDE * strip.thickness:
                continue
            passes = LineString(other.line).distance(Point(place)) <= 1e-6 * strip.thickness
            ahead = float((place - point) @ direction)
            half = 0.5 * other.thickness / sine
            found.append(Ending("joint", ahead, to_exit, j, half, passes, (float(place[0]), float(place[1]))))
    if found:
        return min(found, key=lambda one: one.to_end)
    if to_exit <= _FREE * strip.thickness:
        return Ending("free", to_exit, to_exit)
    return _step(k, end, scene.strips, to_exit)


def _sine(direction: Floats, other: Strip, place: Floats) -> float:
    """Return the sine of the angle between a direction and the other strip's line near a place."""
    middles = 0.5 * (other.line[1:] + other.line[:-1])
    nearest = int(np.argmin(np.sum((middles - place) ** 2, axis=1)))
    along = other.line[nearest + 1] - other.line[nearest]
    along = along / np.hypot(*along)
    return float(abs(direction[0] * along[1] - direction[1] * along[0]))


def _step(k: int, end: int, strips: list[Strip], to_exit: float) -> Ending:
    """Return the ending half-way to a strip that carries on in nearly the same line, or a lost one."""
    strip = strips[k]
    point, direction = strip.outward(end)
    for j, other in enumerate(strips):
        for its_end in (0, 1):
            its_point, its_direction = other.outward(its_end)
            gap = its_point - point
            near = np.hypot(*gap) <= 2.0 * max(strip.thickness, other.thickness)
            if j != k and near and direction @ its_direction < -0.87 and gap @ direction > 0.0:
                middle = 0.5 * (point + its_point)
                half_way = 0.5 * float(gap @ direction)
                return Ending("step", half_way, to_exit, j, at=(float(middle[0]), float(middle[1])))
    return Ending("lost", 0.0, to_exit)
