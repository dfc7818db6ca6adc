"""Drawings in DXF, made by ezdxf in every form of entity, whole and broken.

The checks are the outlines that were drawn. Entities mean what the published DXF reference says.
"""

import math

import ezdxf
import numpy as np
import pytest
from drawn import angle, assert_same, assert_same_shape, circle, faceted, rectangle

from torsionfe.errors import InputError, OutlineWarning, ReadError, UnitError
from torsionfe.outline.files import read_outline, read_outline_report
from torsionfe.outline.outline import Outline

PLATE = rectangle(60.0, 40.0)
ROUNDED = rectangle(60.0, 40.0).filleted(10.0, at=[2])


@pytest.fixture
def drawing(tmp_path):
    """A function that saves a drawing and returns its path."""

    def save(document, name="drawing.dxf"):
        path = tmp_path / name
        document.saveas(path)
        return path

    return save


def new(unit=None):
    document = ezdxf.new("R2010")
    document.header["$INSUNITS"] = {None: 0, "in": 1, "mm": 4, "m": 6, "lightyear": 19}[unit]
    return document, document.modelspace()


def add_plate(space, **attributes):
    for p, q in zip(PLATE.vertices, np.roll(PLATE.vertices, -1, axis=0), strict=True):
        space.add_line(p, q, dxfattribs=attributes)


def add_loop(space, outline, **attributes):
    rows = np.column_stack([outline.vertices, outline.bulges]).tolist()
    return space.add_lwpolyline(rows, format="xyb", close=True, dxfattribs=attributes)


# --- every kind of entity ------------------------------------------------------------------------------


def test_lines(drawing):
    document, space = new()
    add_plate(space)
    assert_same(PLATE, read_outline(drawing(document)), rel=0)


def test_lines_and_an_arc_in_any_order_and_direction(drawing):
    document, space = new()
    space.add_line((0, 40), (0, 0))
    space.add_arc((50, 30), 10, 0, 90)
    space.add_line((60, 0), (60, 30))
    space.add_line((60, 0), (0, 0))
    space.add_line((0, 40), (50, 40))
    assert_same_shape(ROUNDED, read_outline(drawing(document)), rel=1e-14)


@pytest.mark.parametrize("version", ["R12", "R2000", "R2018"])
def test_polylines_with_bulges(drawing, version):
    outline = Outline(angle().filleted(8.0).vertices, angle().filleted(8.0).bulges, [circle(4, 4, 1.5)])
    document = ezdxf.new(version)
    for loop in (outline, *outline.voids):
        rows = np.column_stack([loop.vertices, loop.bulges]).tolist()
        document.modelspace().add_polyline2d(rows, format="xyb", close=True)
    assert_same(outline, read_outline(drawing(document)), rel=0)


def test_light_polylines_with_bulges_keep_their_first_vertex(drawing):
    outline = angle().filleted(8.0).filleted(4.0, at=[2])
    document, space = new()
    add_loop(space, outline)
    assert read_outline(drawing(document)) == outline


def test_a_polyline_that_repeats_its_first_point_is_closed(drawing):
    document, space = new()
    space.add_lwpolyline([*PLATE.vertices.tolist(), (0.0, 0.0)])
    space.add_polyline2d([(5, 5), (9, 5), (9, 9), (5, 5)])
    result = read_outline_report(drawing(document))
    assert result.notes == ()
    assert len(result.outline.vertices) == 4
    assert len(result.outline.voids[0].vertices) == 3


@pytest.mark.parametrize("full", ["circle", "arc", "ellipse"])
def test_full_circles(drawing, full):
    document, space = new()
    if full == "circle":
        space.add_circle((3, 4), 10)
    elif full == "arc":
        space.add_arc((3, 4), 10, 30, 390)
    else:
        space.add_ellipse((3, 4), (6, 8), 1.0)
    outline = read_outline(drawing(document))
    assert outline.area == pytest.approx(100 * np.pi, rel=1e-12)
    assert outline.centroid == pytest.approx((3, 4))
    assert set(np.abs(outline.bulges).round(9)) <= {1.0, round(math.tan(math.pi / 8), 9)}


def test_an_arc_of_more_than_half_a_circle(drawing):
    document, space = new()
    space.add_arc((0, 0), 10, 40, 320)
    space.add_line((10 * math.cos(math.radians(40)), 10 * math.sin(math.radians(40))), (
        10 * math.cos(math.radians(40)), -10 * math.sin(math.radians(40))))
    a = math.radians(40)
    outline = read_outline(drawing(document))
    assert outline.area == pytest.approx(100 * (np.pi - a + math.sin(a) * math.cos(a)), rel=1e-13)
    assert np.count_nonzero(outline.bulges) == 1


