"""What the benchmarks share: fair timing, the machine in general terms, and tables on screen and in Markdown."""

import gc
import json
import math
import os
import platform
import resource
import statistics
import subprocess
import sys
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


def child(script, *arguments) -> dict:
    """Run a benchmark's script in a process of its own and return what it said (see `say`)."""
    command = [sys.executable, str(script), *map(str, arguments)]
    return json.loads(subprocess.run(command, check=True, capture_output=True, text=True).stdout.splitlines()[-1])


def say(**found) -> None:
    """Print, as the last line of a child process, what it found."""
    print(json.dumps(found))


def grown() -> int:
    """Return the largest memory (resident set, bytes) that this process has had so far.

    On Linux from the kernel's own file: what `resource` tells begins with that of the process it was forked from.
    """
    status = Path("/proc/self/status")
    if status.exists():
        return next(int(line.split()[1]) * 1024 for line in status.read_text().splitlines() if "VmHWM" in line)
    unit = 1 if sys.platform == "darwin" else 1024
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss * unit


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
    (RESULTS / (name if name.endswith(".tmp") else f"{name}.md")).write_text("\n".join(lines) + "\n")


def _line(cells) -> str:
    return "| " + " | ".join(cell.replace("|", "\\|") for cell in cells) + " |"
