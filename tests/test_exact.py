"""The exact solids and tubes, each against independent values."""

from __future__ import annotations

import json
import math
from pathlib import Path

import numpy as np
import pytest

from torsionfe.closed_form import exact
from torsionfe.errors import InputError

CASES = json.loads((Path(__file__).parent / "reference" / "torsion_cases.json").read_text(encoding="utf-8"))

MADE_BY = {
    "circle": lambda p: exact.circle(2 * p["r"]),
    "ellipse": lambda p: exact.ellipse(2 * p["a"], 2 * p["b"]),
    "equilateral_triangle": lambda p: exact.equilateral_triangle(p["a"]),
    "rectangle": lambda p: exact.rectangle(p["b"], p["t"]),
    "circular_tube": lambda p: exact.concentric_tube(2 * p["R"], p["R"] - p["r"]),
    "eccentric_tube": lambda p: exact.eccentric_tube(2 * p["R"], 2 * p["r"], p["e"]),
    "elliptical_tube": lambda p: (
        exact.similar_elliptic_tube(2 * p["a"], 2 * p["b"], p["k"])
        if "k" in p
        else exact.confocal_tube(2 * p["a1"], 2 * p["b1"], 2 * p["b0"])
    ),
}
KNOWN = [case for case in CASES if case["family"] in MADE_BY]


@pytest.mark.parametrize("case", KNOWN, ids=lambda case: case["id"])
def test_constant_and_peak_agree_with_the_reference_to_every_digit(case):
    found = MADE_BY[case["family"]](case["parameters"])
    assert found.torsion_constant == pytest.approx(case["quantities"]["J"]["value"], rel=1e-14)
    assert found.section_modulus == pytest.approx(case["quantities"]["W_t"]["value"], rel=1e-13)
    assert found.source


SPOTTED = [c for c in KNOWN if c["family"] in ("ellipse", "eccentric_tube", "elliptical_tube")]


@pytest.mark.parametrize("case", SPOTTED, ids=lambda case: case["id"])
def test_the_hot_spot_sits_where_the_reference_has_it(case):
    found = MADE_BY[case["family"]](case["parameters"])
    peak = case["quantities"]["tau_max_over_Gtheta"]
    places = peak["equivalent_locations"]
    size = max(abs(x) for point in places for x in point)
    # the reference's eccentric holes lie to the left
    spots = [(sign * x, y) for x, y in found.hot_spots for sign in (1.0, -1.0)]
    assert min(math.dist(spot, point) for spot in spots for point in places) < 1e-6 * size


def test_the_family_names_cover_the_reference():
    assert len(KNOWN) == 23
    assert {case["family"] for case in KNOWN} == set(MADE_BY)


def test_limits_meet():
    tube = exact.concentric_tube(100.0, 20.0)
    for other in (
        exact.confocal_tube(100.0, 100.0, 60.0),
        exact.eccentric_tube(100.0, 60.0, 0.0),
        exact.eccentric_tube(100.0, 60.0, 1e-9),
        exact.similar_elliptic_tube(100.0, 100.0, 0.6),
    ):
        assert other.torsion_constant == pytest.approx(tube.torsion_constant, rel=1e-13)
        assert other.section_modulus == pytest.approx(tube.section_modulus, rel=1e-8)
    bar = exact.circle(100.0)
    assert exact.ellipse(100.0, 100.0).torsion_constant == pytest.approx(bar.torsion_constant, rel=1e-15)
    pierced = exact.concentric_tube(100.0, 50.0 - 1e-9)
    assert pierced.torsion_constant == pytest.approx(bar.torsion_constant, rel=1e-12)


def test_eccentricity_only_ever_costs():
    constants = [exact.eccentric_tube(100.0, 60.0, e).torsion_constant for e in np.linspace(0.0, 19.9, 40)]
    assert np.all(np.diff(constants) < 0.0)
    far = exact.eccentric_tube(100.0, 60.0, 19.9)
    assert far.where == "inside, where the wall is thinnest"
    assert far.hot_spots == ((49.9, 0.0),)


def test_turned_solids_are_the_same_with_their_hot_spots_turned():
    lying, upright = exact.rectangle(30.0, 10.0), exact.rectangle(10.0, 30.0)
    assert lying.torsion_constant == upright.torsion_constant
    assert lying.hot_spots == ((0.0, 5.0), (-0.0, -5.0))
    assert upright.hot_spots == ((5.0, 0.0), (-5.0, -0.0))
    assert len(exact.rectangle(10.0, 10.0).hot_spots) == 4
    assert exact.ellipse(10.0, 30.0).hot_spots[0] == (5.0, 0.0)
    triangle = exact.equilateral_triangle(60.0)
    assert {round(math.hypot(x, y), 9) for x, y in triangle.hot_spots} == {round(60.0 / math.sqrt(12.0), 9)}


def test_twist_stress_and_print():
    bar = exact.circle(20.0)
    assert bar.peak_stress(-1e5) == pytest.approx(16e5 / (math.pi * 20.0**3))
    assert bar.twist_rate(1e5, 80e3) == pytest.approx(1e5 * 32.0 / (80e3 * math.pi * 20.0**4))
    assert "section modulus W_t" in str(bar)
    assert "all round" in str(bar)


@pytest.mark.parametrize(
    ("make", "message"),
    [
        (lambda: exact.circle(0.0), "diameter must be greater than 0"),
        (lambda: exact.concentric_tube(10.0, 5.0), "wall must be less than half of outer_diameter, got 5 and 10"),
        (lambda: exact.similar_elliptic_tube(10.0, 5.0, 1.0), "inner_scale must be less than 1"),
        (lambda: exact.confocal_tube(40.0, 60.0, 20.0), "inner_height < height <= width"),
        (lambda: exact.confocal_tube(60.0, 40.0, 40.0), "inner_height < height <= width"),
        (lambda: exact.eccentric_tube(100.0, 60.0, 20.0), r"must stay below .*, got 20 \+ 30 and 50"),
        (lambda: exact.eccentric_tube(100.0, 60.0, -1.0), "eccentricity must be 0 or more"),
        (lambda: exact.ellipse(math.nan, 5.0), "width must be finite"),
        (lambda: exact.rectangle(True, 5.0), "width must be a number"),
    ],
)
def test_impossible_solids_are_refused(make, message):
    with pytest.raises(InputError, match=message):
        make()
