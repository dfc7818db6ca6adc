"""An outline drawn to scale, with its overall dimensions and the numbers of its vertices."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.outline import arcs
from torsionfe.outline.edges import Edges
from torsionfe.outline.fillets import SMOOTH
from torsionfe.outline.outline import Outline
from torsionfe.output.style import INK, MATERIAL, QUIET, label_axes, look, new_axes
from torsionfe.text import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.lines import Line2D
    from matplotlib.patches import PathPatch
    from matplotlib.path import Path
    from matplotlib.text import Annotation, Text

__all__ = ["OutlinePlot", "outline_path", "plot_outline"]

_MOST_NUMBERS = 60
_ROOM = 0.06  # of the size: a smooth vertex nearer to another gets no number


@dataclass(frozen=True)
class OutlinePlot:
    """What `plot_outline` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    material : matplotlib.patches.PathPatch
        The cross-section, its voids left open.
    vertices : matplotlib.lines.Line2D
        A dot at every numbered vertex.
    numbers : dict of int to matplotlib.text.Annotation
        The label of each numbered vertex of the outer loop, by its number.
    dimensions : tuple of matplotlib.text.Text
        Overall width and height.
    """

    axes: Axes
    material: PathPatch
    vertices: Line2D
    numbers: dict[int, Annotation]
    dimensions: tuple[Text, ...]


def outline_path(outline: Outline) -> Path:
    """Return the outline as a matplotlib path: voids stay open, arcs are cubic curves right to 1e-7.

    Every edge becomes one cubic per 30 degrees, with handles of ``4/3 tan(sweep / 4)`` radii (common practice).
    """
    from matplotlib.path import Path

    edges = outline.edges
    parts = np.maximum(np.ceil(np.abs(arcs.sweep(edges.bulge)) / (np.pi / 6.0)), 1.0).astype(int)
    row = np.repeat(np.arange(len(edges)), parts)
    within = np.arange(len(row)) - np.repeat(np.cumsum(parts) - parts, parts)
    bulge = np.tan(np.arctan(edges.bulge) / parts)[row]
    begin, end = within / parts[row], (within + 1) / parts[row]
    p, q = edges.points(row, begin), edges.points(row, end)
    handle = (np.hypot(*(q - p).T) * (1.0 + bulge**2) / 3.0)[:, None]
    first, second = p + handle * edges.tangents(row, begin), q - handle * edges.tangents(row, end)
    # per loop: move to its first point, three points a cubic, close
    points, codes = [], []
    for loop in range(len(outline.voids) + 1):
        mine = edges.loop[row] == loop
        cubics = np.stack([first[mine], second[mine], q[mine]], axis=1).reshape(-1, 2)
        points += [p[mine][:1], cubics, p[mine][:1]]
        codes += [[Path.MOVETO], [Path.CURVE4] * len(cubics), [Path.CLOSEPOLY]]
    return Path(np.concatenate(points), np.concatenate(codes).astype(np.uint8))


def plot_outline(
    outline: Outline,
    ax: Axes | None = None,
    *,
    unit: str = "",
    vertex_numbers: bool = True,
    dimensions: bool = True,
) -> OutlinePlot:
    """Draw an outline to scale: grey where there is material, with dimensions and vertex numbers.

    The numbers are those that ``filleted(radius, at=[...])`` takes, of the outer loop; voids carry their own
    number, as errors name them. Every corner is numbered, and of the vertices where edges meet smoothly those
    with room for it, unless there are more than 60 vertices.

    Parameters
    ----------
    outline : Outline
    ax : matplotlib.axes.Axes, optional
        Drawn into; a new figure by default.
    unit : str
        Of the outline's lengths, for the labels.
    vertex_numbers : bool
        Whether to number the vertices.
    dimensions : bool
        Whether to draw overall width and height.

    Returns
    -------
    OutlinePlot
    """
    from matplotlib.patches import PathPatch

    with look():
        ax = new_axes() if ax is None else ax
    material = PathPatch(outline_path(outline), facecolor=MATERIAL, edgecolor=INK, linewidth=1.2)
    ax.add_patch(material)
    edges = outline.edges
    rows = _numbered(outline, edges) if vertex_numbers else np.zeros(0, dtype=np.int64)
    (dots,) = ax.plot(*edges.start[rows].T, "o", color=INK, markersize=3.0)
    numbers = _draw_numbers(ax, edges, rows)
    if vertex_numbers:
        for k, void in enumerate(outline.voids):
            ax.text(*void.centroid, f"void {k}", ha="center", va="center", fontsize="small", color=QUIET)
    sizes = _draw_dimensions(ax, outline, unit) if dimensions else ()
    ax.set_aspect("equal")
    x0, y0, x1, y1 = outline.bounds
    margin = 0.1 * outline.size
    behind = 2.9 * margin if dimensions else margin
    ax.set_xlim(x0 - behind, x1 + margin)
    ax.set_ylim(y0 - behind, y1 + margin)
    label_axes(ax, unit)
    return OutlinePlot(ax, material, dots, numbers, sizes)


def _numbered(outline: Outline, edges: Edges) -> Ints:
    """Return the vertices of the outer loop with a number: all corners, smooth ones where there is room."""
    rows = np.arange(len(outline.vertices))
    corner = np.abs(edges.interior_angle[rows] - np.pi) > SMOOTH
    shown = list(rows[corner])
    room = _ROOM * outline.size
    for row in rows[~corner] if len(rows) <= _MOST_NUMBERS else ():
        if not shown or np.hypot(*(edges.start[shown] - edges.start[row]).T).min() > room:
            shown.append(row)
    return np.array(sorted(shown), dtype=np.int64)


def _outward(edges: Edges, rows: Ints) -> Floats:
    """Return the unit direction away from the material at vertices."""
    before = edges.previous[rows]
    leaving = edges.tangents(rows, np.zeros(len(rows)))
    arriving = edges.tangents(before, np.ones(len(rows)))
    normal = np.stack([arriving[:, 1] + leaving[:, 1], -arriving[:, 0] - leaving[:, 0]], axis=1)
    return np.asarray(normal / np.hypot(*normal.T)[:, None], dtype=float)


def _draw_numbers(ax: Axes, edges: Edges, rows: Ints) -> dict[int, Annotation]:
    return {
        int(row): ax.annotate(
            str(row),
            tuple(edges.start[row]),
            xytext=tuple(9.0 * away),
            textcoords="offset points",
            ha="center",
            va="center",
            fontsize="small",
            color=INK,
        )
        for row, away in zip(rows, _outward(edges, rows), strict=True)
    }


def _draw_dimensions(ax: Axes, outline: Outline, unit: str) -> tuple[Text, ...]:
    """Draw the overall width below and the overall height to the left."""
    x0, y0, x1, y1 = outline.bounds
    step = 0.14 * outline.size
    x, y = x0 - step, y0 - step
    for corner in (x0, x1):
        ax.plot([corner, corner], [y0 - 0.3 * step, y - 0.15 * step], color=QUIET, linewidth=0.8)
    for corner in (y0, y1):
        ax.plot([x0 - 0.3 * step, x - 0.15 * step], [corner, corner], color=QUIET, linewidth=0.8)
    arrow = {"arrowstyle": "<->", "shrinkA": 0.0, "shrinkB": 0.0, "color": QUIET, "linewidth": 0.8}
    ax.annotate("", (x1, y), (x0, y), arrowprops=arrow)
    ax.annotate("", (x, y1), (x, y0), arrowprops=arrow)
    wide, high = (f"{number(value, 5)} {unit}".strip() for value in (x1 - x0, y1 - y0))
    beyond: dict[str, Any] = {"textcoords": "offset points", "color": QUIET}  # of the line, where no vertex numbers are
    return (
        ax.annotate(wide, (0.5 * (x0 + x1), y), (0.0, -2.0), **beyond, ha="center", va="top"),
        ax.annotate(high, (x, 0.5 * (y0 + y1)), (-2.0, 0.0), **beyond, ha="right", va="center", rotation=90),
    )
