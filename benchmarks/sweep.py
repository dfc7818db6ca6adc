"""What a sweep costs: two cores against one, the overhead a section, a catalogue, memory.

    python benchmarks/sweep.py [speed] [overhead] [catalogue] [memory]

Prints a table; takes about five minutes on two cores.
"""

import csv
import math
import os
import platform
import resource
import sys
import tempfile
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np

from torsionfe.outline.shapes import rectangle, wide_flange
from torsionfe.study.crew import Crew, cores
from torsionfe.study.sweep import sweep
from torsionfe.text import table

PUBLISHED = Path(__file__).parents[1] / "tests" / "reference" / "aisc_wide_flange.csv"


def published():
    """Return depth, flange width, flange and web thickness, root radius and J of the published wide flanges (n, 6)."""
    with open(PUBLISHED, newline="") as file:
        rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
    sizes = [[float(row[name]) for name in ("d", "bf", "tf", "tw", "k", "J")] for row in rows]
    return np.array([[d, b, tf, tw, k - tf, j] for d, b, tf, tw, k, j in sizes])


def catalogue():
    """Return the sizes of 289 wide flanges: the 25 published ones, and 11 even steps from each to the next."""
    sizes = published()[:, :5]
    at = np.linspace(0.0, len(sizes) - 1.0, 289)
    every = np.stack([np.interp(at, np.arange(len(sizes)), column) for column in sizes.T], axis=1)
    names = ("depth", "flange_width", "flange_thickness", "web_thickness", "root_radius")
    return [dict(zip(names, row, strict=True)) for row in every.tolist()]


def timed(function):
    started = time.perf_counter()
    result = function()
    return time.perf_counter() - started, result


def speed():
    """200 wide flanges: the same call on one core and on two, best of three; without workers; with threads."""
    sizes = catalogue()[:200]
    every = os.sched_getaffinity(0)
    one, two = [], []
    for _ in range(3):  # in turns, so that what else runs on the machine disturbs both
        os.sched_setaffinity(0, {min(every)})  # building and dispatch share the core with the worker
        one.append(timed(lambda: sweep(sizes, wide_flange)))
        os.sched_setaffinity(0, every)
        two.append(timed(lambda: sweep(sizes, wide_flange, workers=2)))
    here, rows = timed(lambda: sweep(sizes, wide_flange, workers=0))
    with ThreadPoolExecutor(2) as pool:
        threads, same = timed(lambda: sweep(sizes, wide_flange, executor=pool))
    assert len(rows) == 200
    assert all(rows.same_as(other) for other in (same, *(found for _, found in one + two)))
    one_core, two_cores = min(took for took, _ in one), min(took for took, _ in two)
    yield ["200 wide flanges, one core", f"{one_core:.2f} s", ""]
    yield ["200 wide flanges, two cores", f"{two_cores:.2f} s", f"{one_core / two_cores:.2f} times one core"]
    yield ["  in the calling process alone", f"{here:.2f} s", "no worker to start"]
    yield ["  on two threads", f"{threads:.2f} s", "the same rows, to the last bit"]


def overhead():
    """What dispatch, journal and table add to a section, and what starting the workers does."""
    outlines = [rectangle(10.0 + 0.01 * k, 5.0) for k in range(500)]
    with tempfile.TemporaryDirectory() as folder, Crew(1) as crew:
        start, _ = timed(lambda: sweep(outlines[:1], executor=crew))
        cpu = time.process_time()
        plain, rows = timed(lambda: sweep(outlines, executor=crew))
        cpu = time.process_time() - cpu
        saved, kept = timed(lambda: sweep(outlines, executor=crew, journal=Path(folder) / "j"))
        again, _ = timed(lambda: sweep(outlines, executor=crew, journal=Path(folder) / "j"))
    yield ["start of a worker, first section", f"{start:.2f} s", ""]
    for name, took, solving in (("dispatch and table", plain, rows), ("the same with a journal", saved, kept)):
        each = (took - solving["seconds"].sum()) / len(outlines)
        yield [f"overhead a section, {name}", f"{1e3 * each:.2f} ms", "wall time that is not solving"]
    yield ["  of it in the calling process", f"{1e3 * cpu / len(outlines):.2f} ms", "processor time, beside solving"]
    yield ["resumed from a journal, a section", f"{1e3 * again / len(outlines):.2f} ms", ""]


def full_catalogue():
    """289 wide flanges to +/-0.01 % in J, on two cores."""
    took, rows = timed(lambda: sweep(catalogue(), wide_flange, rel_tol=2e-4, workers=2))
    half = 0.5 * (rows["torsion_constant_upper"] - rows["torsion_constant_lower"]) / rows["torsion_constant"]
    assert half.max() <= 1e-4
    off = np.abs(rows["torsion_constant"][::12] / published()[:, 5] - 1.0)
    yield ["289 wide flanges, +/-0.01 % in J", f"{took:.1f} s", f"widest +/-{100 * half.max():.4f} %"]
    yield ["  25 of them against the published J", f"{100 * np.median(off):.2f} %", "median (published to 3 digits)"]
    yield ["  largest difference", f"{100 * off.max():.2f} %", ""]


def memory():
    """10,000 sections from a generator: the largest memory so far, on the way."""
    settings = {"rel_tol": 1.0, "peak_tol": math.inf, "order": 1}
    peak = {}

    def outlines():
        for k in range(10_000):
            if k in (200, 1000, 5000, 9999):
                peak[k] = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024, largest_worker(crew)
            yield rectangle(10.0 + 0.001 * k, 5.0)

    with tempfile.TemporaryDirectory() as folder, Crew() as crew:
        took, rows = timed(lambda: sweep(outlines(), executor=crew, journal=Path(folder) / "j", **settings))
    yield ["10,000 sections", f"{took:.0f} s", ""]
    for k, (own, worker) in peak.items():
        yield [f"  memory after {k} sections", f"{own:.0f} MB", f"{worker:.0f} MB the largest worker"]
    size = sum(column.nbytes for column in rows.columns.values())
    yield ["  the table itself", f"{size / 2**20:.1f} MB", f"{size / len(rows):.0f} bytes a row"]


def largest_worker(crew):
    """Return the peak memory of the largest worker in MB (Linux only)."""
    found = [0.0]
    for pid in crew.pids:
        status = Path(f"/proc/{pid}/status")
        if status.exists():
            found += [int(line.split()[1]) / 1024 for line in status.read_text().splitlines() if "VmHWM" in line]
    return max(found)


def main():
    parts = {"speed": speed, "overhead": overhead, "catalogue": full_catalogue, "memory": memory}
    chosen = sys.argv[1:] or list(parts)
    rows = [row for name in chosen for row in parts[name]()]
    load = f", load {os.getloadavg()[0]:.1f} from all programs" if hasattr(os, "getloadavg") else ""
    print(table(rows, f"Sweeps on {cores()} cores ({platform.machine()}, Python {platform.python_version()}{load})"))


if __name__ == "__main__":
    main()
