"""The journal of a sweep: every finished section on disk at once, so that a run that was killed goes on where it was.

A text file. The first line says what it is. Each other line is ``crc key json``: eight hexadecimal digits of the
CRC-32 of the rest, the section's digest (32 digits; ``session`` where a run states how it solves), and the row.
Lines are only ever appended, each in one write, so that killing the program leaves at most one half line, at the
end. They reach the disk itself within a second and when the run ends: a power cut may take the rows of the last
second, and they are then solved again.
"""

from __future__ import annotations

import errno
import json
import math
import os
import shutil
import stat
import zlib
from array import array
from collections import Counter
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from pathlib import Path
from time import monotonic
from typing import Any, BinaryIO
from weakref import WeakSet

import numpy as np

from torsionfe.checks import one_of
from torsionfe.errors import JournalError
from torsionfe.study.sweep_table import RowStore, SweepTable
from torsionfe.study.work import LOST, NUMBERS, Row

__all__ = ["ON_CHANGE", "Journal", "Session", "read_journal"]

#: What to do with a journal that was written by another version, with other settings or other parameters.
ON_CHANGE = ("refuse", "keep", "restart")

_MAGIC = b"torsionfe sweep journal, format 1\n"
_FAMILY = b"torsionfe sweep journal, format "
_SESSION = b"session"
_SYNC_EVERY = 1.0  # seconds


@dataclass(frozen=True, slots=True)
class Session:
    """How a run solves: what rows depend on besides their section.

    Attributes
    ----------
    program : str
        Version of torsionfe.
    settings : mapping of str to number
    parameters : tuple of str
        Names.
    """

    program: str
    settings: Mapping[str, float]
    parameters: tuple[str, ...]

    def record(self) -> dict[str, Any]:
        """Return it as the journal writes it."""
        settings = {name: _written(value) for name, value in self.settings.items()}
        return {"program": self.program, "settings": settings, "parameters": list(self.parameters)}


@dataclass
class _Contents:
    """What a journal holds: where each row is, compactly."""

    keys: array[int] = field(default_factory=lambda: array("Q"))  # first half of the digest
    offsets: array[int] = field(default_factory=lambda: array("q"))
    session_of: array[int] = field(default_factory=lambda: array("l"))
    sessions: list[dict[str, Any]] = field(default_factory=list)
    damaged: list[int] = field(default_factory=list)  # line numbers
    end: int = 0  # of the last whole line


