"""Hollow shapes: tube, box, box with fins, cells in a grid, and extrusions from a list of voids."""

from __future__ import annotations

from collections.abc import Iterable, Mapping

from torsionfe.checks import finite_array
from torsionfe.errors import OutlineError
from torsionfe.outline.fillets import round_corners
from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes.bars import circle
from torsionfe.outline.shapes.trade import TradeShape, above_zero, at_most, build, count, less, zero_or_more

__all__ = ["box", "extrusion", "finned_box", "multi_cell", "tube"]


def tube(outer_diameter: float, wall: float) -> TradeShape:
    """Return a round tube centred on the origin.

    Parameters
    ----------
    outer_diameter, wall : float
        ``wall`` less than half of the diameter.
    """
    sizes = above_zero(outer_diameter=outer_diameter, wall=wall)
    d, t = sizes["outer_diameter"], sizes["wall"]
    less("twice the wall", 2.0 * t, "outer_diameter", d)
    outer = circle(d)
    return build("tube", sizes, Outline(outer.vertices, outer.bulges, [circle(d - 2.0 * t)]))


def _panel(box: tuple[float, float, float, float], radius: float, name: str) -> Outline:
    """Return the rectangle ``(left, bottom, right, top)`` with rounded corners."""
    x0, y0, x1, y1 = box
    sharp = Outline([(x0, y0), (x1, y0), (x1, y1), (x0, y1)])
    at_most(name, radius, "half of the shorter side", min(x1 - x0, y1 - y0) / 2.0)
    return round_corners(sharp, {(0, k): (radius, name) for k in range(4)})


def _hollowed(
    kind: str, sizes: Mapping[str, float], outer: Outline, voids: Iterable[Outline]
) -> TradeShape:
    return TradeShape(Outline(outer.vertices, outer.bulges, voids), kind, sizes)


def box(
    width: float, height: float, wall: float, outer_radius: float = 0.0, inner_radius: float = 0.0
) -> TradeShape:
    """Return a rectangular hollow section centred on the origin.

    Parameters
    ----------
    width, height : float
        Outside, along x and y.
    wall : float
        Thickness of all four walls, less than half of the shorter side.
    outer_radius, inner_radius : float
        Of the corners. Tables of hot-finished sections are computed with 1.5 and 1.0 times the wall
        (EN 10210-2, from memory).
    """
    sizes = above_zero(width=width, height=height, wall=wall)
    sizes |= zero_or_more(outer_radius=outer_radius, inner_radius=inner_radius)
    x, y, t = sizes["width"] / 2.0, sizes["height"] / 2.0, sizes["wall"]
    less("twice the wall", 2.0 * t, "width", 2.0 * x)
    less("twice the wall", 2.0 * t, "height", 2.0 * y)
    outer = _panel((-x, -y, x, y), sizes["outer_radius"], "outer_radius")
    inner = _panel((t - x, t - y, x - t, y - t), sizes["inner_radius"], "inner_radius")
    return _hollowed("box", sizes, outer, [inner])


def finned_box(
    width: float,
    height: float,
    wall: float,
    fin_length: float,
    fin_thickness: float,
    *,
    root_radius: float = 0.0,
    inner_radius: float = 0.0,
) -> TradeShape:
    """Return a box with two fins that carry on its top face to both sides; the box is centred on the origin.

    Parameters
    ----------
    width, height, wall : float
        Of the box, outside.
    fin_length, fin_thickness : float
        Length beyond the box's side, and thickness, of each fin.
    root_radius, inner_radius : float
        Fillets under the fins; corners of the void.
    """
    sizes = above_zero(
        width=width, height=height, wall=wall, fin_length=fin_length, fin_thickness=fin_thickness
    )
    sizes |= zero_or_more(root_radius=root_radius, inner_radius=inner_radius)
    x, y, t = sizes["width"] / 2.0, sizes["height"] / 2.0, sizes["wall"]
    less("twice the wall", 2.0 * t, "width", 2.0 * x)
    less("twice the wall", 2.0 * t, "height", 2.0 * y)
    less("fin_thickness", sizes["fin_thickness"], "height", 2.0 * y)
    inner = _panel((t - x, t - y, x - t, y - t), sizes["inner_radius"], "inner_radius")
    tip, under = x + sizes["fin_length"], y - sizes["fin_thickness"]
    right = [(x, -y), (x, under), (tip, under), (tip, y)]
    sharp = Outline(right + [(-px, py) for px, py in reversed(right)], voids=[inner])
    return build("finned_box", sizes, sharp, {"root_radius": [1, 6]})


