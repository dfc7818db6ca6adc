"""Sections on their way through an executor: a bounded number at a time, tried again when a worker is lost."""

from __future__ import annotations

import queue
from collections.abc import Callable, Iterator
from concurrent.futures import BrokenExecutor, Executor, Future
from dataclasses import dataclass
from typing import Any, ParamSpec, TypeVar

from torsionfe.errors import InputError, SolveError
from torsionfe.study.crew import Crew, CrewError
from torsionfe.study.grid import Section
from torsionfe.study.work import LOST, Parcel, Row, Settings, failure, solve_parcel

__all__ = ["Dispatch", "Job"]

_P = ParamSpec("_P")
_T = TypeVar("_T")
_TRIES = 3
_AHEAD = 3  # sections per worker: one at work, one ready, one on its way
_AHEAD_ELSEWHERE = 256  # the workers of another executor are not known, and may be far


@dataclass
class Job:
    """A section that is being solved."""

    section: Section
    parcel: Parcel
    key: bytes
    tries: int = 0


class _Here(Executor):
    """The calling process."""

    def submit(self, fn: Callable[_P, _T], /, *args: _P.args, **kwargs: _P.kwargs) -> Future[_T]:
        future: Future[_T] = Future()
        try:
            future.set_result(fn(*args, **kwargs))
        except Exception as error:
            future.set_exception(error)
        return future


class Dispatch:
    """Sends sections to workers and brings their rows back, in the order in which they finish.

    Parameters
    ----------
    executor : concurrent.futures.Executor or None
        Left running; None starts workers of this machine.
    workers : int or None
        How many of these: one a core by default, 0 solves in the calling process.
    in_flight : int or None
        How many sections may be on their way at a time.
    settings : Settings

    Raises
    ------
    InputError
        An argument is no such thing.
    """

    def __init__(
        self, executor: Executor | None, workers: int | None, in_flight: int | None, settings: Settings
    ) -> None:
        _check(executor, workers, in_flight)
        self.settings = settings
        self.notes: list[str] = []
        self._own: Crew | None = None
        self._executor: Executor
        if executor is not None:
            self._executor, ahead = executor, _AHEAD_ELSEWHERE
        elif workers == 0:
            self._executor, ahead = _Here(), 1
        else:
            self._executor = self._own = Crew(workers)
            ahead = _AHEAD * self._own.workers
        self._most = ahead if in_flight is None else in_flight
        self._jobs: dict[Future[Row], Job] = {}
        self._done: queue.SimpleQueue[Future[Row]] = queue.SimpleQueue()

    @property
    def busy(self) -> bool:
        """Whether sections are on their way."""
        return bool(self._jobs)

    @property
    def full(self) -> bool:
        """Whether as many are on their way as may be."""
        return len(self._jobs) >= self._most

    def submit(self, job: Job) -> None:
        """Send a section off.

        Raises
        ------
        SolveError
            The executor takes none.
        """
        job.tries += 1
        try:
            future = self._executor.submit(solve_parcel, job.parcel, self.settings)
        except BrokenExecutor as error:
            self._replace(error)
            future = self._executor.submit(solve_parcel, job.parcel, self.settings)
        except Exception as error:
            raise SolveError(f"the executor takes no sections: {type(error).__name__}: {error}") from error
        self._jobs[future] = job
        future.add_done_callback(self._done.put)

    def finished(self, timeout: float | None) -> Iterator[tuple[Job, Row]]:
        """Yield the sections that have finished, waiting for the first one ``timeout`` seconds at most.

        Raises
        ------
        SolveError
            No worker can be started.
        """
        while self._jobs:
            try:
                future = self._done.get(timeout=timeout) if timeout else self._done.get_nowait()
            except queue.Empty:
                return
            timeout = None
            job = self._jobs.pop(future)
            row = self._row(job, future)
            if row is not None:
                yield job, row

    def _row(self, job: Job, future: Future[Row]) -> Row | None:
        """Return what has come of a job; None where it was sent again."""
        try:
            return future.result()
        except CrewError:
            raise
        except BrokenExecutor as error:  # every job at hand is lost, nobody knows by whose fault
            self._replace(error)
            job.tries -= 1
        except Exception as error:
            if job.tries >= _TRIES:
                return failure(error, LOST) | {"error": f"{error or type(error).__name__} ({job.tries} times)"}
        self.submit(job)
        return None

    def _replace(self, error: BaseException) -> None:
        """Go on with workers of this machine, which tell whose task it was."""
        if self._own is None:
            self._executor = self._own = Crew()
            self._most = min(self._most, _AHEAD * self._own.workers)
            self.notes.append(f"the executor broke ({error}): the rest was solved by {self._own.workers} local workers")

    def stop(self) -> None:
        """Give up what is on its way: own workers end at once, others are asked to."""
        if self._own is not None:
            self._own.stop()
        for future in list(self._jobs):
            future.cancel()

    def rescued(self) -> Iterator[tuple[Job, Row]]:
        """Yield the sections that had finished when they were given up."""
        for future, job in list(self._jobs.items()):
            if future.done() and not future.cancelled() and future.exception() is None:
                del self._jobs[future]
                yield job, future.result()

    def __enter__(self) -> Dispatch:
        return self

    def __exit__(self, kind: Any, *_: object) -> None:
        if kind is not None:
            self.stop()
        elif self._own is not None:
            self._own.shutdown()


def _check(executor: Any, workers: Any, in_flight: Any) -> None:
    if executor is not None and not isinstance(executor, Executor):
        hint = "; give client.get_executor()" if hasattr(executor, "get_executor") else ""
        raise InputError(f"executor must be a concurrent.futures.Executor, got {executor!r:.80}{hint}")
    if executor is not None and workers is not None:
        raise InputError("give an executor or a number of workers, not both")
    for name, value, least in (("workers", workers, 0), ("in_flight", in_flight, 1)):
        if value is not None and (isinstance(value, bool) or not isinstance(value, int) or value < least):
            raise InputError(f"{name} must be a whole number, {least} or more, got {value!r}")