@pytest.mark.parametrize("tolerance", [None, 1e-2, 1e-4])
def test_an_ellipse_as_arcs_within_a_tolerance(drawing, tolerance):
    document, space = new()
    space.add_ellipse((5, -2), (0, 30), 0.4)
    outline = read_outline(drawing(document), curve_tolerance=tolerance)
    allowed = tolerance or 1e-5 * 60
    n = len(outline.edges)
    points = outline.edges.points(np.arange(n).repeat(5), np.tile(np.linspace(0, 0.8, 5), n))
    x, y = (points - [5, -2]).T / np.array([[12.0], [30.0]])
    assert np.abs(np.hypot(x, y) - 1.0).max() < allowed / 12.0
    assert outline.area == pytest.approx(np.pi * 360, abs=allowed * outline.perimeter)
    # tangent arcs: no corners
    assert np.abs(outline.edges.interior_angle - np.pi).max() < 1e-9


def test_part_of_an_ellipse_chained_with_a_line(drawing):
    document, space = new()
    space.add_ellipse((0, 0), (20, 0), 0.5, start_param=0, end_param=math.pi)
    space.add_line((-20, 0), (20, 0))
    outline = read_outline(drawing(document))
    assert outline.area == pytest.approx(0.5 * np.pi * 200, rel=1e-5)
    assert np.count_nonzero(outline.bulges == 0.0) == 1


def test_splines_by_control_points_and_by_fit_points(drawing):
    document, space = new()
    space.add_open_spline([(0, 0, 0), (0, 20, 0), (30, 20, 0), (30, 0, 0)])
    space.add_line((0, 0), (30, 0))
    outline = read_outline(drawing(document), curve_tolerance=1e-6)
    # one cubic: y = 60 t (1 - t), dx = 180 t (1 - t) dt, so the area is 10800 B(3, 3) = 360
    assert outline.area == pytest.approx(360.0, rel=1e-6)
    assert np.abs(np.degrees(outline.edges.interior_angle) - 180).max() == pytest.approx(90.0)

    document, space = new()
    turn = np.linspace(0, np.pi, 9)
    space.add_spline([(10 * math.cos(t), 10 * math.sin(t), 0) for t in turn])
    space.add_line((-10, 0), (10, 0))
    assert read_outline(drawing(document)).area == pytest.approx(50 * np.pi, rel=2e-3)


def test_a_rational_spline_is_the_circle_that_it_is(drawing):
    # quadratic with weights 1, cos 45: the four quarters of a circle, with corners allowed at the double knots
    w = math.sqrt(0.5)
    points = [(10, 0), (10, 10), (0, 10), (-10, 10), (-10, 0), (-10, -10), (0, -10), (10, -10), (10, 0)]
    document, space = new()
    spline = space.add_spline(degree=2)
    spline.control_points = [(*p, 0) for p in points]
    spline.knots = [0, 0, 0, 1, 1, 2, 2, 3, 3, 4, 4, 4]
    spline.weights = [1, w, 1, w, 1, w, 1, w, 1]
    outline = read_outline(drawing(document))
    assert outline.area == pytest.approx(100 * np.pi, rel=1e-9)
    assert len(outline.edges) == 4


def test_a_spline_with_corners_keeps_them(drawing):
    document, space = new()
    spline = space.add_spline(degree=1)
    spline.control_points = [(0, 0, 0), (30, 0, 0), (30, 10, 0), (0, 10, 0), (0, 0, 0)]
    spline.knots = [0, 0, 1, 2, 3, 4, 4]
    assert_same_shape(rectangle(30, 10), read_outline(drawing(document)), rel=0)


def test_everything_chained_into_one_boundary(drawing):
    document, space = new()
    space.add_line((0, 0), (40, 0))
    space.add_lwpolyline([(40, 0, 0.3), (40, 20, 0)], format="xyb")
    space.add_polyline2d([(40, 20, 0), (30, 30, 0)], format="xyb")
    space.add_ellipse((20, 30), (10, 0), 0.5, start_param=0, end_param=math.pi)
    space.add_open_spline([(10, 30, 0), (5, 30, 0), (0, 25, 0), (0, 20, 0)])
    space.add_arc((-10, 10), math.hypot(10, 10), -45, 45)
    outline = read_outline(drawing(document))
    assert outline.bounds[0] == pytest.approx(0.0, abs=1e-9)
    assert outline.bounds[3] == pytest.approx(35.0, rel=1e-5)


