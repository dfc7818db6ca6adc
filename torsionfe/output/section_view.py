"""What plots over a section share: filled contours inside the true outline, colour bars, labels that find room."""

from __future__ import annotations

import math
import warnings
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats, finite_array
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.output.outline_plot import outline_path
from torsionfe.output.sampled import Samples
from torsionfe.output.style import INK, PAPER, axis_label, written_unit
from torsionfe.text import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.colorbar import Colorbar
    from matplotlib.colors import Colormap
    from matplotlib.contour import ContourSet
    from matplotlib.legend import Legend
    from matplotlib.patches import PathPatch
    from matplotlib.text import Annotation
    from shapely import Polygon

__all__ = [
    "Scale",
    "colour_bar",
    "draw_edge",
    "fill",
    "legend_above",
    "level_values",
    "place_label",
    "points_per_length",
    "section_figure_size",
    "sideways",
    "upright_bar",
]

_WIDE = 1.45  # a section wider than this times its height has its colour bar below


@dataclass(frozen=True, slots=True)
class Scale:
    """A quantity's name and unit on a colour bar or an axis, a power of ten taken out where numbers would be long.

    Attributes
    ----------
    name, unit : str
    power : int
        Numbers are shown divided by ``10**power``.
    """

    name: str
    unit: str
    power: int = 0

    @classmethod
    def of(cls, name: str, unit: str, largest: float) -> Scale:
        """Return the scale that shows numbers up to ``largest`` with one to four digits before the point."""
        if not largest or 0.05 <= abs(largest) < 1e4:
            return cls(name, unit)
        return cls(name, unit, 3 * math.floor(math.log10(abs(largest)) / 3.0))

    @property
    def label(self) -> str:
        """The name with its unit in brackets."""
        if not self.power:
            return axis_label(self.name, self.unit)
        return f"{axis_label(self.name, '')} [{self._ten_and_unit}]"

    def write(self, value: float, _: object = None) -> str:
        """Return a tick's number."""
        return number(value / 10.0**self.power, 3).replace("-", "−")

    def write_with_unit(self, value: float) -> str:
        """Return a number with its power of ten and its unit."""
        if not self.power:
            return f"{self.write(value)} {written_unit(self.unit)}".strip()
        return f"{self.write(value)} × {self._ten_and_unit}"

    @property
    def _ten_and_unit(self) -> str:
        ten, unit = written_unit(f"10^{self.power}"), written_unit(self.unit)
        return f"{ten}{unit[1:]}" if unit.startswith("1/") else f"{ten} {unit}".strip()


def section_figure_size(outline: Outline) -> tuple[float, float]:
    """Return width and height (inches) of a figure that holds the section, its labels and its colour bar."""
    x0, y0, x1, y1 = outline.bounds
    shape = (x1 - x0) / (y1 - y0)
    if sideways(outline):
        return 6.4, float(np.clip(5.6 / shape + 1.9, 2.6, 6.2))
    return float(np.clip(4.6 * shape + 1.9, 3.4, 6.8)), 5.4


def sideways(outline: Outline) -> bool:
    """Return whether a section is so wide that its colour bar goes below it."""
    x0, y0, x1, y1 = outline.bounds
    return (x1 - x0) > _WIDE * (y1 - y0)


def draw_edge(ax: Axes, outline: Outline, width: float = 1.1) -> PathPatch:
    """Draw the true outline, its arcs as curves, nothing inside it."""
    from matplotlib.patches import PathPatch

    path = outline_path(outline)
    patch = PathPatch(path, facecolor="none", edgecolor=INK, linewidth=width, joinstyle="miter", zorder=3.0)
    ax.add_patch(patch)
    return patch


# --- contours ---------------------------------------------------------------------------------------------


