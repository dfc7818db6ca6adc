"""Well-known text, GeoJSON and tables of points, whole and broken.

The rules are those of ISO 19125-1 and ISO/IEC 13249-3 (well-known text), RFC 7946 (GeoJSON) and RFC 4180 (CSV).
"""

import json

import numpy as np
import pytest
import shapely
from drawn import angle, assert_same, assert_same_shape, circle, faceted, rectangle

from torsionfe.errors import InputError, OutlineWarning, ReadError, UnitError
from torsionfe.outline.files import read_outline, read_outline_report, write_outline
from torsionfe.outline.outline import Outline

PLATE = rectangle(30.0, 10.0)
FILLET = angle().filleted(8.0)


@pytest.fixture
def saved(tmp_path):
    """A function that saves a text and returns its path."""

    def save(name, text):
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return path

    return save


# --- well-known text -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text",
    [
        "POLYGON ((0 0, 30 0, 30 10, 0 10, 0 0))",
        "polygon((0 0,30 0,30 10,0 10,0 0))",
        " SRID=4326; POLYGON Z ((0 0 0, 30 0 0, 30 10 0, 0 10 0, 0 0 0))\n",
        "POLYGON M ((0. 0 1, 3e1 0 1, +30.0 1E+1 1, 0 10 1, 0 0 1))",
        "POLYGON ZM ((0 0 0 5, 30 0 0 5, 30 10 0 5, 0 10 0 5, 0 0 0 5))",
        "MULTIPOLYGON (((0 0, 30 0, 30 10, 0 10, 0 0)))",
        "GEOMETRYCOLLECTION (POLYGON ((0 0, 30 0, 30 10, 0 10, 0 0)))",
        "MULTISURFACE (CURVEPOLYGON ((0 0, 30 0, 30 10, 0 10, 0 0)))",
        "CURVEPOLYGON (COMPOUNDCURVE ((0 0, 30 0), LINESTRING (30 0, 30 10, 0 10, 0 0)))",
        "LINESTRING (0 0, 30 0, 30 10, 0 10, 0 0)",
        shapely.Polygon(PLATE.vertices).wkt,
        shapely.to_wkt(shapely.Polygon(PLATE.vertices), output_dimension=3),
    ],
)
def test_polygons_in_well_known_text(saved, text):
    assert_same(PLATE, read_outline(saved("plate.wkt", text)), rel=0)


def test_arcs_in_well_known_text(saved):
    text = (
        "CURVEPOLYGON (COMPOUNDCURVE (CIRCULARSTRING (0 0, 10 10, 0 20), (0 20, -20 20), "
        "CIRCULARSTRING (-20 20, -30 10, -20 0), (-20 0, 0 0)), CIRCULARSTRING (-5 10, -7 12, -9 10, -7 8, -5 10), "
        "CIRCULARSTRING (-11 10, -15 10, -11 10))"
    )
    outline = read_outline(saved("slot.wkt", text))
    assert outline.area == pytest.approx(400 + 100 * np.pi - 4 * np.pi - 4 * np.pi)
    np.testing.assert_allclose(np.abs(outline.bulges), [1, 0, 1, 0], atol=1e-15)