# --- loops, blocks, layers, units ----------------------------------------------------------------------


def test_nested_loops_are_outer_loop_and_voids_whatever_their_order(drawing):
    document, space = new()
    space.add_circle((45, 20), 5)
    add_loop(space, rectangle(10, 10, 10, 15))
    add_plate(space)
    space.add_circle((30, 8), 2)
    outline = read_outline(drawing(document))
    assert outline.area == pytest.approx(2400 - 100 - 29 * np.pi)
    assert len(outline.voids) == 3


def test_blocks_are_taken_apart(drawing):
    document, space = new()
    add_plate(space)
    hole = document.blocks.new("HOLE")
    hole.add_circle((0, 0), 1.0)
    pair = document.blocks.new("PAIR")
    pair.add_blockref("HOLE", (-5, 0))
    pair.add_blockref("HOLE", (5, 0), dxfattribs={"xscale": 2, "yscale": 2})
    space.add_blockref("PAIR", (20, 20), dxfattribs={"rotation": 90})
    space.add_blockref("PAIR", (45, 20), dxfattribs={"xscale": -1})
    outline = read_outline(drawing(document))
    assert outline.area == pytest.approx(2400 - 10 * np.pi, rel=1e-12)
    centres = sorted(tuple(np.round(void.centroid, 9)) for void in outline.voids)
    assert centres == [(20.0, 15.0), (20.0, 25.0), (40.0, 20.0), (50.0, 20.0)]
    assert sorted(round(void.area / np.pi, 9) for void in outline.voids) == [1, 1, 4, 4]


def test_a_block_in_rows_and_columns_and_one_that_is_squeezed(drawing):
    document, space = new()
    add_plate(space)
    document.blocks.new("HOLE").add_circle((0, 0), 2)
    space.add_blockref("HOLE", (10, 10), dxfattribs={
        "row_count": 2, "column_count": 3, "row_spacing": 20, "column_spacing": 10})
    space.add_blockref("HOLE", (50, 20), dxfattribs={"yscale": 3})
    outline = read_outline(drawing(document))
    assert len(outline.voids) == 7
    assert outline.area == pytest.approx(2400 - 6 * 4 * np.pi - 12 * np.pi, rel=1e-6)


def test_what_is_on_layer_0_of_a_block_is_on_the_layer_of_its_insertion(drawing):
    document, space = new()
    add_plate(space, layer="A")
    document.blocks.new("HOLE").add_circle((0, 0), 2)
    space.add_blockref("HOLE", (20, 20), dxfattribs={"layer": "A"})
    space.add_blockref("HOLE", (40, 20), dxfattribs={"layer": "B"})
    assert len(read_outline(drawing(document), layers="A").voids) == 1
    result = read_outline_report(drawing(document))
    assert len(result.outline.voids) == 2
    assert result.notes == ("read from the layers 'A' (5), 'B' (1)",)


def test_mirrored_planes(drawing):
    # seen from below (extrusion 0, 0, -1): x is mirrored, and so is the sense of arcs
    document, space = new()
    down = {"extrusion": (0, 0, -1)}
    add_loop(space, ROUNDED, **down)
    space.add_circle((20, 20), 5, dxfattribs=down)
    space.add_arc((40, 20), 5, 0, 180, dxfattribs=down)
    space.add_line((-35, 20), (-45, 20))
    result = read_outline(drawing(document))
    plate, half = ROUNDED.mirrored(), Outline([(-35, 20), (-45, 20)], [1, 0])
    expected = Outline(plate.vertices, plate.bulges, [circle(-20, 20, 5), half])
    assert_same_shape(expected, result, rel=1e-14)


def test_layers(drawing):
    document, space = new()
    add_plate(space, layer="Section")
    space.add_line((0, 0), (70, 70), dxfattribs={"layer": "Axes"})
    path = drawing(document)
    assert_same(PLATE, read_outline(path, layers="section"))
    assert_same(PLATE, read_outline(path, layers=["SECTION"]))
    with pytest.raises(ReadError, match=r"3 edges meet at \(0, 0\)"):
        read_outline(path)
    with pytest.raises(ReadError, match=r"holds nothing: the drawing has 'Axes' \(1\), 'Section' \(4\); did you mean"):
        read_outline(path, layers=["Section", "Sections"])
    with pytest.raises(InputError, match="layers must be"):
        read_outline(path, layers=[])


