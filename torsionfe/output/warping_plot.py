"""The warping function: how the section moves out of its plane, as contours and as a raised surface."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import positive
from torsionfe.errors import InputError
from torsionfe.output.sampled import Samples, sampled
from torsionfe.output.section_view import (
    Scale,
    colour_bar,
    draw_edge,
    fill,
    legend_above,
    level_values,
    section_figure_size,
)
from torsionfe.output.style import INK, QUIET, TWIST_CENTRE, frame_section, look, new_axes, warping_colours
from torsionfe.torsion.solution import TorsionSolution

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.colorbar import Colorbar
    from matplotlib.contour import ContourSet
    from matplotlib.legend import Legend
    from matplotlib.lines import Line2D
    from matplotlib.patches import PathPatch
    from mpl_toolkits.mplot3d.art3d import Line3DCollection, Poly3DCollection

__all__ = ["WarpingPlot", "WarpingSurface", "plot_warping", "plot_warping_surface"]

_NAME = "warping function"
_STILL = 1e-9  # of the section's size squared: a section that does not warp at all


@dataclass(frozen=True)
class WarpingPlot:
    """What `plot_warping` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    contours : matplotlib.contour.ContourSet
    zero : matplotlib.contour.ContourSet or None
        Where the section stays in its plane.
    outline : matplotlib.patches.PathPatch
    centre : matplotlib.lines.Line2D
        Centre of twist.
    legend : matplotlib.legend.Legend
    bar : matplotlib.colorbar.Colorbar
    """

    axes: Axes
    contours: ContourSet
    zero: ContourSet | None
    outline: PathPatch
    centre: Line2D
    legend: Legend
    bar: Colorbar


@dataclass(frozen=True)
class WarpingSurface:
    """What `plot_warping_surface` drew.

    Attributes
    ----------
    axes : mpl_toolkits.mplot3d.Axes3D
    surface : mpl_toolkits.mplot3d.art3d.Poly3DCollection
    flat, raised : mpl_toolkits.mplot3d.art3d.Line3DCollection
        The outline, in its plane below the surface and along the surface's rim.
    bar : matplotlib.colorbar.Colorbar
    """

    axes: Any
    surface: Poly3DCollection
    flat: Line3DCollection
    raised: Line3DCollection
    bar: Colorbar


def _warps(solution: TorsionSolution) -> bool:
    """Return whether a section leaves its plane by more than rounding."""
    low, high = solution.warping_extremes
    return high - low > _STILL * solution.outline.size**2


def _limits(solution: TorsionSolution) -> tuple[float, float]:
    """Return the ends of the warping function's scale; of some width where a section does not warp."""
    still = 1e-3 * solution.outline.size**2
    return solution.warping_extremes if _warps(solution) else (-still, still)


def _scale(solution: TorsionSolution, unit: str) -> Scale:
    name = _NAME if _warps(solution) else f"{_NAME} (zero: does not warp)"
    return Scale.of(name, f"{unit}^2" if unit else "", max(map(abs, _limits(solution))))


def plot_warping(
    solution: TorsionSolution, ax: Axes | None = None, *, unit: str = "", levels: int | ArrayLike = 14
) -> WarpingPlot:
    """Draw the normalised warping function: displacement along the bar for a twist rate of 1.

    Parameters
    ----------
    solution : TorsionSolution
    ax : matplotlib.axes.Axes, optional
        Drawn into; by default those of a new figure.
    unit : str
        Of the outline's lengths, for labels only.
    levels : int or array_like of shape (n,)
        About how many bands, or the values between them (length**2).

    Returns
    -------
    WarpingPlot
        The function is that about the centre of twist (Trefftz 1935), so that its mean is zero.
    """
    samples = sampled(solution)
    low, high = _limits(solution)
    values = level_values(levels, low, high)
    scale = _scale(solution, unit)
    outline = solution.outline
    with look():
        ax = new_axes(section_figure_size(outline)) if ax is None else ax
        frame_section(ax, outline, unit)
        edge = draw_edge(ax, outline)
        shown = samples.warping if _warps(solution) else np.zeros_like(samples.warping)
        contours = fill(ax, samples, shown, values, colours=warping_colours(), inside=edge)
        zero = _draw_zero(ax, samples, edge) if _warps(solution) else None
        x, y = solution.centre_of_twist
        (centre,) = ax.plot([x], [y], **TWIST_CENTRE.options(), label="centre of twist", zorder=5.0)
        _include(ax, x, y, 0.06 * outline.size)
        bar = colour_bar(ax, contours, values, scale, outline)
        key = legend_above(ax, [centre, *_zero_entry(zero)], columns=2)
    return WarpingPlot(ax, contours, zero, edge, centre, key, bar)


def _draw_zero(ax: Axes, samples: Samples, inside: PathPatch) -> ContourSet:
    zero = ax.tricontour(samples.grid, samples.warping, levels=[0.0], colors=INK, linewidths=1.1, linestyles="--")
    zero.set_clip_path(inside)
    return zero


def _zero_entry(zero: ContourSet | None) -> list[Line2D]:
    from matplotlib.lines import Line2D

    return [] if zero is None else [Line2D([], [], color=INK, linewidth=1.1, linestyle="--", label="no displacement")]


