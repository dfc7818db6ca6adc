"""The hand method beside the answer: errors, sides, reasons, words, figure."""

import math

import pytest

import torsionfe as tf
from torsionfe.errors import InputError
from torsionfe.outline import shapes
from torsionfe.outline.fillets import unfilleted
from torsionfe.output.compare_plot import draw_errors, plot_comparison
from torsionfe.output.tables import csv_text, markdown_text
from torsionfe.quantities import UnitSystem
from torsionfe.study.compare import compare
from torsionfe.study.hand import hand_methods
from torsionfe.study.single import answer
from torsionfe.text import number

LEVER = shapes.angle(62.0, 46.0, 13.0, root_radius=7.0, toe_radius=4.0)


@pytest.fixture(scope="module")
def lever():
    return tf.solve_torsion(LEVER, rel_tol=2e-3, peak_tol=5e-3)


def only(comparison):
    (row,) = comparison.methods
    return row


# --- sides and errors --------------------------------------------------------------------------------------


def test_a_rectangle_by_its_series_is_the_answer():
    # Saint-Venant's series is exact for a rectangle, so the error lies within what is not known exactly
    bar = shapes.rectangle(30.0, 20.0)
    solution = tf.solve_torsion(bar)
    row = only(compare(solution))
    assert abs(row.constant_error) <= solution.torsion_constant.rel_gap
    assert abs(row.stress_error) <= solution.hot_spot.rel_error
    assert (row.stiffness, row.strength) == ("within the bounds", "within the bounds")
    assert (row.constant_reason, row.stress_reason) == ("agrees with the answer", "agrees with the answer")


def test_the_rule_of_thirds_on_a_stubby_plate_is_told_as_such():
    # b/t = 1.5: beta 0.196 (Timoshenko and Goodier, ch. 10), so b t^3 / 3 is 70 % too high
    solution = tf.solve_torsion(shapes.rectangle(30.0, 20.0))
    row = only(compare(solution, [tf.Plate(30.0, 20.0)], rule="third"))
    assert row.constant_error == pytest.approx(1.0 / 3.0 / 0.196 - 1.0, abs=0.01)
    assert row.stiffness == "not conservative"
    assert row.constant_reason.startswith("stubby plate, coefficients by the rule 'third' (+70 %)")
    assert row.stress_error < 0.0
    assert row.strength == "not conservative"
    assert row.stress_reason.startswith("follows from J for stress (+")


def test_bredt_approaches_the_exact_tube_as_the_wall_thins():
    # exact J = pi/2 (R^4 - r^4); Bredt's with the middle radius is off by -(t/2r_m)^2 to first order
    errors = []
    for wall in (4.0, 2.0, 1.0):
        tube = shapes.tube(50.0, wall)
        row = only(compare(tf.solve_torsion(tube, rel_tol=1e-4)))
        mean = 25.0 - wall / 2.0
        errors.append(row.constant_error)
        assert row.constant_error == pytest.approx(-((wall / (2.0 * mean)) ** 2), rel=0.05)
        assert (row.stiffness, row.strength) == ("conservative", "not conservative")
        assert row.stress_error == pytest.approx(mean * (1.0 + (wall / (2.0 * mean)) ** 2) / 25.0 - 1.0, rel=0.1)
    assert errors[0] / errors[1] == pytest.approx(4.0, rel=0.2)


def test_an_angle_with_a_root_fillet_is_stiffer_and_weaker_than_its_plates(lever):
    comparison = compare(lever, torque=450e3, shear_modulus=79e3, length=600.0)
    assert [row.method.name for row in comparison.methods][:2] == ["centreline", "full_depth"]
    for row in comparison.methods:
        assert (row.stiffness, row.strength) == ("conservative", "not conservative")
        assert "hot spot in a fillet of radius 7" in row.stress_reason
    without = tf.solve_torsion(unfilleted(LEVER), rel_tol=1e-3, peak_tol=math.inf).torsion_constant.value
    share = 1.0 - without / lever.torsion_constant.value
    assert f"fillets left out (-{100.0 * share:.2g} %)" in comparison.methods[0].constant_reason
    assert comparison.twist(lever.torsion_constant.value) == pytest.approx(
        450e3 * 600.0 / (79e3 * lever.torsion_constant.value)
    )