def test_hidden_layers_and_hidden_lines_are_left_out_and_told(drawing):
    document, space = new()
    for name in ("off", "frozen"):
        layer = document.layers.add(name)
        getattr(layer, {"off": "off", "frozen": "freeze"}[name])()
        space.add_line((0, 0), (70, 70), dxfattribs={"layer": name})
    space.add_line((0, 0), (70, 70), dxfattribs={"invisible": 1})
    add_plate(space)
    space.add_text("A - A")
    space.add_point((1, 1))
    result = read_outline_report(drawing(document))
    assert_same(PLATE, result.outline)
    assert "left out 2 entities of hidden layers ('frozen' (1), 'off' (1))" in result.notes
    assert "left out what is no boundary: 'POINT' (1), 'TEXT' (1), 'invisible LINE' (1)" in result.notes
    # asked for by name, a hidden layer is read
    with pytest.raises(ReadError, match="open"):
        read_outline(drawing(document), layers="off")


@pytest.mark.parametrize(("unit", "factor"), [("mm", 1.0), ("in", 25.4), ("m", 1000.0)])
def test_the_header_says_the_unit(drawing, unit, factor):
    document, space = new(unit)
    add_plate(space)
    path = drawing(document)
    result = read_outline_report(path, unit="mm")
    assert (result.file_unit, result.unit) == (unit, "mm")
    assert_same(PLATE.scaled(factor), result.outline)
    as_it_is = read_outline_report(path)
    assert (as_it_is.unit, as_it_is.outline) == (unit, PLATE)


def test_units_that_are_missing_unknown_or_contradict_are_asked_for(drawing):
    document, space = new()
    add_plate(space)
    path = drawing(document)
    assert read_outline_report(path).unit is None
    with pytest.raises(UnitError, match="states no unit, so it cannot be turned into 'mm': pass file_unit="):
        read_outline(path, unit="mm")
    assert_same(PLATE.scaled(25.4), read_outline(path, unit="mm", file_unit="inch"))
    with pytest.raises(UnitError, match="no unit of length"):
        read_outline(path, unit="furlong")

    document.header["$INSUNITS"] = 1
    path = drawing(document)
    with pytest.raises(UnitError, match="says that it is in 'in', file_unit says 'mm'"):
        read_outline(path, file_unit="mm")
    assert read_outline_report(path, file_unit="mm", ignore_file_unit=True).unit == "mm"

    document.header["$INSUNITS"] = 19
    with pytest.raises(UnitError, match=r"INSUNITS = 19' is no unit of length"):
        read_outline(drawing(document))
    assert read_outline_report(drawing(document), file_unit="mm", ignore_file_unit=True).unit == "mm"


# --- chords --------------------------------------------------------------------------------------------


def test_chords_become_arcs_and_that_is_told(drawing):
    document, space = new()
    add_loop(space, faceted(angle().filleted(8.0), 8, decimals=4))
    result = read_outline_report(drawing(document))
    assert result.arcs_restored == 1
    assert result.restored.arcs[0].radius == pytest.approx(8.0, abs=1e-3)
    assert "arcs restored from chords  1" in str(result)
    as_drawn = read_outline_report(drawing(document), restore_arcs=False)
    assert as_drawn.restored is None
    assert not as_drawn.outline.bulges.any()


def test_chords_on_no_circle_warn_of_the_hot_spot(drawing):
    document, space = new()
    add_plate(space)
    turn = 2 * np.pi * np.arange(40) / 40
    space.add_lwpolyline(np.stack([30 + 9 * np.cos(turn), 20 + 5 * np.sin(turn)], axis=1), close=True)
    with pytest.warns(OutlineWarning, match=r"drawing.dxf: 40 chords near \(21, 20\).*the peak stress there reads"):
        read_outline(drawing(document))


# --- what people draw wrong ----------------------------------------------------------------------------


def test_gaps_below_the_tolerance_are_closed_and_told(drawing):
    document, space = new()
    space.add_line((0, 0), (60, 0))
    space.add_line((60, 0.0004), (60, 40))
    space.add_line((60, 40), (0, 40))
    space.add_line((0.0002, 40), (0, 0))
    result = read_outline_report(drawing(document))
    assert result.notes == ("closed 2 gaps, the widest 0.0004 at (60, 0.0002)",)
    assert_same_shape(PLATE, result.outline, rel=1e-5)


