"""The hand method beside the answer, as a picture: the stress in the section, and how far off each method is."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from functools import partial
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.errors import InputError
from torsionfe.output.contour import StressPlot, StressScale, plot_stress, stress_scale
from torsionfe.output.section_view import section_figure_size
from torsionfe.output.style import (
    ACCENTS,
    HATCH,
    INK,
    PAPER,
    QUIET,
    axis_label,
    look,
    plain,
    with_unit,
    written_number,
)
from torsionfe.study.compare import CONSERVATIVE, NOT_CONSERVATIVE, UNDEFINED, WITHIN, Comparison
from torsionfe.text import number, percent, signed_percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.container import BarContainer
    from matplotlib.figure import Figure
    from matplotlib.patches import Rectangle
    from matplotlib.text import Text

_LEAST = 3  # methods that a panel has room for: fewer keep to its middle
_STYLES: Mapping[str, tuple[str, str]] = MappingProxyType(
    {
        CONSERVATIVE: (ACCENTS[2].colour, ""),
        NOT_CONSERVATIVE: (ACCENTS[1].colour, HATCH),
        WITHIN: (QUIET, ""),
        UNDEFINED: (PAPER, ""),
    }
)

__all__ = ["ComparisonPlot", "ErrorBars", "draw_errors", "plot_comparison"]


@dataclass(frozen=True)
class ErrorBars:
    """One panel of `plot_comparison`: a bar a method, from the answer to what the method says.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    bars : matplotlib.container.BarContainer
        Hatched where the method is not conservative, grey where that is undecided.
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
    rows = comparison.methods
    with look():
        constant = _constants(comparison, axes[0], unit, brief)
        peak = _peaks(comparison, axes[1], stress_scale(comparison.torque or None, unit, stress_unit), brief)
        _explain(axes[0], {verdict for row in rows for verdict in (row.stiffness, row.strength)})
    return constant, peak


def _constants(comparison: Comparison, ax: Axes, unit: str, brief: bool) -> ErrorBars:
    rows, bounds = comparison.methods, comparison.solution.torsion_constant
    values = ["" if brief else _value(row.method.torsion_constant, 5) for row in rows]
    off, verdicts, gap = [row.constant_error for row in rows], [row.stiffness for row in rows], 0.5 * bounds.rel_gap
    drawn = _panel(ax, comparison, off, verdicts=verdicts, values=values, band=gap)
    middle = with_unit(_value(bounds.value, 6), f"{unit}^4" if unit else "")
    ax.set_title("J by hand" if brief else f"J by hand, off from {middle} ± {percent(gap)}", fontsize="small")
    ax.set_xlabel("error of J [%]")
    return drawn


def _peaks(comparison: Comparison, ax: Axes, shown: StressScale, brief: bool) -> ErrorBars:
    rows, spot = comparison.methods, comparison.solution.hot_spot
    finite = spot is not None and not len(comparison.solution.singular_corners)
    values = ["" if brief else _value(abs(shown.factor) * row.method.stress_per_torque, 4) for row in rows]
    off, verdicts = [row.stress_error for row in rows], [row.strength for row in rows]
    band = spot.rel_error if spot is not None and finite else 0.0
    drawn = _panel(ax, comparison, off, verdicts=verdicts, values=values, band=band)
    title = f"peak {shown.name} by hand"
    if spot is not None and finite:
        true = with_unit(_value(abs(shown.factor) * spot.stress_per_torque, 4), shown.unit)
        title += f", off from {true} ± {percent(spot.rel_error)}"
        ax.set_xlabel("error of the peak stress [%]")
    else:
        title = f"{axis_label(title, shown.unit)}; sharp corner, no finite peak"
        ax.set_xticks([])
    ax.set_title("peak stress by hand" if brief else title, fontsize="small")
    return drawn


def _value(value: float, digits: int) -> str:
    return written_number(value, digits) if abs(value) < 1e-3 else number(value, digits)


def _panel(
    ax: Axes,
    comparison: Comparison,
    off: Sequence[float],
    *,
    verdicts: Sequence[str],
    values: Sequence[str],
    band: float,
) -> ErrorBars:
    import matplotlib

    names, errors = [row.method.name.replace("_", " ") for row in comparison.methods], np.array(off)
    places = np.arange(len(names))
    known = np.where(np.isfinite(errors), 100.0 * errors, 0.0)
    colours, hatches = zip(*(_STYLES[verdict] for verdict in verdicts), strict=True)
    with matplotlib.rc_context({"hatch.color": INK}):
        bars = ax.barh(
            places, known, height=0.5, color=colours, hatch=hatches, edgecolor=INK, zorder=2.0,
            linewidth=np.where(np.isfinite(errors), 0.6, 0.0),
        )
    span = ax.axvspan(-100.0 * band, 100.0 * band, color=QUIET, alpha=0.35, linewidth=0.0, zorder=1.0) if band else None
    if np.isfinite(errors).any():
        ax.axvline(0.0, color=INK, linewidth=0.9, zorder=3.0)
    ax.set_yticks(places, [plain(name) for name in names])
    spare = 0.5 * max(0, _LEAST - len(names))
    ax.set_ylim(len(names) - 0.4 + spare, -0.6 - spare)
    ax.tick_params(axis="y", length=0.0)
    ax.grid(axis="x", color=QUIET, alpha=0.25, linewidth=0.6)
    ax.set_axisbelow(True)
    low, high = min(0.0, float(known.min())), max(0.0, float(known.max()))
    reach = max(high - low, 200.0 * band, 1.0)
    # room for the numbers beyond the longest bar on either side
    before, after = 0.75 if low < 0.0 else 0.08, 0.75 if high > 0.0 or low == 0.0 else 0.08
    ax.set_xlim(min(low - before * reach, -120.0 * band), max(high + after * reach, 120.0 * band))
    return ErrorBars(ax, bars, span, tuple(map(partial(_write, ax), places, errors, values)))


def _write(ax: Axes, place: float, error: float, value: str) -> Text:
    """Write what a method says, and how far off that is, beyond the end of its bar."""
    off = "" if math.isnan(error) else signed_percent(error).replace("-", "−")
    words = f"{value} ({off})" if value and off else value or off or "no finite peak"
    left = math.isfinite(error) and error < 0.0
    at = 0.0 if math.isnan(error) else 100.0 * float(error)
    options: dict[str, Any] = {"ha": "right" if left else "left", "va": "center", "fontsize": "small"}
    shift = (-4.0 if left else 4.0, 0.0)
    return ax.annotate(words, (at, float(place)), shift, textcoords="offset points", **options)


def _explain(ax: Axes, verdicts: Iterable[str]) -> None:
    """Say above the panels what colours, hatching and band mean."""
    import matplotlib
    from matplotlib.patches import Patch

    keys = []
    for verdict, (colour, hatch) in _STYLES.items():
        if verdict in verdicts and verdict != UNDEFINED:
            with matplotlib.rc_context({"hatch.color": INK}):
                keys.append(Patch(facecolor=colour, edgecolor=INK, linewidth=0.6, hatch=hatch, label=verdict))
    keys.append(Patch(facecolor=QUIET, alpha=0.35, linewidth=0.0, label="not known closer"))
    ax.figure.legend(handles=keys, loc="outside upper center", ncols=len(keys), frameon=False)
