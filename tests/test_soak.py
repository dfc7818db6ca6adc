"""The soak in small: one outline of every wild kind, and that it would see a wrong bound, a warning and a crash."""

import sys
import warnings
from pathlib import Path

import numpy as np
import pytest

sys.path.insert(0, str(Path(__file__).parent.parent / "benchmarks"))
import soak
from wild_outlines import WILD

#: The number of the seed, where the first is slow.
SEEDS = {"shared_edge": 9, "cells": 7}


@pytest.mark.parametrize("maker", WILD, ids=lambda maker: maker.__name__)
def test_every_wild_kind_is_solved_or_refused_in_words(maker, monkeypatch):
    monkeypatch.setattr(soak, "WILD", (maker,))
    found = soak.case(1 if maker.__name__ == "needle" else 2 + 3 * SEEDS.get(maker.__name__, 0))
    assert found["kind"] == maker.__name__
    assert found["outcome"] in ("solved", "wider than asked", "refused"), found


def test_a_wrong_bound_and_a_wrong_peak_are_seen(monkeypatch):
    true = soak.solve_torsion
    monkeypatch.setattr(soak, "WILD", (lambda random: soak.Outline([(0, 0), (2, 0), (2, 1), (0, 1)]),))
    assert soak.case(61)["outcome"] == "solved"

    def off_when_tight(outline, rel_tol=1e-2, *given, **options):
        return true(outline.scaled(1.01 if rel_tol < 1e-2 else 1.0), rel_tol, *given, **options)

    monkeypatch.setattr(soak, "solve_torsion", off_when_tight)
    found = soak.case(61)
    assert found["checked"]
    assert found["outcome"] == "VIOLATED"
    solution = true(soak.Outline([(0, 0), (2, 0), (2, 1), (0, 1)]))
    assert list(soak._wrong(solution)) == []
    shrunk = soak.Outline([(0, 0), (1.2, 0), (1.2, 0.6), (0, 0.6)])
    object.__setattr__(solution, "outline", shrunk)
    assert "polar moment" in next(soak._wrong(solution))


@pytest.mark.parametrize("problem", [ZeroDivisionError("nothing"), RuntimeWarning("overflow")])
def test_crashes_and_warnings_are_seen(problem, monkeypatch):
    def breaks(random):
        if isinstance(problem, Warning):
            warnings.warn(problem, stacklevel=1)
        raise problem

    monkeypatch.setattr(soak, "WILD", (breaks,))
    assert soak.case(2)["outcome"] == "CRASHED"
    assert type(problem).__name__ in soak.case(2)["error"]


def test_the_same_seed_makes_the_same_outline():
    for maker in (WILD[0], WILD[5], WILD[9]):
        first, second = (np.random.default_rng(7) for _ in range(2))
        assert maker(first) == maker(second)