def level_values(levels: int | ArrayLike, low: float, high: float) -> Floats:
    """Return where the bands of a contour plot begin and end.

    Parameters
    ----------
    levels : int or array_like of shape (n,)
        About how many bands, at round numbers between ``low`` and ``high``; or the values themselves, rising.

    Raises
    ------
    InputError
        Fewer than 2 or more than 100 bands; values that don't rise.
    """
    if isinstance(levels, (bool, str)):
        raise InputError(f"levels must be a number of bands or the values between them, got {levels!r}")
    if not isinstance(levels, (int, np.integer)):
        given = finite_array("levels", levels)
        if len(given) < 2 or (np.diff(given) <= 0.0).any():
            raise InputError("levels must be two values or more, each larger than the one before")
        return given
    if not 2 <= levels <= 100:
        raise InputError(f"levels must be from 2 to 100 bands, got {levels}")
    from matplotlib.ticker import MaxNLocator

    ticks = np.asarray(MaxNLocator(int(levels), steps=[1, 2, 2.5, 5, 10]).tick_values(low, high), dtype=float)
    step = ticks[1] - ticks[0]
    inside = ticks[(ticks > low + 0.45 * step) & (ticks < high - 0.45 * step)]
    return np.concatenate([[low], inside, [high]])


def fill(
    ax: Axes,
    samples: Samples,
    values: Floats,
    levels: Floats,
    *,
    colours: Colormap,
    inside: PathPatch,
    beyond: bool = False,
) -> ContourSet:
    """Draw filled contours inside an outline, as an image in vector files so that no seams show.

    Parameters
    ----------
    ax : matplotlib.axes.Axes
    samples : Samples
    values : ndarray of shape (n,)
        At the samples' points.
    levels : ndarray of shape (k,)
    colours : matplotlib.colors.Colormap
    inside : matplotlib.patches.PathPatch
        Clips the contours.
    beyond : bool
        Whether values above the last level get a colour of their own; else they get that of the last band.
    """
    from matplotlib.colors import Normalize

    top = levels[-1] - 1e-9 * (levels[-1] - levels[0])
    shown = values if beyond else np.minimum(values, top)
    contours: ContourSet = ax.tricontourf(
        samples.grid,
        np.maximum(shown, levels[0]),
        levels=list(levels),
        cmap=colours,
        norm=Normalize(levels[0], levels[-1]),
        extend="max" if beyond else "neither",
        zorder=1.0,
    )
    with warnings.catch_warnings():  # matplotlib before 3.11 can't, and draws them as lines
        warnings.filterwarnings("ignore", "Rasterization of", UserWarning)
        contours.set_rasterized(True)
    contours.set_clip_path(inside)
    return contours


def colour_bar(ax: Axes, contours: ContourSet, levels: Floats, scale: Scale, outline: Outline) -> Colorbar:
    """Draw a colour bar beside the section, or below a wide one; its last tick is the last level."""
    return _bar(ax, contours, levels, scale, "bottom" if sideways(outline) else "right")


def upright_bar(ax: Axes, contours: ContourSet, levels: Floats, scale: Scale) -> Colorbar:
    """Draw a colour bar to the right; its last tick is the last level."""
    return _bar(ax, contours, levels, scale, "right")


def _bar(ax: Axes, contours: ContourSet, levels: Floats, scale: Scale, side: str) -> Colorbar:
    shape: Any = {"aspect": 30, "fraction": 0.08, "pad": 0.03, "extendfrac": 0.04}
    bar = ax.figure.colorbar(contours, ax=ax, location=side, **shape)
    bar.set_ticks(list(_thinned(levels, 7 if side == "bottom" else 12)), minor=False)
    bar.ax.minorticks_off()
    (bar.ax.xaxis if side == "bottom" else bar.ax.yaxis).set_major_formatter(scale.write)
    bar.set_label(scale.label)
    if bar.solids is not None:
        bar.solids.set_edgecolor("face")  # else vector viewers show seams
    return bar


def _thinned(levels: Floats, most: int) -> Floats:
    """Return at most about ``most`` of the levels, with the first and the last."""
    step = math.ceil((len(levels) - 1) / most)
    kept = levels[:-1:step]
    mean = (levels[-1] - levels[0]) / (len(levels) - 1)
    kept = kept[levels[-1] - kept > 0.5 * step * mean] if step > 1 else kept
    return np.append(kept, levels[-1])


def legend_above(ax: Axes, entries: Sequence[Any], columns: int = 1) -> Legend:
    """Explain what was drawn, above the axes; in a figure of their own, across its whole width.

    Parameters
    ----------
    ax : matplotlib.axes.Axes
    entries : sequence of matplotlib artists
        Each with its label.
    columns : int
    """
    from matplotlib.layout_engine import ConstrainedLayoutEngine

    parent = ax.figure
    engine = getattr(parent, "get_layout_engine", lambda: None)()
    shape: Any = {"handles": list(entries), "borderpad": 0.0, "handlelength": 1.6, "borderaxespad": 0.4}
    shape["ncols"] = columns
    if isinstance(engine, ConstrainedLayoutEngine) and len(parent.axes) <= 2:
        return parent.legend(loc="outside upper left", **shape)
    return ax.legend(loc="lower left", bbox_to_anchor=(0.0, 1.0), **shape)


