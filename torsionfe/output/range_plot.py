"""Where the hand method may still be used: its error over one or two dimensions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import InputError
from torsionfe.output.style import ACCENTS, HATCH, INK, PAPER, QUIET, axis_label, look, new_axes, plain
from torsionfe.study.range import JUDGED, UNDECIDED, UNKNOWN, WITHIN, HandRange
from torsionfe.text import number, percent, signed_percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.collections import FillBetweenPolyCollection, QuadMesh
    from matplotlib.contour import ContourSet
    from matplotlib.lines import Line2D
    from matplotlib.text import Text

__all__ = ["RangePlot", "plot_range"]

_LIMITS = (0.05, 0.10)
_LABELLED = 160  # cells: more have no room for their numbers
#: Fill of a cell by the limit that its error surely keeps: neither or the wider one by hand too low, the narrower
#: one, the wider one or neither by hand too high. In grey they differ, too: lightness (CIELAB) 53, 83, 95, 68, 27.
_BANDS = ("#3f8a8c", "#b4d6d2", "#eef1ec", "#d9976f", "#7d1f12")
_DASHES: tuple[Any, Any] = ("--", "-")
_SIDES = ("too low", "too high")
_NAMES = {"torsion_constant": "J by hand", "peak_stress": "peak stress by hand"}


@dataclass(frozen=True)
class RangePlot:
    """What `plot_range` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    lines : tuple of matplotlib.lines.Line2D
        Over one dimension, a curve for ``J`` and one for the peak stress.
    bands : tuple of matplotlib.collections.FillBetweenPolyCollection
        What the bounds leave open about each curve.
    cells : matplotlib.collections.QuadMesh or None
        Over two dimensions, a cell a section, by the limits that it keeps.
    labels : tuple of matplotlib.text.Text
        The error in each cell, or a question mark where a limit is undecided.
    limits : tuple of matplotlib.contour.ContourSet
        Over two dimensions, where the error comes to the narrower and to the wider limit.
    """

    axes: Axes
    lines: tuple[Line2D, ...] = ()
    bands: tuple[FillBetweenPolyCollection, ...] = ()
    cells: QuadMesh | None = None
    labels: tuple[Text, ...] = ()
    limits: tuple[ContourSet, ...] = ()


def plot_range(
    found: HandRange,
    ax: Axes | None = None,
    *,
    judged: str | Sequence[str] | None = None,
    limits: tuple[float, float] = _LIMITS,
    unit: str = "",
) -> RangePlot:
    """Draw the hand method's error over the dimensions that vary, and the limits of 5 and 10 %.

    Over one dimension: curves of the error, with the width that the bounds leave. Over two: a cell a section, pale
    where the error is within the narrower limit, dark where it is beyond the wider one, in one colour where the hand
    method is too low and in another where it is too high, hatched where there is no answer. The error in percent is
    written in where there is room, with a question mark where the bounds leave a limit undecided; lines run where
    the error, between the sections, comes to a limit.

    Parameters
    ----------
    found : HandRange
    ax : matplotlib.axes.Axes, optional
    judged : {'torsion_constant', 'peak_stress'} or sequence of these, optional
        What is drawn: both curves over one dimension, the torsion constant over two.
    limits : pair of float
        Ratios, rising.
    unit : str
        Of the dimensions that vary, for labels only.

    Returns
    -------
    RangePlot

    Raises
    ------
    InputError
        None or more than two dimensions vary; no section has an answer; limits that don't rise.
    """
    if not isinstance(found, HandRange):
        raise InputError(f"a HandRange is needed, got {type(found).__name__}: see torsionfe.hand_method_range")
    if not (len(limits) == 2 and 0.0 < limits[0] < limits[1]):
        raise InputError(f"limits must be two rising ratios above 0, got {limits!r}")
    varied = [name for name in found.table.parameters if len(set(found.table[name].tolist())) > 1]
    if len(varied) not in (1, 2):
        words = ", ".join(varied) or "none"
        raise InputError(f"one or two dimensions must vary to be drawn; here vary: {words}")
    chosen = _chosen(judged, len(varied))
    if not any(np.isfinite(found.error(name)[0]).any() for name in chosen):
        raise InputError(f"no section has an error of {' or '.join(chosen)} to draw")
    places = [_numbers(found, name) for name in varied]
    with look():
        ax = new_axes() if ax is None else ax
        ax.set_xlabel(axis_label(varied[0].replace("_", " "), unit))
        if len(varied) == 1:
            return _curves(ax, found, places[0], chosen, limits)
        ax.set_ylabel(axis_label(varied[1].replace("_", " "), unit))
        return _cells(ax, found, places, chosen[0], limits)


def _chosen(judged: str | Sequence[str] | None, varied: int) -> list[str]:
    if judged is None:
        return list(JUDGED if varied == 1 else JUDGED[:1])
    names = [judged] if isinstance(judged, str) else list(judged)
    wrong = [name for name in names if name not in JUDGED]
    if wrong or not names:
        raise InputError(f"judged must be of {', '.join(JUDGED)}, got {judged!r}")
    return names


def _numbers(found: HandRange, name: str) -> Floats:
    try:
        return np.asarray(found.table[name], dtype=float)
    except (TypeError, ValueError):
        raise InputError(f"the parameter {name!r} is not a number: only numbers can be drawn over") from None


def _curves(
    ax: Axes, found: HandRange, x: Floats, chosen: list[str], limits: tuple[float, float]
) -> RangePlot:
    order = np.argsort(x, kind="stable")
    for limit, shade in zip(reversed(limits), (0.10, 0.16), strict=True):
        ax.axhspan(-100.0 * limit, 100.0 * limit, color=QUIET, alpha=shade, linewidth=0.0, zorder=0.5)
    ax.axhline(0.0, color=INK, linewidth=0.8, zorder=1.0)
    lines, bands = [], []
    for name, accent in zip(chosen, ACCENTS, strict=False):
        low, high = (100.0 * end[order] for end in found.error(name))
        if not np.isfinite(low).any():
            continue
        bands.append(ax.fill_between(x[order], low, high, color=accent.colour, alpha=0.35, linewidth=0.0))
        style: dict[str, Any] = {"color": accent.colour, "linestyle": accent.dashes, "marker": accent.marker}
        lines += ax.plot(x[order], 0.5 * (low + high), **style, markersize=4.0, linewidth=1.4, label=_NAMES[name])
    ax.set_ylabel("error of the hand method [%]")
    narrow, wide = (percent(limit) for limit in limits)
    ax.set_title(f"shaded: within {narrow}, within {wide}", fontsize="small")
    ax.margins(x=0.03)
    ax.legend(loc="best")
    return RangePlot(ax, tuple(lines), tuple(bands))


def _cells(
    ax: Axes, found: HandRange, places: list[Floats], judged: str, limits: tuple[float, float]
) -> RangePlot:
    from matplotlib.colors import BoundaryNorm, ListedColormap
    from matplotlib.patheffects import withStroke

    columns, i = np.unique(places[0], return_inverse=True)
    rows, j = np.unique(places[1], return_inverse=True)
    low, high = found.error(judged)
    middle = 0.5 * (low + high)
    kept = [found.verdicts(limit, judged) for limit in limits]
    # by what is sure: a cell counts as keeping a limit only where it does for every value between the bounds
    level = np.where(kept[0] == WITHIN, 0, np.where(kept[1] == WITHIN, 1, 2))
    grid, errors = np.full((2, len(rows), len(columns)), np.nan)
    grid[j, i] = np.where(kept[0] == UNKNOWN, np.nan, 2 + np.sign(middle) * level)
    errors[j, i] = middle
    ax.set_facecolor("none")
    ax.patch.set(hatch=HATCH, edgecolor=QUIET)
    norm = BoundaryNorm(np.arange(-0.5, 5.0), 5)
    colours = ListedColormap(list(_BANDS))
    cells = ax.pcolormesh(np.ma.masked_invalid(grid), cmap=colours, norm=norm, edgecolors=PAPER, linewidth=0.6)
    for axis, ticks in ((ax.xaxis, columns), (ax.yaxis, rows)):
        shown = np.unique(np.linspace(0, len(ticks) - 1, min(len(ticks), 12)).round().astype(int))
        axis.set_ticks(shown + 0.5, [number(float(ticks[k])) for k in shown])
    doubtful = (kept[0] == UNDECIDED) | (kept[1] == UNDECIDED)
    labels = []
    for k in np.flatnonzero(np.isfinite(middle) & (doubtful | (grid.size <= _LABELLED))):
        text = signed_percent(float(middle[k])).removesuffix(" %").replace("-", "−") if grid.size <= _LABELLED else ""
        rim = [withStroke(linewidth=2.0, foreground=_BANDS[int(grid[j[k], i[k]])])]
        style: dict[str, Any] = {"ha": "center", "va": "center", "fontsize": "x-small", "path_effects": rim}
        colour = PAPER if level[k] == 2 else INK
        labels.append(ax.text(i[k] + 0.5, j[k] + 0.5, text + "?" * bool(doubtful[k]), color=colour, **style))
    lines = _limit_lines(ax, errors, limits)
    _explain(ax, grid, limits, judged, bool(doubtful.any()))
    return RangePlot(ax, cells=cells, labels=tuple(labels), limits=lines)


def _limit_lines(ax: Axes, errors: Floats, limits: tuple[float, float]) -> tuple[ContourSet, ...]:
    """Draw where the error, taken as linear between the sections, comes to the limits: the wider one in full."""
    known = np.ma.masked_invalid(errors)
    if min(errors.shape) < 2:
        return ()
    x, y = (np.arange(size) + 0.5 for size in reversed(errors.shape))
    lines = []
    for limit, style in zip(limits, _DASHES, strict=True):
        if known.min() < limit < known.max() or known.min() < -limit < known.max():
            options: dict[str, Any] = {"colors": [INK], "linewidths": 1.1, "linestyles": style}
            lines.append(ax.contour(x, y, known, levels=[-limit, limit], **options))
    return tuple(lines)


def _explain(ax: Axes, grid: Floats, limits: tuple[float, float], judged: str, doubtful: bool) -> None:
    """Say above the map what the colours mean that are in it."""
    from matplotlib.lines import Line2D
    from matplotlib.patches import Patch

    narrow, wide = (percent(limit) for limit in limits)
    low, high = _SIDES
    words = [f"{low} by more than {wide}", f"{low}, within {wide}", f"within {narrow}"]
    words += [f"{high}, within {wide}", f"{high} by more than {wide}"]
    keys: list[Any] = [
        Patch(facecolor=_BANDS[k], edgecolor=QUIET, linewidth=0.6, label=words[k])
        for k in np.unique(grid[np.isfinite(grid)]).astype(int)
    ]
    if np.isnan(grid).any():
        keys.append(Patch(facecolor="none", edgecolor=QUIET, linewidth=0.6, hatch=HATCH, label="no answer"))
    if doubtful:
        keys.append(Line2D([], [], linestyle="none", marker="$?$", color=INK, label="limit undecided"))
    for limit, style in zip(limits, _DASHES, strict=True):
        keys.append(Line2D([], [], color=INK, linewidth=1.1, linestyle=style, label=f"at {percent(limit)}"))
    ax.set_title(plain(f"error of {_NAMES[judged]} [%]"), fontsize="medium", pad=10.0 + 14.0 * -(-len(keys) // 3))
    shape: dict[str, Any] = {"loc": "lower left", "bbox_to_anchor": (0.0, 1.0), "borderaxespad": 0.2}
    ax.legend(handles=keys, ncols=3, fontsize="small", **shape)
