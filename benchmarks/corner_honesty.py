"""How often the true error of a sharp corner's stress intensity is within the stated one.

    python benchmarks/corner_honesty.py [--count 100] [--seed 5000]

Random outlines with their corners left sharp, every other one of arcs; each at several settings, beside elements of
order 3 with a bracket of 3e-6. A corner counts as honest if the intensities differ by no more than both stated errors.
"""

import argparse
import math
import sys
from pathlib import Path

import numpy as np
from report import publish

from torsionfe.errors import TorsionError
from torsionfe.torsion.solve import solve_torsion

sys.path.insert(0, str(Path(__file__).parents[1] / "tests"))
from random_outlines import mixed_outline

FINE = {"rel_tol": 3e-6, "order": 3, "peak_tol": math.inf}
SETTINGS = [
    {"order": order, "rel_tol": rel_tol, "peak_tol": peak_tol, "max_unknowns": 30_000}
    for order in (1, 2, 3)
    for rel_tol, peak_tol in ((1e-2, math.inf), (1e-2, 1e-2), (1e-3, 2e-3))
]


def outlines(count, seed):
    """Yield random outlines with sharp re-entrant corners."""
    found = 0
    while found < count:
        try:
            outline = mixed_outline(seed, round_=False)
            sure = solve_torsion(outline, **FINE)
        except TorsionError:
            sure = None  # a random drawing may cross itself
        if sure and len(sure.singular_corners):
            found += 1
            yield outline, sure
        seed += 1


def compared(outline, sure, settings):
    """Return the true and the stated relative error of each corner, and whether a flank is an arc; shape (c, 3)."""
    rough = solve_torsion(outline, **settings)
    intensity, stated = (
        np.array([getattr(corner, name) for corner in rough.corner_stresses]) for name in ("intensity", "rel_error")
    )
    true, slack = (
        np.array([getattr(corner, name) for corner in sure.corner_stresses]) for name in ("intensity", "rel_error")
    )
    edges = outline.edges
    places = rough.singular_corners[:, None] - edges.start
    row = np.hypot(places[..., 0], places[..., 1]).argmin(axis=1)
    curved = (edges.bulge[row] != 0.0) | (edges.bulge[edges.previous[row]] != 0.0)
    return np.stack([np.maximum(np.abs(intensity / true - 1.0) - slack, 0.0), stated, curved], axis=1)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--count", type=int, default=100)
    parser.add_argument("--seed", type=int, default=5000)
    given = parser.parse_args()
    cases = list(outlines(given.count, given.seed))
    head = ["order", "J", "peak", "flanks", "corners", "within", "median stated", "median true", "worst true / stated"]
    rows = []
    for settings in SETTINGS:
        every = np.concatenate([compared(outline, sure, settings) for outline, sure in cases])
        for flanks in ("straight", "arcs"):
            off, stated, _ = every[every[:, 2] == (flanks == "arcs")].T
            within = f"{100.0 * np.mean(off <= stated):.1f} %"
            middle = [f"{100.0 * np.median(values):.2g} %" for values in (stated, off)]
            asked = [settings["order"], f"{settings['rel_tol']:g}", f"{settings['peak_tol']:g}"]
            rows.append([*asked, flanks, len(off), within, *middle, f"{np.max(off / stated):.2f}"])
    publish("corner_honesty", f"Sharp corners of {len(cases)} random outlines", head, rows)


if __name__ == "__main__":
    main()
