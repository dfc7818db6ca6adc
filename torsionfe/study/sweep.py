"""Many sections: solved on all cores or on a cluster, saved as they finish, returned as one table."""

from __future__ import annotations

import hashlib
import os
import signal
import threading
from collections.abc import Callable, Iterable, Iterator, Mapping
from concurrent.futures import Executor
from contextlib import ExitStack, contextmanager
from dataclasses import asdict, dataclass, field
from typing import Any

from torsionfe.checks import one_of
from torsionfe.outline.outline import Outline
from torsionfe.study.dispatch import Dispatch, Job
from torsionfe.study.grid import Section, Sections, sections_of
from torsionfe.study.journal import ON_CHANGE, Journal, Session
from torsionfe.study.sweep_table import RowStore, SweepTable
from torsionfe.study.work import OK, SHORT, Parcel, Row, Settings, failure

__all__ = ["SweepInterrupted", "sweep"]

_LOOK_EVERY = 0.2  # seconds: for Ctrl-C, and for the clock of the progress line

Given = (
    Iterable[Outline] | Mapping[str, Outline] | Mapping[str, Iterable[Any] | float | str] | Iterable[Mapping[str, Any]]
)


class SweepInterrupted(KeyboardInterrupt):
    """Ctrl-C ended a sweep; every row that had finished is saved.

    Attributes
    ----------
    table : SweepTable
        The rows that had finished; they are in the journal, too, where there is one.
    """

    def __init__(self, message: str, table: SweepTable) -> None:
        super().__init__(message)
        self.table = table


def sweep(
    outlines: Given,
    build: Callable[..., Outline] | None = None,
    *,
    executor: Executor | None = None,
    workers: int | None = None,
    journal: str | os.PathLike[str] | None = None,
    on_change: str = "refuse",
    rel_tol: float = 1e-3,
    order: int = 2,
    peak_tol: float = 2e-3,
    max_unknowns: int = 300_000,
    progress: bool | None = None,
    in_flight: int | None = None,
) -> SweepTable:
    """Solve many sections; return one table, a row a section.

    A section that can't be built or solved is a row with its error; the others go on. So does the run when a worker
    is killed: its section is tried three times, then a row ``worker died``. Rows don't depend on executor, order or
    number of workers, to the last bit (on one kind of processor; see `SweepTable.same_as`).

    Sections are built in the calling process, as they are needed: ``build`` may be any function, a lambda too, and
    no more than ``in_flight`` outlines are in memory at a time. An error of the iterable itself ends the run.

    Parameters
    ----------
    outlines : iterable of Outline, mapping of str to Outline, or with ``build`` a parameter grid or iterable
        Outlines, from a generator too; outlines by name; a mapping of parameters to their values, of which every
        combination is built, the last parameter running fastest; or an iterable of mappings, one a section.
    build : callable, optional
        ``build(**parameters)`` returns an `Outline`: ``torsionfe.shapes.angle``, say.
    executor : concurrent.futures.Executor, optional
        Where to solve: threads, processes, ``Client.get_executor()`` of Dask, a pool of MPI ranks. It is left
        running. By default worker processes of this machine, each with one thread.
    workers : int, optional
        How many worker processes: one a core by default; 0 solves in the calling process.
    journal : path, optional
        A file that takes each row as it finishes. A sweep that is given the file of one that was killed, or of a
        smaller one, takes from it every section that is there and solves the others.
    on_change : str
        What to do with a journal of another version of the program, other settings or other parameters:
        ``'refuse'``, ``'keep'`` its rows as they are, or ``'restart'``, which puts it aside.
    rel_tol, order, peak_tol, max_unknowns
        As in `solve_torsion`.
    progress : bool, optional
        Whether to show rate and time left on standard error; by default where that is a terminal.
    in_flight : int, optional
        Sections on their way at a time: 3 a worker by default, 256 for an executor.

    Returns
    -------
    SweepTable

    Raises
    ------
    InputError
        An argument is out of its range.
    JournalError
        The journal is in use, another file, changed, or can't be written.
    SolveError
        No workers can be started, or the executor takes no sections.
    SweepInterrupted
        Ctrl-C, with the rows that had finished. A second Ctrl-C does not wait for the section being built.

    Examples
    --------
    >>> from torsionfe.outline.shapes import rectangle
    >>> table = sweep({"width": [10, 20], "height": 5}, rectangle, workers=0)
    >>> table["torsion_constant"].round().tolist()
    [286.0, 702.0]
    """
    one_of("on_change", on_change, ON_CHANGE)
    settings = Settings(rel_tol, order, peak_tol, max_unknowns)
    given = sections_of(outlines, build)
    rows = RowStore(given.names)
    with ExitStack() as stack:
        book = None
        if journal is not None:
            book = stack.enter_context(Journal(journal, _session(settings, given), on_change))
        dispatch = stack.enter_context(Dispatch(executor, workers, in_flight, settings))
        run = _Run(dispatch, rows, book, stack.enter_context(_progress(progress, given.total)))
        run.stopped = stack.enter_context(_interrupt_noted())
        run.through(given)
        notes = run.notes()
    if run.stopped():
        saved = f"; the journal {str(journal)!r} holds them: run again to go on" if journal is not None else ""
        raise SweepInterrupted(f"stopped after {run.count} sections{saved}", rows.table([*notes, "stopped by Ctrl-C"]))
    return rows.table(notes)