def test_is_808_prints_thin_plate_sums_far_below_the_solid_section():
    # IS 808:2021, ISA 80 x 80 x 8 (open data CC BY 4.0, package steel-sections)
    angle = next(a for a in pytest.importorskip("steel_sections").series("ISA") if a.section == "ISA 80 x 80 x 8")
    shape = shapes.angle(80.0, 80.0, 8.0, root_radius=angle.root_radius_mm)
    printed = only(compare(tf.solve_torsion(shape, rel_tol=2e-3), shape.plates(), rule="third"))
    assert printed.method.torsion_constant / 1e4 == pytest.approx(angle.it_cm4, rel=0.01)
    assert printed.constant_error == pytest.approx(-0.0525, abs=0.003)


def test_sides_are_judged_by_the_ends_of_what_is_not_known():
    bar = shapes.rectangle(30.0, 20.0)
    rough = tf.solve_torsion(bar, rel_tol=0.2, peak_tol=math.inf, order=1)
    bounds, found = rough.torsion_constant, {}
    for share, name in ((0.999, "below"), (1.001, "inside"), (1.001, "above")):
        end = {"below": bounds.lower, "inside": bounds.lower, "above": bounds.upper}[name]
        width = end * share / tf.plate_sum([tf.Plate(1e6, 1.0)]).torsion_constant_twist * 1e6
        found[name] = only(compare(rough, [tf.Plate(width, 1.0)])).stiffness
    assert found == {"below": "conservative", "inside": "within the bounds", "above": "not conservative"}


def test_a_peak_within_its_error_is_undecided():
    bar = shapes.rectangle(30.0, 20.0)
    solution = tf.solve_torsion(bar, rel_tol=2e-2, peak_tol=5e-2)
    spot, exact = solution.hot_spot, tf.plate_sum(bar.plates())
    sides = {"conservative": 1.0 + 1.5 * spot.rel_error, "not conservative": 1.0 - 1.5 * spot.rel_error}
    for share in (0.9, -0.9):
        sides |= {"within the bounds": 1.0 + share * spot.rel_error}
        for verdict, ratio in sides.items():
            # a strip of thickness t has the stress t / J = 3 / (b t^2)
            width = 3.0 / (ratio * spot.stress_per_torque) * 1e4
            row = only(compare(solution, [tf.Plate(width, 0.01)]))
            assert row.strength == verdict, (verdict, row.stress_error, spot.rel_error)
    assert 1.0 / exact.section_modulus == pytest.approx(spot.stress_per_torque, rel=spot.rel_error)


def test_what_did_not_converge_is_told():
    rough = tf.solve_torsion(LEVER, rel_tol=1e-9, max_unknowns=400)
    assert "NOT CONVERGED" in str(compare(rough))


# --- reasons -----------------------------------------------------------------------------------------------


def test_reasons_name_corner_cell_joint_and_cover():
    sharp = compare(tf.solve_torsion(shapes.angle(80.0, 80.0, 8.0), rel_tol=5e-3))
    assert {row.strength for row in sharp.methods} == {"not defined"}
    assert all(math.isnan(row.stress_error) for row in sharp.methods)
    assert sharp.methods[0].stress_reason == "sharp re-entrant corner at (8, 8): unbounded, fillet it"
    assert sharp.methods[0].constant_reason.startswith("joints stiffer than the plates that meet there (-4.")
    same, double, strip, peak = sharp.reasons  # methods with one reason are told together
    assert same.startswith("J by centreline, straight through, web through: joints stiffer")
    assert double.startswith("J by full depth: joints counted for more than they carry (+")
    assert strip.startswith("J by developed: no rectangle: bends and ends that a strip has not (-")
    assert peak == f"peak: {sharp.methods[0].stress_reason}"
    box = tf.solve_torsion(shapes.box(70.0, 40.0, 5.0, outer_radius=8.0, inner_radius=3.0), rel_tol=5e-3)
    assert "closed cell" in only(compare(box, [tf.Plate(220.0, 5.0)])).constant_reason
    assert only(compare(box)).method.name == "thin cells"
    blob = tf.Outline([(0, 0), (30, 0), (30, 12), (12, 12), (12, 60), (0, 60)]).filleted(2.0)
    words = str(compare(tf.solve_torsion(blob, rel_tol=5e-3)))
    assert "hot spot in a fillet of radius 2" in words


