"""Results as tables in files: comma-separated values for programs, Markdown for pasting.

Any result can be a table here that offers one of these, in this order:

* a method ``as_table()`` that returns column names and rows;
* an attribute ``columns``, a mapping of names to columns of equal length (a sweep);
* an iteration over dataclasses of one kind, one a row (margins of safety);
* the fields of a dataclass, one a row.
"""

from __future__ import annotations

import csv
import io
import math
import os
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, fields, is_dataclass
from pathlib import Path
from typing import Any

import numpy as np

from torsionfe.errors import InputError
from torsionfe.storing import store
from torsionfe.text import number, printable
from torsionfe.torsion.bounds import Bounds
from torsionfe.torsion.solution import TorsionSolution

__all__ = ["Table", "csv_text", "markdown_text", "tabulated", "write_csv", "write_markdown"]

Cell = str | float | int | bool | None

#: A spreadsheet takes text that begins with one of these for a formula (common practice: an apostrophe before it).
_FORMULA = ("=", "+", "-", "@", "\t", "\r")


@dataclass(frozen=True)
class Table:
    """Names of columns, and rows of numbers and text as long as the names.

    Attributes
    ----------
    columns : tuple of str
    rows : tuple of tuples
        Numbers with every digit; None where there is none.
    """

    columns: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]


def tabulated(result: Any, unit: str = "") -> Table:
    """Return a result as a table.

    Parameters
    ----------
    result : TorsionSolution, Table or another result
        See the head of this module for what else can be a table.
    unit : str
        Of lengths, for the units of a solution's quantities.

    Raises
    ------
    InputError
        The result is no table of any of those kinds.
    """
    if isinstance(result, Table):
        return result
    if isinstance(result, TorsionSolution):
        return _of_solution(result, unit)
    if hasattr(result, "as_table"):
        columns, rows = result.as_table()
        return Table(tuple(columns), tuple(tuple(map(_cell, row)) for row in rows))
    columns = getattr(result, "columns", None)
    if isinstance(columns, Mapping):
        body = zip(*(np.asarray(column).tolist() for column in columns.values()), strict=True)
        return Table(tuple(map(str, columns)), tuple(tuple(map(_cell, row)) for row in body))
    if isinstance(result, Iterable) and not isinstance(result, (str, bytes, Mapping)):
        items = list(result)
        if items and all(is_dataclass(item) and type(item) is type(items[0]) for item in items):
            names = _scalars(items[0])
            return Table(names, tuple(tuple(_cell(getattr(item, name)) for name in names) for item in items))
    if is_dataclass(result) and not isinstance(result, type):
        return Table(("quantity", "value"), tuple((name, _cell(getattr(result, name))) for name in _scalars(result)))
    raise InputError(f"{type(result).__name__} is no result that can be a table: it has no columns, rows or fields")


def _scalars(item: Any) -> tuple[str, ...]:
    """Return the public fields of a dataclass that fit into a cell."""
    kinds = (str, int, float, np.number, np.bool_, Bounds, type(None))
    names = [field.name for field in fields(item) if not field.name.startswith("_")]
    return tuple(name for name in names if isinstance(getattr(item, name), kinds))


def _cell(value: Any) -> Cell:
    if isinstance(value, Bounds):
        return value.value
    if isinstance(value, (np.number, np.bool_)):
        value = value.item()
    if isinstance(value, float):
        return None if math.isnan(value) else value
    return value if value is None or isinstance(value, (str, int)) else str(value)


def _of_solution(solution: TorsionSolution, unit: str) -> Table:
    """Return every quantity of a solution, one a row, with its bounds or its error and its place."""

    def row(name: str, value: float | None, power: int, **more: float) -> tuple[Cell, ...]:
        known = [more.get(key) for key in ("lower", "upper", "rel_error", "x", "y")]
        dimension = unit or "length"
        text = f"{dimension}^{power}" if power > 1 else dimension if power == 1 else f"1/{dimension}^{-power}"
        return name, _cell(value), *known[:3], text, *known[3:]

    j = solution.torsion_constant
    x, y = solution.centre_of_twist
    low, high = solution.warping_extremes
    rows = [row("torsion constant", j.value, 4, lower=j.lower, upper=j.upper, rel_error=0.5 * j.rel_gap)]
    for k, spot in enumerate(solution.hot_spots):
        name = "hot spot, shear stress per torque" if k == 0 else "equal to it"
        rows.append(row(name, spot.stress_per_torque, -3, rel_error=spot.rel_error, x=spot.x, y=spot.y))
    if solution.hot_spot is not None:
        error = solution.hot_spot.rel_error
        rows.append(row("torsional section modulus", solution.section_modulus, 3, rel_error=error))
    sharp = "sharp re-entrant corner, stress unbounded"
    rows += [row(sharp, None, -3, x=float(px), y=float(py)) for px, py in solution.singular_corners]
    rows.append(row("warping constant", solution.warping_constant, 6))
    rows.append(row("least warping function", low, 2))
    rows.append(row("largest warping function", high, 2))
    rows.append(row("centre of twist", None, 1, x=x, y=y))
    names = ("quantity", "value", "lower bound", "upper bound", "relative error", "unit", "x", "y")
    return Table(names, tuple(rows))


