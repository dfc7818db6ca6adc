"""Where along the boundary material counts for the torsion constant."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.checks import Floats
from torsionfe.output.contour import draw_marks
from torsionfe.output.outline_plot import outline_path
from torsionfe.output.section_view import Scale, legend_above, level_values, place_label, section_figure_size, sideways
from torsionfe.output.style import INK, MATERIAL, frame_section, look, new_axes, stress_colours
from torsionfe.torsion.boundary import along_sides
from torsionfe.torsion.sensitivity import BoundarySensitivity, boundary_sensitivity
from torsionfe.torsion.solution import TorsionSolution

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.collections import LineCollection
    from matplotlib.colorbar import Colorbar
    from matplotlib.legend import Legend
    from matplotlib.lines import Line2D
    from matplotlib.patches import PathPatch
    from matplotlib.text import Annotation

__all__ = ["SensitivityPlot", "plot_sensitivity"]

_PARTS = 6  # pieces of a side
_THIN, _THICK = 1.0, 8.5  # points
_NAME = "gain of J / area added"
_MOST, _NEAR = 0.95, 2.0  # share of the boundary within the scale, and how far above it the hot spot may end it
_BAR: Any = {"aspect": 30, "fraction": 0.08, "pad": 0.03, "extendfrac": 0.04}


@dataclass(frozen=True)
class SensitivityPlot:
    """What `plot_sensitivity` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    ribbon : matplotlib.collections.LineCollection
        The boundary, the wider and darker the more material counts there.
    outline : matplotlib.patches.PathPatch
    hot_spots, corners : matplotlib.lines.Line2D or None
    label : matplotlib.text.Annotation or None
        The gain at the hot spot.
    legend : matplotlib.legend.Legend
    bar : matplotlib.colorbar.Colorbar
    """

    axes: Axes
    ribbon: LineCollection
    outline: PathPatch
    hot_spots: Line2D | None
    corners: Line2D | None
    label: Annotation | None
    legend: Legend
    bar: Colorbar


def plot_sensitivity(
    solution: TorsionSolution | BoundarySensitivity, ax: Axes | None = None, *, unit: str = ""
) -> SensitivityPlot:
    """Draw how much the torsion constant gains where material is added to the boundary.

    The gain for each area added is ``tau^2`` for ``G theta' = 1`` (length**2; Hadamard's formula), so that the hot
    spot is also where material counts most. The scale ends there, or, where only small fillets or sharp corners (whose
    gain has no bound) come near that, at what 5 % of the boundary exceed; the legend says so.

    Parameters
    ----------
    solution : TorsionSolution or BoundarySensitivity
    ax : matplotlib.axes.Axes, optional
        Drawn into; by default those of a new figure.
    unit : str
        Of the outline's lengths, for labels only.

    Returns
    -------
    SensitivityPlot

    Raises
    ------
    InputError
        Neither a solution nor a boundary sensitivity.
    """
    found = solution if isinstance(solution, BoundarySensitivity) else boundary_sensitivity(solution)
    whole = found.solution
    outline = whole.outline
    pieces, gain = _pieces(whole)
    top = _top(found)
    beyond = bool(gain.max() > 1.02 * top)
    with look():
        ax = new_axes(section_figure_size(outline)) if ax is None else ax
        frame_section(ax, outline, unit, room=0.1)
        edge = _draw_material(ax, found)
        ribbon = _draw_ribbon(ax, pieces, gain, top)
        spots, corners = draw_marks(ax, whole)
        scale = Scale.of(_NAME, f"{unit}^2" if unit else "", top)
        label = None
        if whole.hot_spots:
            places = [(spot.x, spot.y) for spot in whole.hot_spots]
            text = scale.write_with_unit(_at_hot_spot(whole))
            label = place_label(ax, outline, places, text, avoid=whole.singular_corners)
        bar = _colour_bar(ax, ribbon, top, scale, below=sideways(outline), beyond=beyond)
        marks: list[Any] = [mark for mark in (corners, spots) if mark is not None]
        key = legend_above(ax, [*marks, *_beyond_entry(beyond)], columns=2)
    return SensitivityPlot(ax, ribbon, edge, spots, corners, label, key, bar)


def _pieces(solution: TorsionSolution) -> tuple[Floats, Floats]:
    """Return short pieces of the boundary, (k, 2, 2), and the gain on each."""
    sides, t = solution.boundary.sides, np.linspace(0.0, 1.0, _PARTS + 1)
    tau, points, _ = along_sides(solution.fields.space, solution.fields.omega, sides, t)
    there = solution.frame.outward_points(points)
    pieces = np.stack([there[:, :-1], there[:, 1:]], axis=2).reshape(-1, 2, 2)
    middle = 0.5 * (tau[:, :-1] + tau[:, 1:]) * solution.frame.scale
    return pieces, (middle**2).ravel()


def _at_hot_spot(solution: TorsionSolution) -> float:
    spot = solution.hot_spot
    return np.nan if spot is None else (spot.stress_per_torque * solution.torsion_constant.value) ** 2


def _top(found: BoundarySensitivity) -> float:
    """Return where the scale ends: at the hot spot, unless hardly any of the boundary comes near it."""
    order = np.argsort(found.density)
    share = np.cumsum(found.weights[order]) / found.weights.sum()
    most = float(found.density[order[np.searchsorted(share, _MOST)]])
    peak = _at_hot_spot(found.solution)
    return peak if peak < _NEAR * most else most


def _beyond_entry(beyond: bool) -> list[Any]:
    from matplotlib.patches import Patch

    over = tuple(stress_colours().get_over())
    return [Patch(facecolor=over, edgecolor="none", label="more, off the scale")] if beyond else []


def _draw_material(ax: Axes, found: BoundarySensitivity) -> PathPatch:
    from matplotlib.patches import PathPatch

    path = outline_path(found.solution.outline)
    ax.add_patch(PathPatch(path, facecolor=MATERIAL, edgecolor="none", zorder=1.0))
    edge = PathPatch(path, facecolor="none", edgecolor=INK, linewidth=0.5, joinstyle="miter", zorder=3.0)
    ax.add_patch(edge)
    return edge


def _draw_ribbon(ax: Axes, pieces: Floats, gain: Floats, top: float) -> LineCollection:
    """Draw the boundary in pieces, the ones that count least first, so that none hides a wider one."""
    from matplotlib.collections import LineCollection
    from matplotlib.colors import Normalize

    order = np.argsort(gain)
    share = np.minimum(gain[order] / top, 1.0)
    drawn: Any = {"cmap": stress_colours(), "norm": Normalize(0.0, top), "capstyle": "round", "zorder": 2.0}
    ribbon = LineCollection(list(pieces[order]), linewidths=_THIN + (_THICK - _THIN) * share, **drawn)
    ribbon.set_array(np.where(gain[order] > 1.02 * top, 1.1 * top, share * top))
    ribbon.set_rasterized(True)
    ax.add_collection(ribbon, autolim=False)
    return ribbon


def _colour_bar(ax: Axes, ribbon: LineCollection, top: float, scale: Scale, *, below: bool, beyond: bool) -> Colorbar:
    ticks = level_values(6, 0.0, top)
    extend = "max" if beyond else "neither"
    bar = ax.figure.colorbar(
        ribbon, ax=ax, location="bottom" if below else "right", extend=extend, **_BAR
    )
    bar.set_ticks(list(ticks), minor=False)
    bar.ax.minorticks_off()
    (bar.ax.xaxis if below else bar.ax.yaxis).set_major_formatter(scale.write)
    bar.set_label(scale.label)
    return bar
