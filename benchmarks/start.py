"""How long it takes to start: the import, and the command's first answer.

    python benchmarks/start.py [--repeats 9]

Each run is a new process, in turns, its files in the page cache; the interpreter's own start is taken off where said.
The goal for the import is under 0.4 s.
"""

import argparse
import os
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

from report import median, publish

ROOT = Path(__file__).parents[1]
COMMAND = ["-m", "torsionfe", "solve", "sluice-lever", "--torque", "450 N*m"]
RUNS = {
    "bare interpreter": ["-c", "pass"],
    "import numpy, scipy.sparse, scipy.spatial": ["-c", "import numpy, scipy.sparse, scipy.spatial"],
    "import torsionfe": ["-c", "import torsionfe"],
    "import and first solution": [
        "-c",
        "import torsionfe as tf; tf.solve_torsion(tf.shapes.angle(62.0, 46.0, 13.0, root_radius=7.0))",
    ],
    "command: help": ["-m", "torsionfe", "--help"],
    "command: a solved section": COMMAND,
    "command: the same with a figure (PNG)": [*COMMAND, "--figure", "figure.png"],
}
HEAVY = ("matplotlib", "ezdxf", "jinja2", "tqdm", "meshio", "pandas")


def timed(arguments, folder):
    """Return wall and processor seconds of one run in a process of its own."""
    environment = os.environ | {"PYTHONPATH": str(ROOT)}
    started, before = time.perf_counter(), _spent()
    subprocess.run([sys.executable, *arguments], check=True, capture_output=True, cwd=folder, env=environment)
    return time.perf_counter() - started, _spent() - before


def _spent():
    used = resource.getrusage(resource.RUSAGE_CHILDREN)
    return used.ru_utime + used.ru_stime


def loaded() -> list[str]:
    """Return which heavy packages the import brings in (none is the goal)."""
    code = f"import torsionfe, sys; print(*[name for name in {HEAVY} if name in sys.modules])"
    environment = os.environ | {"PYTHONPATH": str(ROOT)}
    done = subprocess.run([sys.executable, "-c", code], check=True, capture_output=True, text=True, env=environment)
    return done.stdout.split()


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--repeats", type=int, default=9)
    repeats = parser.parse_args().repeats
    times = {name: [] for name in RUNS}
    with tempfile.TemporaryDirectory() as folder:
        for repeat in range(-1, repeats):
            for name, arguments in RUNS.items():
                took = timed(arguments, folder)
                if repeat >= 0:
                    times[name].append(took)
    found = {name: [median(column) for column in zip(*took, strict=True)] for name, took in times.items()}
    bare = found["bare interpreter"][0]
    rows = [[name, f"{wall:.2f}", f"{wall - bare:.2f}", f"{cpu:.2f}"] for name, (wall, cpu) in found.items()]
    heavy = ", ".join(loaded()) or "none"
    notes = [f"Goal: `import torsionfe` under 0.4 s. Of {', '.join(HEAVY)} it loads: {heavy}."]
    notes[0] += " Processor: time of all cores, which other programs disturb less."
    publish("start", "Start", ["", "time, s", "less the bare interpreter, s", "processor, s"], rows, notes)


if __name__ == "__main__":
    main()
