"""Worker processes of this machine, as an executor that outlives its workers.

Why not the standard process pool: when one of its workers is killed, it gives up every task at hand and won't say
whose fault it was; its workers import the user's script, which must then be written for that; and they are left
behind when the program is killed. Here each worker is a fresh interpreter that reads tasks from a pipe. A worker
that dies costs its own task alone and is replaced; when the program dies, the pipe ends, and so do the workers.
"""

from __future__ import annotations

import math
import os
import pickle
import queue
import signal
import struct
import subprocess
import sys
import threading
from collections.abc import Callable
from concurrent.futures import Executor, Future
from contextlib import suppress
from pathlib import Path
from typing import IO, Any, ParamSpec, TypeVar

from torsionfe.errors import InputError, SolveError
from torsionfe.study.blas import ONE_THREAD

__all__ = ["Crew", "CrewError", "WorkerDiedError", "cores", "serve"]

_P = ParamSpec("_P")
_T = TypeVar("_T")
_READY = b"ready"
_LENGTH = struct.Struct("<Q")
_STARTS = 3
_SHARE = Path("/sys/fs/cgroup/cpu.max")  # of processor time (Linux control groups, version 2)


class WorkerDiedError(SolveError):
    """The worker that had the task ended without an answer."""


class CrewError(SolveError):
    """Worker processes can't be started."""


def cores() -> int:
    """Return how many cores this process may use: those that it is held to, and a container's share of them."""
    count = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1
    with suppress(OSError, ValueError):  # "max 100000" without a limit
        share, period = map(int, _SHARE.read_text().split())
        count = min(count, max(1, math.ceil(share / period)))
    return count


class Crew(Executor):
    """Worker processes, one a core, each with one thread for its linear algebra.

    Started when there is work. Tasks are functions that an ``import`` finds, with arguments that pickle.

    Parameters
    ----------
    workers : int, optional
        One per core that this process may use.

    Raises
    ------
    InputError
        Not a whole number above 0.
    """

    def __init__(self, workers: int | None = None) -> None:
        self.workers = cores() if workers is None else workers
        if isinstance(self.workers, bool) or not isinstance(self.workers, int) or self.workers < 1:
            raise InputError(f"workers must be a whole number above 0, got {workers!r}")
        self._tasks: queue.SimpleQueue[tuple[Future[Any], Any] | None] = queue.SimpleQueue()
        self._closed = self._stopped = False
        self._hands: list[_Worker] = []
        self._lock = threading.Lock()
        self._threads = [threading.Thread(target=self._tend, daemon=True) for _ in range(self.workers)]
        for thread in self._threads:
            thread.start()

    def submit(self, fn: Callable[_P, _T], /, *args: _P.args, **kwargs: _P.kwargs) -> Future[_T]:
        """Return the future of ``fn(*args, **kwargs)``, run by one of the workers."""
        with self._lock:
            if self._closed:
                raise RuntimeError("the crew was shut down")
            future: Future[_T] = Future()
            self._tasks.put((future, (fn, args, kwargs)))
        return future

    def shutdown(self, wait: bool = True, *, cancel_futures: bool = False) -> None:
        """Take no more tasks; the workers end when those at hand are done."""
        with self._lock:
            closed, self._closed = self._closed, True
        if cancel_futures:
            self._drop()
        if not closed:
            for _ in self._threads:
                self._tasks.put(None)
        if wait:
            for thread in self._threads:
                thread.join()

    def stop(self) -> None:
        """End the workers at once, whatever they are at."""
        self._stopped = True
        with self._lock:
            for worker in self._hands:
                worker.kill()
        self.shutdown(cancel_futures=True)

    @property
    def pids(self) -> list[int]:
        """Process numbers of the workers that run."""
        with self._lock:
            return [worker.pid for worker in self._hands]

    def _drop(self) -> None:
        with suppress(queue.Empty):
            while True:
                task = self._tasks.get_nowait()
                if task is not None:
                    task[0].cancel()
                    task[0].set_running_or_notify_cancel()
                else:  # meant for a thread that is still to end
                    self._tasks.put(None)
                    break

    def _tend(self) -> None:
        """Hand tasks to one worker, one at a time, and replace it when it dies."""
        worker: _Worker | None = None
        while (task := self._tasks.get()) is not None:
            future, work = task
            if not future.set_running_or_notify_cancel():
                continue
            try:
                worker = worker or self._start()
                done, value = worker.ask(work)
            except (OSError, EOFError):  # the pipe broke
                how = self._part(worker) if worker is not None else "could not be started"
                future.set_exception(WorkerDiedError(f"the worker process {how}"))
                worker = None
            except Exception as error:  # the task can't be sent, or no worker be started
                future.set_exception(error)
            else:
                future.set_result(value) if done else future.set_exception(value)
        if worker is not None:
            self._part(worker)

    def _start(self) -> _Worker:
        how = "was stopped"
        for _ in range(0 if self._stopped else _STARTS):
            worker = _Worker()
            with self._lock:
                self._hands.append(worker)
            if self._stopped:
                worker.kill()
            if worker.ready():
                return worker
            how = self._part(worker)
        raise CrewError(f"worker processes can't be started: {sys.executable} {how}; give workers=0 or an executor")

    def _part(self, worker: _Worker) -> str:
        with self._lock:
            self._hands.remove(worker)
        return worker.end()