# --- comma-separated values -------------------------------------------------------------------------------


def csv_text(result: Any, unit: str = "") -> str:
    """Return a result as comma-separated values (RFC 4180), the same in every locale.

    Numbers have a decimal point and every digit; a cell is empty where there is no number. Text that a spreadsheet
    would take for a formula gets an apostrophe before it.

    Raises
    ------
    InputError
        See `tabulated`.
    """
    table = tabulated(result, unit)
    stream = io.StringIO()
    writer = csv.writer(stream, lineterminator="\r\n")
    for row in (table.columns, *table.rows):
        writer.writerow([_csv_cell(cell) for cell in row])
    return stream.getvalue()


def _csv_cell(cell: Cell) -> str:
    if cell is None:
        return ""
    if isinstance(cell, str):
        text = printable(cell)
        return f"'{text}" if text.startswith(_FORMULA) else text
    return repr(cell) if isinstance(cell, float) else str(cell)


def write_csv(result: Any, path: str | os.PathLike[str], unit: str = "") -> Path:
    """Write a result as comma-separated values in UTF-8.

    Raises
    ------
    InputError
        See `tabulated`; or the file can't be written: an older one of that name is as it was.
    """
    return store(path, csv_text(result, unit).encode("utf-8"))


# --- Markdown ---------------------------------------------------------------------------------------------

#: What starts markup, in the table, in the line or as HTML.
_MARKUP = str.maketrans({sign: f"\\{sign}" for sign in "\\`*_[]<>|~#$!&"})


def markdown_text(result: Any, unit: str = "", digits: int = 5) -> str:
    """Return a result as a Markdown table, columns of numbers set to the right, nothing in it taken for markup.

    Parameters
    ----------
    result : TorsionSolution, Table or another result
    unit : str
        Of lengths.
    digits : int
        Of numbers.

    Raises
    ------
    InputError
        See `tabulated`.
    """
    table = tabulated(result, unit)
    cells = [[_markdown_cell(cell, digits) for cell in row] for row in (table.columns, *table.rows)]
    right = [_numeric([row[k] for row in table.rows]) for k in range(len(table.columns))]
    widths = [max(3, *(len(row[k]) for row in cells)) for k in range(len(table.columns))]
    lines = [_markdown_line(row, widths, right) for row in cells]
    rule = ["-" * (width - 1) + ":" if number_ else "-" * width for width, number_ in zip(widths, right, strict=True)]
    return "\n".join([lines[0], _markdown_line(rule, widths, right), *lines[1:]]) + "\n"


def _numeric(column: Sequence[Cell]) -> bool:
    return all(cell is None or isinstance(cell, (int, float)) for cell in column)


def _markdown_cell(cell: Cell, digits: int) -> str:
    if cell is None:
        return ""
    if isinstance(cell, float):
        return number(cell, digits)
    return " ".join(printable(str(cell)).split()).translate(_MARKUP)


def _markdown_line(cells: Sequence[str], widths: Sequence[int], right: Sequence[bool]) -> str:
    parts = [
        cell.rjust(width) if to_right else cell.ljust(width)
        for cell, width, to_right in zip(cells, widths, right, strict=True)
    ]
    return "| " + " | ".join(parts) + " |"


def write_markdown(result: Any, path: str | os.PathLike[str], unit: str = "", digits: int = 5) -> Path:
    """Write a result as a Markdown table in UTF-8.

    Raises
    ------
    InputError
        See `tabulated`; or the file can't be written: an older one of that name is as it was.
    """
    return store(path, markdown_text(result, unit, digits).encode("utf-8"))