def test_gaps_above_the_tolerance_are_errors_that_name_them(drawing):
    document, space = new()
    space.add_line((0, 0), (60, 0))
    space.add_line((60, 0.5), (60, 40))
    space.add_line((60, 40), (0, 40))
    space.add_line((0, 40), (0, 0))
    path = drawing(document)
    message = r"open at \(60, 0\).* \(60, 0.5\), a gap of 0.5, above the tolerance of 0.0006"
    with pytest.raises(ReadError, match=message) as caught:
        read_outline(path)
    assert caught.value.at == (60.0, 0.0)
    assert len(read_outline(path, tolerance=0.6).vertices) == 4


def test_a_fillet_chained_across_gaps_stays_an_arc(drawing):
    document, space = new()
    space.add_line((0, 0), (60, 0))
    space.add_line((60, 0), (60, 30.0001))
    space.add_arc((50, 30), 10, 0, 90)
    space.add_line((50.0001, 40.0001), (0, 40))
    space.add_line((0, 40), (0, 0))
    assert_same_shape(ROUNDED, read_outline(drawing(document)), rel=3e-6)


def test_duplicates_are_dropped_and_told(drawing):
    document, space = new()
    add_loop(space, ROUNDED)
    add_loop(space, ROUNDED)
    space.add_line((60, 0), (0, 0))
    space.add_arc((50, 30), 10, 0, 90)
    space.add_circle((20, 20), 3)
    space.add_circle((20, 20), 3)
    result = read_outline_report(drawing(document))
    assert result.notes == ("dropped 9 edges that lie on another one, the first at (0, 0)",)
    assert_same(Outline(ROUNDED.vertices, ROUNDED.bulges, [circle(20, 20, 3)]), result.outline)


def test_specks_are_dropped_and_told(drawing):
    document, space = new()
    space.add_line((0, 0), (0, 1e-6))
    space.add_line((0, 1e-6), (60, 0))
    space.add_line((60, 0), (60, 40))
    space.add_line((60, 40), (0, 40))
    space.add_line((0, 40), (0, 0))
    space.add_line((7, 7), (7, 7))
    result = read_outline_report(drawing(document))
    assert result.notes[0].startswith("dropped 1 edges shorter than")
    assert_same_shape(PLATE, result.outline, rel=1e-6)


def test_open_loops_and_lines_that_are_no_boundary(drawing):
    document, space = new()
    add_plate(space)
    space.add_line((10, 10), (20, 10))
    with pytest.raises(ReadError, match=r"open at \(10, 10\).*a gap of 10.*2 open ends") as caught:
        read_outline(drawing(document))
    assert caught.value.at == (10.0, 10.0)
    document, space = new()
    add_plate(space)
    space.add_line((60, 40), (80, 80))
    with pytest.raises(ReadError, match=r"3 edges meet at \(60, 40\), where a boundary has two") as caught:
        read_outline(drawing(document))
    assert caught.value.at == (60.0, 40.0)


@pytest.mark.parametrize(
    ("loops", "message", "at"),
    [
        ([Outline([(0, 0), (9, 0), (9, 9), (0, 9)]), rectangle(9, 9, 20, 0)], "2 outer loops", (20, 0)),
        ([PLATE, rectangle(30, 30, 5, 5), rectangle(10, 10, 10, 10)], "inside the void at", (10, 10)),
        ([PLATE, rectangle(30, 30, 50, 5)], "two loops cross or touch", (60, 35)),
        ([PLATE, rectangle(10, 10, 50, 5)], "two loops cross or touch", (60, 15)),
    ],
)
def test_loops_that_are_no_cross_section(drawing, loops, message, at):
    document, space = new()
    for loop in loops:
        add_loop(space, loop)
    with pytest.raises(ReadError, match=message) as caught:
        read_outline(drawing(document))
    assert caught.value.at[0] == at[0]


def test_a_loop_that_crosses_itself(drawing):
    document, space = new()
    space.add_lwpolyline([(0, 0), (10, 10), (10, 0), (0, 10)], close=True)
    with pytest.raises(ReadError, match=r"drawing.dxf: the loop crosses itself at \(5, 5\)") as caught:
        read_outline(drawing(document))
    assert caught.value.at == (5.0, 5.0)


# --- space ---------------------------------------------------------------------------------------------


