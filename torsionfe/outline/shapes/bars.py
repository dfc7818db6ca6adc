"""Solid bars and shafts: rectangle, round, ellipse, regular polygon, flats, keyway, splines."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np

from torsionfe.checks import Floats
from torsionfe.outline.biarcs import fit_curve
from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes.trade import (
    TradeShape,
    above_zero,
    at_most,
    build,
    count,
    less,
    zero_or_more,
)

__all__ = [
    "circle",
    "ellipse",
    "flatted_bar",
    "keyed_shaft",
    "rectangle",
    "regular",
    "round_bar",
    "splined_shaft",
]

_QUARTER = math.tan(math.pi / 8.0)


def circle(diameter: float) -> Outline:
    """Return a circle about the origin, in four arcs."""
    r = diameter / 2.0
    return Outline([(r, 0.0), (0.0, r), (-r, 0.0), (0.0, -r)], [_QUARTER] * 4)


def rectangle(width: float, height: float, corner_radius: float = 0.0) -> TradeShape:
    """Return a rectangle centred on the origin, its corners rounded if a radius is given.

    Parameters
    ----------
    width, height : float
        Along x and y.
    corner_radius : float
        At most half of the shorter side (which makes it round).
    """
    sizes = above_zero(width=width, height=height) | zero_or_more(corner_radius=corner_radius)
    x, y = sizes["width"] / 2.0, sizes["height"] / 2.0
    at_most("corner_radius", sizes["corner_radius"], "half of the shorter side", min(x, y))
    sharp = Outline([(-x, -y), (x, -y), (x, y), (-x, y)])
    return build("rectangle", sizes, sharp, {"corner_radius": range(4)})


def round_bar(diameter: float) -> TradeShape:
    """Return a solid round bar centred on the origin."""
    sizes = above_zero(diameter=diameter)
    return build("round_bar", sizes, circle(sizes["diameter"]))


def ellipse(width: float, height: float, *, tolerance: float = 1e-6) -> TradeShape:
    """Return an ellipse centred on the origin, made of smoothly joined arcs.

    Parameters
    ----------
    width, height : float
        Its axes, along x and y (whole, not halved).
    tolerance : float
        Largest distance between the arcs and the true ellipse, as a share of ``sqrt(width * height)``. The
        default takes 100 to 300 arcs up to ``width / height = 10``, with the area right to 1e-6 or better.
    """
    sizes = above_zero(width=width, height=height, tolerance=tolerance)
    at_most("tolerance", sizes["tolerance"], "the coarsest that makes sense", 0.01)
    a, b = sizes["width"] / 2.0, sizes["height"] / 2.0
    at_most("the longer axis", 2.0 * max(a, b), "1000 times the shorter", 2000.0 * min(a, b))
    vertices, bulges = fit_curve(
        lambda t: np.stack([a * np.cos(t), b * np.sin(t)], axis=1),
        lambda t: np.stack([-a * np.sin(t), b * np.cos(t)], axis=1),
        0.0,
        2.0 * math.pi,
        sizes["tolerance"] * 2.0 * math.sqrt(a * b),
    )
    return build("ellipse", sizes, Outline(vertices[:-1], bulges))


def regular(sides: int, across_flats: float, *, corner_radius: float = 0.0) -> TradeShape:
    """Return a regular polygon centred on the origin, one flat at the bottom.

    Parameters
    ----------
    sides : int
        3 to 1000.
    across_flats : float
        Diameter of the inscribed circle: with an even number of sides, the distance between opposite flats.
    corner_radius : float
        At most half of ``across_flats`` (which makes it round).
    """
    n = count("sides", sides, 3, 1000)
    sizes = {"sides": float(n)} | above_zero(across_flats=across_flats)
    sizes |= zero_or_more(corner_radius=corner_radius)
    at_most("corner_radius", sizes["corner_radius"], "half of across_flats", sizes["across_flats"] / 2.0)
    turn = -math.pi / 2.0 - math.pi / n + 2.0 * math.pi / n * np.arange(n)
    radius = sizes["across_flats"] / 2.0 / math.cos(math.pi / n)
    sharp = Outline(radius * np.stack([np.cos(turn), np.sin(turn)], axis=1))
    return build("regular", sizes, sharp, {"corner_radius": range(n)})


def flatted_bar(
    diameter: float, across_flat: float, *, flats: int = 1, corner_radius: float = 0.0
) -> TradeShape:
    """Return a round bar with a flat on top, or with two opposite ones; the round is centred on the origin.

    Parameters
    ----------
    diameter : float
        Of the round.
    across_flat : float
        From the flat to the far side of the round; with two flats, from one to the other.
    flats : int
        1 or 2.
    corner_radius : float
        Where flat and round meet.
    """
    n = count("flats", flats, 1, 2)
    sizes = above_zero(diameter=diameter, across_flat=across_flat) | {"flats": float(n)}
    sizes |= zero_or_more(corner_radius=corner_radius)
    r = sizes["diameter"] / 2.0
    less("across_flat", sizes["across_flat"], "diameter", sizes["diameter"])
    y = sizes["across_flat"] - r if n == 1 else sizes["across_flat"] / 2.0
    x = math.sqrt(r * r - y * y)
    if n == 2:
        bulge = math.tan(math.atan2(y, x) / 2.0)
        sharp = Outline([(x, y), (-x, y), (-x, -y), (x, -y)], [0.0, bulge, 0.0, bulge])
    else:  # the arc in two halves, so that neither is nearly a full circle
        bulge = math.tan((math.pi / 2.0 + math.atan2(y, x)) / 4.0)
        sharp = Outline([(x, y), (-x, y), (0.0, -r)], [0.0, bulge, bulge])
    return build("flatted_bar", sizes, sharp, {"corner_radius": [0, 1, 2, 3] if n == 2 else [0, 1]})


def keyed_shaft(
    diameter: float,
    key_width: float,
    key_depth: float,
    root_radius: float = 0.0,
    *,
    edge_radius: float = 0.0,
    bore_diameter: float = 0.0,
) -> TradeShape:
    """Return a shaft with a keyway on top, the shaft centred on the origin.

    Parameters
    ----------
    diameter : float
        Of the shaft.
    key_width : float
    key_depth : float
        From the crown of the shaft (where the surface would be without the keyway) to the keyway's bottom, as
        drawings give it (common practice).
    root_radius, edge_radius : float
        At the keyway's bottom corners; where its sides meet the surface.
    bore_diameter : float
        Of a concentric bore, if any.
    """
    sizes = above_zero(diameter=diameter, key_width=key_width, key_depth=key_depth)
    sizes |= zero_or_more(root_radius=root_radius, edge_radius=edge_radius, bore_diameter=bore_diameter)
    r, w = sizes["diameter"] / 2.0, sizes["key_width"] / 2.0
    less("key_width", sizes["key_width"], "diameter", sizes["diameter"])
    top, bottom = math.sqrt(r * r - w * w), r - sizes["key_depth"]
    less("the crown's height over the keyway's edges", r - top, "key_depth", sizes["key_depth"])
    less("key_depth", sizes["key_depth"], "the shaft's height over the keyway", r + top)
    if sizes["bore_diameter"]:
        less("bore_diameter", sizes["bore_diameter"], "diameter - 2 key_depth", 2.0 * bottom)
    side = math.tan(math.atan2(top, w) / 4.0)
    sharp = Outline(
        [(w, top), (w, bottom), (-w, bottom), (-w, top), (-r, 0.0), (0.0, -r), (r, 0.0)],
        [0.0, 0.0, 0.0, side, _QUARTER, _QUARTER, side],
        _bore(sizes["bore_diameter"]),
    )
    return build("keyed_shaft", sizes, sharp, {"root_radius": [1, 2], "edge_radius": [0, 3]})


def splined_shaft(
    teeth: int,
    outer_diameter: float,
    root_diameter: float,
    tooth_width: float,
    root_radius: float = 0.0,
    *,
    tip_radius: float = 0.0,
    bore_diameter: float = 0.0,
) -> TradeShape:
    """Return a shaft with straight, parallel-sided splines, centred on the origin, one tooth along +x.

    The form is that of ISO 14: ``teeth`` x ``root_diameter`` x ``outer_diameter``, of width ``tooth_width``
    (from memory).

    Parameters
    ----------
    teeth : int
        2 to 200.
    outer_diameter, root_diameter : float
        Over the tips; at the bottom between the teeth.
    tooth_width : float
        Between a tooth's parallel flanks.
    root_radius, tip_radius : float
        Fillet between flank and root; rounding of the tips.
    bore_diameter : float
        Of a concentric bore, if any.

    Examples
    --------
    >>> splined_shaft(6, 28, 23, 6, root_radius=0.3).area.__round__(1)
    506.5
    """
    n = count("teeth", teeth, 2, 200)
    sizes = {"teeth": float(n)} | above_zero(
        outer_diameter=outer_diameter, root_diameter=root_diameter, tooth_width=tooth_width
    )
    sizes |= zero_or_more(root_radius=root_radius, tip_radius=tip_radius, bore_diameter=bore_diameter)
    low, high, h = sizes["root_diameter"] / 2.0, sizes["outer_diameter"] / 2.0, sizes["tooth_width"] / 2.0
    less("root_diameter", 2.0 * low, "outer_diameter", 2.0 * high)
    less("tooth_width", 2.0 * h, "root_diameter * sin(pi / teeth)", 2.0 * low * math.sin(math.pi / n))
    less("bore_diameter", sizes["bore_diameter"], "root_diameter", 2.0 * low)
    x, tip = math.sqrt(low * low - h * h), math.sqrt(high * high - h * h)
    tooth = np.array([(x, -h), (tip, -h), (tip, h), (x, h)])
    gap = 2.0 * math.pi / n - 2.0 * math.asin(h / low)
    bulges = [0.0, math.tan(math.asin(h / high) / 2.0), 0.0, math.tan(gap / 4.0)]
    k = 4 * np.arange(n)
    sharp = Outline(_around(tooth, n), bulges * n, _bore(sizes["bore_diameter"]))
    corners: dict[str, Sequence[int]] = {
        "root_radius": [*k, *(k + 3)],
        "tip_radius": [*(k + 1), *(k + 2)],
    }
    return build("splined_shaft", sizes, sharp, corners)


def _bore(diameter: float) -> list[Outline]:
    return [circle(diameter)] if diameter > 0.0 else []


def _around(points: Floats, n: int) -> Floats:
    """Return ``n`` copies of points, turned about the origin in equal steps, shape (n m, 2)."""
    turn = 2.0 * math.pi / n * np.arange(n)
    c, s = np.cos(turn), np.sin(turn)
    matrices = np.stack([np.stack([c, s], axis=1), np.stack([-s, c], axis=1)], axis=1)  # for rows
    return np.asarray(np.einsum("mi,nij->nmj", points, matrices).reshape(-1, 2), dtype=float)
