"""An 80 x 80 x 8 angle with an 8 mm root fillet by linear elements to +/-0.1 % in J: time, solves, memory a node.

    python benchmarks/linear_angle.py [--repeats 7]

The goals: under 1 s on two cores; less than half of the time outside the sparse solves; memory in proportion to nodes.
Each row of the memory's table is a process of its own.
"""

import argparse

import numpy as np
from outlines import OUTLINES
from report import child, grown, median, publish, say
from steps import clocked

from torsionfe.torsion.solve import solve_torsion

ANGLE = OUTLINES["angle 80 x 80 x 8, root 8"]
#: J within 0.1 % by the bracket; the peak as it comes.
SETTINGS = {"rel_tol": 2e-3, "peak_tol": np.inf, "order": 1}
TOLERANCES = (4e-3, 2e-3, 1e-3, 5e-4, 2.5e-4)


def solved(rel_tol):
    return solve_torsion(ANGLE(), **SETTINGS | {"rel_tol": rel_tol, "max_unknowns": 1_000_000})


def one(rel_tol) -> None:
    """Solve once in a process of its own and say what it took."""
    solved(0.1)  # loads everything
    before = grown()
    solution = solved(rel_tol)
    say(nodes=len(solution.mesh.nodes), bytes=grown() - before, gap=solution.torsion_constant.rel_gap)


def speed(repeats):
    runs = []
    for repeat in range(-1, repeats):
        outline = ANGLE()
        with clocked() as clock:
            solution = solve_torsion(outline, **SETTINGS)
        if repeat >= 0:
            runs.append(clock.spent)
    whole = [sum(run.values()) for run in runs]
    outside = median([1.0 - run["solve"] / total for run, total in zip(runs, whole, strict=True)])
    yield ["J within", f"{100 * solution.torsion_constant.rel_gap / 2:.3f} %", "0.1 %"]
    yield ["nodes, passes", f"{len(solution.mesh.nodes)}, {len(solution.passes)}", ""]
    yield ["time", f"{median(whole):.2f} s", "< 1 s"]
    yield ["share outside the sparse solves", f"{100 * outside:.0f} %", "< 50 %"]
    for step in runs[0]:
        yield [f"  {step}", f"{1e3 * median([run[step] for run in runs]):.0f} ms", ""]


def memory():
    found = [child(__file__, "--one", rel_tol) for rel_tol in TOLERANCES]
    for run in found:
        each = f"{run['bytes'] / run['nodes'] / 1024:.2f} KB"
        yield [f"memory at {run['nodes']} nodes", f"{run['bytes'] / 2**20:.0f} MB", f"{each} a node"]
    nodes, used = (np.array([run[key] for run in found], dtype=float) for key in ("nodes", "bytes"))
    power = np.polyfit(np.log(nodes), np.log(used), 1)[0]
    yield ["memory grows as nodes to the power of", f"{power:.2f}", "about 1"]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--repeats", type=int, default=7)
    parser.add_argument("--one", type=float, help=argparse.SUPPRESS)
    given = parser.parse_args()
    if given.one:
        one(given.one)
        return
    rows = [*speed(given.repeats), *memory()]
    title = "Angle 80 x 80 x 8, root 8, linear elements"
    notes = ["Memory: the process's largest, less that after one small solution."]
    publish("linear_angle", title, ["", "found", "goal"], rows, notes)


if __name__ == "__main__":
    main()