def test_a_drawing_at_a_height_is_flattened_and_told(drawing):
    document, space = new()
    for p, q in zip(PLATE.vertices, np.roll(PLATE.vertices, -1, axis=0), strict=True):
        space.add_line((*p, 7.0), (*q, 7.0))
    circle_ = space.add_circle((20, 20, 7), 4)
    assert circle_.dxf.center.z == 7
    result = read_outline_report(drawing(document))
    assert result.notes == ("flattened from z = 7",)
    assert result.outline.area == pytest.approx(2400 - 16 * np.pi)


def test_a_drawing_in_space_is_an_error(drawing):
    document, space = new()
    add_plate(space)
    space.add_circle((20, 20, 7), 4)
    with pytest.raises(ReadError, match=r"not flat: z is 0 at .* and 7 at \(16, 20\)") as caught:
        read_outline(drawing(document))
    assert caught.value.at == (16.0, 20.0)

    document, space = new()
    add_plate(space)
    space.add_circle((20, 20), 4, dxfattribs={"extrusion": (1, 0, 0)})
    with pytest.raises(ReadError, match="CIRCLE stands at an angle"):
        read_outline(drawing(document))

    document, space = new()
    add_plate(space)
    space.add_3dface([(0, 0, 0), (1, 0, 0), (1, 1, 0)], dxfattribs={"layer": "solid"})
    with pytest.raises(ReadError, match="'solid' holds a 3DFACE, which is no flat boundary"):
        read_outline(drawing(document))
    assert_same(PLATE, read_outline(drawing(document), layers="0"))

    document, space = new()
    space.add_polyline3d([(0, 0, 0), (10, 0, 0), (10, 10, 5)], close=True)
    with pytest.raises(ReadError, match="not flat"):
        read_outline(drawing(document))

    document, space = new()
    mesh = space.add_polyface()
    mesh.append_face([(0, 0, 0), (1, 0, 0), (1, 1, 0)])
    with pytest.raises(ReadError, match="mesh in space"):
        read_outline(drawing(document))


def test_flat_polylines_in_space_are_read(drawing):
    document, space = new()
    space.add_polyline3d([(*p, 3.0) for p in PLATE.vertices], close=True)
    assert_same(PLATE, read_outline(drawing(document)))


# --- files that are no drawings ------------------------------------------------------------------------


def test_empty_drawings_say_what_there_is(drawing):
    document, space = new()
    with pytest.raises(ReadError, match=r"no line, arc or curve is visible in the model space \(layers: none\)"):
        read_outline(drawing(document))
    space.add_text("nothing but text")
    with pytest.raises(ReadError, match=r"there is only 'TEXT' \(1\)"):
        read_outline(drawing(document))
    document.layers.add("hidden").off()
    space.add_line((0, 0), (1, 1), dxfattribs={"layer": "hidden"})
    with pytest.raises(ReadError, match=r"layers: 'hidden' \(1\)"):
        read_outline(drawing(document))