def test_unfilleting_gives_back_the_sharp_shape():
    for round_, sharp in (
        (shapes.angle(80, 80, 8, 8, 4), shapes.angle(80, 80, 8, 0, 4)),
        (shapes.wide_flange(180, 91, 8, 5.3, root_radius=9), shapes.wide_flange(180, 91, 8, 5.3)),
        (shapes.box(60, 40, 6, outer_radius=5, inner_radius=4), shapes.box(60, 40, 6, outer_radius=5)),
        (shapes.keyed_shaft(40, 12, 5, 1), shapes.keyed_shaft(40, 12, 5, 0)),
    ):
        assert unfilleted(round_).matches(sharp)
    assert unfilleted(shapes.tube(50, 5)).matches(shapes.tube(50, 5))


# --- what it takes -----------------------------------------------------------------------------------------


def test_everything_that_describes_plates_is_taken(lever):
    plates = LEVER.plates()
    for given in (plates, list(plates), tf.plate_sum(plates), tf.derive_plates(LEVER), {"mine": plates}):
        row = only(compare(lever, given))
        assert row.method.torsion_constant == pytest.approx(57572.0, rel=2e-3)
    assert only(compare(lever, {"mine": plates})).method.name == "mine"
    cells = shapes.tube(50, 5).thin_cells()
    assert only(compare(lever, cells)).method.answer.torsion_constant == tf.cell_sum(cells).torsion_constant
    assert only(compare(lever, tf.cell_sum(cells))).method.name == "thin cells"


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ({"torque": math.nan}, "torque"),
        ({"shear_modulus": 0.0}, "shear_modulus"),
        ({"torque": True}, "torque"),
        ({"torque": "450"}, "torque"),
        ({"length": -1.0}, "length"),
        ({"plates": []}, "empty"),
        ({"plates": {}}, "empty mapping"),
        ({"plates": [3]}, r"plates\[0\] must be a Plate"),
        ({"plates": 3.0}, "sequence of Plate"),
        ({"rule": "guess"}, "guess"),
    ],
)
def test_bad_arguments_are_told(lever, arguments, message):
    with pytest.raises(InputError, match=message):
        compare(lever, **arguments)


def test_a_shaft_is_no_set_of_plates():
    with pytest.raises(InputError, match="no part of the section is a plate"):
        compare(tf.solve_torsion(shapes.keyed_shaft(44, 12, 5, 0.8), rel_tol=1e-2, peak_tol=0.1))
    with pytest.raises(InputError, match="TorsionSolution is needed"):
        compare(LEVER)


# --- words and pictures ------------------------------------------------------------------------------------


def test_it_prints_writes_and_shows_itself(lever):
    comparison = compare(lever, {"a|b <i>": LEVER.plates()}, torque=450e3, shear_modulus=79e3, length=600.0)
    text = str(comparison)
    assert "conservative" in text
    assert "twist, rad" in text
    assert "J for stress" in text
    assert "J for stress" not in str(compare(lever, shapes.tube(50, 5).thin_cells()))  # Bredt has one J
    assert "J by hand" not in repr(comparison)
    rows = csv_text(comparison).splitlines()
    assert rows[0].startswith("method,J for twist,J for stress,error of J,stiffness,peak stress")
    assert len(rows) == 3
    assert r"a\|b" in markdown_text(comparison)
    page = comparison._repr_html_()
    assert "<svg" in page
    assert "<i>" not in page
    assert "a|b &lt;i&gt;" in page


