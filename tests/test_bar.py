"""Bar, stepped bar, allowables and margins: closed forms on sections by their numbers, then the real solver."""

import math
import pickle
from dataclasses import dataclass, field, replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import torsionfe as tf
from torsionfe.cautions import MARGINS, cautions
from torsionfe.errors import InputError
from torsionfe.member.bar import Bar, SteppedBar, TorqueCase
from torsionfe.member.margins import Allowables, margins, torque_limits
from torsionfe.outline import shapes
from torsionfe.text import number
from torsionfe.torsion.bounds import Bounds

G = 80e3


@dataclass(frozen=True)
class Spot:
    x: float
    y: float
    stress_per_torque: float
    rel_error: float


@dataclass(frozen=True)
class Section:
    """A section by its numbers."""

    torsion_constant: Bounds
    hot_spot: Spot | None
    outline: object = None
    singular_corners: np.ndarray = field(default_factory=lambda: np.zeros((0, 2)))
    section_modulus: float = math.nan
    warping_constant: float = 0.0
    warping_extremes: tuple = (0.0, 0.0)
    centre_of_twist: tuple = (0.0, 0.0)


def round_section(diameter, spread=0.0, error=0.0, corners=()):
    """Return a solid round section: J = pi d^4 / 32, tau = 16 T / (pi d^3) (Coulomb 1784)."""
    j = math.pi * diameter**4 / 32
    spot = Spot(diameter / 2, 0.0, 16 / (math.pi * diameter**3), error)
    sharp = np.array(corners, dtype=float).reshape(-1, 2)
    return Section(Bounds(j * (1 - spread), j * (1 + spread)), spot, singular_corners=sharp)


def bar_of(diameter, length=500.0, **options):
    return Bar(round_section(diameter, **options), length, G, f"d{diameter:g}")


# --- one bar ----------------------------------------------------------------------------------------------


def test_a_round_bar():
    bar = bar_of(20.0)
    j = math.pi * 20**4 / 32
    assert bar.stiffness == pytest.approx(G * j / 500)
    assert bar.twist(1e5) == pytest.approx(1e5 * 500 / (G * j))
    assert bar.twist_degrees(1e5) == pytest.approx(math.degrees(bar.twist(1e5)))
    assert bar.twist_rate(1e5) == pytest.approx(bar.twist(1e5) / 500)
    peak = bar.peak_stress(-1e5)
    assert (peak.stress, peak.x, peak.y) == pytest.approx((16e5 / (math.pi * 8000), 10.0, 0.0))
    assert "spring constant" in str(bar)


def test_the_bracket_reaches_stiffness_and_twist():
    bar = bar_of(20.0, spread=0.01)
    assert bar.stiffness_bounds.lower == pytest.approx(0.99 * bar.stiffness)
    for torque in (1e5, -1e5):
        bounds = bar.twist_bounds(torque)
        assert bounds.lower < bar.twist(torque) < bounds.upper
        assert max(abs(bounds.lower), abs(bounds.upper)) == pytest.approx(abs(bar.twist(torque)) / 0.99)


def test_the_solver_s_own_section():
    bar = Bar(tf.solve_torsion(shapes.round_bar(20.0)), 500.0, G)
    exact = bar_of(20.0)
    assert bar.twist_bounds(1e5).lower <= exact.twist(1e5) <= bar.twist_bounds(1e5).upper
    assert bar.peak_stress(1e5).stress == pytest.approx(exact.peak_stress(1e5).stress, rel=2e-3)


@pytest.mark.parametrize("wrong", [0.0, -1.0, math.nan, math.inf, True, "500", None])
def test_bad_lengths_and_moduli_are_refused(wrong):
    with pytest.raises(InputError, match="length"):
        Bar(round_section(20), wrong, G)
    with pytest.raises(InputError, match="shear_modulus"):
        Bar(round_section(20), 500.0, wrong)


def test_an_outline_in_place_of_its_solution_is_refused():
    with pytest.raises(InputError, match="call solve_torsion"):
        Bar(shapes.round_bar(20), 500.0, G)
    with pytest.raises(InputError, match="torque must be finite"):
        bar_of(20).twist(math.nan)
    with pytest.raises(InputError, match="torque must be a number"):
        bar_of(20).twist_bounds("450")


# --- several in series ------------------------------------------------------------------------------------


