"""Kill sweeps at random moments and see that their journal loses nothing and repeats nothing.

    python tests/crash_sweep.py [kills] [workers] [seed]

The suite runs a handful of kills; a longer run is ``python tests/crash_sweep.py 100``. One kill in four hits a
worker instead of the program: then the run must go on by itself.
"""

import os
import random
import signal
import subprocess
import sys
import tempfile
import time
from contextlib import suppress
from pathlib import Path

from torsionfe.outline.shapes import rectangle
from torsionfe.study.sweep import sweep

SECTIONS = 30
GRID = {"width": [10.0 + 0.1 * k for k in range(SECTIONS)], "height": 5.0}


def solved(journal, workers):
    return sweep(GRID, rectangle, journal=journal, workers=workers, rel_tol=1e-2, peak_tol=0.1)


def started(journal, workers):
    """Return a process that sweeps, its own program free of any guard against being imported by workers."""
    code = f"import sys; sys.path[:] = {[str(Path(__file__).parent), *sys.path]!r}\n"
    code += f"from crash_sweep import solved; solved({str(journal)!r}, {workers}); print('done')"
    return subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True)


def whole_lines(journal):
    """Return the finished lines of the file, as bytes."""
    data = journal.read_bytes() if journal.exists() else b""
    return data[: data.rfind(b"\n") + 1]


def keys(journal):
    return [line.split(b" ")[1] for line in whole_lines(journal).splitlines()[1:] if b" session " not in line]


def worker_of(pid):
    """Return a child of a process (Linux), or None."""
    children = []
    with suppress(OSError):  # each thread has its own
        for threads in Path(f"/proc/{pid}/task").glob("*/children"):
            children += threads.read_text().split()
    return int(random.choice(children)) if children else None


def wait(run, journal):
    """Wait for a random number of further rows and a moment more; one time in eight for a moment of the start."""
    if random.random() < 0.125:
        time.sleep(random.uniform(0.0, 1.0))
        return
    wanted = random.randint(len(keys(journal)) + 1, SECTIONS)
    while len(keys(journal)) < wanted and run.poll() is None:
        time.sleep(0.002)
    time.sleep(random.uniform(0.0, 0.03))


def kill_once(journal, workers, odds=0.25):
    """Start a sweep, kill it or a worker of it after a while; return whether the sweep itself was killed."""
    before = whole_lines(journal)
    run = started(journal, workers)
    wait(run, journal)
    worker = worker_of(run.pid) if random.random() < odds else None
    if worker is not None:
        with suppress(ProcessLookupError):
            os.kill(worker, signal.SIGKILL)
    else:
        run.kill()
    out, _ = run.communicate(timeout=60)
    after = whole_lines(journal)
    assert after.startswith(before), "a row that was saved has gone"
    assert len(set(keys(journal))) == len(keys(journal)), "a section was solved twice"
    if worker is not None:
        assert run.returncode == 0, "the run did not survive its worker"
        assert out == "done\n"
        assert len(keys(journal)) == SECTIONS
    return worker is None and run.returncode == -signal.SIGKILL


def complete(journal, workers, reference):
    """Finish a sweep that was killed; it must return what an undisturbed one does."""
    before = keys(journal)
    table = solved(journal, workers)
    assert table.same_as(reference), "the table differs from that of an undisturbed run"
    assert keys(journal)[: len(before)] == before
    assert len(keys(journal)) == len(set(keys(journal))) == SECTIONS


def campaign(kills, workers=2, folder=None):
    """Kill that often; return how many kills hit the sweep, and how many rows it had saved since its start."""
    reference = sweep(GRID, rectangle, workers=0, rel_tol=1e-2, peak_tol=0.1)
    hits = rows = 0
    with tempfile.TemporaryDirectory(dir=folder) as home:
        journal = Path(home) / "0.journal"
        for k in range(kills):
            before = len(keys(journal))
            hits += kill_once(journal, workers)
            rows += len(keys(journal)) - before
            if len(keys(journal)) > 0.9 * SECTIONS or k == kills - 1:
                complete(journal, workers, reference)
                journal = Path(home) / f"{k + 1}.journal"
    return hits, rows


if __name__ == "__main__":
    given = [int(argument) for argument in sys.argv[1:]]
    random.seed(given[2] if len(given) > 2 else None)
    kills = given[0] if given else 60
    workers = given[1] if len(given) > 1 else 2
    began = time.perf_counter()
    hits, rows = campaign(kills, workers)
    took = time.perf_counter() - began
    print(f"{kills} kills in {took:.0f} s, {hits} of them hit a sweep at work; {rows} rows saved by then,", end=" ")
    print("none lost, none repeated")