class Journal:
    """A journal that one run holds for itself, to find rows in it and to append others.

    Parameters
    ----------
    path : str or path
        Made where it does not exist.
    session : Session
    on_change : str
        Where the program's version, the settings or the names of the parameters differ from the journal's:
        ``'refuse'`` raises, ``'keep'`` uses its rows as they are and says so, ``'restart'`` copies it aside
        and begins anew.

    Attributes
    ----------
    notes : list of str
        What was found and done.

    Raises
    ------
    JournalError
        In use by another run, not a journal, of a later format, changed (``'refuse'``), or can't be written.
    """

    def __init__(self, path: str | os.PathLike[str], session: Session, on_change: str = "refuse") -> None:
        one_of("on_change", on_change, ON_CHANGE)
        self.path = _checked_path(path)
        self.notes: list[str] = []
        self._fd = _locked(self.path)
        _open.add(self)
        self._synced = monotonic()
        self._reader: BinaryIO | None = None
        try:
            self._reader = open(self.path, "rb")  # noqa: SIM115 (closed by close)
            self._begin(session, on_change)
        except OSError as error:
            self.close()
            raise JournalError(f"journal {str(self.path)!r}: {error.strerror or error}") from error
        except BaseException:
            self.close()
            raise

    # --- opening --------------------------------------------------------------------------------------

    def _begin(self, session: Session, on_change: str) -> None:
        contents = self._read()
        record = session.record()
        changes = _changes(contents.sessions[-1], record) if contents.sessions else []
        if contents.keys and not contents.sessions:
            changes = ["the line that says how its rows were solved is damaged"]
        if changes and on_change == "refuse":
            raise JournalError(
                f"journal {str(self.path)!r} is from a run that differs: {'; '.join(changes)}. Choose on_change='keep' "
                "to use its rows as they are, 'restart' to put it aside and solve all again, or another journal"
            )
        if changes and on_change == "restart":
            aside = _put_aside(self.path)
            os.ftruncate(self._fd, 0)
            self.notes.append(f"the journal differed ({'; '.join(changes)}): it was put aside as {aside.name!r}")
            contents = self._read()
        if contents.damaged:
            lines = ", ".join(map(str, contents.damaged[:5])) + (" ..." if len(contents.damaged) > 5 else "")
            self.notes.append(f"{len(contents.damaged)} damaged journal line(s) left out (line {lines})")
        if not contents.sessions or contents.sessions[-1] != record:
            self._write(_line(_SESSION, record))
            contents.sessions.append(record)
            self._sync()
        self._sessions = contents.sessions
        self._sort(contents)

    def _read(self) -> _Contents:
        """Return what is in the file, a half-written last line cut off; a new file gets its first line."""
        assert self._reader is not None
        size = os.fstat(self._fd).st_size
        self._reader.seek(0)
        head = self._reader.read(len(_MAGIC))
        if head != _MAGIC:
            if size >= len(_MAGIC) or not _MAGIC.startswith(head):
                raise JournalError(_not_a_journal(self.path, head))
            os.ftruncate(self._fd, 0)  # new, or killed while its first line was written
            self._write(_MAGIC)
            _sync_folder(self.path.parent)
        contents = _scan(self._reader)
        if contents.end < size:
            os.ftruncate(self._fd, contents.end)
            self.notes.append(f"a half-written last journal line was dropped ({size - contents.end} bytes)")
        return contents

    def _sort(self, contents: _Contents) -> None:
        keys = np.frombuffer(contents.keys, dtype=np.uint64) if contents.keys else np.empty(0, dtype=np.uint64)
        order = np.argsort(keys, kind="stable")
        self._keys = keys[order]
        self._offsets = np.array(contents.offsets, dtype=np.int64)[order]
        self._session_of = np.array(contents.session_of, dtype=np.int64)[order]
        self._used = np.zeros(len(order), dtype=bool)

    # --- rows -----------------------------------------------------------------------------------------

    def find(self, key: bytes) -> Row | None:
        """Return the row of a section, None where it has none yet, or one that should be tried again."""
        number = np.uint64(int.from_bytes(key[:8], "big"))
        first, last = (int(np.searchsorted(self._keys, number, side)) for side in ("left", "right"))
        if first == last:
            return None
        assert self._reader is not None
        self._used[first:last] = True
        self._reader.seek(int(self._offsets[last - 1]))  # of several, the last counts
        found = _parsed(self._reader.readline())
        if found is None or found[0] != key.hex().encode() or found[1]["row"]["status"] == LOST:
            return None
        return _read_row(found[1]["row"])

    def append(self, key: bytes, index: int, parameters: Mapping[str, Any], row: Row) -> None:
        """Write the row of a section.

        Raises
        ------
        JournalError
            It can't be written: the disk is full, say.
        """
        plain = {name: _written(value) for name, value in parameters.items()}
        record = {"index": index, "parameters": plain, "row": {name: _written(value) for name, value in row.items()}}
        self._write(_line(key.hex().encode(), record))
        if monotonic() - self._synced > _SYNC_EVERY:
            self._sync()

    def summary(self) -> list[str]:
        """Return notes on what the journal held, for a run that has asked for all its sections."""
        notes = list(self.notes)
        older: Counter[str] = Counter()
        for number, count in Counter(self._session_of[self._used].tolist()).items():
            changes = _changes(self._sessions[number], self._sessions[-1]) if number >= 0 else ["settings not known"]
            if changes:
                older["; ".join(changes)] += count
        notes += [f"{n} rows were kept from a run that differed: {changes}" for changes, n in older.items()]
        left = len(np.unique(self._keys[~self._used]))
        if left:
            notes.append(
                f"the inputs have changed: {left} of the {len(np.unique(self._keys))} rows that the journal held "
                "belong to no section of this run; they stay in the file, not in the table"
            )
        return notes

    def close(self) -> None:
        """Bring every row to the disk and give the journal free."""
        if self._fd >= 0:
            fd, self._fd = self._fd, -1
            _open.discard(self)
            try:
                os.fsync(fd)
            finally:
                os.close(fd)
        if self._reader is not None:
            self._reader.close()

    def __enter__(self) -> Journal:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def _write(self, line: bytes) -> None:
        rest = memoryview(line)
        try:
            while rest:
                rest = rest[os.write(self._fd, rest) :]
        except OSError as error:
            raise JournalError(
                f"journal {str(self.path)!r} can't be written: {error.strerror}; the rows before are saved in it"
            ) from error

    def _sync(self) -> None:
        os.fsync(self._fd)
        self._synced = monotonic()


