"""The hand method beside the answer, as a picture: the stress in the section, and how far off each method is."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import InputError
from torsionfe.output.contour import StressPlot, plot_stress, stress_scale
from torsionfe.output.section_view import Scale, section_figure_size
from torsionfe.output.style import ACCENTS, HATCH, INK, QUIET, look, plain, with_unit, written_number
from torsionfe.study.compare import NOT_CONSERVATIVE, Comparison
from torsionfe.text import number, percent, signed_percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.container import BarContainer
    from matplotlib.figure import Figure
    from matplotlib.patches import Rectangle
    from matplotlib.text import Text

__all__ = ["ComparisonPlot", "ErrorBars", "draw_errors", "plot_comparison"]


@dataclass(frozen=True)
class ErrorBars:
    """One panel of `plot_comparison`: a bar a method, from the answer to what the method says.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    bars : matplotlib.container.BarContainer
        Hatched where the method is not conservative.
    band : matplotlib.patches.Rectangle or None
        What is not known exactly: the bracket of ``J``, the error of the hot spot.
    values : tuple of matplotlib.text.Text
        What each method says, and how far off that is.
    """

    axes: Axes
    bars: BarContainer
    band: Rectangle | None
    values: tuple[Text, ...]


@dataclass(frozen=True)
class ComparisonPlot:
    """What `plot_comparison` drew.

    Attributes
    ----------
    axes : tuple of matplotlib.axes.Axes
        Of the section, of the torsion constant and of the peak stress.
    stress : StressPlot
    constant, peak : ErrorBars
    """

    axes: tuple[Axes, Axes, Axes]
    stress: StressPlot
    constant: ErrorBars
    peak: ErrorBars


def plot_comparison(
    comparison: Comparison, figure: Figure | None = None, *, unit: str = "", stress_unit: str = ""
) -> ComparisonPlot:
    """Draw the stress contour of a section, and beside it the hand method's errors.

    Parameters
    ----------
    comparison : Comparison
    figure : matplotlib.figure.Figure, optional
        Drawn into; a new one by default.
    unit, stress_unit : str
        Of the outline's lengths, and of stress; for labels only.

    Returns
    -------
    ComparisonPlot

    Raises
    ------
    InputError
        No comparison.
    """
    from matplotlib.figure import Figure as NewFigure

    if not isinstance(comparison, Comparison):
        raise InputError(f"a Comparison is needed, got {type(comparison).__name__}: see torsionfe.compare")
    wide, high = section_figure_size(comparison.solution.outline)
    with look():
        if figure is None:
            rows = 1.1 + 0.34 * len(comparison.methods)
            figure = NewFigure(figsize=(wide + 4.6, max(high, 2.0 * rows)), layout="constrained")
        grid = figure.add_gridspec(1, 2, width_ratios=(wide, 4.6))
        left, right = figure.add_subfigure(grid[0, 0]), figure.add_subfigure(grid[0, 1])
        section = left.add_subplot()
        panels = right.subplots(2, 1)
        torque = comparison.torque or None
        drawn = plot_stress(comparison.solution, section, torque=torque, unit=unit, stress_unit=stress_unit)
    constant, peak = draw_errors(comparison, (panels[0], panels[1]), unit=unit, stress_unit=stress_unit)
    return ComparisonPlot((section, panels[0], panels[1]), drawn, constant, peak)


def draw_errors(
    comparison: Comparison, axes: tuple[Axes, Axes], *, unit: str = "", stress_unit: str = "", brief: bool = False
) -> tuple[ErrorBars, ErrorBars]:
    """Draw the errors of the torsion constant and of the peak stress by each method into two axes.

    A bar is hatched where the method is not conservative; the line in the middle is the answer, with a band as wide
    as what is not known exactly. ``brief`` writes the errors only, for panels beside a table of the values.
    """
    solution, rows = comparison.solution, comparison.methods
    spot = solution.hot_spot
    j_scale = Scale.of("J", f"{unit}^4" if unit else "", max(row.method.torsion_constant for row in rows))
    shown = stress_scale(comparison.torque or None, unit, stress_unit)
    stresses = [abs(shown.factor) * row.method.stress_per_torque for row in rows]
    names = [row.method.name.replace("_", " ") for row in rows]
    with look():
        constant = _panel(
            axes[0],
            names,
            np.array([row.constant_error for row in rows]),
            unsafe=[row.stiffness == NOT_CONSERVATIVE for row in rows],
            values=["" if brief else _value(row.method.torsion_constant, 5) for row in rows],
            band=0.5 * solution.torsion_constant.rel_gap,
        )
        middle = with_unit(_value(solution.torsion_constant.value, 6), j_scale.unit)
        sure = percent(0.5 * solution.torsion_constant.rel_gap)
        axes[0].set_title(f"J by hand, off from {middle} ± {sure}", fontsize="small")
        axes[0].set_xlabel("error of J [%]")
        peak = _panel(
            axes[1],
            names,
            np.array([row.stress_error for row in rows]),
            unsafe=[row.strength == NOT_CONSERVATIVE for row in rows],
            values=["" if brief else _value(stress, 4) for stress in stresses],
            band=0.0 if spot is None or len(solution.singular_corners) else spot.rel_error,
        )
        if spot is None or math.isnan(rows[0].stress_error):
            axes[1].set_title(f"{shown.name} by hand; sharp corner, no finite peak", fontsize="small")
            axes[1].set(xticks=[], xlabel="")
        else:
            true = with_unit(_value(abs(shown.factor) * spot.stress_per_torque, 4), shown.unit)
            axes[1].set_title(f"{shown.name} by hand, off from {true} ± {percent(spot.rel_error)}", fontsize="small")
            axes[1].set_xlabel("error of the peak stress [%]")
        if brief:
            axes[0].set_title("J by hand", fontsize="small")
            axes[1].set_title("peak stress by hand", fontsize="small")
        _explain(axes[0], rows)
    return constant, peak


def _value(value: float, digits: int) -> str:
    return written_number(value, digits) if abs(value) < 1e-3 else number(value, digits)


def _panel(
    ax: Axes, names: list[str], errors: Floats, *, unsafe: list[bool], values: list[str], band: float
) -> ErrorBars:
    import matplotlib

    places = np.arange(len(names))
    known = np.where(np.isfinite(errors), 100.0 * errors, 0.0)
    colours = [ACCENTS[1].colour if bad else ACCENTS[2].colour for bad in unsafe]
    hatches = [HATCH if bad else "" for bad in unsafe]
    with matplotlib.rc_context({"hatch.color": INK}):
        bars = ax.barh(
            places, known, height=0.5, color=colours, hatch=hatches, edgecolor=INK, linewidth=0.6, zorder=2.0
        )
    span = ax.axvspan(-100.0 * band, 100.0 * band, color=QUIET, alpha=0.35, linewidth=0.0, zorder=1.0) if band else None
    ax.axvline(0.0, color=INK, linewidth=0.9, zorder=3.0)
    ax.set_yticks(places, [plain(name) for name in names])
    ax.set_ylim(len(names) - 0.4, -0.6)
    ax.tick_params(axis="y", length=0.0)
    ax.grid(axis="x", color=QUIET, alpha=0.25, linewidth=0.6)
    ax.set_axisbelow(True)
    low, high = min(0.0, float(known.min())), max(0.0, float(known.max()))
    reach = max(high - low, 200.0 * band, 1.0)
    # room for the numbers beyond the longest bar on either side
    before, after = 0.75 if low < 0.0 else 0.08, 0.75 if high > 0.0 or low == 0.0 else 0.08
    ax.set_xlim(low - before * reach, high + after * reach)
    found = []
    for place, error, value in zip(places, errors, values, strict=True):
        off = "" if math.isnan(error) else signed_percent(error).replace("-", "−")
        words = f"{value} ({off})" if value and off else value or off or "no finite peak"
        left = math.isfinite(error) and error < 0.0
        at = 0.0 if math.isnan(error) else 100.0 * float(error)
        options: dict[str, Any] = {"ha": "right" if left else "left", "va": "center", "fontsize": "small"}
        shift = (-4.0 if left else 4.0, 0.0)
        found.append(ax.annotate(words, (at, float(place)), shift, textcoords="offset points", **options))
    return ErrorBars(ax, bars, span, tuple(found))


def _explain(ax: Axes, rows: Any) -> None:
    """Say above the panels what colour and hatching mean."""
    import matplotlib
    from matplotlib.patches import Patch

    with matplotlib.rc_context({"hatch.color": INK}):
        bad_key = Patch(facecolor=ACCENTS[1].colour, edgecolor=INK, lw=0.6, hatch=HATCH, label="not conservative")
    keys = [
        Patch(facecolor=ACCENTS[2].colour, edgecolor=INK, linewidth=0.6, label="conservative"),
        bad_key,
    ]
    used = {row.stiffness == NOT_CONSERVATIVE for row in rows} | {row.strength == NOT_CONSERVATIVE for row in rows}
    shown = [key for key, bad in zip(keys, (False, True), strict=True) if bad in used]
    ax.figure.legend(handles=shown, loc="outside upper center", ncols=2, frameon=False)