def test_what_shapely_writes_comes_back(saved):
    faceted_ = shapely.box(0, 0, 40, 20).buffer(5.0, quad_segs=8).difference(shapely.Point(20, 10).buffer(4.0))
    result = read_outline_report(saved("box.wkt", faceted_.wkt))
    assert result.arcs_restored == 5
    assert result.outline.area == pytest.approx(800 + 2 * 60 * 5 + 25 * np.pi - 16 * np.pi, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "it is empty"),
        ("POINT (1 2)", "a POLYGON or CURVEPOLYGON is needed before character 7, got 'POINT'"),
        ("POLYGON EMPTY", "the POLYGON is empty"),
        ("MULTIPOLYGON (((0 0, 1 0, 1 1, 0 0)), ((5 5, 6 5, 6 6, 5 5)))", "holds more than one part"),
        ("POLYGON ((0 0, 30 0, 30 10, 0 10))", r"the ends of a ring do not meet at \(0, 10\).*a gap of 10"),
        ("POLYGON ((0 0, 30 0, 30 10, 0 10, 0 0)", "expected at character 38, got 'the end'"),
        ("POLYGON ((0 0, 30 0, 30 10, 0 10, 0 0)) x", "the end of the text is expected at character 39, got 'x'"),
        ("POLYGON ((0 0, 30 0, 30 zehn, 0 10, 0 0))", "a finite number is expected at character 28, got 'ZEHN'"),
        ("POLYGON ((0 0, 30 0, 30 nan, 0 10, 0 0))", "got 'NAN'"),
        ("POLYGON ((0 0, 30 0, 30 1e999, 0 10, 0 0))", "a finite number is expected at character 29, got '1E999'"),
        ("POLYGON ((0 0, 30 0, 30, 0 10, 0 0))", "a point of 2 to 4 numbers"),
        ("POLYGON ((0 0, 30 0 1, 30 10, 0 10, 0 0))", "as many as the others have"),
        ("POLYGON Z ((0 0 0, 30 0 0, 30 10 5, 0 10 0, 0 0 0))", "not flat: z goes from 0 to 5"),
        ("POLYGON ((0 0, 30 0, 30 10, 0 10, 0 0); DROP", "got '; DROP"),
        ("CURVEPOLYGON (CIRCULARSTRING (0 0, 1 1, 2 0, 0 0))", "has 4 points: an odd number"),
        ("CURVEPOLYGON (CIRCULARSTRING (0 0, 0 0, 2 0, 1 -1, 0 0))", "the same point twice"),
        ("CURVEPOLYGON (COMPOUNDCURVE ((0 0, 9 0), (9 1, 9 9, 0 0)))", r"COMPOUNDCURVE do not meet at \(9, 0\)"),
        ("POLYGON ((0 0, 10 10, 10 0, 0 10, 0 0))", r"crosses itself at \(5, 5\)"),
        ("POLYGON ((0 0, 9 0, 9 9, 0 9, 0 0), (20 20, 21 20, 21 21, 20 20))", "2 outer loops"),
        ("(" * 100_000, "is needed"),
        ("GEOMETRYCOLLECTION (" * 50_000, "is needed"),
        ("POLYGON ((" + "0 0, " * 300_000, "above the limit of 50000"),
        (b"POLYGON ((0 0, 30 0, \xff", r"no text in UTF-8 \(byte 21\)"),
        (b"POLYGON\0((0 0", "zero byte"),
    ],
)
def test_texts_that_are_no_polygon(saved, text, message):
    with pytest.raises(ReadError, match=message) as caught:
        read_outline(saved("bad.wkt", text))
    assert str(caught.value).startswith("bad.wkt: ")
    assert len(str(caught.value)) < 400


# --- GeoJSON -------------------------------------------------------------------------------------------

RING = [[0, 0], [30, 0], [30, 10], [0, 10], [0, 0]]


def polygon(*rings, **members):
    return {"type": "Polygon", "coordinates": list(rings or [RING]), **members}


@pytest.mark.parametrize(
    "found",
    [
        polygon(),
        polygon([[*p, 0.0] for p in RING]),
        {"type": "Feature", "geometry": polygon(), "properties": None},
        {"type": "FeatureCollection", "features": [{"type": "Feature", "geometry": polygon(), "properties": {}}]},
        {"type": "GeometryCollection", "geometries": [polygon()]},
        {"type": "MultiPolygon", "coordinates": [[RING]]},
        json.loads(shapely.to_geojson(shapely.Polygon(PLATE.vertices))),
    ],
)
def test_polygons_in_geojson(saved, found):
    assert_same(PLATE, read_outline(saved("plate.geojson", json.dumps(found))), rel=0)
    assert_same(PLATE, read_outline(saved("plate.json", json.dumps(found))), rel=0)


def test_what_is_written_is_a_feature_that_others_can_read(tmp_path):
    outline = Outline(FILLET.vertices, FILLET.bulges, [circle(4, 4, 2)])
    path = write_outline(outline, tmp_path / "a.geojson", unit="mm")
    found = json.loads(path.read_text())
    shape = shapely.from_geojson(json.dumps(found["geometry"]))
    assert shape.is_valid
    assert shape.exterior.is_ccw
    assert not shape.interiors[0].is_ccw  # the right-hand rule of RFC 7946
    assert shape.area == pytest.approx(outline.area, rel=2e-3)
    assert found["cross_section"]["unit"] == "mm"


