"""Plates of any outline from its medial axis: what trade shapes state, what files bring, what is no plate."""

from __future__ import annotations

import json
import math
from pathlib import Path

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from torsionfe.closed_form.cells import cell_sum
from torsionfe.closed_form.derive import DERIVED, derive_plates
from torsionfe.closed_form.medial import inscribed_circles
from torsionfe.closed_form.plates import Plate, plate_sum
from torsionfe.errors import InputError
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline

CASES = json.loads((Path(__file__).parent / "reference" / "torsion_cases.json").read_text(encoding="utf-8"))
BY_NAME = {case["id"]: case for case in CASES}


def outline_of(name: str) -> Outline:
    (loop,) = BY_NAME[name]["geometry"]["loops"]
    return Outline(loop["vertices"], [0.0 if edge is None else edge["bulge"] for edge in loop["edges"]])


def sizes(plates) -> np.ndarray:
    return np.array(sorted((plate.width, plate.thickness) for plate in plates))


# --- inscribed circles --------------------------------------------------------------------------------


@pytest.mark.parametrize("bulge", [1.5, 4.566, 12.0])
def test_a_bulge_too_small_to_see_leaves_a_square_one_plate(bulge):
    # from inside it some rays meet nothing but its own arc
    square = Outline([(0, 0), (0.5, 0), (0.500005, 0), (1, 0), (1, 1), (0, 1)], [0, bulge, 0, 0, 0, 0])
    circles = inscribed_circles(square)
    assert np.isfinite(circles.radius).all()
    assert np.isfinite(circles.touch).all()
    assert sizes(derive_plates(square).plates) == pytest.approx(np.array([[1.0, 1.0]]), abs=1e-3)


def test_plates_beside_a_wall_thinner_than_the_chords():
    void = shapes.round_bar(1.0).translated(0.49995, 0.0).rotated(0.7)
    derived = derive_plates(Outline([(-1, 0), (1, 0)], [1, 1], [void]))
    assert 0.0 <= derived.covered <= 1.0



@pytest.mark.parametrize(
    "outline",
    [
        shapes.angle(80, 60, 8, root_radius=8, toe_radius=4),
        shapes.wide_flange(200, 100, 10, 6, 12, flange_slope=0.14),
        shapes.keyed_shaft(50, 14, 5.5, root_radius=1),
        shapes.multi_cell(120, 60, 3, 2, outer_radius=6, inner_radius=3),
        shapes.rectangle(30, 10).rotated(0.3).translated(1e3, -2e3),
    ],
    ids=lambda shape: shape.kind,
)
def test_circles_touch_the_boundary_and_lie_within_it(outline):
    circles = inscribed_circles(outline)
    polygon = outline.polygon(1e-7 * outline.size)
    some = np.arange(0, len(circles), 11)
    centres = shapely.points(circles.centre[some])
    assert np.all(shapely.contains(polygon, centres))
    off = shapely.distance(centres, polygon.boundary) - circles.radius[some]
    assert np.abs(off).max() < 2e-7 * outline.size
    for point in (circles.foot, circles.touch):
        assert np.hypot(*(point - circles.centre).T) == pytest.approx(circles.radius, rel=1e-7)
        assert shapely.distance(shapely.points(point[some]), polygon.boundary).max() < 2e-7 * outline.size
    # every loop is one closed round
    for loop in np.unique(circles.loop):
        assert set(circles.loop[circles.following[circles.loop == loop]]) == {loop}
    assert len(np.unique(circles.following)) == len(circles)


def test_a_round_bar_has_no_medial_axis():
    assert len(inscribed_circles(shapes.round_bar(20))) == 0


# --- trade shapes: the same plates as the shape states ---------------------------------------------------

