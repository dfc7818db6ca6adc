"""Restrained warping against closed forms, an independent beam element, and its limits; torsional buckling."""

import math
from dataclasses import dataclass, field

import numpy as np
import pytest

import torsionfe as tf
from torsionfe.errors import InputError
from torsionfe.member.bar import Bar
from torsionfe.member.buckling import torsional_buckling
from torsionfe.member.restrained import restrain
from torsionfe.outline import shapes
from torsionfe.torsion.bounds import Bounds

E, G = 210e3, 80e3


@dataclass(frozen=True)
class Section:
    """A section by its numbers."""

    outline: object = field(default_factory=lambda: shapes.wide_flange(300, 150, 10.7, 7.1))
    torsion_constant: Bounds = field(default_factory=lambda: Bounds(2.0e5, 2.0e5))
    warping_constant: float = 1.26e11
    warping_extremes: tuple = (-1.1e4, 1.1e4)
    centre_of_twist: tuple = (0.0, 0.0)
    hot_spot: None = None
    singular_corners: np.ndarray = field(default_factory=lambda: np.zeros((0, 2)))
    section_modulus: float = math.nan


def bar_of(ratio, **changes):
    """Return a bar whose length is ``ratio`` decay lengths."""
    section = Section(**changes)
    decay = math.sqrt(E * section.warping_constant / (G * section.torsion_constant.value))
    return Bar(section, ratio * decay, G)


RATIOS = [1e-3, 0.1, 1.0, 3.99, 4.01, 20.0, 2000.0]


def one(value):
    assert value.shape == (1,)
    return float(value[0])


# Cantilever, near end held: theta(L) = T/(G J) (L - tanh(kL)/k), B(0) = T tanh(kL)/k
# (Vlasov, Thin-Walled Elastic Beams, ch. II; Timoshenko 1945).
@pytest.mark.parametrize("ratio", RATIOS)
def test_cantilever(ratio):
    bar = bar_of(ratio)
    result = restrain(bar, E, 5e5, warping="near")
    k, gj = 1 / result.decay_length, result.torsional_rigidity
    # the difference L - tanh(kL)/k written so that it keeps its digits where kL is small
    free = bar.length * (1 - math.tanh(ratio) / ratio if ratio > 0.01 else ratio**2 / 3 - 2 * ratio**4 / 15)
    assert one(result.twist(bar.length)) == pytest.approx(5e5 / gj * free, rel=1e-9)
    assert one(result.bimoment(0.0)) == pytest.approx(5e5 * math.tanh(ratio) / k, rel=1e-9)
    assert result.largest_bimoment == pytest.approx((one(result.bimoment(0.0)), 0.0))
    assert one(result.warping_share(0.0)) == pytest.approx(1.0)
    shear = 1 - math.cosh(ratio / 2) / math.cosh(ratio) if ratio < 100 else 1.0
    assert one(result.shear_torque(bar.length / 2)) == pytest.approx(5e5 * shear, rel=1e-7, abs=1e-9 * 5e5)


@pytest.mark.parametrize("ratio", RATIOS[1:])
def test_both_ends_held(ratio):
    # theta(L) = T/(G J) (L - (2/k) tanh(kL/2)), bimoment opposite and equal at the ends
    bar = bar_of(ratio)
    result = restrain(bar, E, 5e5, warping="both")
    k, gj = 1 / result.decay_length, result.torsional_rigidity
    exact = 5e5 / gj * (bar.length - 2 / k * math.tanh(ratio / 2))
    assert one(result.twist(bar.length)) == pytest.approx(exact, rel=1e-8)
    assert result.bimoment(np.array([0.0, bar.length])) == pytest.approx(
        np.array([1, -1]) * 5e5 / k * math.tanh(ratio / 2), rel=1e-8
    )


@pytest.mark.parametrize("ratio", RATIOS[2:])
def test_forks_at_both_ends(ratio):
    # mid-span torque: theta = T/(2 G J k) (kL/2 - tanh(kL/2)), B = T/(2k) tanh(kL/2); uniform torque m = T/L:
    # theta = m/(G J) (L^2/8 - (1 - 1/cosh(kL/2))/k^2)  (Timoshenko 1945)
    bar = bar_of(ratio)
    middle = restrain(bar, E, 5e5, warping="neither", load="middle")
    spread = restrain(bar, E, 5e5, warping="neither", load="uniform")
    k, gj, half = 1 / middle.decay_length, middle.torsional_rigidity, bar.length / 2
    assert one(middle.twist(half)) == pytest.approx(5e5 / (2 * gj * k) * (ratio / 2 - math.tanh(ratio / 2)), rel=1e-8)
    assert abs(one(middle.bimoment(half))) == pytest.approx(5e5 / (2 * k) * math.tanh(ratio / 2), rel=1e-8)
    sech = 1 / math.cosh(ratio / 2) if ratio < 1000 else 0.0
    exact = 5e5 / bar.length / gj * (bar.length**2 / 8 - (1 - sech) / k**2)
    assert one(spread.twist(half)) == pytest.approx(exact, rel=1e-8)