@pytest.mark.parametrize("torque", [None, 450e3, -450e3])
def test_stresses_and_twists_are_those_of_the_torque(lever, torque):
    comparison = compare(lever, LEVER.plates(), torque=torque, shear_modulus=79e3, length=600.0)
    head, (solved, by_hand) = comparison.as_table()
    solved, by_hand = (dict(zip(head, row, strict=True)) for row in (solved, by_hand))
    times = 1.0 if torque is None else abs(torque)
    hand = tf.plate_sum(LEVER.plates())
    assert solved["peak stress"] == pytest.approx(times * lever.hot_spot.stress_per_torque, rel=1e-12)
    assert by_hand["peak stress"] == pytest.approx(hand.peak_stress(times).max(), rel=1e-12)
    text = str(comparison)
    assert number(solved["peak stress"]) in text
    assert number(by_hand["peak stress"]) in text
    if torque is None:
        assert math.isnan(solved["twist"])
        return
    assert solved["twist"] == pytest.approx(tf.Bar(lever, 600.0, 79e3).twist(torque), rel=1e-12)
    assert by_hand["twist"] == pytest.approx(torque * 600.0 / (79e3 * hand.torsion_constant_twist), rel=1e-12)
    assert number(by_hand["twist"]) in text


def test_the_figure_shows_every_method_and_its_side(lever):
    comparison = compare(lever)
    drawn = plot_comparison(comparison, unit="mm")
    section, constant, peak = drawn.axes
    assert section.get_xlabel() == "x [mm]"
    assert len(drawn.constant.bars) == len(comparison.methods) == len(drawn.peak.values)
    for bar, row in zip(drawn.constant.bars, comparison.methods, strict=True):
        assert bar.get_width() == pytest.approx(100.0 * row.constant_error)
        assert bar.get_hatch() in ("", None)
    assert all(bar.get_hatch() for bar in drawn.peak.bars)
    assert constant.get_xlabel() == "error of J [%]"
    assert "mm" in constant.get_title(loc="left")
    assert peak.get_yticklabels()[0].get_text() == "centreline"
    sharp = compare(tf.solve_torsion(shapes.angle(80.0, 80.0, 8.0), rel_tol=2e-2))
    assert "no finite peak" in plot_comparison(sharp).axes[2].get_title(loc="left")
    from matplotlib.figure import Figure

    exact = tf.solve_torsion(shapes.rectangle(30.0, 20.0), rel_tol=2e-2)
    words = [text.get_text() for text in plot_comparison(compare(exact)).axes[1].figure.legends[0].get_texts()]
    assert words == ["within the bounds", "not known closer"]

    brief = draw_errors(comparison, tuple(Figure().subplots(1, 2)), brief=True)
    assert brief[0].values[0].get_text() == "−18 %"
    with pytest.raises(InputError, match="Comparison is needed"):
        plot_comparison(lever)


def test_methods_of_an_outline_that_nobody_described():
    assert [method.name for method in hand_methods(shapes.rectangle(30, 20))] == ["centreline"]
    plain = tf.Outline([(0, 0), (80, 0), (80, 8), (8, 8), (8, 80), (0, 80)])
    assert hand_methods(plain)[0].torsion_constant == pytest.approx(
        tf.plate_sum(shapes.angle(80, 80, 8).plates()).torsion_constant_twist, rel=0.01
    )


def test_the_answer_of_a_section_tells_its_hand_method(lever):
    told = str(answer(lever, UnitSystem("mm"), torque=450e3))
    assert "by hand (centreline)" in told
    assert "-18 % off, conservative for stiffness" in told
    assert "-20 % off, not conservative for strength" in told
    assert "hot spot in a fillet of radius 7" in told
    tube = str(answer(tf.solve_torsion(shapes.tube(50.0, 2.0), rel_tol=1e-4), UnitSystem("")))
    assert "by hand (thin cells)" in tube
    shaft = tf.solve_torsion(shapes.keyed_shaft(44, 12, 5, 0.8), rel_tol=1e-2, peak_tol=0.1)
    assert "by hand" not in str(answer(shaft, UnitSystem("")))
