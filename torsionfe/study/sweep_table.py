"""The table that a sweep returns: one row a section, one column a quantity."""

from __future__ import annotations

import csv
import io
import math
import numbers
import os
import sys
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats
from torsionfe.errors import InputError
from torsionfe.storing import store
from torsionfe.study.work import NUMBERS, OK, SHORT, WORDS, Row
from torsionfe.text import number, percent, table

if TYPE_CHECKING:
    from matplotlib.axes import Axes

__all__ = ["RowStore", "SweepTable", "check_names"]

_NUMBERS, _WORDS = tuple(NUMBERS), tuple(WORDS)
_COUNTS = ("singular_corners",)
_SHOWN = 12


@dataclass(frozen=True, eq=False, repr=False)
class SweepTable:
    """Sections and their answers, in the order in which they were given. ``print`` shows the first.

    ``pandas.DataFrame(table.columns)`` is the same table as a frame.

    Attributes
    ----------
    parameters : tuple of str
        The first columns: what the sections were built from.
    columns : dict of str to ndarray
        Every column by its name, each of shape (n,), read-only; `NUMBERS` and `WORDS` of
        `torsionfe.study.work` say what the answers are.
    notes : tuple of str
        What the reader of the table has to know, such as rows that come from an older version.
    """

    parameters: tuple[str, ...]
    columns: dict[str, NDArray[Any]]  # pandas takes no other mapping
    notes: tuple[str, ...] = ()

    def __len__(self) -> int:
        return len(self.columns["status"])

    def __getitem__(self, name: str) -> NDArray[Any]:
        try:
            return self.columns[name]
        except KeyError:
            raise InputError(f"the table has no column {name!r}, only {', '.join(self.columns)}") from None

    @property
    def solved(self) -> NDArray[np.bool_]:
        """Which rows hold an answer, converged or not, shape (n,)."""
        return np.asarray(np.isin(self["status"].astype(str), (OK, SHORT)))

    @property
    def array(self) -> NDArray[Any]:
        """The table as a structured array, shape (n,)."""
        found = np.empty(len(self), dtype=[(name, column.dtype) for name, column in self.columns.items()])
        for name, column in self.columns.items():
            found[name] = column
        return found

    def same_as(self, other: SweepTable) -> bool:
        """Return whether another table holds the same rows, bit for bit; times and notes are left out."""
        if tuple(self.columns) != tuple(other.columns) or len(self) != len(other):
            return False
        return all(_same(self[name], other[name]) for name in self.columns if name != "seconds")

    def save_csv(self, path: str | os.PathLike[str]) -> Path:
        """Write the table as comma-separated values, every digit kept, empty where there is no number.

        Raises
        ------
        InputError
            The file can't be written; an older one of that name is as it was.
        """
        text = io.StringIO()
        writer = csv.writer(text, lineterminator="\n")
        writer.writerow(self.columns)
        for row in zip(*(column.tolist() for column in self.columns.values()), strict=True):
            writer.writerow(["" if isinstance(cell, float) and math.isnan(cell) else cell for cell in row])
        return store(path, text.getvalue().encode())

    def plot(self, ax: Axes | None = None, **options: Any) -> Any:
        """Draw a column over one or two parameters; see `torsionfe.output.sweep_map.plot_map`."""
        from torsionfe.output.sweep_map import plot_map

        return plot_map(self, ax=ax, **options)

    def __repr__(self) -> str:
        return f"<SweepTable {self._summary()}>"

    def _summary(self) -> str:
        counts = Counter(self["status"].tolist())
        return f"{len(self)} section{'s'[: len(self) != 1]}" + "".join(f", {n} {name}" for name, n in counts.items())

    def __str__(self) -> str:
        shown = range(min(len(self), _SHOWN))
        heads = ["row", *self.parameters, "J", "+/-", "stress/torque", "hand J", "status"]
        rows = [heads, *([str(k), *self._cells(k)] for k in shown)]
        lines = [table(rows, f"Sweep: {self._summary()}", head=True)]
        if len(self) > _SHOWN:
            lines.append(f"... and {len(self) - _SHOWN} more rows")
        if (self["singular_corners"][:_SHOWN] > 0).any():
            lines.append("* the largest finite stress: it is unbounded in sharp re-entrant corners")
        failed = np.flatnonzero(~self.solved)
        lines += [f"row {k}: {self['error'][k]}" for k in failed[:5]]
        if len(failed) > 5:
            lines.append(f"... and {len(failed) - 5} more without an answer: table['error']")
        return "\n".join([*lines, *(f"note: {note}" for note in self.notes)])

    def _cells(self, k: int) -> list[str]:
        given = [self[name][k] for name in self.parameters]
        cells = [number(float(v)) if isinstance(v, (float, np.floating)) else str(v)[:24] for v in given]
        if not self.solved[k]:
            return [*cells, "", "", "", "", str(self["status"][k])]
        j = float(self["torsion_constant"][k])
        half = 0.5 * float(self["torsion_constant_upper"][k] - self["torsion_constant_lower"][k]) / j
        hand = float(self["hand_error"][k])
        off = "" if np.isnan(hand) else percent(hand)
        tau = float(self["stress_per_torque"][k])
        stress = "none finite" if math.isnan(tau) else number(tau) + " *"[: 2 * bool(self["singular_corners"][k])]
        return [*cells, number(j, 6), percent(half), stress, off, str(self["status"][k])]