def multi_cell(
    width: float,
    height: float,
    wall: float,
    columns: int,
    rows: int = 1,
    *,
    web: float | None = None,
    outer_radius: float = 0.0,
    inner_radius: float = 0.0,
) -> TradeShape:
    """Return a rectangular extrusion with equal cells in a grid, centred on the origin.

    Parameters
    ----------
    width, height : float
        Outside, along x and y.
    wall : float
        Thickness of the outer walls.
    columns, rows : int
        Number of cells along x and y, 1 to 50.
    web : float, optional
        Thickness of the walls between cells; ``wall`` by default.
    outer_radius, inner_radius : float
        Of the outer corners; of the cells' corners.
    """
    between = wall if web is None else web
    sizes = above_zero(width=width, height=height, wall=wall, web=between)
    n, m = count("columns", columns, 1, 50), count("rows", rows, 1, 50)
    sizes |= {"columns": float(n), "rows": float(m)}
    sizes |= zero_or_more(outer_radius=outer_radius, inner_radius=inner_radius)
    b, h, t, w = (sizes[name] for name in ("width", "height", "wall", "web"))
    less("2 wall + (columns - 1) web", 2.0 * t + (n - 1) * w, "width", b)
    less("2 wall + (rows - 1) web", 2.0 * t + (m - 1) * w, "height", h)
    u, v = (b - 2.0 * t - (n - 1) * w) / n, (h - 2.0 * t - (m - 1) * w) / m
    corners = [
        (t - b / 2.0 + i * (u + w), t - h / 2.0 + k * (v + w)) for k in range(m) for i in range(n)
    ]
    cells = [_panel((x, y, x + u, y + v), sizes["inner_radius"], "inner_radius") for x, y in corners]
    outer = _panel((-b / 2.0, -h / 2.0, b / 2.0, h / 2.0), sizes["outer_radius"], "outer_radius")
    return _hollowed("multi_cell", sizes, outer, cells)


def extrusion(
    width: float,
    height: float,
    voids: Iterable[tuple[float, float, float, float] | Outline],
    *,
    outer_radius: float = 0.0,
    inner_radius: float = 0.0,
) -> TradeShape:
    """Return a rectangular extrusion with any voids, its lower left corner at the origin.

    Parameters
    ----------
    width, height : float
        Outside, along x and y.
    voids : iterable
        Each ``(left, bottom, width, height)`` of a rectangle, as dimensioned from the lower left corner, or
        an `Outline` of any form.
    outer_radius, inner_radius : float
        Of the outer corners; of the corners of the rectangular voids.

    Examples
    --------
    >>> two = extrusion(120, 60, [(6, 6, 61.5, 48), (72.5, 6, 41.5, 48)], outer_radius=9, inner_radius=5)
    >>> len(two.voids), round(two.area, 2)
    (2, 2229.39)
    """
    sizes = above_zero(width=width, height=height)
    sizes |= zero_or_more(outer_radius=outer_radius, inner_radius=inner_radius)
    loops = [
        given if isinstance(given, Outline) else _pocket(k, given, sizes) for k, given in enumerate(voids)
    ]
    outer = _panel((0.0, 0.0, sizes["width"], sizes["height"]), sizes["outer_radius"], "outer_radius")
    return _hollowed("extrusion", sizes | {"voids": float(len(loops))}, outer, loops)


def _pocket(k: int, given: tuple[float, float, float, float], sizes: Mapping[str, float]) -> Outline:
    """Return the rectangular void number ``k``, or say which of its numbers is impossible."""
    try:
        numbers = finite_array(f"void {k}", given)
    except ValueError as error:
        raise OutlineError(str(error)) from None
    if len(numbers) != 4:
        raise OutlineError(f"void {k} must be (left, bottom, width, height) or an Outline, got {given!r:.80}")
    left, bottom, wide, high = (float(value) for value in numbers)
    named = zip(("left", "bottom", "width", "height"), (left, bottom, wide, high), strict=True)
    above_zero(**{f"void {k}: {name}": value for name, value in named})
    less(f"void {k}: its right side at", left + wide, "the width", sizes["width"])
    less(f"void {k}: its top at", bottom + high, "the height", sizes["height"])
    return _panel((left, bottom, left + wide, bottom + high), sizes["inner_radius"], "inner_radius")
