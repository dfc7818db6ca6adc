"""One table of a job file, read key by key: every value is checked, every error names file, line and key."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass, field
from difflib import get_close_matches
from pathlib import Path
from typing import Any

from torsionfe.checks import finite, one_of
from torsionfe.errors import InputError, JobError, OutlineError
from torsionfe.job.lines import Path as KeyPath
from torsionfe.job.lines import line_of
from torsionfe.quantities import UnitSystem, parse_quantity

__all__ = ["Source", "Stated", "Table"]

_PERCENT = re.compile(r"\s*(\d+\.?\d*(?:[eE][-+]?\d+)?)\s*%\s*\Z")


@dataclass(frozen=True, slots=True)
class Stated:
    """A number as a job states it, and in the job's units.

    Attributes
    ----------
    path : tuple
        Keys and places in arrays that lead to it.
    text : str
        As it stands in the file.
    value : float
    kind : str
        ``length``, ``torque``, ``stress``, ``angle``, ``twist rate`` or ``number``.
    """

    path: KeyPath
    text: str
    value: float
    kind: str


@dataclass
class Source:
    """A job file while it is read.

    Attributes
    ----------
    path : pathlib.Path
    lines : dict
        The line of each key.
    system : UnitSystem
        Which bare numbers are in, and quantities are brought into.
    folders : list of pathlib.Path
        Besides the job file's own, those that it may read from.
    stated : list of Stated
        Every number read so far, in the order of reading.
    """

    path: Path
    lines: dict[KeyPath, int]
    system: UnitSystem = field(default_factory=UnitSystem)
    folders: list[Path] = field(default_factory=list)
    stated: list[Stated] = field(default_factory=list)

    def error(self, path: KeyPath, message: str) -> JobError:
        """Return an error that names the file and the line of a key."""
        line = line_of(self.lines, path)
        return JobError(f"{self.path.name}, line {line}: {message}", line)


class Table:
    """A table of a job file.

    Parameters
    ----------
    source : Source
    path : tuple
        Where the table is.
    data : mapping
        What it holds.
    keys : iterable of str
        All that it may hold; another is an error.
    """

    def __init__(self, source: Source, path: KeyPath, data: Mapping[str, Any], keys: Sequence[str]) -> None:
        self.source, self.path, self.data = source, path, data
        unknown = [key for key in data if key not in keys]
        if unknown:
            near = get_close_matches(unknown[0], keys, n=1, cutoff=0.5)
            hint = f": did you mean {near[0]!r}?" if near else ""
            more = f" (nor {', '.join(map(_shown, unknown[1:6]))})" if unknown[1:] else ""
            where = f"[{self.name()}]" if path else "the job file"
            message = f"{where} has no key {_shown(unknown[0])}{more}{hint or '.'} Allowed: {', '.join(keys)}"
            raise self.error(unknown[0], message)

    # --- where it is ----------------------------------------------------------------------------------

    def name(self, key: str = "") -> str:
        """Return what messages call the table, or one of its keys: ``bar.segments[1].length``."""
        text = ""
        for part in (*self.path, *([key] if key else [])):
            text += f"[{part}]" if isinstance(part, int) else f".{part}" if text else part
        return text

    def error(self, key: str, message: str) -> JobError:
        """Return an error at one of the table's keys, or at the table itself (key ``''``)."""
        return self.source.error((*self.path, key) if key else self.path, message)

    @contextmanager
    def blame(self, key: str = "") -> Iterator[None]:
        """Turn an error of what a value was used for into one that names its line."""
        try:
            yield
        except JobError:
            raise
        except (InputError, OutlineError) as error:
            raise self.error(key, f"{self.name(key)}: {error}") from error

    def __contains__(self, key: str) -> bool:
        return key in self.data

    # --- plain values ---------------------------------------------------------------------------------

    def need(self, *keys: str) -> None:
        """Raise unless every key is there."""
        missing = [key for key in keys if key not in self.data]
        if missing:
            where = f"[{self.name()}]" if self.path else "the job file"
            raise self.error("", f"{where} needs {' and '.join(map(repr, missing))}")

    def _wrong(self, key: str, wanted: str) -> JobError:
        return self.error(key, f"{self.name(key)} must be {wanted}, got {_shown(self.data[key])}")

    def text(self, key: str, default: str = "", longest: int = 200) -> str:
        """Return a string."""
        value = self.data.get(key, default)
        if not isinstance(value, str):
            raise self._wrong(key, "text in quotes")
        if len(value) > longest:
            raise self.error(key, f"{self.name(key)} must have {longest} characters at most, got {len(value)}")
        return value

    def texts(self, key: str, default: Sequence[str] = (), most: int = 50) -> tuple[str, ...]:
        """Return strings; a single one counts as a list of one."""
        value = self.data.get(key, list(default))
        given = [value] if isinstance(value, str) else value
        if not isinstance(given, list) or not all(isinstance(item, str) for item in given):
            raise self._wrong(key, "text, or a list of texts")
        if len(given) > most:
            raise self.error(key, f"{self.name(key)} must have {most} entries at most, got {len(given)}")
        return tuple(given)

    def flag(self, key: str, default: bool) -> bool:
        """Return true or false."""
        value = self.data.get(key, default)
        if not isinstance(value, bool):
            raise self._wrong(key, "true or false")
        return value

    def whole(self, key: str, default: int, least: int, most: int) -> int:
        """Return a whole number within limits."""
        value = self.data.get(key, default)
        if isinstance(value, bool) or not isinstance(value, int) or not least <= value <= most:
            raise self._wrong(key, f"a whole number from {least} to {most}")
        return value

    def wholes(self, key: str, most: int = 1000) -> tuple[int, ...] | None:
        """Return whole numbers from 0; None where the key is missing."""
        if key not in self.data:
            return None
        value = self.data[key]
        given = value if isinstance(value, list) else [value]
        good = all(isinstance(item, int) and not isinstance(item, bool) and item >= 0 for item in given)
        if not good or len(given) > most:
            raise self._wrong(key, f"a list of whole numbers from 0, {most} at most")
        return tuple(given)

    def choice(self, key: str, allowed: Sequence[str], default: str = "") -> str:
        """Return one of some words."""
        with self.blame_plain(key):
            return one_of(self.name(key), self.data.get(key, default), allowed)

    def choices(self, key: str, allowed: Sequence[str], default: Sequence[str]) -> tuple[str, ...]:
        """Return some of some words, each once, in the order given."""
        given = self.texts(key, default)
        with self.blame_plain(key):
            return tuple(dict.fromkeys(one_of(f"an entry of {self.name(key)}", item, allowed) for item in given))

    # --- numbers with units ---------------------------------------------------------------------------

    @contextmanager
    def blame_plain(self, key: str) -> Iterator[None]:
        """As `blame`, for messages that name the key already."""
        try:
            yield
        except JobError:
            raise
        except InputError as error:
            raise self.error(key, str(error)) from error

    def quantity(self, key: str, kind: str, default: float | None = None) -> float | None:
        """Return a number of a kind in the job's units; bare numbers are in them already."""
        if key not in self.data:
            return default
        return self.measure((key,), self.data[key], kind)

    def needed(self, key: str, kind: str) -> float:
        """Return a number that must be there."""
        self.need(key)
        return self.measure((key,), self.data[key], kind)

    def measure(self, path: KeyPath, given: Any, kind: str) -> float:
        """Return a number found at a path below the table, in the job's units."""
        place = (*self.path, *path)
        name = Table(self.source, place, {}, ()).name()
        try:
            found = parse_quantity(name, given, kind)
            value = self.source.system.of(found)
        except InputError as error:
            raise self.source.error(place, str(error)) from error
        self.source.stated.append(Stated(place, _as_stated(given), value, kind))
        return value

    def number(self, key: str, default: float) -> float:
        """Return a plain number."""
        if key not in self.data:
            return default
        with self.blame_plain(key):
            value = finite(self.name(key), self.data[key])
        self.source.stated.append(Stated((*self.path, key), _as_stated(self.data[key]), value, "number"))
        return value

    def share(self, key: str, default: float) -> float:
        """Return a ratio, given as a number or as percent: ``0.001`` or ``'0.1 %'``."""
        value = self.data.get(key, default)
        if not isinstance(value, str):
            return self.number(key, default)
        match = _PERCENT.match(value)
        if match is None:
            raise self._wrong(key, "a number, or percent such as '0.1 %'")
        found = float(match[1]) / 100.0
        self.source.stated.append(Stated((*self.path, key), value, found, "number"))
        return found

    # --- tables within --------------------------------------------------------------------------------

    def table(self, key: str, keys: Sequence[str]) -> Table | None:
        """Return a table within; None where it is missing."""
        if key not in self.data:
            return None
        if not isinstance(self.data[key], dict):
            raise self._wrong(key, f"a table, [{self.name(key)}]")
        return Table(self.source, (*self.path, key), self.data[key], keys)

    def tables(self, key: str, keys: Sequence[str], most: int = 1000) -> list[Table]:
        """Return the tables of an array of them; none where it is missing."""
        given = self.data.get(key, [])
        if not isinstance(given, list) or not all(isinstance(item, dict) for item in given):
            raise self._wrong(key, f"one table or more, [[{self.name(key)}]]")
        if len(given) > most:
            raise self.error(key, f"{self.name(key)} must have {most} entries at most, got {len(given)}")
        return [Table(self.source, (*self.path, key, k), item, keys) for k, item in enumerate(given)]


def _as_stated(given: Any) -> str:
    return f"{given:.15g}" if isinstance(given, float) else str(given)


def _shown(value: Any) -> str:
    """Return a value of a job file for a message: short, on one line."""
    text = repr(value)
    return text if len(text) <= 60 else f"{text[:57]}..."