def _same(mine: NDArray[Any], other: NDArray[Any]) -> bool:
    if mine.dtype != other.dtype:
        return False
    if mine.dtype == np.float64:
        return bool(mine.tobytes() == other.tobytes())
    return bool(mine.tolist() == other.tolist())


class RowStore:
    """Rows as they come, in any order, in a few compact arrays.

    Parameters
    ----------
    names : sequence of str
        Parameters.
    """

    def __init__(self, names: Sequence[str]) -> None:
        check_names(names)
        self.names = tuple(names)
        self._numbers = np.full((64, len(_NUMBERS)), np.nan)
        self._words: dict[str, list[str | None]] = {name: [] for name in _WORDS}
        self._given: dict[str, list[Any]] = {name: [] for name in self.names}

    def put(self, index: int, parameters: Mapping[str, Any], row: Row) -> None:
        """Store a row at its place."""
        while index >= len(self._numbers):
            self._numbers = np.concatenate([self._numbers, np.full_like(self._numbers, np.nan)])
        for column in (*self._words.values(), *self._given.values()):
            column.extend([None] * (index + 1 - len(column)))
        self._numbers[index] = [row.get(name, np.nan) for name in _NUMBERS]
        for name, words in self._words.items():
            words[index] = sys.intern(str(row.get(name, "")))  # few are different, so each is kept once
        for name, given in self._given.items():
            given[index] = parameters.get(name)

    def table(self, notes: Iterable[str] = ()) -> SweepTable:
        """Return the rows that have come so far."""
        done = [k for k, status in enumerate(self._words["status"]) if status is not None]
        columns: dict[str, NDArray[Any]] = {
            name: _typed([given[k] for k in done]) for name, given in self._given.items()
        }
        for place, name in enumerate(_NUMBERS):
            column = self._numbers[done, place]
            columns[name] = np.nan_to_num(column).astype(np.int64) if name in _COUNTS else column
        for name, words in self._words.items():
            columns[name] = np.array([words[k] for k in done], dtype=object)
        for column in columns.values():
            column.flags.writeable = False
        return SweepTable(self.names, columns, tuple(notes))


def check_names(names: Sequence[str]) -> None:
    """Refuse a parameter whose name is one of the answers'.

    Raises
    ------
    InputError
        The message names it.
    """
    clash = next((name for name in names if name in _NUMBERS or name in _WORDS), None)
    if clash is not None:
        raise InputError(f"a parameter can't be called {clash!r}: the table has an answer of that name; rename it")


def _typed(values: list[Any]) -> NDArray[Any] | Floats:
    """Return a column of the narrowest type that holds its values as they are."""
    for kind, dtype in ((bool, np.bool_), (numbers.Integral, np.int64), (numbers.Real, np.float64)):
        if values and all(isinstance(v, kind) and (kind is bool or not isinstance(v, bool)) for v in values):
            try:
                return np.array(values, dtype=dtype)
            except OverflowError:
                break
    column = np.empty(len(values), dtype=object)
    column[:] = values
    return column