def test_without_our_member_the_arcs_are_restored_from_the_chords(tmp_path):
    path = write_outline(FILLET, tmp_path / "a.geojson")
    found = json.loads(path.read_text())
    del found["cross_section"]
    path.write_text(json.dumps(found))
    assert_same(FILLET, read_outline(path), rel=1e-12)


def test_arcs_stay_true_when_the_coordinates_are_moved_and_are_told_of_when_not(tmp_path):
    path = write_outline(FILLET, tmp_path / "a.geojson")
    found = json.loads(path.read_text())
    ring = np.array(found["geometry"]["coordinates"][0])
    found["geometry"]["coordinates"][0] = (2.0 * ring[:, ::-1] * [-1, 1] + [5, 7]).tolist()  # turned, twice as large
    path.write_text(json.dumps(found))
    expected = FILLET.rotated(np.pi / 2).scaled(2.0).translated(5, 7)
    assert_same(expected, read_outline(path, restore_arcs=False), rel=1e-12)

    found["geometry"]["coordinates"][0] = (ring * [-1, 1]).tolist()  # mirrored: the bulges are not
    path.write_text(json.dumps(found))
    with pytest.warns(OutlineWarning, match=r"the arc at \(-16, 8\) of ring 0 no longer fits"):
        outline = read_outline(path)
    assert_same_shape(FILLET.mirrored(), outline, rel=1e-12)


@pytest.mark.parametrize(
    ("found", "message"),
    [
        ("{", "it is no JSON"),
        ("[" * 200_000, "it is no JSON"),
        ('{"a":' * 100_000, "it is no JSON"),
        ("null", "a Polygon or a Feature with one is needed, got none"),
        ([], "is needed, got none"),
        ({"type": "Point", "coordinates": [0, 0]}, "got the type 'Point'"),
        ({"type": "Feature", "geometry": None}, "got none"),
        ({"type": "FeatureCollection", "features": []}, "the FeatureCollection holds 0 parts"),
        ({"type": "FeatureCollection"}, "holds no parts"),
        ({"type": "MultiPolygon", "coordinates": [[RING], [RING]]}, "the MultiPolygon holds 2 parts"),
        ({"type": "Polygon"}, "has no coordinates"),
        (polygon("abcd"), "ring 0 is no list"),
        (polygon([[0, 0], [1, 0], [0, 0]]), "ring 0 is no list of at least 4"),
        (polygon(RING[:-1]), r"ring 0 is open: it starts at \(0, 0\) and ends at \(0, 10\)"),
        (polygon([[0, 0], [30, "0"], [30, 10], [0, 0]]), "ring 0 is no list"),
        (polygon([[0, 0], [30, True], [30, 10], [0, 0]]), "ring 0 is no list"),
        (polygon([[0, 0], [30, None], [30, 10], [0, 0]]), "ring 0 is no list"),
        (polygon([[0, 0, 0], [30, 0, 0], [30, 10, 3], [0, 0, 0]]), "not flat: z goes from 0 to 3"),
        (polygon([[0, 0], [10**400, 0], [30, 10], [0, 0]]), "too large"),
        ('{"type": "Polygon", "coordinates": [[[0, 0], [NaN, 0], [30, 10], [0, 0]]]}', "NaN is no number of JSON"),
        ('{"type": "Polygon", "coordinates": [[[0, 0], [1e999, 0], [30, 10], [0, 0]]]}', "not finite"),
        ("1" * 5000, "it is no JSON|is needed"),
        (polygon(cross_section={"arcs": [{"ring": 0, "from": 0, "to": 9, "bulge": 1}]}), "names no stretch of a ring"),
        (polygon(cross_section={"arcs": [{"ring": 1, "from": 0, "to": 1, "bulge": 1}]}), "names no stretch of a ring"),
        (polygon(cross_section={"arcs": [7]}), "names no stretch of a ring"),
        ("[" + "[0,0]," * 500_000 + "[0,0]]", "above the limit of 50000"),
    ],
)
def test_texts_that_are_no_geojson_polygon(saved, found, message):
    with pytest.raises(ReadError, match=message) as caught:
        read_outline(saved("bad.geojson", found if isinstance(found, str) else json.dumps(found)))
    assert len(str(caught.value)) < 400