TRADE = [
    shapes.angle(80, 60, 8),
    shapes.angle(80, 60, 8, root_radius=8, toe_radius=4),
    shapes.angle(25, 25, 10, root_radius=3),
    shapes.tee(100, 80, 10, 7),
    shapes.tee(100, 80, 10, 7, 8),
    shapes.channel(100, 50, 8, 6),
    shapes.channel(100, 50, 8, 6, 8, toe_radius=4),
    shapes.zee(100, 50, 6, 6),
    shapes.zee(100, 50, 6, 6, 6),
    shapes.wide_flange(200, 100, 10, 6),
    shapes.wide_flange(200, 100, 10, 6, 12),
    shapes.plate_girder(200, 6, 8, top_width=80, top_thickness=10, bottom_width=120, bottom_thickness=14),
    shapes.cross(60, 50, 6, 4),
    shapes.rectangle(100, 10),
    shapes.rectangle(10, 12),
    shapes.rectangle(20, 20),
]


@pytest.mark.parametrize("idealisation", DERIVED)
@pytest.mark.parametrize("shape", TRADE, ids=repr)
def test_trade_shapes_have_the_plates_that_they_state(shape, idealisation):
    stated = shape.plates(idealisation)
    derived = derive_plates(shape, idealisation)
    assert sizes(derived) == pytest.approx(sizes(stated), rel=1e-6)
    hand = plate_sum(derived)
    assert hand.torsion_constant_twist == pytest.approx(plate_sum(stated).torsion_constant_twist, rel=1e-6)
    assert hand.idealisation == idealisation
    assert derived.covered > 0.93
    assert derived.closed is derived.cells is None


@settings(max_examples=25, deadline=None)
@given(st.floats(0.0, 6.3), st.floats(-1e3, 1e3), st.floats(1e-3, 1e3), st.booleans())
def test_moving_turning_scaling_and_mirroring_change_nothing(angle, shift, scale, mirror):
    shape = shapes.channel(100, 50, 8, 6, 8)
    moved = shape.rotated(angle).translated(shift, -shift).scaled(scale)
    moved = moved.mirrored(angle / 2.0) if mirror else moved
    assert sizes(derive_plates(moved)) == pytest.approx(scale * sizes(derive_plates(shape)), rel=1e-5)


@pytest.mark.parametrize("thickness", [1.0, 1e-2])
def test_plates_may_be_ten_thousand_times_as_wide_as_thick(thickness):
    derived = derive_plates(shapes.angle(100, 100, thickness))
    assert sizes(derived) == pytest.approx(sizes(shapes.angle(100, 100, thickness).plates()), rel=1e-6)


def test_tapered_flanges_stay_one_plate_of_their_mean_thickness():
    shape = shapes.wide_flange(200, 100, 10, 6, 12, flange_slope=0.14)
    derived = derive_plates(shape)
    assert sizes(derived) == pytest.approx(sizes(shape.plates()), rel=0.02)
    assert sum("tapers from 6.97" in note for note in derived.notes) == 2
    overlap = derive_plates(shapes.channel(100, 50, 8.5, 6, flange_slope=0.08), "full_depth")
    # measured at mid-width, the flange's mean thickness is the stated one
    assert overlap.plates[1].thickness == pytest.approx(8.5, rel=0.01)


def test_joints_are_named():
    tee, angle = derive_plates(shapes.tee(100, 80, 10, 7, 8)), derive_plates(shapes.angle(80, 60, 8, root_radius=8))
    (joint,) = tee.joints
    assert (joint.kind, tee[joint.plate].thickness, tee[joint.other].thickness) == ("through", 7.0, 10.0)
    assert joint.at == pytest.approx((0.0, 35.0), abs=1e-6)
    (corner,) = angle.joints
    assert corner.kind == "corner"
    assert corner.at == pytest.approx((4.0, 4.0))
    assert "cross" in derive_plates(shapes.cross(60, 50, 6, 4)).notes[0]


# --- outlines that nobody typed plates for ---------------------------------------------------------------


def test_a_bent_zee_is_one_strip_of_its_developed_width():
    p = BY_NAME["zee_coldformed"]["parameters"]
    derived = derive_plates(outline_of("zee_coldformed"))
    (strip,) = derived
    # two flanges and the web between bends of mean radius (r_i + r_o) / 2
    flat = 2.0 * (p["b"] - p["r_o"]) + p["h"] - 2.0 * p["r_o"]
    assert strip.width == pytest.approx(flat + math.pi * 0.5 * (p["r_i"] + p["r_o"]), rel=1e-5)
    assert strip.thickness == pytest.approx(4.0)
    assert "developed width" in derived.notes[0]
    true = BY_NAME["zee_coldformed"]["quantities"]["J"]["value"]
    assert plate_sum(derived).torsion_constant_twist == pytest.approx(true, rel=0.002)