class _Worker:
    """One process, and the pipes to it."""

    def __init__(self) -> None:
        if getattr(sys, "frozen", False) or not sys.executable:
            raise CrewError("a frozen program can't start worker processes: give workers=0 or an executor")
        path = [os.path.abspath(entry) for entry in sys.path]  # '' is the folder of now
        code = f"import sys; sys.path[:] = {path!r}; from torsionfe.study.crew import serve; serve()"
        # Ctrl-C at the terminal is for this process: it ends the workers itself
        apart: dict[str, Any] = {"start_new_session": True}
        if os.name == "nt":  # pragma: no cover (Windows)
            apart = {"creationflags": getattr(subprocess, "CREATE_NEW_PROCESS_GROUP", 0)}
        try:
            self._process = subprocess.Popen(
                [sys.executable, "-c", code],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                env={**os.environ, **ONE_THREAD},
                **apart,
            )
        except OSError as error:
            raise CrewError(f"{sys.executable} can't be started: {error}; give workers=0 or an executor") from error
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._into: IO[bytes] = self._process.stdin
        self._out_of: IO[bytes] = self._process.stdout
        self.pid = self._process.pid

    def ready(self) -> bool:
        with suppress(OSError):
            return self._out_of.read(len(_READY)) == _READY
        return False  # pragma: no cover (a pipe that breaks reads as empty)

    def ask(self, work: Any) -> tuple[bool, Any]:
        """Return whether the task returned, and what, or the exception that it raised."""
        _send(self._into, pickle.dumps(work))
        done, value = pickle.loads(_receive(self._out_of))
        return done, value

    def kill(self) -> None:
        self._process.kill()

    def end(self) -> str:
        """Close the pipes, wait for the process, and return how it ended."""
        with suppress(OSError):
            self._into.close()
        code = self._process.wait()
        self._out_of.close()
        if code < 0:
            return f"was killed by signal {-code} ({signal.strsignal(-code)}), by the system for want of memory perhaps"
        return f"ended with exit code {code}"


def serve() -> None:
    """Run tasks that come pickled through standard input, until it ends. The life of a worker."""
    import torsionfe.study.work  # noqa: F401 (loaded before the first task comes)

    signal.signal(signal.SIGINT, signal.SIG_IGN)
    source, sink = os.fdopen(os.dup(0), "rb"), os.fdopen(os.dup(1), "wb")
    with open(os.devnull, "rb") as nothing:
        os.dup2(nothing.fileno(), 0)
    os.dup2(2, 1)  # what a task prints goes to standard error, not among the answers
    with suppress(EOFError, OSError):  # the program that wanted the answers has gone
        sink.write(_READY)
        sink.flush()
        while True:
            _send(sink, _answer(_receive(source)))


def _answer(work: bytes) -> bytes:
    try:
        fn, args, kwargs = pickle.loads(work)
        return pickle.dumps((True, fn(*args, **kwargs)))
    except Exception as error:
        with suppress(Exception):
            found = pickle.dumps((False, error))
            pickle.loads(found)
            return found
        return pickle.dumps((False, RuntimeError(f"{type(error).__name__}: {error}")))


def _send(sink: IO[bytes], message: bytes) -> None:
    sink.write(_LENGTH.pack(len(message)) + message)
    sink.flush()


def _receive(source: IO[bytes]) -> bytes:
    """Return the next message.

    Raises
    ------
    EOFError
        The other end has gone.
    """
    head = source.read(_LENGTH.size)
    message = source.read(_LENGTH.unpack(head)[0]) if len(head) == _LENGTH.size else b""
    if not message:
        raise EOFError("the pipe ended")
    return message
