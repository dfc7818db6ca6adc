"""A comb with 1,000 fillets: time and memory up to a million unknowns.

    python benchmarks/scaling.py [--full]

Each row is a process of its own. It solves the comb with quadratic elements to a tighter bracket than the row before
it. *Whole* is the time of `solve_torsion`, every pass and the triangulation included; *last pass* is the time of both
solves on the last mesh, assembly and bounds included, best of three; memory is the peak of the resident set, less what
the imports take. The exponents are fitted to all rows. The default stops at some 600,000 unknowns, ``--full`` goes
beyond a million. Goals: cost growing as ``N**1.15`` or better, at most 1.5 KB an unknown.
"""

import argparse
from dataclasses import replace

import numpy as np
from outlines import comb
from report import child, grown, publish, say, seconds

from torsionfe.torsion.fields import solve_fields
from torsionfe.torsion.solve import solve_torsion

FILLETS = 1000
SMALL = (1e-2, 3e-3, 1e-3, 3e-4, 1e-4)
FULL = (*SMALL, 3e-5)


def one(rel_tol) -> None:
    """Solve once and say what it took."""
    solve_torsion(comb(2), rel_tol=1e-2)  # loads everything
    outline, before = comb(FILLETS), grown()
    whole, solution = seconds(
        solve_torsion, outline, rel_tol=rel_tol, peak_tol=np.inf, max_unknowns=3_000_000
    )
    peak = grown()
    last = min(seconds(solve_fields, replace(solution.fields.space.mesh), 2)[0] for _ in range(3))
    say(
        unknowns=solution.fields.space.size,
        passes=len(solution.passes),
        within=solution.torsion_constant.rel_gap / 2,
        whole=whole,
        last=last,
        bytes=peak - before,
        total=peak,
    )


def _power(unknowns, values) -> float:
    return float(np.polyfit(np.log(unknowns), np.log(values), 1)[0])


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--full", action="store_true", help="up to more than a million unknowns")
    parser.add_argument("--one", type=float, help=argparse.SUPPRESS)
    given = parser.parse_args()
    if given.one:
        one(given.one)
        return
    runs = [child(__file__, "--one", rel_tol) for rel_tol in (FULL if given.full else SMALL)]
    rows = [
        [
            f"{run['unknowns']}",
            f"{run['passes']}",
            f"{run['within']:.1e}",
            f"{run['whole']:.2f}",
            f"{run['last']:.2f}",
            f"{1e6 * run['last'] / run['unknowns']:.1f}",
            f"{run['bytes'] / 2**20:.0f}",
            f"{run['bytes'] / run['unknowns'] / 1024:.2f}",
            f"{run['total'] / run['unknowns'] / 1024:.2f}",
        ]
        for run in runs
    ]
    unknowns = np.array([run["unknowns"] for run in runs], dtype=float)
    powers = [f"{_power(unknowns, [run[key] for run in runs]):.2f}" for key in ("whole", "last", "bytes")]
    rows.append(["grows as N to the power of", "", "", *powers[:2], "", powers[2], "", ""])
    head = [
        *["unknowns", "passes", "J within", "whole, s", "last pass, s", "microseconds an unknown"],
        *["memory, MB", "KB an unknown", "with the imports"],
    ]
    notes = ["Goals: N^1.15 or better; 1.5 KB an unknown at most."]
    publish("scaling", f"A comb with {FILLETS} fillets, quadratic elements", head, rows, notes)


if __name__ == "__main__":
    main()