def test_a_stubby_bar_is_a_beam_of_its_flanges():
    # lambda to 0 leaves E C_w theta'''' = m: T L^3 / (3 E C_w), and for both ends held at mid-span T L^3 / (192 E C_w)
    bar = bar_of(1e-4)
    ec = E * bar.solution.warping_constant
    free = restrain(bar, E, 1.0, warping="near")
    assert one(free.twist(bar.length)) == pytest.approx(bar.length**3 / 3 / ec, rel=1e-7)
    middle = restrain(bar, E, 1.0, warping="both", load="middle")
    assert one(middle.twist(bar.length / 2)) == pytest.approx(bar.length**3 / 192 / ec, rel=1e-7)
    spread = restrain(bar, E, 1.0, warping="both", load="uniform")
    assert one(spread.twist(bar.length / 2)) == pytest.approx(bar.length**3 / 384 / ec, rel=1e-7)


def hermite_bar(ec, gj, length, load, warping, rotation, n=200):
    """Solve the same bar with cubic Hermite elements: unknowns theta and theta' at each node.

    Element matrices of a beam under tension (Przemieniecki 1968, ch. 5 and 15), E C_w for E I and G J for the
    tension. Returns nodes and theta.
    """
    h = length / n
    scale = np.outer([1, h, 1, h], [1, h, 1, h])
    bend = ec / h**3 * scale * np.array([[12, 6, -12, 6], [6, 4, -6, 2], [-12, -6, 12, -6], [6, 2, -6, 4]])
    pull = gj / (30 * h) * scale * np.array([[36, 3, -36, 3], [3, 4, -3, -1], [-36, -3, 36, -3], [3, -1, -3, 4]])
    k, f = np.zeros((2 * n + 2, 2 * n + 2)), np.zeros(2 * n + 2)
    for e in range(n):
        rows = np.arange(2 * e, 2 * e + 4)
        k[np.ix_(rows, rows)] += bend + pull
        if load == "uniform":
            f[rows] += np.array([h / 2, h**2 / 12, h / 2, -(h**2) / 12]) / length
    if load != "uniform":
        f[2 * n if load == "end" else n] = 1.0
    held = [0] + [2 * n] * (rotation == "both") + [1] * (warping != "neither") + [2 * n + 1] * (warping == "both")
    free = np.setdiff1d(np.arange(2 * n + 2), held)
    theta = np.zeros(2 * n + 2)
    theta[free] = np.linalg.solve(k[np.ix_(free, free)], f[free])
    return np.linspace(0, length, n + 1), theta[::2], theta[1::2]


@pytest.mark.parametrize("ratio", [0.5, 3.0, 12.0])
@pytest.mark.parametrize("warping", ["neither", "near", "both"])
@pytest.mark.parametrize(
    ("load", "rotation"),
    [("end", "near"), ("middle", "near"), ("middle", "both"), ("uniform", "near"), ("uniform", "both")],
)
def test_against_an_independent_beam_element(ratio, warping, load, rotation):
    bar = bar_of(ratio)
    result = restrain(bar, E, 1.0, warping=warping, load=load, rotation=rotation)
    z, theta, rate = hermite_bar(
        result.warping_rigidity, result.torsional_rigidity, bar.length, load, warping, rotation
    )
    assert result.twist(z) == pytest.approx(theta, abs=1e-5 * np.abs(theta).max())
    assert result.twist_rate(z) == pytest.approx(rate, abs=1e-4 * np.abs(rate).max())
    assert result.free_twist >= result.largest_twist[0] * (1 - 1e-12)
    assert result.largest_twist[0] == pytest.approx(np.abs(theta).max(), rel=1e-4)


@pytest.mark.parametrize("ratio", [0.3, 3.9, 4.1, 50.0])
@pytest.mark.parametrize("load", ["middle", "uniform"])
def test_equilibrium_and_end_conditions(ratio, load):
    """The torque falls by what is applied on the way; held ends don't rotate or warp."""
    bar = bar_of(ratio)
    result = restrain(bar, E, 7.0, warping="near", load=load)
    z = np.array([0.0, 0.2, 0.499999, 0.500001, 0.9, 1.0]) * bar.length
    torque = result.shear_torque(z) + result.warping_torque(z)
    passed = 7.0 * (z > bar.length / 2) if load == "middle" else 7.0 * z / bar.length
    assert torque + passed == pytest.approx(torque[0], abs=1e-8)
    ends = np.array([0.0, bar.length])
    assert result.twist(ends) == pytest.approx(0.0, abs=1e-12 * result.largest_twist[0])
    assert abs(one(result.twist_rate(0.0))) < 1e-10 * result.largest_twist[0] / bar.length
    assert abs(one(result.bimoment(bar.length))) < 1e-9 * result.largest_bimoment[0]


def test_normal_stress_is_bimoment_times_omega_over_the_warping_constant():
    bar = bar_of(3.0, warping_extremes=(-9e3, 1.2e4))
    result = restrain(bar, E, 5e5, warping="near")
    assert result.largest_normal_stress[0] == pytest.approx(result.largest_bimoment[0] * 1.2e4 / 1.26e11)