@dataclass
class _Run:
    """One sweep at work."""

    dispatch: Dispatch
    rows: RowStore
    journal: Journal | None
    bar: Any
    stopped: Callable[[], bool] = bool
    count: int = 0
    failed: int = 0
    complete: bool = field(default=False)

    def through(self, given: Sections) -> None:
        """Solve all sections, or stop where asked to."""
        for section in given:
            self._take(section)
            while self.dispatch.full and not self.stopped():
                self._collect()
            if self.stopped():
                return self._give_up()
            self._collect(0.0)
        while self.dispatch.busy:
            self._collect()
            if self.stopped():
                return self._give_up()
        self.complete = True
        return None

    def _take(self, section: Section) -> None:
        """Find a section's row in the journal, or send it off."""
        if section.outline is None:
            assert section.error is not None
            row = failure(section.error)
            key = hashlib.sha256(repr((dict(section.parameters), row["error"])).encode()).digest()[:16]
            return self._settle(section, row, None if self._found(key) else key)
        parcel = Parcel.of(section.outline)
        key = parcel.digest()
        known = self._found(key)
        if known is not None:
            self.bar.initial += 1  # not solved now: left out of the rate
            return self._settle(section, known, None)
        return self.dispatch.submit(Job(section, parcel, key))

    def _found(self, key: bytes) -> Row | None:
        return self.journal.find(key) if self.journal is not None else None

    def _collect(self, timeout: float = _LOOK_EVERY) -> None:
        for job, row in self.dispatch.finished(timeout):
            self._settle(job.section, row, job.key)

    def _give_up(self) -> None:
        self.dispatch.stop()
        for job, row in self.dispatch.rescued():
            self._settle(job.section, row, job.key)

    def _settle(self, section: Section, row: Row, new: bytes | None) -> None:
        """Put a row into the table and, where it is new, its key given, into the journal."""
        if self.journal is not None and new is not None:
            self.journal.append(new, section.index, section.parameters, row)
        self.rows.put(section.index, section.parameters, row)
        self.count += 1
        if row["status"] not in (OK, SHORT):
            self.failed += 1
            self.bar.set_postfix_str(f"{self.failed} failed", refresh=False)
        self.bar.update(1)

    def notes(self) -> list[str]:
        """Return what the reader of the table has to know."""
        if self.journal is None:
            return self.dispatch.notes
        return [*(self.journal.summary() if self.complete else self.journal.notes), *self.dispatch.notes]


def _session(settings: Settings, given: Sections) -> Session:
    from torsionfe import __version__

    return Session(__version__, asdict(settings), given.names)


class _Silent:
    """A progress bar that isn't shown."""

    initial = 0

    def update(self, count: int) -> None:
        """Show nothing."""

    def set_postfix_str(self, text: str, refresh: bool) -> None:
        """Show nothing."""


@contextmanager
def _progress(wanted: bool | None, total: int | None) -> Iterator[Any]:
    if wanted is False:
        yield _Silent()
        return
    from tqdm import tqdm

    # disable=None: only where standard error is a terminal
    with tqdm(total=total, unit="section", disable=False if wanted else None, dynamic_ncols=True) as bar:
        yield _Silent() if bar.disable else bar


@contextmanager
def _interrupt_noted() -> Iterator[Callable[[], bool]]:
    """Note the first Ctrl-C instead of raising in the middle of a write; the second one raises.

    Outside the main thread, or where the program handles interrupts its own way, nothing is changed.
    """
    noted = threading.Event()
    plain = threading.current_thread() is threading.main_thread()
    if not plain or signal.getsignal(signal.SIGINT) is not signal.default_int_handler:
        yield noted.is_set
        return

    def note(number: int, frame: Any) -> None:
        if noted.is_set():
            signal.default_int_handler(number, frame)
        noted.set()

    signal.signal(signal.SIGINT, note)
    try:
        yield noted.is_set
    finally:
        signal.signal(signal.SIGINT, signal.default_int_handler)