def test_the_unit_of_a_geojson_file_is_checked(saved):
    text = json.dumps(polygon(cross_section={"unit": "furlong"}))
    with pytest.raises(UnitError, match=r"plate\.json: 'furlong' is no unit of length"):
        read_outline(saved("plate.json", text))
    text = json.dumps(polygon(cross_section={"unit": ["mm"]}))
    with pytest.raises(UnitError, match="no unit of length"):
        read_outline(saved("plate.json", text))


# --- tables of points ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "text",
    [
        "0,0\n30,0\n30,10\n0,10\n",
        "0,0\r\n30,0\r\n30,10\r\n0,10\r\n0,0\r\n",  # closed by repeating the first point
        "\ufeffx,y\n0,0\n30,0\n30,10\n0,10",
        '"Y","X"\n0,0\n0,30\n10,30\n10,0',
        "# a plate\n\n0 0\n30  0\n30 10\n0 10\n\n",
        "0\t0\n30\t0\n30\t10\n0\t10",
        "x;y;radius;bulge;loop\n0,0;0,0;;;\n30,0;0;;;\n3,0e1;1,0E+1;;;\n0;10;;;",
        "0;0;0;0\n30;0;0;0\n30;10;0;0\n0;10;0;0\n",
    ],
)
def test_tables_of_points(saved, text):
    assert_same(PLATE, read_outline(saved("plate.csv", text)), rel=0)


def test_radii_round_the_corners(saved):
    text = "0,0,0\n80,0,0\n80,8,4\n8,8,8\n8,80,0\n0,80,0"
    expected = angle().filleted(8.0, at=[3]).filleted(4.0, at=[2])
    assert_same_shape(expected, read_outline(saved("angle.csv", text)), rel=1e-14)
    clockwise = "\n".join(reversed(text.split()))
    assert_same_shape(expected, read_outline(saved("angle.csv", clockwise)), rel=1e-14)
    with pytest.raises(ReadError, match=r"angle\.csv: the point \(40, 0\) has the radius 3 and is no corner"):
        read_outline(saved("angle.csv", text.replace("80,0,0", "40,0,3\n80,0,0")))
    with pytest.raises(ReadError, match=r"angle\.csv: radius 40 does not fit at vertex 3 \(8, 8\)|radius 4"):
        read_outline(saved("angle.csv", text.replace("8,8,8", "8,8,90")))


def test_bulges_and_loops(saved):
    text = "x,y,bulge,loop\n-20,0,1,1\n20,0,1,1\n-5,0,1,2\n5,0,1,2\n"
    outline = read_outline(saved("tube.csv", text))
    assert_same(Outline(circle(0, 0, 20).vertices, [1, 1], [circle(0, 0, 5)]), outline)
    # without names, the third column is the radius and the fourth the loop; rows of a loop may be apart
    text = "0,0,0,7\n1,1,0,2\n30,0,0,7\n2,1,0,2\n30,10,0,7\n1,2,0,2\n0,10,0,7\n"
    assert_same(Outline(PLATE.vertices, voids=[Outline([(1, 1), (2, 1), (1, 2)])]), read_outline(saved("p.txt", text)))


