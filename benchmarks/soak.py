"""Random outlines by the thousand: no crash, no hang, no violated bound, every refusal an error that says why.

    python benchmarks/soak.py [--count 10000] [--seed 1] [--resume results/soak.jsonl]

A third of the outlines are those of the property tests; the others are wilder (`wild_outlines`): needles, necks, voids
that nearly touch, tiny fillets, arcs of nearly a full circle, hundreds of voids, vertices a billionth apart, any unit,
far from the origin, put together from others, and what must be refused: drawings that cross themselves, and no outlines
at all. A refusal may only be one of this project's errors, with a place where one can be named; a warning counts as a
crash. Each section runs in a worker process with a time limit; its printed table, centre of twist, warping constant and
sharp corners must be finite, and two bounds from theory hold. One in twenty is solved again to a tighter bracket, and
turned and mirrored, and every two brackets must overlap; the plastic torque may not be below that of first yield.
With ``--resume``, finished cases are kept in a file and not repeated.
"""

import argparse
import json
import math
import multiprocessing
import queue
import sys
import threading
import time
import warnings
from collections import Counter
from pathlib import Path

import numpy as np
from report import publish

from torsionfe.errors import TorsionError
from torsionfe.member.plastic import plastic_torque
from torsionfe.outline.outline import Outline
from torsionfe.torsion.solve import solve_torsion

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "tests"))
from random_outlines import random_outline
from wild_outlines import WILD

LIMIT = 120.0  # seconds a case
SETTINGS = {"rel_tol": 1e-2, "peak_tol": 1e-1, "max_unknowns": 60_000}


def case(seed):
    """Return the outcome of one case as a dict of plain data."""
    random = np.random.default_rng(seed)
    maker = WILD[int(random.integers(len(WILD)))] if seed % 3 else None
    found = {"seed": seed, "kind": maker.__name__ if maker else "property tests", "checked": seed % 20 == 1}
    started = time.perf_counter()
    try:
        outline = maker(random) if maker else random_outline(seed)
        solution = solve_torsion(outline, **SETTINGS)
        found["outcome"] = "solved" if solution.converged else "wider than asked"
        wrong = [*_wrong(solution), *(_wrong_beside_others(solution) if found["checked"] else [])]
        if wrong:
            found["outcome"], found["error"] = "VIOLATED", "; ".join(wrong)
    except TorsionError as error:
        found["outcome"] = "refused"
        found["error"] = f"{type(error).__name__}: {error}"
        found["placed"] = getattr(error, "at", None) is not None
    except Exception as error:  # a crash, or a warning, is what this looks for
        found["outcome"] = "CRASHED"
        found["error"] = f"{type(error).__name__}: {error}"
    found["seconds"] = time.perf_counter() - started
    return found


def _wrong(solution):
    """Yield what cannot be true of a solution."""
    bounds, spot = solution.torsion_constant, solution.hot_spot
    if not 0.0 < bounds.lower <= bounds.upper < math.inf:
        yield f"bounds {bounds.lower!r} to {bounds.upper!r}"
    filled = Outline(solution.outline.vertices, solution.outline.bulges)
    polar = solution.outline.edges.moments()[2][:2].sum()
    # warping only softens; of all solid sections of one area the round one is stiffest (Polya 1948)
    if bounds.lower > (1.0 + 1e-9) * min(polar, filled.area**2 / (2.0 * math.pi)):
        yield f"J over {bounds.lower!r}, polar moment {polar!r}, filled area {filled.area!r}"
    numbers = [*solution.centre_of_twist, solution.warping_constant]
    numbers += [value for corner in solution.corner_stresses for value in (corner.intensity, corner.rel_error)]
    if not np.isfinite(numbers).all() or "nan" in str(solution).split():
        yield f"not finite: {numbers}"
    if spot is not None and not len(solution.singular_corners):
        # Bredt: the mean round the outer loop is twice the area inside it over its length
        mean = 2.0 * filled.area / (filled.perimeter * bounds.value)
        if not (1.0 + spot.rel_error) * spot.stress_per_torque >= (1.0 - 1e-3) * mean:
            yield f"peak {spot.stress_per_torque!r} +/- {spot.rel_error!r} below the mean {mean!r}"


