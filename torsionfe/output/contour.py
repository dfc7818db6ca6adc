"""The shear stress over the section: contours, lines of shear flow, hot spots and sharp corners."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats, finite
from torsionfe.errors import InputError
from torsionfe.output.sampled import Samples, sampled
from torsionfe.output.section_view import (
    Scale,
    colour_bar,
    draw_edge,
    fill,
    legend_above,
    level_values,
    place_label,
    section_figure_size,
)
from torsionfe.output.style import (
    HOT_SPOT,
    INK,
    SINGULAR,
    Mark,
    frame_section,
    look,
    new_axes,
    stress_colours,
)
from torsionfe.torsion.solution import TorsionSolution

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.collections import LineCollection, PathCollection
    from matplotlib.colorbar import Colorbar
    from matplotlib.contour import ContourSet
    from matplotlib.legend import Legend
    from matplotlib.lines import Line2D
    from matplotlib.patches import PathPatch
    from matplotlib.text import Annotation

__all__ = ["StressPlot", "StressScale", "draw_flow", "draw_marks", "draw_mesh", "plot_stress", "stress_scale"]

_QUANTILE = 0.98  # of the area: the end of the scale where no finite peak exists
_BEYOND = ("off the scale: 2 % of the area", "above that, off the scale")  # without and with a hot spot


@dataclass(frozen=True)
class StressPlot:
    """What `plot_stress` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
        ``axes.figure`` is what `torsionfe.output.figures.save_figure` writes.
    contours : matplotlib.contour.ContourSet
        Size of the shear stress.
    outline : matplotlib.patches.PathPatch
    flow : matplotlib.contour.ContourSet or None
        Lines of equal stress function, along which the shear stress points.
    arrows : matplotlib.collections.PathCollection or None
        Its direction.
    mesh : matplotlib.collections.LineCollection or None
    hot_spots, corners : matplotlib.lines.Line2D or None
        Markers of the hot spots and of the sharp re-entrant corners.
    label : matplotlib.text.Annotation or None
        Stress at the hot spot.
    legend : matplotlib.legend.Legend or None
    bar : matplotlib.colorbar.Colorbar
    levels : ndarray of shape (k,)
        Stress at which the bands begin and end.
    """

    axes: Axes
    contours: ContourSet
    outline: PathPatch
    flow: ContourSet | None
    arrows: PathCollection | None
    mesh: LineCollection | None
    hot_spots: Line2D | None
    corners: Line2D | None
    label: Annotation | None
    legend: Legend | None
    bar: Colorbar
    levels: Floats


@dataclass(frozen=True, slots=True)
class StressScale:
    """How stress is shown: for a torque or per torque, in which unit.

    Attributes
    ----------
    factor : float
        Torque that stress per torque is multiplied by; 1 without one.
    name, unit : str
    """

    factor: float
    name: str
    unit: str

    def at_hot_spot(self, solution: TorsionSolution) -> float:
        """Return the stress at the hot spot; NaN where there is none."""
        spot = solution.hot_spot
        return float("nan") if spot is None else spot.stress_per_torque * abs(self.factor)


def stress_scale(torque: float | None, unit: str, stress_unit: str) -> StressScale:
    """Return how stress is shown.

    Raises
    ------
    InputError
        The torque is 0 or no number.
    """
    if torque is None:
        return StressScale(1.0, "shear stress / torque", f"1/{unit}^3" if unit else "")
    load = finite("torque", torque)
    if load == 0.0:
        raise InputError("torque is 0, so there is no stress to draw: leave it out to draw the stress per torque")
    return StressScale(load, "shear stress", stress_unit)


def plot_stress(
    solution: TorsionSolution,
    ax: Axes | None = None,
    *,
    torque: float | None = None,
    unit: str = "",
    stress_unit: str = "",
    levels: int | ArrayLike = 14,
    flow: bool = True,
    mesh: bool = False,
    legend: bool = True,
) -> StressPlot:
    """Draw the size of the shear stress over the section, its direction, its hot spots and its sharp corners.

    The colour scale ends at the hot spot. Beside sharp re-entrant corners, where the elastic stress is unbounded,
    what lies above it is shown in a colour of its own; where no finite peak exists, the scale ends at the stress
    that 2 % of the area exceed. The legend says which.

    Parameters
    ----------
    solution : TorsionSolution
    ax : matplotlib.axes.Axes, optional
        Drawn into; by default those of a new figure that no window and no pyplot knows of.
    torque : float, optional
        force * length; without it, stress per torque is drawn (1/length**3).
    unit, stress_unit : str
        Of the outline's lengths, and of stress; for labels only.
    levels : int or array_like of shape (n,)
        About how many bands, or the stresses between them.
    flow : bool
        Whether to draw lines of shear flow: level lines of the stress function (Prandtl 1903) in equal steps, so
        that they lie closer where the stress is larger. Arrows point along the stress.
    mesh : bool
        Whether to draw the elements.
    legend : bool
        Whether to explain the markers above the axes.

    Returns
    -------
    StressPlot

    Raises
    ------
    InputError
        The torque is 0 or no number; levels that don't rise.
    """
    shown = stress_scale(torque, unit, stress_unit)
    samples = sampled(solution)
    size = samples.magnitude * abs(shown.factor)
    top, clipped = _end_of_scale(solution, samples, size, shown)
    values = level_values(levels, 0.0, top)
    outline = solution.outline
    with look():
        ax = new_axes(section_figure_size(outline)) if ax is None else ax
        frame_section(ax, outline, unit, room=0.09)
        edge = draw_edge(ax, outline)
        beyond = clipped or bool(size.max() > values[-1] * 1.02)
        contours = fill(ax, samples, size, values, colours=stress_colours(), inside=edge, beyond=beyond)
        lines, arrows = draw_flow(ax, solution, samples, shown.factor) if flow else (None, None)
        triangles = draw_mesh(ax, solution) if mesh else None
        spots, corners = draw_marks(ax, solution)
        scale = Scale.of(shown.name, shown.unit, values[-1])
        label = _label_hot_spot(ax, solution, scale.write_with_unit(shown.at_hot_spot(solution)))
        bar = colour_bar(ax, contours, values, scale, outline)
        over = "" if not beyond else "off the scale" if values[-1] != top else _BEYOND[spots is not None]
        key = _draw_legend(ax, (corners, spots), over, lines) if legend else None
    return StressPlot(
        ax, contours, edge, lines, arrows, triangles, spots, corners, label, key, bar, values
    )


def _end_of_scale(
    solution: TorsionSolution, samples: Samples, size: Floats, shown: StressScale
) -> tuple[float, bool]:
    """Return where the colour scale ends, and whether stress is cut off there."""
    if solution.hot_spot is not None:
        return shown.at_hot_spot(solution), bool(len(solution.singular_corners))
    corners = samples.points[samples.triangles]
    u, v = corners[:, 1] - corners[:, 0], corners[:, 2] - corners[:, 0]
    area = np.abs(u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])
    mean = size[samples.triangles].mean(axis=1)
    order = np.argsort(mean)
    share = np.cumsum(area[order]) / area.sum()
    return float(mean[order[np.searchsorted(share, _QUANTILE)]]), True


# --- shear flow -------------------------------------------------------------------------------------------

_GAP = 0.014  # between lines of shear flow at a high stress, of the section's size
_ARROW_EVERY = 0.45  # of the section's size


def draw_flow(
    ax: Axes, solution: TorsionSolution, samples: Samples, sense: float = 1.0, span: float | None = None
) -> tuple[ContourSet, PathCollection]:
    """Draw level lines of the stress function, with arrowheads along the shear stress of a torque.

    Parameters
    ----------
    ax : matplotlib.axes.Axes
    solution : TorsionSolution
    samples : Samples
    sense : float
        Sign of the torque.
    span : float, optional
        Width of what is shown (length), which the distance of lines and arrows goes by; the section by default.
    """
    phi = samples.stress_function
    shown = solution.outline.size if span is None else span
    # |grad phi| = stress for G theta' = 1; the 90th percentile leaves out what a fillet adds
    steep = float(np.quantile(samples.magnitude, 0.9)) * solution.torsion_constant.value
    low, high = float(phi.min()), float(phi.max())
    count = int(np.clip(round((high - low) / (steep * _GAP * shown)), 4, 10))
    values = low + (high - low) * (np.arange(count) + 0.5) / count
    lines = ax.tricontour(samples.grid, phi, levels=list(values), colors=INK, linewidths=0.5, alpha=0.75, zorder=2.0)
    return lines, _draw_arrows(ax, lines, samples, np.sign(sense), _ARROW_EVERY * shown)


def _draw_arrows(
    ax: Axes, lines: ContourSet, samples: Samples, sense: float, every: float
) -> PathCollection:
    """Draw arrowheads at equal distances along the level lines."""
    from matplotlib.collections import PathCollection
    from matplotlib.path import Path
    from matplotlib.transforms import Affine2D

    # on every other line: heads side by side run into each other
    places = [_spaced(np.asarray(segment), every) for group in lines.allsegs[::2] for segment in group]
    points = np.concatenate([np.empty((0, 2)), *places])
    heads = []
    if len(points):
        distance = np.hypot(*(points[:, None] - samples.points[None, :: max(1, len(samples.points) // 4000)]).T)
        near = np.argmin(distance, axis=0) * max(1, len(samples.points) // 4000)
        along = samples.stress[near] * sense
        along = along / np.maximum(np.hypot(*along.T), 1e-300)[:, None]
        across = np.stack([-along[:, 1], along[:, 0]], axis=1)
        tip = np.stack([3.4 * along, -2.8 * along + 2.2 * across, -1.5 * along, -2.8 * along - 2.2 * across], axis=1)
        heads = [Path(np.append(t, t[:1], axis=0), closed=True) for t in tip]
    arrows = PathCollection(
        heads, offsets=points, offset_transform=ax.transData, facecolor=INK, edgecolor="none", zorder=2.1
    )
    arrows.set_transform(Affine2D().scale(1.0 / 72.0) + ax.figure.dpi_scale_trans)  # heads are in points
    ax.add_collection(arrows, autolim=False)
    return arrows


def _spaced(line: Floats, every: float) -> Floats:
    """Return points at equal distances along a line, none where it is short."""
    walked = np.append(0.0, np.cumsum(np.hypot(*np.diff(line, axis=0).T)))
    count = int(walked[-1] / every + 0.5)
    at = (np.arange(count) + 0.25) / max(count, 1) * walked[-1]
    return np.stack([np.interp(at, walked, line[:, k]) for k in range(2)], axis=1)


# --- marks ------------------------------------------------------------------------------------------------


def draw_mesh(ax: Axes, solution: TorsionSolution) -> LineCollection:
    """Draw the sides between elements; those on the boundary are the outline itself."""
    from matplotlib.collections import LineCollection

    mesh = solution.mesh
    inner = np.ones(len(mesh.links), dtype=bool)
    inner[mesh.side_link] = False
    width = 0.35 * min(1.0, math.sqrt(3000.0 / len(mesh.triangles)))  # a fine mesh stays grey
    sides = LineCollection(list(mesh.nodes[mesh.links[inner]]), colors=INK, linewidths=width, alpha=0.45, zorder=1.5)
    sides.set_rasterized(True)
    ax.add_collection(sides, autolim=False)
    return sides


def draw_marks(
    ax: Axes, solution: TorsionSolution, window: tuple[float, float, float, float] | None = None
) -> tuple[Line2D | None, Line2D | None]:
    """Mark the hot spots and the sharp re-entrant corners, each with its name for a legend.

    Parameters
    ----------
    ax : matplotlib.axes.Axes
    solution : TorsionSolution
    window : tuple of float, optional
        ``(x_min, y_min, x_max, y_max)``: only those inside.
    """
    spots, corners = solution.hot_spots, solution.singular_corners
    named = "largest stress elsewhere" if len(corners) else "hot spot"
    equal = f" ({len(spots)} equal)" if len(spots) > 1 else ""
    many = f"{len(corners)} sharp re-entrant corners" if len(corners) > 1 else "sharp re-entrant corner"

    def mark(points: ArrayLike, symbol: Mark, label: str) -> Line2D | None:
        where = np.reshape(np.asarray(points, dtype=float), (-1, 2))
        if window is not None:
            where = where[((where >= window[:2]) & (where <= window[2:])).all(axis=1)]
        if not len(where):
            return None
        return ax.plot(*where.T, **symbol.options(), label=label, zorder=5.0)[0]

    return (
        mark([(spot.x, spot.y) for spot in spots], HOT_SPOT, named + equal),
        mark(corners, SINGULAR, f"{many}: stress unbounded"),
    )


def _label_hot_spot(ax: Axes, solution: TorsionSolution, text: str) -> Annotation | None:
    places = [(spot.x, spot.y) for spot in solution.hot_spots]
    return place_label(ax, solution.outline, places, text, avoid=solution.singular_corners) if places else None


def _draw_legend(
    ax: Axes, marks: tuple[Line2D | None, ...], over: str, lines: ContourSet | None
) -> Legend:
    """Explain markers, lines and what lies over the end of the scale, above the axes."""
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    entries: list[Line2D | Patch] = [mark for mark in marks if mark is not None]
    if over:
        entries.append(Patch(facecolor=tuple(stress_colours().get_over()), edgecolor="none", label=over))
    if lines is not None:
        entries.append(Line2D([], [], color=INK, linewidth=0.6, marker=">", markersize=3.5, label="shear flow"))
    return legend_above(ax, entries)
