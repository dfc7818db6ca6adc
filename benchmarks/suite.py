"""Twelve outlines to four and to six digits: time, its ratio to the bare solves on the last mesh, and the true error.

    python benchmarks/suite.py [--repeats 7] [--only WORD]

Each repeat goes through all outlines and settings in turn, and times, one right after the other,

* the whole: `solve_torsion` on a fresh outline (mesh, every pass, bounds, peak), and
* the bare cost: numbering, assembling, and solving (factorising, or multigrid where that is faster) both systems of
  the same order once on the mesh that the whole ended with, by the same functions.

The ratio is the median over the repeats of the ratios within one. True errors are against a solution with elements of
order 5 or 6 and much tighter tolerances, computed once (``--references``) and kept in ``results/references.json``.
"""

import argparse
import json
from dataclasses import replace

import numpy as np
from outlines import OUTLINES
from report import RESULTS, geometric_mean, median, publish, seconds

from torsionfe.fem.assembly import assemble
from torsionfe.fem.solve import solve_constrained
from torsionfe.fem.space import space_of
from torsionfe.torsion.fields import _stress_function_problem
from torsionfe.torsion.solve import solve_torsion

REFERENCES = RESULTS / "references.json"
#: Within 1e-4 by the bracket, not by luck: the middle is at most half of the bracket's width off.
SETTINGS = {
    "J 1e-4, peak 0.2 %, order 2": {"rel_tol": 2e-4, "peak_tol": 2e-3, "order": 2},
    "J 1e-4, peak 0.2 %, order 3": {"rel_tol": 2e-4, "peak_tol": 2e-3, "order": 3},
    "J 1e-6, peak 0.1 %, order 2": {"rel_tol": 2e-6, "peak_tol": 1e-3, "order": 2},
    "J 1e-6, peak 0.1 %, order 3": {"rel_tol": 2e-6, "peak_tol": 1e-3, "order": 3},
}
SHORT = ("J 1e-4, peak 0.2 %, order 2", "J 1e-6, peak 0.1 %, order 3")


def references() -> dict:
    """Return ``{outline: {"J", "J_rel_gap", "peak", "peak_rel_error", "how"}}``, computing what is not kept yet.

    ``peak`` is the largest finite stress for ``G theta' = 1`` (length).
    """
    kept = json.loads(REFERENCES.read_text()) if REFERENCES.exists() else {}
    for name, build in OUTLINES.items():
        if name not in kept:
            print(f"reference of {name} ...", flush=True)
            kept[name] = _reference(build())
            REFERENCES.write_text(json.dumps(kept, indent=1) + "\n")
    return kept


def _reference(outline) -> dict:
    order = 5 if len(outline.edges) > 100 else 6
    settings = {"rel_tol": 1e-8, "order": order, "peak_tol": 2e-5, "max_unknowns": 400_000}
    solution = solve_torsion(outline, **settings)
    spot, j = solution.hot_spot, solution.torsion_constant
    asked = ", ".join(f"{name}={value:g}" for name, value in settings.items())
    return {
        "J": j.value,
        "J_rel_gap": j.rel_gap,
        "peak": spot.stress_per_torque * j.value,
        "peak_rel_error": spot.rel_error,
        "how": f"solve_torsion({asked}): {solution.fields.space.size} unknowns, {solution.shortfall or 'converged'}",
    }


def bare(mesh, order, problem) -> None:
    """Number, assemble and solve both systems on a mesh, and nothing else."""
    unknown, source = problem
    system = assemble(space_of(replace(mesh), order))  # (a copy, without what the mesh has worked out already)
    solve_constrained(system.space, system.stiffness, source, unknown)
    solve_constrained(system.space, system.stiffness, system.twist, np.arange(-1, system.space.size - 1))