def test_a_stepped_bar_adds_its_twists():
    parts = [bar_of(30, 200.0), bar_of(20, 300.0), bar_of(25, 100.0)]
    stepped = SteppedBar(parts)
    result = stepped.response(1e5)
    assert result.torques == pytest.approx(1e5)
    assert result.twists == pytest.approx(np.cumsum([0.0, *(part.twist(1e5) for part in parts)]))
    assert stepped.stiffness == pytest.approx(1e5 / result.twists[-1])
    assert stepped.positions == pytest.approx([0, 200, 500, 600])
    assert result.governing == 1
    assert result.reactions == {0: pytest.approx(-1e5)}
    assert result.twist_at(350.0) == pytest.approx(parts[0].twist(1e5) + parts[1].twist(1e5) / 2)
    assert result.twists_degrees == pytest.approx(np.degrees(result.twists))
    assert "largest stress in segment d20" in str(result)


def test_torques_at_stations_make_the_diagram():
    stepped = SteppedBar([bar_of(30, 200.0), bar_of(20, 300.0), bar_of(25, 100.0)])
    result = stepped.response(TorqueCase("gears", {1: 5e4, 2: -2e4, 3: 3e4}))
    assert result.torques == pytest.approx([6e4, 1e4, 3e4])
    middle = SteppedBar(stepped.segments, held=2).response(TorqueCase("gears", {0: 1e4, 1: 2e4, 3: 3e4}))
    assert middle.torques == pytest.approx([-1e4, -3e4, 3e4])
    assert middle.twists[2] == 0.0
    assert middle.twists[0] == pytest.approx(stepped.segments[0].twist(1e4) + stepped.segments[1].twist(3e4))
    assert middle.reactions == {2: pytest.approx(-6e4)}
    lines = str(middle).splitlines()
    for k, (begin, end) in enumerate([("0", "200"), ("200", "500"), ("500", "600")]):
        words = lines[4 + k].split()
        assert begin in words
        assert words[words.index(begin) + 1 : words.index(begin) + 3] == [end, number(middle.torques[k], 6)]
        assert f" {number(middle.twists[k + 1])} rad " in lines[4 + k]


def test_held_at_both_ends():
    # two equal bars, torque between them: half each; a quarter of the free twist (statics and symmetry)
    bar = bar_of(20, 250.0)
    result = SteppedBar([bar, bar], held=(0, 2)).response(TorqueCase("middle", {1: 1e5}))
    assert result.torques == pytest.approx([5e4, -5e4])
    assert result.twists == pytest.approx([0.0, bar.twist(5e4), 0.0])
    assert sum(result.reactions.values()) == pytest.approx(-1e5)


@settings(deadline=None)
@given(
    st.lists(st.tuples(st.floats(10, 40), st.floats(50, 500)), min_size=2, max_size=6),
    st.lists(st.floats(-1e5, 1e5), min_size=7, max_size=7),
    st.sets(st.integers(0, 6), min_size=1, max_size=3),
)
def test_springs_in_series_are_in_equilibrium(sizes, loads, held):
    """Torque = stiffness * twist step, the jump at each free station is what is applied, held stations stay."""
    n = len(sizes)
    held = tuple({min(station, n) for station in held})
    stepped = SteppedBar([bar_of(d, length) for d, length in sizes], held)
    applied = np.where(np.isin(np.arange(n + 1), held), 0.0, np.array(loads[: n + 1]))
    result = stepped.response(TorqueCase("any", dict(enumerate(applied.tolist()))))
    k = np.array([part.stiffness for part in stepped.segments])
    scale = 1e5 * n
    assert k * np.diff(result.twists) == pytest.approx(result.torques, abs=1e-9 * scale)
    jump = np.append(0.0, result.torques) - np.append(result.torques, 0.0)
    free = ~np.isin(np.arange(n + 1), held)
    assert jump[free] == pytest.approx(applied[free], abs=1e-9 * scale)
    assert np.all(result.twists[~free] == 0.0)


def test_the_brackets_of_every_segment_reach_the_twist():
    parts = [bar_of(30, 200.0, spread=0.01), bar_of(20, 300.0, spread=0.02)]
    result = SteppedBar(parts).response(TorqueCase("both", {1: 4e4, 2: 1e5}))
    worst = [0.0, parts[0].twist(1.4e5) / 0.99, parts[0].twist(1.4e5) / 0.99 + parts[1].twist(1e5) / 0.98]
    assert result.twists + result.twist_errors == pytest.approx(worst)
    assert result.torque_errors == pytest.approx(0.0, abs=1e-9)
    held = SteppedBar(parts, held=(0, 2)).response(TorqueCase("middle", {1: 1e5}))
    stiff, soft = 1.01 * parts[0].stiffness, 0.98 * parts[1].stiffness
    assert held.torques[0] + held.torque_errors[0] >= 1e5 * stiff / (stiff + soft) * (1 - 1e-3)


