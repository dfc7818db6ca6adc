"""What the benchmarks share: fair timing, the machine in general terms, and tables on screen and in Markdown."""

import gc
import math
import os
import platform
import statistics
import time
from pathlib import Path

import numpy as np
import scipy

from torsionfe.text import table

RESULTS = Path(__file__).parent / "results"


def machine() -> str:
    """Return what a reader needs to judge the times by, without naming the machine."""
    cores = len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count()
    python = ".".join(platform.python_version_tuple()[:2])
    return (
        f"{cores} cores of a shared {platform.machine().replace('_', '-')} server, Python {python}, "
        f"numpy {np.__version__}, scipy {scipy.__version__}"
    )


def seconds(function, *given, **options):
    """Return the wall time of one call and its result, no garbage of earlier calls on its bill."""
    gc.collect()
    started = time.perf_counter()
    result = function(*given, **options)
    return time.perf_counter() - started, result


def median(values) -> float:
    return statistics.median(values)


def geometric_mean(values) -> float:
    return math.exp(statistics.fmean(math.log(value) for value in values))


def publish(name: str, title: str, head, rows, notes=(), *, show=True) -> None:
    """Print a table and write it to ``results/NAME.md``, the machine and the notes below it."""
    rows = [[str(cell) for cell in row] for row in rows]
    notes = [*notes, f"Measured on {machine()}."]
    if show:
        print(table([head, *rows], title, head=True))
        print("\n".join(["", *notes, ""]), flush=True)
    lines = [f"**{title}**", "", _line(head), "|" + " --- |" * len(head), *map(_line, rows), "", " ".join(notes)]
    RESULTS.mkdir(exist_ok=True)
    (RESULTS / f"{name}.md").write_text("\n".join(lines) + "\n")


def _line(cells) -> str:
    return "| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |"
