"""The hand method over ranges of dimensions: errors between bounds, verdicts, gaps, figures."""

import math

import numpy as np
import pytest

import torsionfe as tf
from torsionfe.errors import InputError
from torsionfe.outline import shapes
from torsionfe.output.range_plot import plot_range
from torsionfe.output.style import cielab
from torsionfe.study.compare import compare
from torsionfe.study.grid import combinations
from torsionfe.study.range import OUTSIDE, UNDECIDED, UNKNOWN, WITHIN, HandRange, hand_method_range
from torsionfe.study.sweep_table import RowStore

LOOSE = {"workers": 0, "progress": False, "rel_tol": 1e-2, "peak_tol": 0.1}
ANGLE = {"leg_x": 80.0, "leg_y": 80.0, "thickness": [8.0], "root_radius": 8.0}


def judged(low, high):
    low, high = np.array([low]), np.array([high])
    return HandRange(None, low, high, low, high, ("",), ("",)).verdicts(0.05)[0]


def test_verdicts_hold_for_every_value_between_the_ends():
    assert judged(-0.049, 0.049) == WITHIN
    assert judged(0.051, 0.06) == OUTSIDE
    assert judged(-0.2, -0.051) == OUTSIDE
    assert judged(0.04, 0.06) == UNDECIDED
    assert judged(-0.06, 0.01) == UNDECIDED
    assert judged(math.nan, math.nan) == UNKNOWN


def test_a_range_carries_bounds_errors_and_gaps():
    found = hand_method_range(
        shapes.angle,
        {"leg_x": 80.0, "leg_y": 80.0, "thickness": [4.0, 8.0, 90.0], "root_radius": [0.0, 8.0]},
        workers=0,
        progress=False,
        rel_tol=5e-3,
        peak_tol=2e-2,
    )
    assert len(found) == 6
    assert (found.constant_low[:4] < found.constant_high[:4]).all()
    assert np.isnan(found.constant_low[4:]).all()
    assert np.isnan(found.stress_low[[0, 2]]).all()  # sharp corners have no peak
    angle = shapes.angle(80, 80, 8, 8)
    (plain,) = compare(tf.solve_torsion(angle), angle.plates()).methods
    assert found.constant_low[3] <= plain.constant_error <= found.constant_high[3]
    assert found.stress_low[3] <= plain.stress_error <= found.stress_high[3]
    assert found.verdicts(0.05)[3] == OUTSIDE
    assert "no answer" in str(found)
    assert "row 4: OutlineError: thickness 90 must be less than leg_x 80" in str(found)
    assert found.errors[:4] == ("",) * 4
    names, rows = found.as_table()
    assert len(rows) == 6
    assert len(names) == len(rows[0])
    drawn = plot_range(found, unit="mm")
    assert drawn.axes.get_xlabel() == "thickness [mm]"
    assert len(drawn.labels) == 4
    assert any(text.get_text() == "no answer" for text in drawn.axes.get_legend().get_texts())
    with pytest.raises(InputError, match="limits"):
        plot_range(found, limits=(0.1, 0.05))


def test_one_dimension_is_a_curve_within_its_bounds():
    sizes = {"thickness": iter(np.linspace(1.0, 6.0, 4))}  # an iterator gives its values once only
    found = hand_method_range(lambda thickness: shapes.tube(50.0, thickness), sizes, **LOOSE)
    exact = [-((t / (50.0 - t)) ** 2) / (1.0 + (t / (50.0 - t)) ** 2) for t in np.linspace(1.0, 6.0, 4)]
    assert (found.constant_low <= exact).all()  # Bredt against pi/2 (R^4 - r^4)
    assert (exact <= found.constant_high).all()
    drawn = found.plot()
    assert len(drawn.lines) == 2
    assert drawn.lines[0].get_ydata() == pytest.approx(50.0 * (found.constant_low + found.constant_high))
    assert drawn.axes.get_ylabel() == "error of the hand method [%]"
    with pytest.raises(InputError, match="judged"):
        plot_range(found, judged="twist")


def test_other_idealisations_and_own_functions():
    full = hand_method_range(shapes.angle, ANGLE, hand="full_depth", **LOOSE)
    assert full.names == ("full_depth",)
    own = hand_method_range(shapes.angle, ANGLE, hand=lambda **size: [tf.Plate(152.0, size["thickness"])], **LOOSE)
    assert own.names == ("given by hand",)
    assert own.constant_low[0] < full.constant_low[0]
    drawn = hand_method_range(
        lambda **size: tf.Outline(shapes.angle(**size).vertices, shapes.angle(**size).bulges),
        ANGLE,
        hand="full_depth",
        **LOOSE,
    )
    assert drawn.constant_low[0] == pytest.approx(full.constant_low[0], abs=1e-3)  # found on the medial axis