def test_files_cut_short_anywhere_are_errors(drawing, tmp_path):
    document, space = new()
    add_loop(space, ROUNDED)
    data = drawing(document).read_bytes()
    start = data.index(b"ENTITIES")
    for end in [0, 1, 100, *range(start, len(data) - 5, max(1, (len(data) - start) // 25))]:
        path = tmp_path / "cut.dxf"
        path.write_bytes(data[:end])
        with pytest.raises(ReadError, match=r"cut.dxf: (it is no DXF file or is cut short|it is empty)"):
            read_outline(path)


@pytest.mark.parametrize(
    "data",
    [
        b"",
        b"\0" * 1000,
        bytes(range(256)) * 40,
        b"hello\nEOF",
        b"0\nEOF\n",
        b"0\nSECTION\n2\nENTITIES\n0\nENDSEC\n0\nEOF\n",
    ],
)
def test_garbage(tmp_path, data):
    path = tmp_path / "garbage.dxf"
    path.write_bytes(data)
    with pytest.raises(ReadError, match=r"garbage\.dxf: "):
        read_outline(path)


def test_numbers_that_the_library_would_make_up_are_refused(drawing, tmp_path):
    document, space = new()
    add_plate(space)
    text = drawing(document).read_text().replace("60.0", "6o.0", 1)
    path = tmp_path / "damaged.dxf"
    path.write_text(text)
    with pytest.raises(ReadError, match="the drawing is damaged"):
        read_outline(path)


@pytest.mark.parametrize("number", ["nan", "inf", "1e308"])
def test_numbers_that_are_none(drawing, tmp_path, number):
    document, space = new()
    add_plate(space)
    path = tmp_path / "strange.dxf"
    path.write_text(drawing(document).read_text().replace("\n60.0\n", f"\n{number}\n", 1))
    with pytest.raises(ReadError, match=r"not finite, or larger|damaged"):
        read_outline(path)


def test_binary_drawings(drawing, tmp_path):
    document, space = new("mm")
    add_loop(space, ROUNDED)
    path = tmp_path / "binary.dxf"
    document.saveas(path, fmt="bin")
    assert read_outline(path) == ROUNDED
    path.write_bytes(path.read_bytes()[:-200])
    with pytest.raises(ReadError, match="cut short"):
        read_outline(path)


# --- bounded time and memory ---------------------------------------------------------------------------


def test_blocks_that_hold_themselves_or_multiply(drawing):
    document, space = new()
    block = document.blocks.new("A")
    block.add_line((0, 0), (1, 0))
    block.add_blockref("A", (1, 1))
    space.add_blockref("A", (0, 0))
    with pytest.raises(ReadError, match=r"nested over|damaged"):
        read_outline(drawing(document))

    document, space = new()
    document.blocks.new("B0").add_line((0, 0), (1, 0))
    for k in range(1, 13):  # ten to the twelfth lines
        block = document.blocks.new(f"B{k}")
        for x in range(10):
            block.add_blockref(f"B{k - 1}", (x, k))
    space.add_blockref("B12", (0, 0))
    with pytest.raises(ReadError, match="above the limit of 500"):
        read_outline(drawing(document), max_edges=500)

    document, space = new()
    document.blocks.new("C").add_line((0, 0), (1, 0))
    space.add_blockref("C", (0, 0), dxfattribs={"row_count": 30000, "column_count": 30000, "row_spacing": 1})
    with pytest.raises(ReadError, match="inserted 900000000 times"):
        read_outline(drawing(document))


def test_limits_on_size(drawing):
    document, space = new()
    space.add_lwpolyline([(k, k * k) for k in range(300)])
    with pytest.raises(ReadError, match="299 edges or more, above the limit of 200"):
        read_outline(drawing(document), max_edges=200)
    with pytest.raises(ReadError, match="over 1000 bytes"):
        read_outline(drawing(document), max_bytes=1000)


def test_the_table(drawing):
    document, space = new("mm")
    add_plate(space)
    space.add_circle((20, 20), 5)
    space.add_text("A - A")
    assert str(read_outline_report(drawing(document))) == "\n".join([
        "drawing.dxf (dxf)",
        "=================",
        "unit of the file           mm",
        "size                       60 x 40 mm",
        "area                       2321.46 mm^2",
        "edges                      4 straight, 2 arcs",
        "voids                      1",
        "arcs restored from chords  0",
        "note                       left out what is no boundary: 'TEXT' (1)",
    ])


def test_reading_says_nothing_on_the_terminal(drawing, capfd, tmp_path):
    document, space = new()
    add_plate(space)
    read_outline(drawing(document))
    path = tmp_path / "damaged.dxf"
    path.write_text(drawing(document).read_text().replace("60.0", "6o.0", 1))
    with pytest.raises(ReadError):
        read_outline(path)
    assert capfd.readouterr() == ("", "")




# --- entities with numbers that make no sense ----------------------------------------------------------


def bare(*entities):
    """The text of a drawing that holds nothing but entities, each a list of tags."""
    tags = [(0, "SECTION"), (2, "ENTITIES"), *(tag for entity in entities for tag in entity), (0, "ENDSEC"), (0, "EOF")]
    return "".join(f"{code}\n{value}\n" for code, value in tags)


SPLINE = [(0, "SPLINE"), (8, "0"), (70, 0), (71, 2), (72, 6), (73, 3)]
KNOTS = [(40, 0), (40, 0), (40, 0), (40, 1), (40, 1), (40, 1)]
POINTS = [(10, 0), (20, 0), (30, 0), (10, 5), (20, 5), (30, 0), (10, 10), (20, 0), (30, 0)]


@pytest.mark.parametrize(
    ("entity", "message"),
    [
        ([(0, "CIRCLE"), (8, "0"), (10, 3), (20, 4), (40, 0)], r"the CIRCLE at \(3, 4\) has the radius 0"),
        ([(0, "CIRCLE"), (8, "0"), (10, 3), (20, 4), (40, -2)], r"the CIRCLE at \(3, 4\) has the radius -2"),
        ([(0, "ARC"), (8, "0"), (10, 3), (20, 4), (40, 1), (50, "nan"), (51, 9)], "has the radius 1|damaged"),
        ([(0, "LINE"), (8, "0"), (10, 0), (20, 0), (30, "inf"), (11, 5), (21, 5), (31, 0)], "not flat|not a finite"),
        ([(0, "ELLIPSE"), (8, "0"), (10, 3), (20, 4), (11, 0), (21, 0), (31, 0), (40, 1)], "has no size|damaged"),
        ([(0, "ELLIPSE"), (8, "0"), (10, 3), (20, 4), (11, 5), (21, 0), (31, 2), (40, 1)], "tilted out of the plane"),
        ([*SPLINE[:3], (71, 60), *SPLINE[4:], *KNOTS, *POINTS], "has the degree 60|damaged"),
        ([*SPLINE, *KNOTS[:3], (40, -1), (40, 1), (40, 1), *POINTS], "do not fit its points|damaged"),
        ([*SPLINE, *KNOTS, (41, 1), (41, 0), (41, 1), *POINTS], "a weight of 0 or less|damaged"),
        ([*SPLINE, *KNOTS, *POINTS[:3], (10, "nan"), *POINTS[4:]], "not finite|damaged"),
        ([(0, "INSERT"), (8, "0"), (2, "NONE"), (10, 0), (20, 0)], "the block 'NONE' is not in the drawing|damaged"),
    ],
)
def test_entities_that_make_no_sense(tmp_path, entity, message):
    path = tmp_path / "strange.dxf"
    path.write_text(bare(entity))
    with pytest.raises(ReadError, match=message):
        read_outline(path)


def test_points_without_a_line_are_no_boundary(drawing):
    document, space = new()
    add_plate(space)
    space.add_lwpolyline([(5, 5)])
    space.add_polyline2d([(5, 5)])
    space.add_open_spline([(5, 5, 0)] * 4)
    assert_same(PLATE, read_outline(drawing(document)))


def test_the_frame_of_a_smoothed_polyline_is_no_part_of_it(drawing):
    # flag 16 marks the points of the control frame, which is not drawn
    document, space = new()
    polyline = space.add_polyline2d([(99, 99), *PLATE.vertices.tolist()], close=True)
    polyline.vertices[0].dxf.flags |= 16
    assert_same(PLATE, read_outline(drawing(document)))


def test_drawings_of_too_many_loops(drawing):
    document, space = new()
    for x in range(40):
        for y in range(26):
            space.add_circle((x, y), 0.2)
    with pytest.raises(ReadError, match="holds 1040 loops, above the limit of 1000"):
        read_outline(drawing(document))


def test_drawings_of_too_many_entries(tmp_path):
    path = tmp_path / "large.dxf"
    path.write_text(bare(*([(0, "POINT"), (8, "0"), (10, k), (20, k)] for k in range(1000))))
    with pytest.raises(ReadError, match="entries, above the limit of 800"):
        read_outline(path, max_edges=200)


# --- curves and blocks that cannot be ------------------------------------------------------------------------


def spline_of_a_high_degree(space, _):
    space.add_spline(dxfattribs={"degree": 60}).control_points = [(k, k * k, 0) for k in range(70)]


def spline_with_a_knot_missing(space, _):
    spline = space.add_open_spline([(0, 0), (1, 2), (3, 1), (4, 4)])
    spline.knots = [0, 0, 0, 0, 1, 1, 1]


def spline_with_falling_knots(space, _):
    spline = space.add_open_spline([(0, 0), (1, 2), (3, 1), (4, 4)])
    spline.knots = [0, 0, 0, 0, -1, 1, 1, 1]


def spline_with_a_weight_of_nought(space, _):
    space.add_rational_spline([(0, 0), (1, 2), (3, 1), (4, 4)], weights=[1, 1, 0, 1])


def a_block_that_is_not_there(space, _):
    space.add_blockref("NOWHERE", (0, 0))


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (spline_of_a_high_degree, "SPLINE has the degree 60: 1 to|damaged"),
        (spline_with_a_knot_missing, "knots that do not fit its points|damaged"),
        (spline_with_falling_knots, "knots that do not fit its points"),
        (spline_with_a_weight_of_nought, "a weight of 0 or less"),
        (a_block_that_is_not_there, "the block 'NOWHERE' is not in the drawing|damaged"),
    ],
)
def test_curves_and_blocks_that_cannot_be_are_told(drawing, make, words):
    document, space = new("mm")
    make(space, document)
    with pytest.raises(ReadError, match=words):
        read_outline(drawing(document))