def _include(ax: Axes, x: float, y: float, room: float) -> None:
    """Widen the axes so that a point outside the section (a channel's centre of twist) is seen."""
    (x0, x1), (y0, y1) = ax.get_xlim(), ax.get_ylim()
    ax.set_xlim(min(x0, x - room), max(x1, x + room))
    ax.set_ylim(min(y0, y - room), max(y1, y + room))


def plot_warping_surface(
    solution: TorsionSolution,
    ax: Any = None,
    *,
    unit: str = "",
    height: float = 0.45,
    view: tuple[float, float] = (28.0, -58.0),
) -> WarpingSurface:
    """Draw the section raised by its warping function.

    Parameters
    ----------
    solution : TorsionSolution
    ax : mpl_toolkits.mplot3d.Axes3D, optional
        Made with ``projection="3d"``; by default those of a new figure.
    unit : str
        Of the outline's lengths, for labels only.
    height : float
        Of the surface, from its lowest to its highest point, as a share of the section's size.
    view : tuple of float
        Elevation and azimuth in degrees.

    Returns
    -------
    WarpingSurface

    Raises
    ------
    InputError
        ``ax`` is not three-dimensional.
    """
    share = positive("height", height)
    samples = sampled(solution, parts=_surface_parts(solution))
    low, high = _limits(solution)
    scale = _scale(solution, unit)
    with look():
        ax = _axes_3d(ax)
        surface = ax.plot_trisurf(
            *samples.points.T,
            samples.warping,
            triangles=samples.triangles,
            cmap=warping_colours(),
            vmin=low,
            vmax=high,
            linewidth=0.0,
            antialiased=False,
        )
        surface.set_rasterized(True)
        surface.set_clip_on(False)
        below, above = _draw_rims(ax, samples, low)
        _set_box(ax, solution, (low, high), share, unit)
        ax.view_init(*view)
        bar = ax.figure.colorbar(surface, ax=ax, location="right", fraction=0.04, pad=0.02, shrink=0.62, aspect=22)
        bar.ax.yaxis.set_major_formatter(scale.write)
        bar.set_label(scale.label)
    return WarpingSurface(ax, surface, below, above, bar)


def _surface_parts(solution: TorsionSolution) -> int:
    """Return a coarser split than that of contours: each triangle is drawn and sorted by itself."""
    return int(np.clip(np.sqrt(20_000 / len(solution.mesh.triangles)), 1, 6))


def _axes_3d(ax: Any) -> Any:
    from matplotlib.figure import Figure

    if ax is None:
        return Figure(figsize=(6.4, 4.4), layout="constrained").add_subplot(projection="3d")
    if not hasattr(ax, "plot_trisurf"):
        raise InputError("ax must be three-dimensional: figure.add_subplot(projection='3d') makes such axes")
    return ax


def _draw_rims(ax: Any, samples: Samples, floor: float) -> tuple[Line3DCollection, Line3DCollection]:
    """Draw the outline in its plane, at the lowest point of the surface, and raised along the surface's rim."""
    from mpl_toolkits.mplot3d.art3d import Line3DCollection

    ends = np.sort(samples.triangles[:, [[0, 1], [1, 2], [2, 0]]].reshape(-1, 2), axis=1)
    sides, uses = np.unique(ends, axis=0, return_counts=True)
    rim = sides[uses == 1]
    raised = np.column_stack([samples.points, samples.warping])[rim]
    flat = raised.copy()
    flat[..., 2] = floor
    below = ax.add_collection3d(Line3DCollection(flat, colors=QUIET, linewidths=0.8, zorder=0.0))
    above = ax.add_collection3d(Line3DCollection(raised, colors=INK, linewidths=0.9, zorder=10.0))
    below.set_clip_on(False)
    above.set_clip_on(False)
    return below, above


def _set_box(
    ax: Any, solution: TorsionSolution, limits: tuple[float, float], share: float, unit: str
) -> None:
    """Show lengths to scale in the plane and the warping function ``share`` of the size high, on clean panes."""
    from matplotlib.ticker import MaxNLocator

    x0, y0, x1, y1 = solution.outline.bounds
    size = solution.outline.size
    wide, deep = max(x1 - x0, 0.15 * size), max(y1 - y0, 0.15 * size)
    ax.set_xlim(0.5 * (x0 + x1) - 0.5 * wide, 0.5 * (x0 + x1) + 0.5 * wide)
    ax.set_ylim(0.5 * (y0 + y1) - 0.5 * deep, 0.5 * (y0 + y1) + 0.5 * deep)
    ax.set_zlim(*limits)
    ax.set_box_aspect((wide / size, deep / size, share), zoom=1.04)
    for axis, name, low, high in ((ax.xaxis, "x", x0, x1), (ax.yaxis, "y", y0, y1)):
        scale = Scale.of(name, unit, max(abs(low), abs(high)))
        axis.set_major_locator(MaxNLocator(max(2, round(5 * (high - low) / size))))
        axis.set_major_formatter(scale.write)
        axis.set_label_text(scale.label)
    ax.set_zticks([])
    for axis in (ax.xaxis, ax.yaxis, ax.zaxis):
        axis.set_pane_color((1.0, 1.0, 1.0, 0.0))
        axis.line.set_color(QUIET)
    ax.zaxis.line.set_visible(False)
    ax.grid(False)