def test_bad_stations_are_refused():
    stepped = SteppedBar([bar_of(20), bar_of(30)])
    for station in (3, -1, True, "1"):
        with pytest.raises(InputError, match="there is no station"):
            stepped.response(TorqueCase("odd", {station: 1.0}))
        with pytest.raises(InputError, match="there is no station"):
            SteppedBar(stepped.segments, held=(station,))
    with pytest.raises(InputError, match="one Bar or more"):
        SteppedBar([])
    with pytest.raises(InputError, match="held is empty"):
        SteppedBar(stepped.segments, held=())
    with pytest.raises(InputError, match="twists nothing"):
        SteppedBar(stepped.segments, held=2).response(1e5)
    with pytest.raises(InputError, match="torque of case 'odd'"):
        TorqueCase("odd", {1: math.nan})
    with pytest.raises(InputError, match="limit_factor"):
        TorqueCase("odd", 1.0, limit_factor=0.0)


# --- allowables and margins -------------------------------------------------------------------------------


def test_strengths_from_tension():
    mises = Allowables.from_tension(250.0, 400.0, criterion="von Mises")
    tresca = Allowables.from_tension(250.0, criterion="Tresca", twist=0.1)
    assert (mises.shear_yield, mises.shear_ultimate) == pytest.approx((250 / math.sqrt(3), 400 / math.sqrt(3)))
    assert (tresca.shear_yield, tresca.shear_ultimate, tresca.twist) == (125.0, None, 0.1)
    assert "von Mises" in mises.basis
    assert "Tresca" in tresca.basis


def test_bad_allowables_are_refused():
    with pytest.raises(InputError, match="no allowable"):
        Allowables()
    with pytest.raises(InputError, match="exchanged"):
        Allowables(shear_yield=300.0, shear_ultimate=200.0)
    with pytest.raises(InputError, match="twist must be greater than 0"):
        Allowables(twist=-0.1)
    with pytest.raises(InputError, match="did you mean 'von Mises'"):
        Allowables.from_tension(250.0, criterion="von Misses")
    with pytest.raises(InputError, match="no tensile strength"):
        Allowables.from_tension(criterion="Tresca", twist=0.1)


def test_margins_by_hand():
    bar = bar_of(20.0)
    case = TorqueCase("landing", 1e5, limit_factor=1.2, ultimate_factor=1.8)
    found = bar.margins(case, Allowables(100.0, 160.0, twist=0.1, twist_rate=2e-4))
    tau = 16e5 / (math.pi * 8000)
    expected = {
        "shear yield": 100 / (1.2 * tau) - 1,
        "shear ultimate": 160 / (1.8 * tau) - 1,
        "twist": 0.1 / (1.2 * bar.twist(1e5)) - 1,
        "twist rate": 2e-4 / (1.2 * bar.twist_rate(1e5)) - 1,
    }
    assert {row.criterion: row.margin for row in found} == pytest.approx(expected)
    assert found.governing.criterion == min(expected, key=expected.get)
    for row in found:
        largest = bar.margins(replace(case, torque=row.largest_torque), found.allowables)
        assert next(r for r in largest if r.criterion == row.criterion).margin == pytest.approx(0.0, abs=1e-12)
    assert found.satisfied
    assert not bar.margins(1e6, found.allowables).satisfied
    assert found[1:][0] is found[1]


def test_a_coarse_mesh_never_flatters():
    """Margins fall by the whole bracket and error, and the true margin is never below what is said."""
    allowables = Allowables(100.0, twist=0.1, twist_rate=2e-4)
    true = bar_of(20.0).margins(1e5, allowables)
    rough = bar_of(20.0, spread=0.02, error=0.05).margins(1e5, allowables)
    factor = {"shear yield": 1.05, "twist": 1 / 0.98, "twist rate": 1 / 0.98}
    for row, best in zip(rough, true, strict=True):
        assert 1 + row.margin == pytest.approx((1 + best.margin) / factor[row.criterion])


@pytest.mark.parametrize("tolerance", [0.3, 0.03, 1e-3])
def test_the_solver_s_margins_stay_below_the_exact_ones(tolerance):
    # a rectangle 2 : 1, J = 0.22868 b t^3, W_t = 0.24594 b t^2 (Saint-Venant's series; Timoshenko and Goodier)
    solution = tf.solve_torsion(shapes.rectangle(20, 10), rel_tol=tolerance, peak_tol=math.inf)
    j, w = 4573.633542391415, 2 * 10**3 * 0.245940
    allowables = Allowables(100.0, twist=0.1)
    strength, twist = Bar(solution, 500.0, G).margins(5e4, allowables)
    assert twist.margin <= 0.1 * G * j / (5e4 * 500) - 1 <= twist.margin + 2 * tolerance * (1 + twist.margin)
    assert strength.margin <= 100 * w / 5e4 - 1 + 1e-4