def test_a_function_that_fails_costs_its_own_section_only():
    def hand(thickness, **_):
        return [tf.Plate(152.0, 8.0 / (thickness - 8.0))] if thickness < 20.0 else []

    grid = {**ANGLE, "thickness": [8.0, 12.0, 20.0]}
    found = hand_method_range(shapes.angle, grid, hand=hand, **LOOSE)
    assert np.isfinite(found.constant_low).tolist() == [False, True, False]
    assert found.errors[0] == "ZeroDivisionError: float division by zero"
    assert found.errors[1] == ""
    assert found.errors[2].startswith("hand method: plates is empty")
    assert np.isfinite(found.table["torsion_constant"]).all()  # what was solved is kept
    assert (found.verdicts(0.05) == UNKNOWN).tolist() == [True, False, True]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"grid": {}}, "grid"),
        ({"grid": [1.0]}, "grid"),
        ({"hand": 3}, "hand must be"),
        ({"hand": "centerline"}, "did you mean 'centreline'"),
        ({"build": "angle"}, "build must be a function"),
        ({"grid": {"leg_x": []}}, "has no values"),
    ],
)
def test_bad_arguments_are_told_before_anything_is_solved(change, message):
    given = {"build": shapes.angle, "grid": ANGLE} | change
    with pytest.raises(InputError, match=message):
        hand_method_range(given.pop("build"), given.pop("grid"), **given, **LOOSE)


def test_workers_and_journal_give_the_same_range(tmp_path):
    grid = {**ANGLE, "thickness": [6.0, 8.0]}
    here = hand_method_range(shapes.angle, grid, **LOOSE)
    for _ in range(2):  # the second time from the journal
        options = LOOSE | {"workers": 1, "journal": tmp_path / "range.journal"}
        there = hand_method_range(shapes.angle, grid, **options)
        assert there.table.same_as(here.table)
        assert (there.stress_low == here.stress_low).all()


def made_up(errors, doubt=0.0):
    """Return a range over two dimensions with errors of our own, shape (rows, columns)."""
    high, wide = np.shape(errors)
    grid = {"leg_x": 60.0, "leg_y": 60.0, "thickness": [4.0 + k for k in range(wide)]}
    grid["root_radius"] = [1.0 + k for k in range(high)]
    flat = np.transpose(errors).ravel()  # the last parameter runs fastest
    store = RowStore(tuple(grid))
    for k, row in enumerate(combinations(grid)):
        store.put(k, row, {"status": "ok"})
    empty = ("",) * len(flat)
    return HandRange(store.table(), flat - doubt, flat + doubt, flat - doubt, flat + doubt, empty, empty)


def test_a_map_tells_sides_limits_and_doubt_apart():
    drawn = plot_range(made_up([[-0.2, -0.07, 0.0], [0.02, 0.07, 0.2], [math.nan, 0.01, 0.3]], doubt=0.001), unit="mm")
    levels = np.ma.filled(drawn.cells.get_array().reshape(3, 3).astype(float), -1.0)
    assert levels.tolist() == [[0, 1, 2], [2, 3, 4], [-1, 2, 4]]
    assert [text.get_text() for text in drawn.labels[:3]] == ["−20", "+2", "−7"]
    assert len(drawn.labels) == 8
    told = [text.get_text() for text in drawn.axes.get_legend().get_texts()]
    assert told[:5] == [
        "too low by more than 10 %",
        "too low, within 10 %",
        "within 5 %",
        "too high, within 10 %",
        "too high by more than 10 %",
    ]
    assert told[5:] == ["no answer", "at 5 %", "at 10 %"]
    assert [line.levels.tolist() for line in drawn.limits] == [[-0.05, 0.05], [-0.1, 0.1]]
    lightness = np.sort(cielab(drawn.cells.cmap(np.arange(5)))[:, 0])
    assert np.diff(lightness).min() > 10.0  # five greys on a grey print


def test_the_lines_of_a_map_run_where_the_error_comes_to_a_limit():
    drawn = plot_range(made_up([[0.0, 0.1, 0.2]] * 2))
    for line, limit in zip(drawn.limits, (0.05, 0.1), strict=True):
        x = np.concatenate([path.vertices[:, 0] for path in line.get_paths() if len(path.vertices)])
        assert x == pytest.approx(0.5 + 10.0 * limit)


def test_undecided_cells_are_marked_in_maps_too_large_for_numbers():
    errors = np.full((14, 14), 0.02)
    errors[3, 5] = 0.0505
    drawn = plot_range(made_up(errors, doubt=0.001))
    (mark,) = drawn.labels
    assert mark.get_text() == "?"
    assert mark.get_position() == (5.5, 3.5)
    assert "limit undecided" in [text.get_text() for text in drawn.axes.get_legend().get_texts()]


@pytest.mark.parametrize(
    ("found", "options", "said"),
    [
        (3, {}, "a HandRange is needed, got int"),
        (made_up([[0.1, 0.2]]), {"limits": (0.1, 0.05)}, "two rising ratios above 0"),
        (made_up([[0.1, 0.2]]), {"judged": "mass"}, "judged must be of"),
        (made_up([[0.1]]), {}, "one or two dimensions must vary to be drawn; here vary: none"),
        (made_up([[math.nan, math.nan]] * 2), {}, "no section has an error of .* to draw"),
    ],
)
def test_ranges_that_cannot_be_drawn_say_why(found, options, said):
    with pytest.raises(InputError, match=said):
        plot_range(found, **options)


def test_one_varied_dimension_is_a_curve_and_a_range_names_itself():
    drawn = plot_range(made_up([[0.1, math.nan, 0.3]]))
    assert drawn.axes.get_xlabel().startswith("thickness")
    assert repr(made_up([[0.1, 0.2]])) == "<HandRange of 2 sections over leg_x, leg_y, thickness, root_radius>"
