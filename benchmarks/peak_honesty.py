"""How often the true error of the peak is within the stated one, and whether the bracket always holds J.

    python benchmarks/peak_honesty.py [--scan] [--random 96] [--worst 8]

Over every reference case with a finite peak (``tests/reference``), the outlines of the benchmarks and random outlines
of the property tests, filleted (their references by elements of order 4); each with elements of order 1 to 3 at
several tolerances. A case counts as honest if ``|tau - true| <= rel_error * true`` for the hot spot's stress per
torque, the reference's own last digit forgiven. ``--scan`` repeats it with other values of the two constants in
``torsionfe/torsion/look.py``.
"""

import argparse
import sys
from dataclasses import dataclass
from pathlib import Path
from statistics import median

from outlines import OUTLINES
from report import publish
from suite import references

from torsionfe.errors import TorsionError
from torsionfe.outline.outline import Outline
from torsionfe.torsion import look
from torsionfe.torsion.solve import solve_torsion

sys.path.insert(0, str(Path(__file__).parents[1] / "tests"))
from cases import reference_cases
from random_outlines import mixed_outline

SETTINGS = [
    {"order": order, "rel_tol": rel_tol, "peak_tol": peak_tol, "max_unknowns": most}
    for order, most in ((1, 30_000), (2, 60_000), (3, 60_000))
    for rel_tol, peak_tol in ((1e-2, 1e-2), (1e-3, 2e-3), (2e-4, 5e-4))
]
#: The scan's values of _CAUTION and of _OF_CHANGE, each beside the value of the other that is in force.
CAUTION, OF_CHANGE = (1.0, 1.3, 1.6, 2.0), (0.5, 0.7, 1.0)


@dataclass(frozen=True)
class Truth:
    """An outline with its true J, the stress per torque at its peak, and how well they are known."""

    name: str
    outline: Outline
    j: float
    peak: float
    j_slack: float
    peak_slack: float
    encloses: bool  # whether J is that of the outline itself, not of the ellipse that its arcs stand for


def truths():
    """Yield every outline with a known peak."""
    for name, case in reference_cases().items():
        if case.has("tau_max_over_Gtheta") and case.has("J"):
            j, tau = case.value("J"), case.value("tau_max_over_Gtheta")
            slack = 10.0 ** -case.digits("J"), 10.0 ** -case.digits("tau_max_over_Gtheta")
            yield Truth(name, case.outline, j, tau / j, *slack, not case.has_ellipse)
    for name, known in references().items():
        yield Truth(name, OUTLINES[name](), *_known(known))


def _known(known):
    return known["J"], known["peak"] / known["J"], known["J_rel_gap"], known["peak_rel_error"], True


def random_truths(count):
    """Yield random outlines, filleted, every other one of arcs, solved by elements of order 4."""
    seed = found = 0
    while found < count:
        seed += 1
        try:
            outline = mixed_outline(seed, round_=True)
            exact = solve_torsion(outline, rel_tol=1e-6, order=4, peak_tol=5e-5, max_unknowns=150_000)
        except TorsionError:
            continue  # a random drawing may cross itself
        spot, j = exact.hot_spot, exact.torsion_constant
        if spot is None or len(exact.singular_corners) or spot.rel_error > 2e-4:
            continue
        found += 1
        yield Truth(f"random {seed}", outline, j.value, spot.stress_per_torque, j.rel_gap, spot.rel_error, True)


@dataclass(frozen=True)
class Verdict:
    """What became of one case: stated and true error of the peak, and whether J was enclosed."""

    name: str
    stated: float
    true: float
    honest: bool
    enclosed: bool | None


def judged(truth, settings):
    solution = solve_torsion(truth.outline, **settings)
    j, spot = solution.torsion_constant, solution.hot_spot
    true = abs(spot.stress_per_torque / truth.peak - 1.0)
    slack = 1.0 + truth.j_slack
    enclosed = j.lower / slack <= truth.j <= j.upper * slack if truth.encloses else None
    return Verdict(truth.name, spot.rel_error, true, true <= spot.rel_error + truth.peak_slack, enclosed)