def test_a_sharp_corner_has_no_strength_margin():
    bar = bar_of(20.0, corners=[(3.0, 4.0)])
    found = bar.margins(1e5, Allowables(100.0, 160.0, twist=0.1))
    strength = [row for row in found if row.criterion.startswith("shear")]
    assert len(strength) == 2
    for row in strength:
        assert math.isnan(row.margin)
        assert math.isnan(row.largest_torque)
        assert row.note == "not defined: sharp re-entrant corner at (3, 4): fillet it"
    twist = found[2]
    assert math.isfinite(twist.margin)
    assert not found.satisfied
    assert found.governing is strength[0]
    assert "not defined" in str(found)
    assert not bar.margins(1.0, Allowables(100.0)).satisfied


def test_the_solver_s_sharp_corner():
    found = Bar(tf.solve_torsion(shapes.angle(60, 60, 8)), 500.0, G).margins(1e4, Allowables(100.0))
    assert "(8, 8): fillet it" in found[0].note
    filleted = Bar(tf.solve_torsion(shapes.angle(60, 60, 8, root_radius=8)), 500.0, G)
    assert filleted.margins(1e4, Allowables(100.0))[0].defined


def test_a_section_without_hot_spot_has_no_strength_margin():
    section = replace(round_section(20.0), hot_spot=None)
    found = Bar(section, 500.0, G).margins(1e5, Allowables(100.0))
    assert "no hot spot" in found[0].note
    unsure = replace(round_section(20.0), hot_spot=Spot(1.0, 0.0, 1e-3, math.nan))
    assert "no known error" in Bar(unsure, 500.0, G).margins(1e5, Allowables(100.0))[0].note


def test_an_unloaded_sharp_segment_is_no_matter():
    stepped = SteppedBar([bar_of(20), bar_of(30, corners=[(1, 1)])])
    found = stepped.margins(TorqueCase("first only", {1: 1e5}), Allowables(100.0))
    assert [row.margin for row in found] == [pytest.approx(100 * math.pi * 8000 / 16e5 - 1), math.inf]
    assert found.satisfied == (found[0].margin >= 0)
    assert not stepped.margins(1e5, Allowables(100.0))[1].defined


def test_the_governing_case_of_several():
    stepped = SteppedBar([bar_of(20), bar_of(16)])
    cases = [TorqueCase("taxi", 2e4), TorqueCase("gust", {1: 9e4, 2: 1e4}), TorqueCase("none", 0.0)]
    found = stepped.margins(cases, Allowables(200.0))
    assert (found.governing.case, found.governing.segment) == ("gust", "d20")
    assert len(found) == 6
    assert [row.margin for row in found if row.case == "none"] == [math.inf, math.inf]
    for wrong in ([], "gust"):
        with pytest.raises(InputError, match="cases must be"):
            margins(stepped, wrong, Allowables(200.0))


def test_torque_limits():
    bar = bar_of(20.0)
    limits = torque_limits(bar, Allowables(100.0, 160.0, twist=0.1), ultimate_factor=2.0)
    w = math.pi * 8000 / 16
    expected = [100 * w, 160 * w / 2, 0.1 * bar.stiffness]
    assert [row.largest_torque for row in limits.rows] == pytest.approx(expected)
    assert float(limits) == pytest.approx(min(expected))
    assert "Largest torque" in str(bar.torque_limits(limits.allowables))
    sharp = bar_of(20.0, corners=[(1, 1)]).torque_limits(limits.allowables)
    assert math.isnan(float(sharp))
    assert "not defined" in str(sharp)


def test_cautions_stand_under_every_margin():
    bar = bar_of(20.0)
    allowables = Allowables.from_tension(250.0, criterion="Tresca")
    for text in (str(bar.margins(1e5, allowables)), str(bar.torque_limits(allowables))):
        assert text.endswith(cautions())
        assert all(line in text for line in MARGINS)
        assert "Tresca" in text
    assert "fatigue" in cautions()
    assert "licensed engineer" in cautions()


def test_printed_margins_are_rounded_down():
    bar = bar_of(20.0)
    limit = bar.torque_limits(Allowables(100.0)).rows[0].largest_torque
    assert "-0.001" in str(bar.margins(limit * 1.0001, Allowables(100.0)))


def test_results_travel_between_processes():
    found = pickle.loads(pickle.dumps(SteppedBar([bar_of(20)]).margins(1e5, Allowables(100.0))))
    assert found[0].margin == bar_of(20).margins(1e5, Allowables(100.0))[0].margin


def test_a_twist_margin_names_the_largest_torque_of_the_steps():
    bar = SteppedBar([bar_of(20.0), bar_of(20.0)])
    found = bar.margins(TorqueCase("two", {1: -9e4, 2: 3e4}), Allowables(twist=0.5))
    (twist,) = [row for row in found if row.criterion == "twist"]
    assert abs(twist.torque) == 6e4  # -9e4 + 3e4 in the first step, 3e4 in the second
