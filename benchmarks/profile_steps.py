"""Where the time goes, step by step: three outlines at the default tolerances, and two large ones.

    python benchmarks/profile_steps.py [--repeats 9]

Each second is counted once, at the innermost step. The last table: what a second question to a solution costs.
"""

import argparse

from outlines import OUTLINES, comb
from report import median, publish, seconds
from steps import OTHER, STEPS, clocked

from torsionfe.member.bar import Bar
from torsionfe.torsion.solve import solve_torsion

FOUR_DIGITS = {"rel_tol": 2e-4, "peak_tol": 2e-3}
CASES = {
    "angle, root 8": (OUTLINES["angle 80 x 80 x 8, root 8"], FOUR_DIGITS),
    "box": (OUTLINES["box, rounded"], FOUR_DIGITS),
    "keyed shaft": (OUTLINES["keyed shaft"], FOUR_DIGITS),
    "spline, 1e-6": (OUTLINES["splined shaft, 24 teeth"], {"rel_tol": 2e-6, "peak_tol": 1e-3}),
    "comb of 200 fillets": (lambda: comb(200), FOUR_DIGITS),
}


def profile(build, settings, repeats):
    """Return the median seconds of each step, of the whole, and the unknowns and passes."""
    runs = []
    for repeat in range(-1, repeats):
        with clocked() as clock:
            solution = solve_torsion(clock.wrapped(build, "outline")(), **settings)
        if repeat >= 0:
            runs.append(clock.spent)
    steps = {step: median([run[step] for run in runs]) for step in runs[0]}
    return steps, solution


def asked_again(solution):
    """Yield what further questions to a solved section cost."""
    middle = [solution.hot_spot.x, solution.hot_spot.y]
    questions = {
        "peak stress of another torque": lambda: solution.hot_spot.stress_per_torque * 2e6,
        "twist rate of another torque": lambda: solution.twist_rate(2e6, 79e3),
        "bar: twist of another torque": lambda: Bar(solution, length=500.0, shear_modulus=79e3).twist(2e6),
        "stress at the hot spot of another torque": lambda: solution.stress_at([middle], torque=2e6),
        "warping constant, the first time": lambda: solution.warping_constant,
        "warping constant, again": lambda: solution.warping_constant,
    }
    for name, question in questions.items():
        yield [name, f"{1e6 * seconds(question)[0]:.0f}"]


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--repeats", type=int, default=9)
    repeats = parser.parse_args().repeats
    found = {
        name: profile(build, settings, repeats if settings is FOUR_DIGITS and "comb" not in name else 3)
        for name, (build, settings) in CASES.items()
    }
    rows = []
    for step in [*STEPS, OTHER]:
        row = [step]
        for steps, _ in found.values():
            row += [f"{1e3 * steps[step]:.1f}", f"{100 * steps[step] / sum(steps.values()):.0f} %"]
        rows.append(row)
    rows.append(["whole"] + [cell for s, _ in found.values() for cell in (f"{1e3 * sum(s.values()):.0f}", "")])
    rows.append(["unknowns, passes"])
    for _, solution in found.values():
        rows[-1] += [f"{solution.fields.space.size}", f"{len(solution.passes)}"]
    head = ["step, ms"] + [cell for name in found for cell in (name, "")]
    notes = [
        "Quadratic elements; J within 1e-4 and peak within 0.2 % unless said otherwise; medians. Outline: built and"
        " validated (no part of the times in other tables). Constrain: rows and columns of the void constants tied, of"
        " zero values dropped. Solve: both systems. Bound: energies of each triangle. Peak: stress along the boundary"
        " and its summits.",
    ]
    publish("profile_steps", "Where the time goes", head, rows, notes)
    again = list(asked_again(found["box"][1]))
    publish("asked_again", "Further questions to the box's solution", ["question", "microseconds"], again)


if __name__ == "__main__":
    main()
