"""Sizing: known roots, the trail, ranges without an answer, trials that fail, and the real solver."""

import math

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from torsionfe.errors import InputError, MeshError, OutlineError
from torsionfe.member.margins import Allowables
from torsionfe.outline import shapes
from torsionfe.study.size import bar_margin, size

G = 80e3


def itself(dimension):
    return dimension


@settings(deadline=None)
@given(st.floats(0.02, 0.98), st.floats(0.2, 5.0))
def test_the_smallest_dimension_is_found_to_the_tolerance(root, power):
    result = size(itself, 0.0, 1.0, lambda d: (d / root) ** power - 1.0, rel_tol=1e-4)
    assert result.found
    assert result.margin >= 0.0
    assert root * (1 - 1e-12) <= result.dimension <= root + 1e-4
    below = [trial for trial in result.trail if trial.dimension < result.dimension]
    assert not any(trial.meets for trial in below)
    assert max(trial.dimension for trial in below) >= result.dimension - result.tolerance


def test_few_trials_are_needed_and_none_is_made_twice():
    made = []
    size(lambda d: made.append(d) or d, 1.0, 10.0, lambda d: d**3 / 200.0 - 1.0, rel_tol=1e-4)
    assert len(made) == len(set(made)) <= 14


def test_the_low_end_that_meets_is_the_answer():
    result = size(itself, 3.0, 9.0, lambda d: d)
    assert (result.found, result.dimension, len(result.trail)) == (True, 3.0, 1)
    assert "already" in result.reason


def test_no_solution_in_range_is_an_answer():
    result = size(itself, 1.0, 2.0, lambda d: d - 5.0)
    assert not result.found
    assert math.isnan(result.dimension)
    assert "largest margin from 1 to 2 is -3, at 2" in result.reason
    assert len(result.trail) == 7
    assert "no dimension meets" in str(result)


def test_a_margin_that_is_never_defined_is_an_answer():
    result = size(itself, 1.0, 2.0, lambda d: math.nan)
    assert not result.found
    assert "no trial from 1 to 2 has a margin" in result.reason


def test_a_trial_that_fails_is_recorded():
    def build(radius):
        if radius > 4.0:
            raise OutlineError(f"fillet radius {radius:g} does not fit: 4 at most")
        return radius

    result = size(build, 0.0, 10.0, lambda r: r - 2.5)
    assert result.found
    assert 2.5 <= result.dimension <= 2.51
    failed = [trial for trial in result.trail if trial.failed]
    assert failed
    assert "OutlineError: fillet radius 10 does not fit" in failed[0].note
    assert "failed" in str(result)


def test_a_range_that_fails_everywhere_is_an_answer():
    def build(radius):
        raise MeshError("cannot be triangulated")

    result = size(build, 1.0, 2.0, itself)
    assert not result.found
    assert all(trial.failed for trial in result.trail)
    assert "MeshError" in result.reason


@pytest.mark.parametrize("hole", [(-1.0, 0.37), (0.1, 0.5), (0.28, 0.32)])
def test_undefined_margins_inside_the_range(hole):
    """The answer has a defined margin and the trial just below it does not meet."""
    result = size(itself, 0.0, 1.0, lambda d: math.nan if hole[0] < d < hole[1] else d - 0.3)
    assert result.found
    exact = 0.3 if not hole[0] < 0.3 < hole[1] else hole[1]
    assert result.dimension == pytest.approx(exact, abs=1e-3)


def test_an_unbounded_margin_does_no_harm():
    result = size(itself, 0.0, 1.0, lambda d: math.inf if d > 0.5 else d - 0.4)
    assert 0.4 <= result.dimension <= 0.4011


def test_a_jump_over_zero_is_closed_in_on():
    result = size(itself, 0.0, 1.0, lambda d: 1.0 if d >= 0.7 else -1.0)
    assert 0.7 <= result.dimension <= 0.701


def test_a_margin_of_zero_all_along_is_left_quickly():
    result = size(itself, 0.0, 1.0, lambda d: 0.0 if d > 0.3 else -1.0)
    assert 0.3 <= result.dimension <= 0.301
    assert len(result.trail) < 60


def test_errors_of_the_users_own_pass_through():
    with pytest.raises(ZeroDivisionError):
        size(itself, 0.0, 1.0, lambda d: 1 / d)


def test_bad_arguments_are_refused():
    with pytest.raises(InputError, match="low must be below high"):
        size(itself, 2.0, 1.0, itself)
    with pytest.raises(InputError, match="high must be finite"):
        size(itself, 0.0, math.inf, itself)
    with pytest.raises(InputError, match="rel_tol"):
        size(itself, 0.0, 1.0, itself, rel_tol=0.5)
    with pytest.raises(InputError, match="scan"):
        size(itself, 0.0, 1.0, itself, scan=0)
    for wrong in (None, "good", True):
        with pytest.raises(InputError, match="meets must return"):
            size(itself, -1.0, 1.0, lambda d, answer=wrong: answer)


# --- the real solver --------------------------------------------------------------------------------------


def test_the_diameter_of_a_round_bar():
    # tau = 16 T / (pi d^3): d = cbrt(16 T / (pi tau)) (Coulomb 1784)
    judge = bar_margin(4e5, 500.0, G, Allowables(shear_yield=120.0), rel_tol=1e-4)
    result = size(shapes.round_bar, 10.0, 60.0, judge)
    exact = (16 * 4e5 / (math.pi * 120)) ** (1 / 3)
    assert exact * (1 - 1e-3) <= result.dimension <= exact * 1.004
    assert "shear yield" in result.trail[-1].note
    assert "licensed engineer" in str(result)


def test_the_thickness_of_a_box_for_twist():
    judge = bar_margin(2e6, 2000.0, G, Allowables(twist=0.05), peak_tol=math.inf)
    result = size(lambda wall: shapes.box(80, 50, wall), 1.0, 10.0, judge)
    assert result.found
    assert judge(shapes.box(80, 50, result.dimension)).satisfied
    assert not judge(shapes.box(80, 50, result.dimension - 0.02)).satisfied


def test_the_fillet_of_an_angle_starts_from_a_sharp_corner_that_has_no_margin():
    def build(radius):
        return shapes.angle(80, 80, 8, root_radius=radius)

    judge = bar_margin(2.4e5, 500.0, G, Allowables(shear_yield=120.0))
    result = size(build, 0.0, 100.0, judge, rel_tol=2e-3)
    assert result.found
    assert "fillet it" in result.trail[0].note
    assert result.trail[1].failed  # no fillet of 100 fits
    assert judge(build(result.dimension)).satisfied
    assert not judge(build(0.8 * result.dimension)).satisfied
