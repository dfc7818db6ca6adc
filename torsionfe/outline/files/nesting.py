"""Loops nested by containment: one outer loop, and the voids directly inside it."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import shapely
from numpy.typing import NDArray

from torsionfe.checks import Floats, Ints
from torsionfe.errors import OutlineError, ReadError
from torsionfe.outline.files.loops import SMALLEST, RawLoop
from torsionfe.outline.fillets import SMOOTH, round_corners
from torsionfe.outline.outline import Outline

__all__ = ["nest"]

Shapes = NDArray[np.object_]

_MOST_LOOPS = 1000


def nest(loops: Sequence[RawLoop]) -> Outline:
    """Return the outline of closed loops: the one that holds all the others, and those as its voids.

    Parameters
    ----------
    loops : sequence of RawLoop
        In any order and direction.

    Raises
    ------
    ReadError
        A loop crosses itself or another, there are several outer loops, or a loop lies inside a void; the
        message and ``at`` name the place.
    """
    if not loops:
        raise ReadError("it holds no closed loop")
    if len(loops) > _MOST_LOOPS:
        raise ReadError(f"it holds {len(loops)} loops, above the limit of {_MOST_LOOPS}")
    outlines = [_checked(loop) for loop in loops]
    if len(outlines) == 1:
        return outlines[0]
    polygons = np.array([outline.polygon() for outline in outlines])
    _refuse_crossing(polygons)
    depth, parent = _depths(polygons, outlines)
    outer = np.flatnonzero(depth == 0)
    if len(outer) > 1:
        raise _several(outlines, [int(k) for k in outer])
    deep = np.flatnonzero(depth > 1)
    if len(deep):
        x, y = loops[deep[0]].place
        void = loops[parent[deep[0]]].place
        raise ReadError(
            f"the loop at ({x:g}, {y:g}) lies inside the void at ({void[0]:g}, {void[1]:g}): material in a "
            "void is apart from the rest, so it is no part of one cross-section",
            (x, y),
        )
    shell = outlines[outer[0]]
    voids = [outline for k, outline in enumerate(outlines) if k != outer[0]]
    return Outline(shell.vertices, shell.bulges, voids)


def _checked(loop: RawLoop) -> Outline:
    """Return the loop as an outline of its own, its corners rounded."""
    if len(loop.vertices) and np.ptp(loop.vertices, axis=0).max() < SMALLEST:
        raise ReadError(f"the loop at ({loop.place[0]:g}, {loop.place[1]:g}) has no size", loop.place)
    try:
        outline = Outline(loop.vertices, loop.bulges)
        return outline if loop.radii is None or not loop.radii.any() else _rounded(outline, loop, loop.radii)
    except OutlineError as error:
        x, y = loop.place
        raise ReadError(f"{error} (of the loop that starts at ({x:g}, {y:g}))", error.at or (x, y)) from error


def _rounded(outline: Outline, loop: RawLoop, radii: Floats) -> Outline:
    """Return an outline, made of the loop, with its vertices rounded by radii (n,)."""
    # the outline may have turned the loop round: vertex 0 stays first
    turned = not np.array_equal(outline.vertices, loop.vertices)
    radii = radii[-np.arange(len(radii)) % len(radii)] if turned else radii
    straight = np.abs(outline.edges.interior_angle - np.pi) <= SMOOTH
    none = np.flatnonzero(straight & (radii > 0.0))
    if len(none):
        x, y = outline.vertices[none[0]]
        radius = radii[none[0]]
        raise ReadError(f"the point ({x:g}, {y:g}) has the radius {radius:g} and is no corner", (float(x), float(y)))
    return round_corners(outline, {(0, k): (float(radius), "radius") for k, radius in enumerate(radii)})


def _refuse_crossing(polygons: Shapes) -> None:
    rings = shapely.get_exterior_ring(polygons)
    first, second = shapely.STRtree(rings).query(rings, predicate="intersects")
    pairs = np.flatnonzero(first < second)
    if len(pairs):
        a, b = rings[first[pairs[0]]], rings[second[pairs[0]]]
        point = shapely.get_coordinates(shapely.intersection(a, b))[0]
        x, y = float(point[0]), float(point[1])
        raise ReadError(f"two loops cross or touch at ({x:g}, {y:g}): part them or make them one", (x, y))


def _depths(polygons: Shapes, outlines: Sequence[Outline]) -> tuple[Ints, Ints]:
    """Return how many loops each lies in, and the smallest of them (-1 for none)."""
    points = shapely.points(np.array([outline.vertices[0] for outline in outlines]))
    inner, outer = shapely.STRtree(polygons).query(points, predicate="within")
    apart = inner != outer
    inner, outer = inner[apart], outer[apart]
    depth = np.bincount(inner, minlength=len(outlines))
    parent = np.full(len(outlines), -1)
    largest_first = np.argsort(-shapely.area(polygons[outer]), kind="stable")
    parent[inner[largest_first]] = outer[largest_first]  # the smallest comes last and stays
    return depth, parent


def _several(outlines: Sequence[Outline], outer: Sequence[int]) -> ReadError:
    named = []
    for k in outer[:4]:
        x0, y0, x1, y1 = outlines[k].bounds
        named.append(f"{x1 - x0:.4g} x {y1 - y0:.4g} at ({x0:g}, {y0:g})")
    more = ", ..." if len(outer) > 4 else ""
    x, y = outlines[outer[1]].vertices[0]
    return ReadError(
        f"it holds {len(outer)} outer loops ({', '.join(named)}{more}), and a cross-section has one: choose "
        "layers, or take the others away",
        (float(x), float(y)),
    )