# --- the file ---------------------------------------------------------------------------------------------

_open: WeakSet[Journal] = WeakSet()


def _let_go() -> None:
    """Close the journals of the parent in a forked child, which would hold their locks beyond the parent's end."""
    for journal in list(_open):
        os.close(journal._fd)
        journal._fd = -1


if hasattr(os, "register_at_fork"):
    os.register_at_fork(after_in_child=_let_go)


def _checked_path(path: Any) -> Path:
    try:
        found = Path(path)
    except TypeError:
        raise JournalError(f"journal must be the path of a file, got {path!r:.80}") from None
    if not found.parent.is_dir():
        raise JournalError(f"journal {str(path)!r}: there is no folder {str(found.parent)!r}; make it first")
    if found.exists() and not stat.S_ISREG(found.stat().st_mode):
        raise JournalError(f"journal {str(path)!r} is no file")
    return found


def _locked(path: Path) -> int:
    """Return a descriptor of the file, which no other run has; the lock goes with the process that holds it."""
    try:
        fd = os.open(path, os.O_RDWR | os.O_CREAT | os.O_APPEND | getattr(os, "O_BINARY", 0), 0o644)
    except OSError as error:
        raise JournalError(f"journal {str(path)!r} can't be opened: {error.strerror}") from error
    try:
        _lock(fd)
    except OSError as error:
        os.close(fd)
        if error.errno not in (errno.EAGAIN, errno.EACCES, errno.EDEADLK):
            raise JournalError(f"journal {str(path)!r} can't be locked: {error.strerror}; use a local disk") from error
        raise JournalError(
            f"journal {str(path)!r} is in use by another run: wait for its end, or choose another journal"
        ) from None
    return fd


def _lock(fd: int) -> None:
    try:
        import fcntl
    except ImportError:  # pragma: no cover (Windows)
        import msvcrt

        place = os.lseek(fd, 0, os.SEEK_CUR)
        os.lseek(fd, 1 << 40, os.SEEK_SET)  # beyond every row, so that they can still be read
        msvcrt.locking(fd, msvcrt.LK_NBLCK, 1)  # type: ignore[attr-defined,unused-ignore]
        os.lseek(fd, place, os.SEEK_SET)
    else:
        fcntl.flock(fd, fcntl.LOCK_EX | fcntl.LOCK_NB)


def _sync_folder(folder: Path) -> None:
    """Bring the name of a new file to the disk, where folders can be opened."""
    try:
        fd = os.open(folder, os.O_RDONLY)
    except OSError:  # pragma: no cover (Windows)
        return
    try:
        os.fsync(fd)
    finally:
        os.close(fd)


def _put_aside(path: Path) -> Path:
    number = next(n for n in range(1, 1_000_000) if not path.with_name(f"{path.name}.{n}").exists())
    return Path(shutil.copyfile(path, path.with_name(f"{path.name}.{number}")))


def _not_a_journal(path: Path, head: bytes) -> str:
    if head.startswith(_FAMILY):
        return f"journal {str(path)!r} is of a format that this version does not know: use the version that wrote it"
    return f"{str(path)!r} is another kind of file, no sweep journal: choose another name, it is left as it is"