def _wrong_beside_others(solution):
    """Yield where a tighter bracket, a moved section's or the plastic torque disagree."""
    outline, bounds = solution.outline, solution.torsion_constant
    tight = solve_torsion(outline, 1e-3, 3, peak_tol=math.inf, max_unknowns=60_000).torsion_constant
    moved = solve_torsion(outline.rotated(1.0).mirrored(0.2), **SETTINGS).torsion_constant
    for other in (tight, moved):
        # far from the origin, coordinates keep fewer digits
        slack = 1e-9 + 1e-14 * float(np.abs(outline.vertices).max()) / outline.size
        if other.lower > bounds.upper * (1.0 + slack) or bounds.lower > other.upper * (1.0 + slack):
            yield f"{bounds.lower!r} to {bounds.upper!r}, then {other.lower!r} to {other.upper!r}"
    if len(outline.edges) < 200 and solution.hot_spot is not None and not len(solution.singular_corners):
        plastic = plastic_torque(outline, 1.0).plastic_modulus
        if solution.section_modulus * (1.0 - solution.hot_spot.rel_error) > plastic * (1.0 + 1e-4):
            yield f"first yield at {solution.section_modulus!r}, fully plastic at {plastic!r}"


def _worker(tasks, results):
    warnings.simplefilter("error")
    while multiprocessing.parent_process().is_alive():  # a soak that is killed leaves no worker behind
        try:
            seed = tasks.get(timeout=5.0)
        except queue.Empty:
            continue
        if seed is None:
            return
        results.put(case(seed))


def run(seeds, processes):
    """Yield the outcome of each seed as it comes, from some processes side by side."""
    seeds, found = list(seeds), queue.Queue()

    def through(part):
        for item in _run(part):
            found.put(item)

    for k in range(processes):
        threading.Thread(target=through, args=(seeds[k::processes],), daemon=True).start()
    for _ in seeds:
        yield found.get()


def _run(seeds):
    """Yield the outcome of each seed, from a worker that is replaced when it takes too long or dies."""
    context = multiprocessing.get_context("spawn")
    tasks, results, worker = context.Queue(), context.Queue(), None
    for seed in seeds:
        if worker is None:
            worker = context.Process(target=_worker, args=(tasks, results), daemon=True)
            worker.start()
        tasks.put(seed)
        began = time.monotonic()
        while True:
            try:
                yield results.get(timeout=1.0)
                break
            except Exception:
                hung = time.monotonic() - began > LIMIT
                if hung or not worker.is_alive():
                    worker.kill()
                    worker.join()
                    tasks, results, worker = context.Queue(), context.Queue(), None
                    yield {"seed": seed, "kind": "", "outcome": "HUNG" if hung else "DIED", "seconds": LIMIT}
                    break
    if worker is not None:
        tasks.put(None)
        worker.join()


def report(found, took):
    """Print and write what happened, kind by kind."""
    kinds = sorted({item["kind"] for item in found})
    outcomes = ("solved", "wider than asked", "refused", "VIOLATED", "CRASHED", "HUNG", "DIED")
    rows = []
    for kind in [*kinds, "all"]:
        mine = [item for item in found if kind in (item["kind"], "all")]
        count = Counter(item["outcome"] for item in mine)
        placed = sum(item.get("placed", False) for item in mine)
        slowest = max(item["seconds"] for item in mine)
        rows.append([kind.replace("_", " "), len(mine), *(count[name] for name in outcomes), placed, f"{slowest:.1f}"])
    head = ["outlines", "count", "solved", "wider than asked", "refused", "bound violated", "crashed", "hung", "died",
            "refusals with a place", "slowest, s"]  # fmt: skip
    checked = sum(item.get("checked", False) and item["outcome"] != "refused" for item in found)
    seconds = sum(item["seconds"] for item in found)
    errors = Counter(item["error"].split(":")[0] for item in found if item["outcome"] == "refused")
    notes = [
        f"Brackets of 1e-2 within {SETTINGS['max_unknowns']} unknowns; {checked} solved again to 1e-3 with elements of "
        "order 3, and turned and mirrored. Refused: "
        f"{', '.join(f'{count} by {name}' for name, count in errors.most_common())}. "
        f"{len(found) / max(seconds, 1e-9):.1f} sections a second of one process."
    ]
    publish("soak", f"{len(found)} random outlines", head, rows, notes)
    for item in found:
        if item["outcome"].isupper():
            print(item)
    print(f"this run took {took:.0f} s")


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--count", type=int, default=10_000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--processes", type=int, default=1, choices=(1, 2))
    parser.add_argument("--resume", type=Path, help="file of finished cases, kept and added to")
    given = parser.parse_args()
    known = {}
    if given.resume and given.resume.exists():
        known = {item["seed"]: item for item in map(json.loads, given.resume.read_text().splitlines())}
    wanted = range(given.seed, given.seed + given.count)
    began = time.monotonic()
    log = given.resume.open("a") if given.resume else None
    try:
        for item in run((seed for seed in wanted if seed not in known), given.processes):
            known[item["seed"]] = item
            if log:
                log.write(json.dumps(item) + "\n")
                log.flush()
            if item["outcome"].isupper():
                print(item, flush=True)
    finally:
        if log:
            log.close()
    report([known[seed] for seed in wanted if seed in known], time.monotonic() - began)


if __name__ == "__main__":
    main()