@pytest.mark.parametrize(
    "head", ["x [in],y [in]", "# unit: in", "x (inch),y", "#UNIT = Inches\nx,y"]
)
def test_the_unit_of_a_table(saved, head):
    result = read_outline_report(saved("plate.csv", f"{head}\n0,0\n30,0\n30,10\n0,10"), unit="mm")
    assert (result.file_unit, result.unit) == ("in", "mm")
    assert_same(PLATE.scaled(25.4), result.outline)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("x,y\n", "it holds no points"),
        ("# nothing\n", "it holds no points"),
        ("0,0\n30,0\n30;10\n0,10", "line 3 has 1 columns where 2 are needed"),
        ("0,0\n30,0\n30,zehn\n0,10", "line 3: y must be a finite number, got 'zehn'"),
        ("0,0\n30,0\n30,\n0,10", "line 3: y must be a finite number, got ''"),
        ("0,0\n30,0\n30,nan\n0,10", "line 3: y must be a finite number, got 'nan'"),
        ("0,0\n30,0\n30,1e999\n0,10", "line 3: y must be a finite number, got '1e999'"),
        ("0,0\n30,0\n30,1_0\n0,10", "got '1_0'"),
        ("0;0\n30;0\n30;1.234,5\n0;10", "got '1.234,5'"),
        ("0,0,0\n30,0,-1\n30,10,0\n0,10,0", "line 2: the radius must be 0 or more, got -1"),
        ("0,0,0,0\n30,0,0,0.5\n30,10,0,0\n0,10,0,0", "line 2: the loop must be a whole number, got '0.5'"),
        ("0\n30\n", "line 1 has 1 columns"),
        ("0,0,0,0,0\n", "line 1 has 5 columns"),
        ("x,z\n0,0\n", "line 1: 'z' is neither a number nor the name of a column"),
        ("x,y,radus\n0,0,0\n", "did you mean 'radius'"),
        ("x,x\n0,0\n", "the columns must be x and y and others once each"),
        ("x,radius\n0,0\n", "the columns must be x and y"),
        ("0,0\n30,0\n", "a loop needs 3 vertices"),
        ("0,0\n10,10\n10,0\n0,10", r"crosses itself at \(5, 5\)"),
        ("0,0\n" * 200_000, "above the limit of 50000"),
    ],
)
def test_tables_that_are_none(saved, text, message):
    with pytest.raises(ReadError, match=message) as caught:
        read_outline(saved("bad.csv", text))
    assert str(caught.value).startswith("bad.csv: ")


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("x [mm],y [in]\n0,0\n", "different units"),
        ("# unit: mm\nx [in],y [in]\n0,0\n30,0\n30,10\n", "are said to be in 'mm' and in 'in'"),
        ("x [parsnip],y\n0,0\n30,0\n30,10\n", "'parsnip' is no unit of length"),
    ],
)
def test_units_that_contradict_or_are_unknown(saved, text, message):
    with pytest.raises(UnitError, match=message):
        read_outline(saved("bad.csv", text))


# --- the file itself -----------------------------------------------------------------------------------


def test_paths_that_are_no_file(tmp_path):
    with pytest.raises(ReadError, match="there is no file"):
        read_outline(tmp_path / "none.dxf")
    with pytest.raises(ReadError, match="is no file"):
        read_outline(tmp_path)
    for path in (3, None, "a\0b"):
        with pytest.raises(ReadError, match=r"is no path to a file|there is no file"):
            read_outline(path)


def test_formats_by_ending_or_by_name(saved):
    text = "POLYGON ((0 0, 30 0, 30 10, 0 10, 0 0))"
    assert_same(PLATE, read_outline(saved("plate.WKT", text)))
    assert_same(PLATE, read_outline(str(saved("plate.section", text)), format="wkt"))
    with pytest.raises(ReadError, match=r"the ending '.section' tells no format that can be read \(.dxf, .wkt"):
        read_outline(saved("plate.section", text))
    with pytest.raises(InputError, match="format must be one of 'dxf', 'wkt'"):
        read_outline(saved("plate.wkt", text), format="wtk")


@pytest.mark.parametrize(
    ("option", "value", "message"),
    [
        ("tolerance", 0, "tolerance must be greater than 0"),
        ("curve_tolerance", float("nan"), "curve_tolerance must be finite"),
        ("facet_tolerance", "1", "facet_tolerance must be a number"),
        ("max_edges", -1, "max_edges"),
        ("max_bytes", 0, "max_bytes"),
        ("max_seconds", True, "max_seconds"),
        ("layers", "0", "only a DXF file has layers"),
        ("layers", [3], "layers must be one name or several"),
    ],
)
def test_bad_options(saved, option, value, message):
    with pytest.raises(InputError, match=message):
        read_outline(saved("plate.csv", "0,0\n30,0\n30,10\n0,10"), **{option: value})


def test_chords_in_any_format_are_restored_or_left(saved):
    outline = faceted(FILLET, 8)
    rows = "\n".join(f"{x!r},{y!r}" for x, y in outline.vertices.tolist())
    path = saved("fillet.csv", rows)
    assert_same_shape(FILLET, read_outline(path), rel=1e-10)
    assert_same(outline, read_outline(path, restore_arcs=False), rel=0)