def measure(names, repeats):
    """Return the last solution, the times of the whole and the ratios, by outline and setting."""
    solutions, times, bares = {}, {}, {}
    for repeat in range(-1, repeats):  # the first round only loads and warms up
        for name in names:
            for label, settings in SETTINGS.items():
                outline = OUTLINES[name]()
                took, solution = seconds(solve_torsion, outline, **settings)
                fields = solution.fields
                problem = _stress_function_problem(fields.system)
                floor, _ = seconds(bare, fields.space.mesh, fields.space.order, problem)
                if repeat >= 0:
                    solutions[name, label] = solution
                    times.setdefault((name, label), []).append(took)
                    bares.setdefault((name, label), []).append(floor)
    return solutions, times, bares


def _errors(solution, reference) -> tuple[float, float]:
    """Return the true relative errors of J and of the peak shear stress for a given torque."""
    j = solution.torsion_constant.value
    true = reference["peak"] / reference["J"]
    return abs(j / reference["J"] - 1.0), abs(solution.hot_spot.stress_per_torque / true - 1.0)


def _row(name, solution, times, bares, reference):
    j_error, peak_error = _errors(solution, reference)
    ratio = median([whole / floor for whole, floor in zip(times, bares, strict=True)])
    return [
        name,
        solution.fields.space.size,
        len(solution.passes),
        f"{solution.torsion_constant.rel_gap / 2:.1e}",
        f"{j_error:.1e}",
        f"{100 * solution.hot_spot.rel_error:.3f} %",
        f"{100 * peak_error:.3f} %",
        f"{median(times):.3f}",
        f"{median(bares):.3f}",
        f"{ratio:.1f}",
    ]


HEAD = [
    *["outline", "unknowns", "passes", "J within", "true error", "peak within", "true error"],
    *["time, s", "bare, s", "ratio"],
]


def _section(label, names, measured, known):
    """Return the rows of one setting, the geometric mean last."""
    solutions, times, bares = measured
    rows = [
        _row(name, solutions[name, label], times[name, label], bares[name, label], known[name]) for name in names
    ]
    whole = [median(times[name, label]) for name in names]
    floor = [median(bares[name, label]) for name in names]
    ratio = [float(row[-1]) for row in rows]
    mean = [f"{geometric_mean(values):.{digits}f}" for values, digits in ((whole, 3), (floor, 3), (ratio, 1))]
    return [*rows, ["geometric mean", *[""] * 6, *mean]]


NOTES = [
    "Time is of one `solve_torsion`, from an outline to bounds and peak (median of {repeats} interleaved runs); bare is"
    " numbering, assembling and solving both systems once on the final mesh, by the same functions; the ratio is of the"
    " two within one run.",
    "True errors are against elements of order 5 and 6 at 1e-8 (`benchmarks/results/references.json`).",
]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--repeats", type=int, default=7)
    parser.add_argument("--only", default="", help="outlines with this in their name; writes no files")
    parser.add_argument("--references", action="store_true", help="compute the references and stop")
    given = parser.parse_args()
    known = references()
    if given.references:
        return
    names = [name for name in OUTLINES if given.only in name]
    measured = measure(names, given.repeats)
    notes = [note.format(repeats=given.repeats) for note in NOTES]
    everything = []
    for label in SETTINGS:
        everything += [[f"*{label}*", *[""] * (len(HEAD) - 1)], *_section(label, names, measured, known)]
    name = "suite_full" if not given.only else "suite_part.tmp"
    publish(name, "Twelve outlines, four settings", HEAD, everything, notes)
    if given.only:
        return
    short = [_section(label, names, measured, known) for label in SHORT]
    rows = [[*a[:2], *a[3:7], *a[7::2], *b[1:2], *b[3:7], b[7]] for a, b in zip(*short, strict=True)]
    _publish_short(rows, notes)


def _publish_short(rows, notes) -> None:
    head = [
        *["outline", "unknowns", "J within", "true", "peak within", "true", "time, s", "times bare"],
        *["unknowns", "J within", "true", "peak within", "true", "time, s"],
    ]
    title = f"{SHORT[0]} (the default), left; {SHORT[1]}, right"
    publish("suite", title, head, rows, notes, show=False)


if __name__ == "__main__":
    main()
