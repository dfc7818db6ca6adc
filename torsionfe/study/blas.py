"""One thread for the linear algebra while sections are solved.

Sums over several threads round differently: with one, a section's digits don't depend on where it is solved. And
workers, one per core, don't get in each other's way.
"""

from __future__ import annotations

import ctypes
import importlib
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from functools import cache
from pathlib import Path

__all__ = ["ONE_THREAD", "one_thread"]

#: Environment of a worker process: read when the libraries load.
ONE_THREAD = dict.fromkeys(
    [f"{library}_NUM_THREADS" for library in ("OMP", "OPENBLAS", "MKL", "BLIS", "NUMEXPR")]
    + ["VECLIB_MAXIMUM_THREADS"],
    "1",
)

_NAMES = [f"{before}openblas_{{}}_num_threads{after}" for before in ("scipy_", "") for after in ("64_", "_64", "")]

_lock = threading.Lock()
_inside = 0
_before: list[int] = []


@contextmanager
def one_thread() -> Iterator[None]:
    """Hold OpenBLAS, as numpy and scipy bring it, to one thread in this process.

    Nested and concurrent uses count: the last to leave restores what the first has found. Other libraries are
    left as they are; `ONE_THREAD` holds them in workers that are started here.
    """
    global _inside, _before  # noqa: PLW0603 (the setting is the process's)
    with _lock:
        if _inside == 0:
            _before = [get() for get, _ in _controls()]
            for _, put in _controls():
                put(1)
        _inside += 1
    try:
        yield
    finally:
        with _lock:
            _inside -= 1
            if _inside == 0:
                for (_, put), count in zip(_controls(), _before, strict=True):
                    put(count)


@cache
def _controls() -> list[tuple[Callable[[], int], Callable[[int], None]]]:
    """Return the functions that get and set the number of threads, of each copy of OpenBLAS."""
    found = []
    for file in _libraries():
        with suppress(OSError):
            library = ctypes.CDLL(file)
            name = next((name for name in _NAMES if hasattr(library, name.format("set"))), None)
            if name:
                found.append((getattr(library, name.format("get")), getattr(library, name.format("set"))))
    return found


def _libraries() -> Iterator[str]:
    """Yield files through which the linear algebra of numpy and scipy is reached.

    A handle on an extension finds what the libraries export that it was linked with. On Windows it doesn't: there
    the libraries that lie beside the package are opened.
    """
    for name in ("numpy.linalg._umath_linalg", "scipy.sparse.linalg._dsolve._superlu"):
        with suppress(ImportError):
            module = importlib.import_module(name)
            yield str(module.__file__)
            package = importlib.import_module(name.partition(".")[0])
            home = Path(str(package.__file__)).parent
            yield from map(str, sorted(home.with_name(f"{home.name}.libs").glob("*openblas*.dll")))