def _line(key: bytes, record: Mapping[str, Any]) -> bytes:
    body = key + b" " + json.dumps(record, separators=(",", ":"), allow_nan=False).encode()
    return b"%08x %s\n" % (zlib.crc32(body), body)


def _parsed(line: bytes) -> tuple[bytes, dict[str, Any]] | None:
    """Return key and record of a line; None where it is damaged."""
    if not line.endswith(b"\n") or line[:9] != b"%08x " % zlib.crc32(line[9:-1]):
        return None
    key, _, record = line[9:-1].partition(b" ")
    return key, json.loads(record)


def _scan(reader: BinaryIO) -> _Contents:
    """Return where the rows are; only the checksum of a row is looked at."""
    reader.seek(0)
    contents = _Contents(end=len(reader.readline()))
    for number, line in enumerate(reader, start=2):
        if not line.endswith(b"\n"):
            break
        if line[:9] != b"%08x " % zlib.crc32(line[9:-1]):
            contents.damaged.append(number)
        elif line.startswith(_SESSION, 9):
            contents.sessions.append(json.loads(line[9 + len(_SESSION) :]))
        else:
            contents.keys.append(int(line[9:25], 16))
            contents.offsets.append(contents.end)
            contents.session_of.append(len(contents.sessions) - 1)
        contents.end += len(line)
    return contents


def _changes(before: Mapping[str, Any], now: Mapping[str, Any]) -> list[str]:
    """Return how two sessions differ, in words."""
    found = []
    if before["program"] != now["program"]:
        found.append(f"program version {before['program']}, now {now['program']}")
    if before["parameters"] != now["parameters"]:
        names = (", ".join(run["parameters"]) or "none" for run in (before, now))
        found.append("parameters {}, now {}".format(*names))
    settings = [(name, before["settings"].get(name), value) for name, value in now["settings"].items()]
    return found + [f"{name} {then}, now {value}" for name, then, value in settings if then != value]


# --- numbers ----------------------------------------------------------------------------------------------


def _written(value: Any) -> Any:
    """Return a value as JSON holds it; floats keep every digit."""
    if isinstance(value, float) and not math.isfinite(value):
        return None if math.isnan(value) else repr(value)
    return value if value is None or isinstance(value, (bool, int, float, str)) else repr(value)


def _read_row(record: Mapping[str, Any]) -> Row:
    row = dict(record)
    return row | {name: math.nan if row[name] is None else float(row[name]) for name in NUMBERS if name in row}


def read_journal(path: str | os.PathLike[str]) -> SweepTable:
    """Return the rows of a journal as a table, in the order of their sections, without solving anything.

    A section that a sweep was given several times may be there once.

    Parameters
    ----------
    path : str or path
        May belong to a run that is still going on.

    Raises
    ------
    JournalError
        No such file, or not a journal.
    """
    where = _checked_path(path)
    try:
        with open(where, "rb") as reader:
            head = reader.read(len(_MAGIC))
            if head != _MAGIC:
                raise JournalError(_not_a_journal(where, head))
            contents = _scan(reader)
            places = _latest(reader, contents)
            names = contents.sessions[-1]["parameters"] if contents.sessions else []
            rows = RowStore(names)
            for index, record in enumerate(_records(reader, places)):
                rows.put(index, record["parameters"], _read_row(record["row"]))
    except OSError as error:
        raise JournalError(f"journal {str(where)!r} can't be read: {error.strerror}") from error
    damaged = len(contents.damaged)
    return rows.table([f"{damaged} damaged journal line(s) left out"] if damaged else [])


def _latest(reader: BinaryIO, contents: _Contents) -> list[int]:
    """Return where the last row of each section is, in the order of the sections."""
    found: dict[tuple[int, int], int] = {}
    for key, offset in zip(contents.keys, contents.offsets, strict=True):
        reader.seek(offset)
        record = _parsed(reader.readline())
        if record is not None:
            found[record[1]["index"], key] = offset
    return [found[place] for place in sorted(found)]


def _records(reader: BinaryIO, places: list[int]) -> Iterator[dict[str, Any]]:
    for offset in places:
        reader.seek(offset)
        record = _parsed(reader.readline())
        if record is not None:
            yield record[1]