def test_normal_stress_of_a_thin_wide_flange():
    # B / (h M_flange): the flange bends in its plane, sigma = (B / h) / (t b^2 / 6) (handbook, thin walls)
    solution = tf.solve_torsion(shapes.wide_flange(200, 100, 1.0, 1.0), rel_tol=1e-2, peak_tol=math.inf)
    result = restrain(Bar(solution, 1000.0, G), E, 1e4, warping="near")
    flange = result.largest_bimoment[0] / 199 / (1.0 * 100**2 / 6)
    assert result.largest_normal_stress[0] == pytest.approx(flange, rel=2e-2)


def test_length_beyond_which_the_restraint_no_longer_matters():
    # cantilever: the effect is tanh(kL) / (kL)
    result = restrain(bar_of(3.0), E, 5e5, warping="near")
    for effect in (0.5, 0.1, 0.01):
        ratio = result.length_for_effect(effect) / result.decay_length
        assert math.tanh(ratio) / ratio == pytest.approx(effect, rel=1e-6)
    assert result.effect == pytest.approx(math.tanh(3) / 3)
    assert restrain(bar_of(3.0), E, 5e5, warping="neither").length_for_effect(0.01) == 0.0
    for wrong in (0.0, 1.0, math.nan, "much"):
        with pytest.raises(InputError, match="effect"):
            result.length_for_effect(wrong)
    with pytest.raises(InputError, match="too small"):
        result.length_for_effect(1e-7)


@pytest.mark.parametrize("constant", [0.0, 1e-20])
def test_a_section_that_does_not_warp(constant):
    bar = Bar(Section(warping_constant=constant), 1000.0, G)
    result = restrain(bar, E, 5e5, warping="both")
    assert one(result.twist(1000.0)) == pytest.approx(bar.twist(5e5), rel=1e-6)
    assert result.effect == result.length_for_effect(0.01) == 0.0
    assert result.largest_normal_stress[0] < 1e-3
    assert "does not warp" in str(result)


def test_the_table_says_what_holds():
    text = str(restrain(bar_of(3.0), E, 5e5, warping="near"))
    assert "kept from warping" in text
    assert "effect below 5 % beyond" in text
    assert "caution: Restrained warping by Vlasov" in text
    assert "licensed engineer" in text


def test_bad_input_is_refused():
    bar = bar_of(1.0)
    with pytest.raises(InputError, match="warping must be one of"):
        restrain(bar, E, 1.0, warping="left")
    with pytest.raises(InputError, match="twists nothing"):
        restrain(bar, E, 1.0, warping="near", rotation="both")
    with pytest.raises(InputError, match="elastic_modulus"):
        restrain(bar, -E, 1.0, warping="near")
    with pytest.raises(InputError, match="torque must be finite"):
        restrain(bar, E, math.nan, warping="near")
    with pytest.raises(InputError, match="positions must be from 0"):
        restrain(bar, E, 1.0, warping="near").twist(-1.0)
    with pytest.raises(InputError, match="positions must be from 0"):
        restrain(bar, E, 1.0, warping="near").twist(math.nan)


# --- torsional buckling -----------------------------------------------------------------------------------


def test_cruciform_buckles_by_torsion():
    # thin cross of four legs b x t: sigma = G (t/b)^2 (Timoshenko and Gere 1961, art. 5.4), long bar
    leg = np.array([(60, -1), (60, 1), (1, 1)])
    turns = [np.array([(c, s), (-s, c)]) for c, s in ((1, 0), (0, 1), (-1, 0), (0, -1))]
    cross = tf.Outline(np.concatenate([leg @ turn for turn in turns]))
    bar = Bar(tf.solve_torsion(cross, peak_tol=math.inf), 1000.0, G)
    result = torsional_buckling(bar, E)
    assert result.stress == pytest.approx(G * (2 / 60) ** 2, rel=0.05)
    assert result.torsion_governs
    assert result.warping_part < 0.01 * result.load
    assert "upper limit" in str(result)


def test_wide_flange_buckling_load_by_hand():
    outline = shapes.wide_flange(300, 150, 10.7, 7.1, root_radius=15)
    bar = Bar(Section(outline=outline), 3000.0, G)
    area, _, (i_x, i_y, _) = outline.edges.moments()
    expected = area / (i_x + i_y) * (G * 2e5 + math.pi**2 * E * 1.26e11 / 3000**2)
    result = torsional_buckling(bar, E)
    assert result.load == pytest.approx(expected)
    assert result.flexural_load == pytest.approx(math.pi**2 * E * i_y / 3000**2)
    assert torsional_buckling(bar, E, 0.5).warping_part == pytest.approx(4 * result.warping_part)
    wide = Bar(Section(outline=outline, torsion_constant=Bounds(1.9e5, 2.1e5)), 3000.0, G)
    assert torsional_buckling(wide, E).shear_part == pytest.approx(0.95 * result.shear_part)


def test_a_channel_is_refused():
    channel = shapes.channel(100, 50, 8, 6)
    bar = Bar(Section(outline=channel, centre_of_twist=(-20.0, 0.0)), 3000.0, G)
    with pytest.raises(InputError, match="torsion and bending buckle together"):
        torsional_buckling(bar, E)