def test_a_slit_tube_is_one_strip():
    (strip,) = derive_plates(outline_of("slit_tube_40_36"))
    assert strip.width == pytest.approx(2.0 * math.pi * 38.0 - 2.0, rel=1e-3)  # the slit is 2 wide
    true = BY_NAME["slit_tube_40_36"]["quantities"]["J"]["value"]
    assert plate_sum([strip]).torsion_constant_twist == pytest.approx(true, rel=0.002)


def test_a_lipped_channel_has_five_plates():
    lower = [(50, 0), (50, 15), (48, 15), (48, 2), (2, 2)]
    outline = Outline([(0, 0), *lower, *((x, 100 - y) for x, y in reversed(lower)), (0, 100)])
    derived = derive_plates(outline)
    assert sizes(derived) == pytest.approx(np.array([[14, 2], [14, 2], [48, 2], [48, 2], [98, 2]]))
    assert [joint.kind for joint in derived.joints] == ["corner"] * 4


def test_three_arms_meet_in_the_middle():
    arm = shapely.box(0, -2, 50, 2)
    arms = [shapely.affinity.rotate(arm, angle, origin=(0, 0)) for angle in (90, 210, 330)]
    derived = derive_plates(Outline.from_polygon(shapely.union_all(arms)))
    assert sizes(derived) == pytest.approx(np.full((3, 2), [50.0, 4.0]))


def test_chords_and_noise_do_not_break_plates_up():
    shape = shapes.angle(80, 80, 8, root_radius=8)
    coarse = Outline.from_polygon(shape.polygon(0.05))
    assert sizes(derive_plates(coarse)) == pytest.approx(sizes(shape.plates()), rel=1e-6)
    ring = np.asarray(shapely.segmentize(shape.polygon(0.05), 1.0).exterior.coords)[:-1]
    for seed in range(2):
        noise = np.random.default_rng(seed).normal(0.0, 0.02, ring.shape)
        assert sizes(derive_plates(Outline(ring + noise))) == pytest.approx(sizes(shape.plates()), rel=5e-3)


def test_a_step_in_thickness_makes_two_plates():
    derived = derive_plates(Outline([(0, 0), (100, 0), (100, 5), (50, 5), (50, 10), (0, 10)]))
    assert sizes(derived) == pytest.approx(np.array([[50.0, 10.0], [50.0, 5.0]]), rel=0.06)
    assert derived.joints[0].kind == "step"


def test_what_is_no_plate_is_reported_with_its_share_and_place():
    bulb = shapely.box(0, 0, 80, 4).union(shapely.Point(84, 2).buffer(9))
    outline = Outline.from_polygon(bulb)
    derived = derive_plates(outline)
    (plate,) = derived
    assert (plate.width, plate.thickness) == pytest.approx((75.2, 4.0), rel=1e-3)
    (region,) = derived.unplated
    assert region.share == pytest.approx(1.0 - 4.0 * plate.width / outline.area, abs=1e-3)
    assert bulb.contains(shapely.Point(region.at))
    assert region.at[0] > 75.0
    assert derived.covered == pytest.approx(1.0 - region.share, abs=1e-3)
    assert any("ends at (75.23, 2) in a region that is no plate" in note for note in derived.notes)
    assert any("cover only 54.3 %" in note for note in derived.notes)
    assert "unplated: 45.7 %" in str(derived)


@pytest.mark.parametrize(
    "outline",
    [shapes.round_bar(20), shapes.regular(6, 30), shapes.ellipse(60, 50), shapes.keyed_shaft(50, 14, 5.5)],
    ids=lambda shape: shape.kind,
)
def test_stubby_solids_have_no_plates_and_say_so(outline):
    derived = derive_plates(outline)
    assert len(derived) == 0
    assert derived.covered == pytest.approx(0.0, abs=1e-9)
    assert "the sum of thin plates does not apply" in derived.notes[0]
    with pytest.raises(InputError, match="plates is empty"):
        plate_sum(derived)


