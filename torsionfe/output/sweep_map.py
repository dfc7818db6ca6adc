"""A sweep as a picture: one column over one or two of the parameters."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats
from torsionfe.errors import InputError
from torsionfe.output.style import (
    ACCENTS,
    HATCH,
    INK,
    QUIET,
    axis_label,
    look,
    new_axes,
    plain,
    stress_colours,
    warping_colours,
)
from torsionfe.study.sweep_table import SweepTable
from torsionfe.text import number, percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.collections import QuadMesh
    from matplotlib.colorbar import Colorbar
    from matplotlib.lines import Line2D
    from matplotlib.text import Text

__all__ = ["SweepMap", "plot_map"]

#: What each column is called, with the power of the unit of length that it has; None: a ratio, shown in percent.
_COLUMNS: Mapping[str, tuple[str, int | None]] = {
    "torsion_constant": ("torsion constant J", 4),
    "stress_per_torque": ("peak shear stress / torque", -3),
    "stress_rel_error": ("relative error of the peak shear stress", None),
    "section_modulus": ("torsional section modulus", 3),
    "hand_torsion_constant": ("torsion constant by the hand method", 4),
    "hand_error": ("error of the hand method's J", None),
    "hand_section_modulus": ("section modulus by the hand method", 3),
    "hand_stress_error": ("error of the hand method's peak stress", None),
    "area": ("area", 2),
}
_LABELLED = 120  # cells: more have no room for their numbers


@dataclass(frozen=True)
class SweepMap:
    """What `plot_map` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    cells : matplotlib.collections.QuadMesh or None
        The map over two parameters.
    bar : matplotlib.colorbar.Colorbar or None
    labels : tuple of matplotlib.text.Text
        The value in each cell, where there is room.
    lines : tuple of matplotlib.lines.Line2D
        The curve over one parameter.
    """

    axes: Axes
    cells: QuadMesh | None
    bar: Colorbar | None
    labels: tuple[Text, ...]
    lines: tuple[Line2D, ...]


def plot_map(
    table: SweepTable,
    x: str | None = None,
    y: str | None = None,
    value: str = "torsion_constant",
    *,
    at: Mapping[str, Any] | None = None,
    ax: Axes | None = None,
    unit: str = "",
) -> SweepMap:
    """Draw a column of a sweep over one parameter as a curve, or over two as a map of cells.

    Sections without an answer are left out of the curve and hatched in the map.

    Parameters
    ----------
    table : SweepTable
    x, y : str, optional
        Parameters; by default the first and second of those that vary, apart from the ones in ``at``.
    value : str
        A column of numbers.
    at : mapping of str to object, optional
        Values at which the other parameters are held.
    ax : matplotlib.axes.Axes, optional
        Of a figure of its own by default.
    unit : str
        Of the outlines' lengths, for the labels.

    Returns
    -------
    SweepMap

    Raises
    ------
    InputError
        No such parameter or column, a parameter that varies and is neither drawn nor held, several sections in one
        place, or none.
    """
    rows = _held(table, at or {})
    x, y = _axes_of(table, rows, x, y, at or {})
    values, label = _column(table, value, unit)
    _check_places(table, rows, [name for name in (x, y) if name is not None])
    with look():
        ax = ax if ax is not None else new_axes()
        if at:
            ax.set_title(plain(", ".join(f"{_words(name)} {held}" for name, held in at.items())))
        ax.set_xlabel(axis_label(_words(x), _unit_of(x, unit)))
        if y is None:
            return _curve(ax, _numbers(table, x)[rows], values[rows], label)
        ax.set_ylabel(axis_label(_words(y), _unit_of(y, unit)))
        places = np.stack([_numbers(table, x)[rows], _numbers(table, y)[rows]], axis=1)
        return _cells(ax, places, values[rows], label)


# --- which rows -------------------------------------------------------------------------------------------


def _held(table: SweepTable, at: Mapping[str, Any]) -> NDArray[np.int64]:
    """Return the rows whose parameters have the values that are held."""
    chosen = np.ones(len(table), dtype=bool)
    for name, wanted in at.items():
        _check_parameter(table, name)
        chosen &= np.array([given == wanted for given in table[name].tolist()], dtype=bool)
        if not chosen.any():
            known = ", ".join(str(given) for given in dict.fromkeys(table[name].tolist()))
            raise InputError(f"no section has {name} = {wanted!r}; there are {known:.200}")
    if not len(table):
        raise InputError("the table has no rows to draw")
    return np.flatnonzero(chosen)


def _axes_of(
    table: SweepTable, rows: NDArray[np.int64], x: str | None, y: str | None, at: Mapping[str, Any]
) -> tuple[str, str | None]:
    for name in (x, y):
        if name is not None:
            _check_parameter(table, name)
    varied = [name for name in table.parameters if len(set(table[name][rows].tolist())) > 1]
    free = [name for name in varied if name not in (x, y)]
    if x is None:
        if not free:
            raise InputError("no parameter varies: there is nothing to draw over")
        x = free.pop(0)
    if y is None and free:
        y = free.pop(0)
    if free:
        raise InputError(f"{', '.join(free)} vary, too: hold them with at={{name: value}}")
    return x, y


def _check_parameter(table: SweepTable, name: str) -> None:
    if name not in table.parameters:
        raise InputError(f"{name!r} is no parameter of this sweep; those are {', '.join(table.parameters) or 'none'}")


def _check_places(table: SweepTable, rows: NDArray[np.int64], names: list[str]) -> None:
    places = list(zip(*(table[name][rows].tolist() for name in names), strict=True))
    if len(set(places)) < len(places):
        raise InputError(f"several sections have the same {' and '.join(names)}: draw over other parameters")


def _numbers(table: SweepTable, name: str) -> Floats:
    try:
        return table[name].astype(float)
    except (TypeError, ValueError):
        raise InputError(f"parameter {name!r} is not a number: hold it with at={{{name!r}: value}}") from None


def _column(table: SweepTable, name: str, unit: str) -> tuple[Floats, str]:
    """Return a column as it is drawn, and its label."""
    if name in table.parameters or table[name].dtype.kind not in "fi":
        raise InputError(f"{name!r} is no column of numbers; those are {', '.join(_COLUMNS)}")
    words, power = _COLUMNS.get(name, (_words(name), 0))
    values = np.where(table.solved, table[name].astype(float), np.nan)
    if not np.isfinite(values).any():
        raise InputError(f"the column {name!r} holds no numbers: no section has that answer")
    if power is None:
        return 100.0 * values, axis_label(words, "%")
    powers = {-3: f"1/{unit}^3", 2: f"{unit}^2", 3: f"{unit}^3", 4: f"{unit}^4"}
    return values, axis_label(words, powers.get(power, "") if unit else "")


def _words(name: str) -> str:
    return name.replace("_", " ")


def _unit_of(name: str, unit: str) -> str:
    """Return the unit of a parameter: lengths have one, counts, slopes and angles don't."""
    lengths = ("width", "height", "depth", "thickness", "radius", "leg", "diameter", "wall", "flats", "web")
    return unit if any(word in name for word in lengths) else ""


