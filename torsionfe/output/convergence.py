"""How the bounds of the torsion constant and the peak stress closed in as the mesh was refined."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import InputError
from torsionfe.output.section_view import Scale
from torsionfe.output.style import ACCENTS, INK, QUIET, look
from torsionfe.text import percent
from torsionfe.torsion.solution import TorsionSolution

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.collections import FillBetweenPolyCollection
    from matplotlib.container import ErrorbarContainer
    from matplotlib.lines import Line2D

__all__ = ["ConvergencePlot", "plot_convergence"]


@dataclass(frozen=True)
class ConvergencePlot:
    """What `plot_convergence` drew.

    Attributes
    ----------
    axes : tuple of matplotlib.axes.Axes
        Of the torsion constant and of the peak stress.
    bracket : matplotlib.collections.FillBetweenPolyCollection
        Between the bounds.
    lower, upper : matplotlib.lines.Line2D
    peaks : matplotlib.container.ErrorbarContainer or None
        Peak stress with its stated error; none where no finite peak exists.
    """

    axes: tuple[Axes, Axes]
    bracket: FillBetweenPolyCollection
    lower: Line2D
    upper: Line2D
    peaks: ErrorbarContainer | None


def plot_convergence(
    solution: TorsionSolution, ax: tuple[Axes, Axes] | None = None, *, unit: str = ""
) -> ConvergencePlot:
    """Draw the bounds of ``J`` and the peak stress per torque against the number of unknowns.

    Parameters
    ----------
    solution : TorsionSolution
    ax : pair of matplotlib.axes.Axes, optional
        For the torsion constant and for the peak stress; by default those of a new figure.
    unit : str
        Of the outline's lengths, for labels only.

    Returns
    -------
    ConvergencePlot

    Raises
    ------
    InputError
        ``ax`` is no pair of axes.
    """
    steps = solution.passes
    unknowns = np.array([step.unknowns for step in steps], dtype=float)
    lower, upper = (np.array([getattr(step, name) for step in steps]) for name in ("lower", "upper"))
    with look():
        first, second = _pair(ax)
        scale = Scale.of("torsion constant J", f"{unit}^4" if unit else "", float(upper[-1]))
        bracket, low, high = _draw_bracket(first, unknowns, lower, upper)
        _finish(first, scale, f"bracket {percent(solution.torsion_constant.rel_gap)} wide")
        peaks = _draw_peaks(second, solution, unknowns, unit)
        for axes in (first, second):
            axes.set_xscale("log")
            axes.set_xticks(list(unknowns), _numbered(unknowns), minor=False)
            axes.tick_params(axis="x", which="minor", bottom=False, labelbottom=False)
            wide = (unknowns[-1] / unknowns[0]) ** 0.06 if len(unknowns) > 1 else 2.0
            axes.set_xlim(unknowns[0] / wide, unknowns[-1] * wide)
        stacked = abs(first.get_position().x0 - second.get_position().x0) < 0.05
        if stacked:
            first.tick_params(axis="x", labelbottom=False)
        for axes in (second,) if stacked else (first, second):
            axes.set_xlabel("unknowns")
    return ConvergencePlot((first, second), bracket, low, high, peaks)


def _numbered(unknowns: Floats) -> list[str]:
    """Return the label of each number of unknowns, left out where the next is too near on a logarithmic axis."""
    place = np.log(unknowns)
    room = 0.09 * (place[-1] - place[0])
    near = np.append(np.diff(place) < room, False)
    return ["" if close else f"{int(n)}" for n, close in zip(unknowns, near, strict=True)]


def _pair(ax: tuple[Axes, Axes] | None) -> tuple[Axes, Axes]:
    from matplotlib.axes import Axes as AnyAxes
    from matplotlib.figure import Figure

    if ax is None:
        above, below = Figure(figsize=(5.6, 4.6), layout="constrained").subplots(2)
        return above, below
    given = list(ax) if isinstance(ax, (tuple, list, np.ndarray)) else [ax]
    if len(given) != 2 or not all(isinstance(one, AnyAxes) for one in given):
        raise InputError("ax must be two axes, for the torsion constant and the peak: figure.subplots(2) makes them")
    return given[0], given[1]


def _draw_bracket(
    ax: Axes, unknowns: Floats, lower: Floats, upper: Floats
) -> tuple[FillBetweenPolyCollection, Line2D, Line2D]:
    bracket = ax.fill_between(unknowns, lower, upper, color=QUIET, alpha=0.25, linewidth=0.0)
    lines = []
    for values, accent, name in ((upper, ACCENTS[1], "upper bound"), (lower, ACCENTS[0], "lower bound")):
        style: dict[str, Any] = {"color": accent.colour, "linestyle": accent.dashes, "marker": accent.marker}
        lines += ax.plot(unknowns, values, **style, markersize=4.5, linewidth=1.3, label=name)
    final = 0.5 * (lower[-1] + upper[-1])
    ax.axhline(final, color=INK, linewidth=0.6, linestyle=":", zorder=1.0)
    ax.legend(loc="best", frameon=False)
    return bracket, lines[1], lines[0]


def _draw_peaks(ax: Axes, solution: TorsionSolution, unknowns: Floats, unit: str) -> ErrorbarContainer | None:
    """Draw the peak of each pass with its error; the first pass has nothing to judge its own by."""
    peak = np.array([step.stress_per_torque for step in solution.passes])
    error = np.array([step.rel_error for step in solution.passes])
    known = np.isfinite(peak)
    spot = solution.hot_spot
    if spot is None or not known.any():
        where: dict[str, Any] = {"transform": ax.transAxes, "ha": "center", "va": "center", "color": INK}
        ax.text(0.5, 0.5, "no finite peak: every flank rises into a sharp re-entrant corner", **where)
        ax.set_yticks([])
        ax.set_ylabel("peak shear stress")
        return None
    bar = np.where(error < 1.0, error, 0.0) * peak
    accent = ACCENTS[0]
    options: dict[str, Any] = {"color": accent.colour, "marker": accent.marker, "markersize": 4.5, "capsize": 3.0}
    drawn = ax.errorbar(unknowns[known], peak[known], bar[known], **options, linewidth=1.3, elinewidth=0.9)
    ax.axhline(spot.stress_per_torque, color=INK, linewidth=0.6, linestyle=":", zorder=1.0)
    scale = Scale.of("peak stress / torque", f"1/{unit}^3" if unit else "", spot.stress_per_torque)
    judged = "; the first has no error of its own" if error[0] >= 1.0 and len(error) > 1 else ""
    _finish(ax, scale, f"peak ± {percent(spot.rel_error)}{judged}")
    return drawn


def _finish(ax: Axes, scale: Scale, title: str) -> None:
    """Label the axis, with as many digits as tell its ticks apart."""
    from matplotlib.ticker import MaxNLocator

    ax.yaxis.set_major_locator(MaxNLocator(5, steps=[1, 2, 5, 10]))
    step = float(np.diff(ax.get_yticks())[0]) / 10.0**scale.power
    digits = max(0, -math.floor(math.log10(step) + 1e-9))
    ax.yaxis.set_major_formatter(lambda value, _: f"{value / 10.0**scale.power:.{digits}f}")
    ax.set_ylabel(scale.label.replace(" [", "\n["))
    ax.set_title(title, fontsize="small")