def test_a_stretch_too_short_for_a_plate_is_left_out_with_a_note():
    lens = Outline([(-20, 0), (20, 0)], [0.25, 0.25])  # two arcs, 10 thick in the middle
    derived = derive_plates(lens)
    assert len(derived) == 0
    assert "a stretch at (0, 0) was left out" in derived.notes[0]
    assert "thick, filling" in derived.notes[0]


def test_fins_on_a_box_are_the_plates_and_the_box_a_cell():
    shape = shapes.finned_box(60, 40, 3, 20, 4, root_radius=2)
    derived = derive_plates(shape)
    assert sizes(derived) == pytest.approx(np.array([[21.5, 4.0], [21.5, 4.0]]))
    assert {joint.other for joint in derived.joints} == {-1}
    assert derived.cells.fins == derived.plates
    assert "closed cells" in derived.notes[0]
    assert derived.covered > 0.98
    assert "closed cells: 1, with 4 walls" in str(derived)
    whole, without = cell_sum(derived.cells), cell_sum(derived.without(0).cells)
    fin = plate_sum([derived[0]]).torsion_constant_twist
    assert whole.torsion_constant - without.torsion_constant == pytest.approx(fin)


# --- accept, edit, reject -------------------------------------------------------------------------------


def test_plates_are_edited_in_copies_that_keep_count():
    derived = derive_plates(shapes.channel(100, 50, 8, 6, 8))
    less = derived.without(0)
    assert (len(derived), len(less)) == (3, 2)
    assert less.covered < derived.covered - 0.3
    assert less.joints == ()
    assert less.unplated[0].share > 0.3
    assert "taken out by hand" in less.notes[-1]
    more = less.with_plate(Plate(92.0, 6.0, "web"), [(-22.0, -46.0), (-22.0, 46.0)])
    assert more.covered == pytest.approx(derived.covered)
    assert "plate 2 (web) was given by hand" in plate_sum(more).notes[-1]
    named = more.changed(0, name="flange")
    assert named.notes == more.notes
    thicker = named.changed(0, thickness=9.0)
    assert "flange) was changed by hand, from 47 x 8" in thicker.notes[-1]
    assert plate_sum(thicker).torsion_constant_twist > plate_sum(more).torsion_constant_twist
    assert len(derived.with_plate(Plate(10.0, 2.0)).rectangles()) == 4


@pytest.mark.parametrize(
    ("edit", "message"),
    [
        (lambda d: d.without(3), "no plate 3: they are numbered 0 to 2"),
        (lambda d: d.without(True), "whole number"),
        (lambda d: d.with_plate((1, 2)), r"must be a Plate\(width, thickness\)"),
        (lambda d: d.with_plate(Plate(1, 1), [(0, 0), (0, 0)]), "two different points"),
        (lambda d: d.changed(0, width=-1.0), "width must be greater than 0"),
        (lambda _: derive_plates("outline"), "outline must be an Outline, got str"),
        (lambda d: derive_plates(d.outline, "developed"), "idealisation must be one of"),
        (lambda d: derive_plates(d.outline, taper=0.0), "taper must be greater than 0"),
        (lambda d: derive_plates(d.outline, taper=1.0), "taper must be below 1"),
    ],
)
def test_wrong_edits_are_refused(edit, message):
    derived = derive_plates(shapes.channel(100, 50, 8, 6, 8))
    with pytest.raises(InputError, match=message):
        edit(derived)


# --- drawn over the outline -------------------------------------------------------------------------------


@pytest.fixture
def figure():
    matplotlib = pytest.importorskip("matplotlib")
    matplotlib.use("Agg")
    import matplotlib.pyplot as plt

    yield plt.figure()
    plt.close("all")