def _share(verdicts):
    return f"{100.0 * sum(v.honest for v in verdicts) / len(verdicts):.1f} %"


def _enclosed(verdicts):
    told = [v.enclosed for v in verdicts if v.enclosed is not None]
    return f"{sum(told)} of {len(told)}"


def _row(settings, verdicts):
    true = [v.true for v in verdicts]
    return [
        f"{settings['order']}",
        f"{settings['rel_tol']:g}, {settings['peak_tol']:g}",
        _share(verdicts),
        f"{median(v.true / v.stated for v in verdicts):.2f}",
        f"{100 * median(v.stated for v in verdicts):.2g} %",
        f"{100 * median(true):.2g} %",
        f"{100 * max(true):.2g} %",
        _enclosed(verdicts),
    ]


def _dishonest(settings, verdicts):
    for v in verdicts:
        if not v.honest:
            label = f"order {settings['order']}, {settings['rel_tol']:g}, {settings['peak_tol']:g}"
            yield v.true / v.stated, [v.name, label, f"{100 * v.stated:.2g} %", f"{100 * v.true:.2g} %"]


def honesty(known, worst):
    """Judge every case at every setting with the constants as they are."""
    verdicts = [(settings, [judged(truth, settings) for truth in known]) for settings in SETTINGS]
    rows = [_row(settings, found) for settings, found in verdicts]
    every = [v for _, found in verdicts for v in found]
    ratio = median(v.true / v.stated for v in every)
    rows.append(["all", "", _share(every), f"{ratio:.2f}", "", "", "", _enclosed(every)])
    head = ["order", "rel_tol, peak_tol", "honest", "true/stated", "stated", "true", "largest true", "J enclosed"]
    notes = [
        f"{len(known)} cases; true/stated, stated and true: medians. Honest: the true error of the peak stress per"
        " torque is within the stated one. J enclosed: the true J lies between the bounds (ellipses left out: their"
        " arcs are another outline)."
    ]
    publish("peak_honesty", "The stated error of the peak", head, rows, notes)
    missed = sorted((row for pair in verdicts for row in _dishonest(*pair)), reverse=True, key=lambda row: row[0])
    shown = [[f"{ratio:.1f}", *row] for ratio, row in missed[:worst]]
    head = ["true/stated", "case", "setting", "stated", "true"]
    publish("peak_missed", f"The worst of {len(missed)} misses", head, shown)


def scan(known):
    """Judge again with other constants, at the settings of order 2."""
    settings = [s for s in SETTINGS if s["order"] == 2]
    before = look._CAUTION, look._OF_CHANGE
    pairs = sorted({*((c, before[1]) for c in CAUTION), *((before[0], c) for c in OF_CHANGE)})
    rows = []
    try:
        for look._CAUTION, look._OF_CHANGE in pairs:
            found = [judged(truth, s) for s in settings for truth in known]
            stated = median(v.stated for v in found)
            rows.append([f"{look._CAUTION:g}", f"{look._OF_CHANGE:g}", _share(found), f"{100 * stated:.2g} %"])
            print(*rows[-1], flush=True)
    finally:
        look._CAUTION, look._OF_CHANGE = before
    head = ["_CAUTION", "_OF_CHANGE", "honest", "stated, median"]
    notes = [f"Order 2 at its three settings, {len(known)} cases each; in force: {before[0]:g} and {before[1]:g}."]
    publish("peak_scan", "The two constants of the stated error", head, rows, notes)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--scan", action="store_true")
    parser.add_argument("--random", type=int, default=96, help="random outlines to add")
    parser.add_argument("--worst", type=int, default=8)
    given = parser.parse_args()
    known = [*truths(), *random_truths(given.random)]
    honesty(known, given.worst)
    if given.scan:
        scan(known)


if __name__ == "__main__":
    main()