# --- labels -----------------------------------------------------------------------------------------------


def place_label(
    ax: Axes, outline: Outline, spots: Sequence[tuple[float, float]], text: str, avoid: ArrayLike = ()
) -> Annotation:
    """Write a label with a leader line, at the spot and on the side where it covers the least.

    Parameters
    ----------
    ax : matplotlib.axes.Axes
        Its limits are set.
    outline : Outline
    spots : sequence of (x, y)
        Any of which the label may be written at.
    text : str
    avoid : array_like of shape (k, 2)
        Further points that it should not cover.
    """
    import shapely
    from matplotlib.font_manager import FontProperties

    size = FontProperties(size="small").get_size_in_points()
    half = np.array([0.30 * size * len(text) + 3.0, 0.75 * size])
    per_point = 1.0 / points_per_length(ax)
    away = [(r, a) for r in (14.0, 20.0, 28.0, 40.0, 56.0, 76.0) for a in np.radians(np.arange(0.0, 360.0, 15.0))]
    (x0, x1), (y0, y1) = ax.get_xlim(), ax.get_ylim()
    points = np.concatenate([np.reshape(np.asarray(avoid, dtype=float), (-1, 2)), np.reshape(spots, (-1, 2))])
    ground = _Ground(outline.polygon(1e-3 * outline.size), shapely.box(x0, y0, x1, y1), points)
    best: tuple[float, Any, Any] = (math.inf, None, None)
    for spot in list(spots)[:6]:
        for distance, angle in away:
            direction = np.array([math.cos(angle), math.sin(angle)])
            # the nearer edge of the text lies at the distance, whatever its direction
            offset = direction * distance + np.sign(np.round(direction, 6)) * half * np.abs(direction)
            cost = 0.004 * distance + ground.cost(np.asarray(spot), offset * per_point, half * per_point)
            if cost < best[0]:
                best = (cost, spot, offset)
    _, spot, offset = best
    return ax.annotate(
        text,
        spot,
        xytext=tuple(offset),
        textcoords="offset points",
        ha="center",
        va="center",
        fontsize="small",
        color=INK,
        bbox={"boxstyle": "round,pad=0.25", "facecolor": PAPER, "edgecolor": INK, "linewidth": 0.5, "alpha": 0.92},
        arrowprops={"arrowstyle": "-", "color": INK, "linewidth": 0.7, "shrinkB": 3.5},
        zorder=6.0,
    )


def points_per_length(ax: Axes) -> float:
    """Return about how many points of print a length is drawn on."""
    box = ax.get_window_extent()
    dots = 72.0 / ax.figure.dpi
    (x0, x1), (y0, y1) = ax.get_xlim(), ax.get_ylim()
    return float(min(box.width * dots / abs(x1 - x0), box.height * dots / abs(y1 - y0)))


@dataclass(frozen=True)
class _Ground:
    """What a label should not hide: the material, marked points (k, 2), and the frame, in the section's coordinates."""

    material: Polygon
    frame: Polygon
    points: Floats

    def cost(self, spot: Floats, offset: Floats, half: Floats) -> float:
        """Return how much a label of a size hides or leaves the frame, and what its leader line crosses."""
        import shapely

        middle = spot + offset
        label = shapely.box(*(middle - half), *(middle + half))
        leader = shapely.LineString([spot, middle]).difference(label)
        near = shapely.distance(shapely.points(self.points), label) < 0.6 * half[1]
        others = self.points[np.abs(self.points - spot).max(axis=1) > 0.0]
        crossed = shapely.distance(shapely.points(others), leader) < 0.6 * half[1]
        hidden = label.intersection(self.material).area / label.area
        outside = 1.0 - label.intersection(self.frame).area / label.area
        through = leader.intersection(self.material).length / max(leader.length, 1e-300)
        return float(hidden + 3.0 * outside + 0.4 * through + 2.0 * near.sum() + crossed.sum())
