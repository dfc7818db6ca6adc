"""Points in columns: x, y and optionally the radius of the corner, the bulge of the edge that follows, the loop.

Columns are told by a first line of names (``x [mm], y [mm], radius, bulge, loop`` in any order), or else are x,
y, radius and loop. They are set off by commas, semicolons, tabs or blanks; with anything but a comma between
the columns, the decimal sign may be a comma.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from difflib import get_close_matches

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import ReadError, UnitError
from torsionfe.outline.files.loops import LARGEST, Found, RawLoop, ReadOptions, closed_loop, too_many
from torsionfe.outline.outline import Outline

__all__ = ["points_text", "read_points"]

_NUMBER = re.compile(r"[+-]?(?:[0-9]+[.,]?[0-9]*|[.,][0-9]+)(?:[eE][+-]?[0-9]+)?")
_HEAD = re.compile(r"(?P<name>[^\[(]*?)\s*(?:\[(?P<unit>[^\]]*)\]|\((?P<round>[^)]*)\))?")
_UNIT_LINE = re.compile(r"#\s*unit\s*[:=]\s*(?P<unit>.+)", re.IGNORECASE)
_COLUMNS = ("x", "y", "radius", "loop", "bulge")
_LENGTHS = ("x", "y", "radius")
_SPARE_LINES = 1000
_LONGEST_LINE = 2000


@dataclass(frozen=True)
class _Head:
    """Which column is what, and in which unit."""

    names: tuple[str, ...]
    unit: str | None
    given: bool


def read_points(text: str, options: ReadOptions) -> Found:
    """Return the loops of a table of points.

    Raises
    ------
    ReadError
        A cell is no number, a row too short or long, or a column unknown; the message tells the line.
    UnitError
        The columns are in different units.
    """
    if text.count("\n") > options.max_edges + _SPARE_LINES:
        raise too_many(text.count("\n"), options.max_edges)
    lines, unit = _lines(text)
    if not lines:
        raise ReadError("it holds no points")
    long = next((number for number, line in lines if len(line) > _LONGEST_LINE), None)
    if long is not None:
        raise ReadError(f"line {long} is longer than {_LONGEST_LINE} characters: it is no table of points")
    sign = next((sign for sign in ";\t," if sign in lines[0][1]), None)
    rows = [(number, _cells(line, sign)) for number, line in lines]
    head = _head(rows[0], sign)
    if unit is not None and head.unit is not None and unit != head.unit:
        raise UnitError(f"the points are said to be in {unit!r} and in {head.unit!r}")
    rows = rows[1:] if head.given else rows
    if not rows:
        raise ReadError("it holds no points")
    values = np.array([_values(cells, number, head, sign) for number, cells in rows])
    return Found(tuple(_loops(values, head)), unit or head.unit)


def _lines(text: str) -> tuple[list[tuple[int, str]], str | None]:
    """Return the lines that hold something, each with its number, and the unit that a comment states."""
    lines, unit = [], None
    for number, raw in enumerate(text.split("\n"), 1):
        line = raw.strip(" \r\f\v")
        if line.startswith("#"):
            found = _UNIT_LINE.fullmatch(line)
            unit = found["unit"].strip() if found else unit
        elif line.strip():
            lines.append((number, line))
    return lines, unit


def _cells(line: str, sign: str | None) -> list[str]:
    return [cell.strip().strip('"').strip() for cell in line.split(sign)]


def _number(cell: str, sign: str | None) -> float | None:
    """Return a cell's number, None where it is none."""
    if not _NUMBER.fullmatch(cell) or ("," in cell and sign == ","):
        return None
    return float(cell.replace(",", "."))


def _head(row: tuple[int, list[str]], sign: str | None) -> _Head:
    number, cells = row
    if all(_number(cell, sign) is not None or (not cell and k > 1) for k, cell in enumerate(cells)):
        if not 2 <= len(cells) <= 4:
            raise ReadError(
                f"line {number} has {len(cells)} columns: x, y and at most radius and loop are taken without a line "
                "of names above"
            )
        return _Head(_COLUMNS[: len(cells)], None, False)
    names, units = [], set()
    for cell in cells:
        found = _HEAD.fullmatch(cell)
        name = (found["name"] if found else cell).strip().lower()
        name = "radius" if name == "r" else name
        if name not in _COLUMNS:
            near = get_close_matches(name, _COLUMNS, n=1)
            hint = f"; did you mean {near[0]!r}?" if near else ""
            raise ReadError(
                f"line {number}: {cell!r:.40} is neither a number nor the name of a column "
                f"({', '.join(_COLUMNS)}){hint}"
            )
        unit = found and (found["unit"] or found["round"])
        if unit and name in _LENGTHS:
            units.add(unit.strip())
        names.append(name)
    if len(set(names)) < len(names) or not {"x", "y"} <= set(names):
        raise ReadError(f"line {number}: the columns must be x and y and others once each, got {', '.join(names)}")
    if len(units) > 1:
        raise UnitError(f"line {number}: the columns are in different units ({', '.join(sorted(units))})")
    return _Head(tuple(names), units.pop() if units else None, True)


def _values(cells: list[str], number: int, head: _Head, sign: str | None) -> list[float]:
    """Return the numbers of a row; what is left empty beside x and y is 0."""
    if len(cells) != len(head.names):
        raise ReadError(f"line {number} has {len(cells)} columns where {len(head.names)} are needed")
    values = []
    for name, cell in zip(head.names, cells, strict=True):
        value = 0.0 if not cell and name not in ("x", "y") else _number(cell, sign)
        if value is None or not abs(value) < LARGEST:
            raise ReadError(f"line {number}: {name} must be a finite number, got {cell!r:.40}")
        if name == "radius" and value < 0.0:
            raise ReadError(f"line {number}: the radius must be 0 or more, got {value:g}")
        if name == "loop" and value != round(value):
            raise ReadError(f"line {number}: the loop must be a whole number, got {cell!r:.40}")
        values.append(value)
    return values


def _loops(values: Floats, head: _Head) -> list[RawLoop]:
    column = {name: values[:, k] for k, name in enumerate(head.names)}
    zero = np.zeros(len(values))
    loop, bulges, radii = (column.get(name, zero) for name in ("loop", "bulge", "radius"))
    points = np.stack([column["x"], column["y"]], axis=1)
    _, first, of_row = np.unique(loop, return_index=True, return_inverse=True)
    loops = []
    for which in np.argsort(first):
        rows = np.flatnonzero(of_row == which)
        ring = closed_loop(points[rows], bulges[rows])
        loops.append(RawLoop(ring.vertices, ring.bulges, radii[rows][: len(ring.vertices)]))
    return loops


def points_text(outline: Outline, unit: str | None) -> str:
    """Return a table with the columns x, y, bulge and loop (0 for the outer one)."""
    suffix = "" if unit is None else f" [{unit}]"
    lines = [f"x{suffix},y{suffix},bulge,loop"]
    for number, loop in enumerate((outline, *outline.voids)):
        rows = zip(loop.vertices.tolist(), loop.bulges.tolist(), strict=True)
        lines += [f"{x!r},{y!r},{bulge!r},{number}" for (x, y), bulge in rows]
    return "\n".join(lines) + "\n"