# --- drawing ----------------------------------------------------------------------------------------------


def _curve(ax: Axes, x: Floats, values: Floats, label: str) -> SweepMap:
    order = np.argsort(x, kind="stable")
    accent = ACCENTS[0]
    lines = ax.plot(x[order], values[order], color=accent.colour, linestyle=accent.dashes, marker=accent.marker, ms=4.0)
    ax.set_ylabel(label)
    ax.grid(color=QUIET, alpha=0.25, linewidth=0.6)
    return SweepMap(ax, None, None, (), tuple(lines))


def _cells(ax: Axes, places: Floats, values: Floats, label: str) -> SweepMap:
    """Draw a cell a section, all of one size: the axes carry the parameters' values at the middles."""
    columns, i = np.unique(places[:, 0], return_inverse=True)
    rows, j = np.unique(places[:, 1], return_inverse=True)
    ratio = "%" in label
    grid = np.full((len(rows), len(columns)), np.nan)
    grid[j, i] = values
    ax.set_facecolor("none")
    ax.patch.set(hatch=HATCH, edgecolor=QUIET)
    colours = warping_colours() if ratio else stress_colours()
    if np.nanmax(grid) <= 0.0:  # dark is far from 0
        colours = colours.reversed()
    cells = ax.pcolormesh(np.ma.masked_invalid(grid), cmap=colours, edgecolors="white", linewidth=0.5)
    for axis, ticks in ((ax.xaxis, columns), (ax.yaxis, rows)):
        shown = np.unique(np.linspace(0, len(ticks) - 1, min(len(ticks), 12)).round().astype(int))
        axis.set_ticks(shown + 0.5, [number(float(ticks[k])) for k in shown])
    bar = ax.figure.colorbar(cells, ax=ax, label=label)
    return SweepMap(ax, cells, bar, _values_in_cells(ax, cells, grid, ratio), ())


def _values_in_cells(ax: Axes, cells: QuadMesh, grid: Floats, ratio: bool) -> tuple[Text, ...]:
    """Write each value into its cell, dark on pale and pale on dark, where there is room."""
    if grid.size > _LABELLED:
        return ()
    low, high = (float(end) for end in cells.get_clim())
    found = []
    for row, column in zip(*np.nonzero(np.isfinite(grid)), strict=True):
        value = float(grid[row, column])
        share = (value - low) / (high - low) if high > low else 0.0
        dark = (1.0 - share if high <= 0.0 else share) > 0.55
        text = percent(value / 100.0).removesuffix(" %") if ratio else number(value, 3)
        colour = "white" if dark else INK
        found.append(ax.text(column + 0.5, row + 0.5, text, ha="center", va="center", fontsize="x-small", color=colour))
    return tuple(found)