def test_plates_are_drawn_dashed_and_labelled(figure):
    from torsionfe.output.plate_plot import plot_plates

    shape = shapes.channel(100, 50, 8, 6, 8)
    drawing = plot_plates(shape, derive_plates(shape), figure.add_subplot(), unit="mm")
    assert sorted(label.get_text() for label in drawing.labels) == ["47 × 8", "47 × 8", "92 × 6"]
    assert all(patch.get_linestyle() == "--" for patch in drawing.rectangles)
    assert len(drawing.rectangles) == len(drawing.centre_lines) == 3
    assert drawing.axes.get_xlabel() == "x [mm]"
    assert drawing.axes.get_aspect() == 1.0
    assert drawing.unplaced == ()
    extent = drawing.rectangles[0].get_path().get_extents()
    assert (extent.width, extent.height) == pytest.approx((6.0, 92.0))
    figure.canvas.draw()


def test_stated_plates_are_drawn_where_they_are_found(figure):
    from torsionfe.output.plate_plot import plot_plates

    figure.set_size_inches(9.0, 12.0)
    shape = shapes.wide_flange(200, 100, 10, 6, 12)
    drawing = plot_plates(shape, shape.plates("web_through"), figure.add_subplot())
    assert drawing.unplaced == ()
    tops = [label for label in drawing.labels if "top" in label.get_text()]
    assert len(tops) == 2
    assert all(label.get_position()[1] > 90.0 for label in tops)
    stranger = plot_plates(shape, [Plate(33.0, 5.0, "rib")], figure.add_subplot())
    assert stranger.unplaced == (0,)
    assert "no place found for plate 0 (rib)" in stranger.axes.get_title(loc="left")


@pytest.mark.parametrize("idealisation", ["centreline", "straight_through", "web_through"])
def test_equal_plates_that_cross_keep_their_names(figure, idealisation):
    from torsionfe.output.plate_plot import plot_plates

    figure.set_size_inches(7.0, 7.0)
    cross = shapes.cross(80, 80, 8)
    drawing = plot_plates(cross, cross.plates(idealisation), figure.add_subplot())
    assert drawing.unplaced == ()
    for line, label in zip(drawing.centre_lines, drawing.labels, strict=True):
        wide, high = np.ptp(line.get_xydata(), axis=0)
        assert (wide > high) == ("level" in label.get_text()), label.get_text()
        assert (label.get_rotation() == 0.0) == (wide > high)
        middle = line.get_xydata().mean(axis=0)
        for word, side in (("top", middle[1]), ("bottom", -middle[1]), ("right", middle[0]), ("left", -middle[0])):
            assert word not in label.get_text().split() or side > 10.0


def test_labels_of_plates_keep_clear_of_each_other_in_small_figures(figure):
    from torsionfe.output.plate_plot import plot_plates

    figure.set_size_inches(2.6, 2.4)
    shape = shapes.wide_flange(100, 100, 10, 6, root_radius=8)
    drawing = plot_plates(shape, shape.plates("web_through"), figure.add_subplot(), unit="mm")
    figure.canvas.draw()
    boxes = [label.get_window_extent() for label in drawing.labels]
    assert len(boxes) == 5
    assert not any(a.overlaps(b) for k, a in enumerate(boxes) for b in boxes[:k])
    assert any("flange" not in label.get_text() for label in drawing.labels)  # where no room is for the name
    assert "\n" in drawing.axes.get_title(loc="left")


def test_cells_and_unplated_regions_are_drawn_too(figure):
    from torsionfe.output.plate_plot import plot_plates

    box = shapes.box(100, 60, 5, 7.5, 5)
    drawing = plot_plates(box, derive_plates(box), figure.add_subplot())
    assert len(drawing.centre_lines) == 1
    assert drawing.labels == ()
    figure.canvas.draw()
    pixels = np.asarray(figure.canvas.buffer_rgba())[::-1]
    wall, void = (
        pixels[tuple(drawing.axes.transData.transform(point).astype(int)[::-1])][:3]
        for point in ((48.8, 9.0), (9.0, 9.0))
    )
    assert tuple(void) == (255, 255, 255)
    assert all(220 < shade < 235 for shade in wall)  # pale grey
    angle = shapes.angle(25, 25, 10, root_radius=3)
    assert len(plot_plates(angle, derive_plates(angle), figure.add_subplot()).regions) == 1
    with pytest.raises(InputError, match="there is nothing to draw"):
        plot_plates(angle, [])
    with pytest.raises(InputError, match="must be a sequence of Plate"):
        plot_plates(angle, [1.0])
