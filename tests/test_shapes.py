"""Trade shapes against published and closed-form section properties."""

import csv
import json
import math
import pickle
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from torsionfe.errors import InputError, OutlineError
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline

REFERENCE = Path(__file__).parent / "reference"
RECORDS = {record["id"]: record for record in json.loads((REFERENCE / "torsion_cases.json").read_text())}


def i_shape(p):
    return shapes.wide_flange(p["h"], p["b"], p["tf"], p["tw"], p["r"])


def thin(function, **more):
    def made(p):
        t = p["t"]
        return function(p["h_mid"] + t, p["b_mid"] + t / 2.0, t, t, **more)

    return made


def square_box(p):
    b = p.get("B", p.get("b_mid", 0) + p["t"] * ("b_mid" in p))
    return shapes.box(b, p.get("H", b), p["t"], p.get("r_o", 0.0), p.get("r_i", 0.0))


def two_cell(p):
    left = p["x_web"] - p["tw"] / 2.0
    high = p["H"] - 2.0 * p["t"]
    right = p["x_web"] + p["tw"] / 2.0
    voids = [(p["t"], p["t"], left - p["t"], high), (right, p["t"], p["W"] - p["t"] - right, high)]
    return shapes.extrusion(p["W"], p["H"], voids, outer_radius=p["r_o"], inner_radius=p["r_i"])


def unequal_box(p):
    void = (p["t_left"], p["t_tb"], p["B"] - p["t_left"] - p["t_right"], p["H"] - 2.0 * p["t_tb"])
    return shapes.extrusion(p["B"], p["H"], [void], outer_radius=p["r_o"], inner_radius=p["r_i"])


def shaft_with_holes(p):
    holes = [shapes.round_bar(2 * p["r"]).translated(p["pitch"], 0).rotated(k * math.pi / 2) for k in range(p["n"])]
    return shapes.round_bar(2 * p["R"]).difference(holes[0]).difference(holes[1]).difference(holes[2]).difference(
        holes[3]
    )


def monosymmetric(p):
    return shapes.plate_girder(
        p["h"], p["tw"], p["r"], top_width=p["b_top"], top_thickness=p["t_top"], bottom_width=p["b_bot"],
        bottom_thickness=p["t_bot"],
    )  # fmt: skip


#: how to make each record's section from its parameters
MAKERS = {
    "circle_r25": lambda p: shapes.round_bar(2 * p["r"]),
    **{f"ellipse_30_{b}": lambda p: shapes.ellipse(2 * p["a"], 2 * p["b"]) for b in (25, 15, 6)},
    "equilateral_a60": lambda p: shapes.regular(3, p["a"] / math.sqrt(3.0)),
    **{f"rect_{n}": lambda p: shapes.rectangle(p["b"], p["t"]) for n in (1, "1p5", 2, 3, 5, 6, 8, 10, 20)},
    **{f"tube_{n}": lambda p: shapes.tube(2 * p["R"], p["R"] - p["r"]) for n in ("50_40", "50_49", "30_15")},
    "polygon_6_a20": lambda p: shapes.regular(6, p["side"] * math.sqrt(3.0)),
    **{f"sqtube_sharp_{n}": square_box for n in ("0p05", "0p1")},
    **{f"channel_thin_{n}": thin(shapes.channel) for n in ("t10p0", "t2p5")},
    **{
        f"angle_thin_{n}": lambda p: shapes.angle(p["L_mid"] + p["t"] / 2, p["L_mid"] + p["t"] / 2, p["t"])
        for n in ("t10p0", "t5p0", "t2p5")
    },
    **{
        n: lambda p: shapes.angle(p["L"], p["L"], p["t"], p["r"])
        for n in ("angle_80_8_r1", "angle_80_8_r4", "angle_80_8_r8", "angle_25_10_r3")
    },
    "smallfillet_60_10_0p1": lambda p: shapes.angle(p["L"], p["L"], p["t"], p["r"]),
    "smallfillet_60_10_0p02": lambda p: shapes.angle(p["L"], p["L"], p["t"]).filleted(p["r"]),
    "tee_slender": lambda p: shapes.tee(p["bf"], p["h"], p["tf"], p["tw"], p["r"]),
    "channel_stubby": lambda p: shapes.channel(p["h"], p["b"], p["tf"], p["tw"], p["r"]),
    "zee_stubby": lambda p: shapes.zee(p["h"], p["b"], p["t"], p["t"], p["r"]),
    "zee_coldformed": lambda p: shapes.zee(
        p["h"], p["b"], p["t"], p["t"], p["r_i"], heel_radius=p["r_o"]
    ),
    "I_slender": i_shape,
    "I_monosymmetric": monosymmetric,
    "cross_fillet_60_16_6": lambda p: shapes.cross(p["a"], p["a"], p["w"], p["r"]),
    **dict.fromkeys(("shs_100_8", "shs_60_12", "shs_100x5", "shs_200x10", "rhs_100x50x5"), square_box),
    "rhs_unequal": unequal_box,
    "twocell_fillet": two_cell,
    "shaft_4holes": shaft_with_holes,
    **{
        n: lambda p: shapes.keyed_shaft(p["D"], p["w"], p["depth"], p["r"])
        for n in ("keyway_50_14_5p5_r1", "keyway_40_12_5_r1p5")
    },
    **{n: lambda p: shapes.flatted_bar(2 * p["R"], p["R"] + p["c"]) for n in ("dshaft_20_12", "dshaft_20_4")},
    **{n: lambda p: shapes.rectangle(p["a"], p["a"], p["r"]) for n in ("roundsq_40_5", "roundsq_40_15")},
    **{n: i_shape for n, record in RECORDS.items() if record["family"] in ("IPE", "HE", "W")},
    **{
        n: lambda p: shapes.channel(p["h"], p["b"], p["tf"], p["tw"], p["r"]) for n in ("upe_100", "upe_300")
    },
}


@pytest.mark.parametrize("name", MAKERS)
def test_areas_and_moments_of_the_reference_cases(name):
    # tests/reference/torsion_cases.json: exact areas, centroids and second moments of the drawn geometry
    record = RECORDS[name]
    shape = MAKERS[name](record["parameters"])
    given = {key: value["value"] for key, value in record["quantities"].items()}
    accuracy = 1e-6 if name.startswith("ellipse") else 1e-10
    assert shape.area == pytest.approx(given["area"], rel=accuracy)
    if "second_moments_centroidal" in given:
        second = shape.edges.moments()[2]
        expected = np.array([given["second_moments_centroidal"][key] for key in ("Ixx", "Iyy", "Ixy")])
        if name == "rhs_unequal":  # drawn with its thick wall on the other side
            second[2], expected[2] = abs(second[2]), abs(expected[2])
        np.testing.assert_allclose(second, expected, rtol=1e-9, atol=1e-9 * expected[0])


@pytest.mark.parametrize(
    ("shape", "area"),
    [
        # printed areas in cm^2, three digits, of EN/DIN tables for tapered and toed sections, from memory
        (shapes.channel(100, 50, 8.5, 6, 8.5, toe_radius=4.5, flange_slope=0.08), 13.5),
        (shapes.channel(200, 75, 11.5, 8.5, 11.5, toe_radius=6, flange_slope=0.08), 32.2),
        (shapes.channel(300, 100, 16, 10, 16, toe_radius=8, flange_slope=0.08), 58.8),
        (shapes.wide_flange(100, 50, 6.8, 4.5, 4.5, toe_radius=2.7, flange_slope=0.14), 10.6),
        (shapes.wide_flange(200, 90, 11.3, 7.5, 7.5, toe_radius=4.5, flange_slope=0.14), 33.4),
        (shapes.angle(100, 100, 10, 12, 6), 19.2),
        (shapes.angle(80, 80, 8, 10, 5), 12.3),
        (shapes.angle(100, 50, 8, 8, 4), 11.4),
    ],
)
def test_areas_that_tables_print(shape, area):
    assert shape.area / 100.0 == pytest.approx(area, rel=0.004)


def american():
    with (REFERENCE / "aisc_wide_flange.csv").open() as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


@pytest.mark.parametrize("row", american(), ids=lambda row: row["shape"])
def test_wide_flanges_weigh_what_their_names_say(row):
    # W44X408 weighs 408 lb/ft: at 490 lb/ft^3 (common practice) a square inch is 3.403 lb/ft
    d, bf, tw, tf, k = (float(row[name]) for name in ("d", "bf", "tw", "tf", "k"))
    shape = shapes.wide_flange(d, bf, tf, tw, k - tf)
    nominal = float(row["shape"].split("X")[1]) / (490.0 / 144.0)
    assert shape.area == pytest.approx(nominal, rel=0.025)


def test_every_shape_is_centred_as_documented():
    centred = [
        shapes.rectangle(30, 10, 2),
        shapes.round_bar(20),
        shapes.tube(20, 3),
        shapes.box(40, 30, 3, 4, 2),
        shapes.ellipse(40, 10),
        shapes.regular(6, 20),
        shapes.tee(50, 40, 5, 4, 3),
        shapes.channel(40, 20, 5, 4, 3),
        shapes.zee(40, 20, 5, 4, 3),
        shapes.wide_flange(40, 20, 5, 4, 3),
        shapes.cross(40, 20, 5, 2, upright_thickness=6),
        shapes.multi_cell(40, 30, 2, 3, 2),
        shapes.flatted_bar(20, 16, flats=2),
    ]
    for shape in centred:
        x0, y0, x1, y1 = shape.bounds
        assert (x0 + x1, y0 + y1) == pytest.approx((0.0, 0.0), abs=1e-12 * shape.size), shape
    assert shapes.angle(30, 20, 3).bounds == (0, 0, 30, 20)
    assert shapes.extrusion(30, 20, [(2, 2, 5, 5)]).bounds == (0, 0, 30, 20)
    assert shapes.keyed_shaft(50, 14, 5.5).bounds[:3] == pytest.approx((-25, -25, 25))
    assert shapes.flatted_bar(40, 32).bounds == pytest.approx((-20, -20, 20, 12))
    assert shapes.finned_box(40, 30, 3, 10, 2).bounds == (-30, -15, 30, 15)


def test_areas_of_the_other_shapes_by_hand():
    # a spline shaft: root circle plus, per tooth, the strip between the circles
    d, w = 23.0, 6.0

    def strip(r):  # area of a circle within w/2 of a diameter, over half of it
        h = w / 2.0
        return h * math.sqrt(r * r - h * h) + r * r * math.asin(h / r)

    expected = math.pi / 4.0 * d * d + 6.0 * (strip(14.0) - strip(11.5))
    assert shapes.splined_shaft(6, 28, 23, 6).area == pytest.approx(expected, rel=1e-12)
    hollow = shapes.splined_shaft(6, 28, 23, 6, bore_diameter=10)
    assert hollow.area == pytest.approx(expected - math.pi * 25.0, rel=1e-12)
    assert shapes.finned_box(40, 30, 3, 10, 2).area == pytest.approx(40 * 30 - 34 * 24 + 2 * 20)
    assert shapes.multi_cell(40, 30, 2, 3, 2, web=1).area == pytest.approx(40 * 30 - 34 * 25)
    assert shapes.cross(40, 20, 5, upright_thickness=6).area == pytest.approx(40 * 5 + 6 * 15)
    flat = 2.0 * (100.0 * math.acos(0.8) - 8.0 * 6.0)  # two segments of a circle of radius 10
    assert shapes.flatted_bar(20, 16, flats=2).area == pytest.approx(100.0 * math.pi - flat)
    sides = shapes.regular(5, 10, corner_radius=5).area  # rounded all the way: the inscribed circle
    assert sides == pytest.approx(25.0 * math.pi)


def test_splines_and_keyways_are_differences_and_unions():
    cut = shapes.round_bar(50).difference(shapes.rectangle(14, 20).translated(0, 29.5))
    assert cut.matches(shapes.keyed_shaft(50, 14, 5.5), 1e-9)
    bars = [shapes.rectangle(28, 6).rotated(k * math.pi / 3.0) for k in range(3)]
    star = shapes.round_bar(23).union(bars[0]).union(bars[1]).union(bars[2])
    tips = shapes.tube(40, 6)  # cut the tips round
    assert star.difference(tips).area == pytest.approx(shapes.splined_shaft(6, 28, 23, 6).area, rel=1e-9)


@settings(max_examples=40, deadline=None)
@given(st.floats(0.1, 50.0), st.floats(0.1, 50.0))
def test_the_ellipse_is_within_its_tolerance(width, height):
    shape = shapes.ellipse(width, height)
    edges = shape.edges
    rows = np.repeat(np.arange(len(edges)), 9)
    points = edges.points(rows, np.tile(np.linspace(0.0, 1.0, 9), len(edges)))
    a, b = width / 2.0, height / 2.0
    level = np.hypot(points[:, 0] / a, points[:, 1] / b) - 1.0
    slope = np.hypot(points[:, 0] / a**2, points[:, 1] / b**2)  # of the level, at the ellipse
    assert np.abs(level / slope).max() < 1.1e-6 * math.sqrt(width * height)
    np.testing.assert_allclose(edges.interior_angle, math.pi, atol=1e-7)
    assert shape.area == pytest.approx(math.pi * a * b, rel=1e-5)


def test_shapes_know_their_kind_and_dimensions():
    shape = shapes.angle(80, 60, 8, root_radius=8)
    assert shape.kind == "angle"
    assert dict(shape.dimensions) == {
        "leg_x": 80.0, "leg_y": 60.0, "thickness": 8.0, "root_radius": 8.0, "toe_radius": 0.0, "heel_radius": 0.0
    }  # fmt: skip
    assert repr(shape).startswith("<angle leg_x 80, leg_y 60, thickness 8, root_radius 8: Outline 80 x 60, 7 edges")
    with pytest.raises(TypeError):
        shape.dimensions["leg_x"] = 1.0
    with pytest.raises(AttributeError):
        shape.kind = "tee"
    assert shape == Outline(shape.vertices, shape.bulges)
    assert hash(shape) == hash(Outline(shape.vertices, shape.bulges))


def test_every_function_is_named_as_its_kind_and_its_parameters_as_the_dimensions():
    import inspect

    made = [
        shapes.rectangle(30, 10), shapes.round_bar(9), shapes.tube(9, 1), shapes.angle(9, 9, 1),
        shapes.tee(9, 9, 1, 1), shapes.channel(9, 9, 1, 1), shapes.zee(9, 9, 1, 1), shapes.wide_flange(9, 9, 1, 1),
        shapes.box(9, 9, 1), shapes.ellipse(9, 5), shapes.regular(5, 9), shapes.flatted_bar(9, 7),
        shapes.keyed_shaft(9, 2, 1), shapes.splined_shaft(6, 28, 23, 6), shapes.cross(9, 9, 1),
        shapes.multi_cell(9, 9, 1, 2), shapes.finned_box(9, 9, 1, 3, 1), shapes.extrusion(9, 9, []),
        shapes.plate_girder(9, 1, top_width=4, top_thickness=1, bottom_width=5, bottom_thickness=1),
    ]  # fmt: skip
    assert {shape.kind for shape in made} == set(shapes.__all__) - {"TradeShape"}
    for shape in made:
        parameters = set(inspect.signature(getattr(shapes, shape.kind)).parameters)
        assert set(shape.dimensions) == parameters, shape


def test_copies_keep_kind_and_scale_lengths_only():
    shape = shapes.channel(100, 50, 8.5, 6, 8.5, toe_radius=4.5, flange_slope=0.08)
    for copy in (shape.translated(1, 2), shape.rotated(1.0), shape.mirrored(), pickle.loads(pickle.dumps(shape))):
        assert copy.kind == "channel"
        assert copy.dimensions == shape.dimensions
    twice = shape.scaled(2.0)
    assert twice.dimensions["depth"] == 200.0
    assert twice.dimensions["flange_slope"] == 0.08
    assert twice.matches(shapes.channel(200, 100, 17, 12, 17, toe_radius=9, flange_slope=0.08))
    nut = shapes.regular(6, 10).scaled(3.0)
    assert dict(nut.dimensions) == {"sides": 6.0, "across_flats": 30.0, "corner_radius": 0.0}


def test_filleting_a_sharp_shape_gives_the_shape_with_that_radius():
    for sharp, filleted in (
        (shapes.angle(80, 80, 8), shapes.angle(80, 80, 8, 8)),
        (shapes.box(100, 60, 8), shapes.box(100, 60, 8, 0, 8)),
        (shapes.keyed_shaft(50, 14, 5.5), shapes.keyed_shaft(50, 14, 5.5, 8 / 8)),
    ):
        radius = max(filleted.dimensions.get("root_radius", 0), filleted.dimensions.get("inner_radius", 0))
        copy = sharp.filleted(radius)
        assert copy.matches(filleted)
        assert (copy.kind, dict(copy.dimensions)) == (filleted.kind, dict(filleted.dimensions))
    plain = shapes.angle(80, 80, 8).filleted(2.0, at=[1])
    assert type(plain) is Outline


def test_shapes_state_their_plates_and_cells():
    plates = shapes.angle(80, 60, 8, 8).rotated(0.3).plates()
    assert sorted((plate.width, plate.thickness) for plate in plates) == [(56.0, 8.0), (76.0, 8.0)]
    full = shapes.angle(80, 60, 8, 8).plates("full_depth")
    assert sorted(plate.width for plate in full) == [60.0, 80.0]
    for shape in (
        shapes.rectangle(30, 10), shapes.tee(9, 9, 1, 1), shapes.channel(9, 9, 1, 1), shapes.zee(9, 9, 1, 1),
        shapes.wide_flange(9, 9, 1, 1),
    ):  # fmt: skip
        assert len(shape.plates().plates) >= 1
    assert shapes.tube(50, 5).thin_cells().areas[0] == pytest.approx(math.pi * 22.5**2)
    with pytest.raises(InputError, match="round bar is no set of plates"):
        shapes.round_bar(5).plates()


IMPOSSIBLE = [
    (lambda: shapes.angle(10, 80, 12), "thickness 12 must be less than leg_x 10"),
    (lambda: shapes.angle(80, 10, 12), "thickness 12 must be less than leg_y 10"),
    (lambda: shapes.angle(80, 80, 8, 0, 9), "toe_radius 9 must be at most thickness 8"),
    (lambda: shapes.angle(80, 80, 8, 80), "root_radius 80 does not fit at vertex 3 .* allow 72 at most"),
    (lambda: shapes.angle(80, 80, 8, heel_radius=90), "heel_radius 90 does not fit .* allow 80 at most"),
    (lambda: shapes.rectangle(30, 10, 6), "corner_radius 6 must be at most half of the shorter side 5"),
    (lambda: shapes.tube(50, 25), "twice the wall 50 must be less than outer_diameter 50"),
    (lambda: shapes.box(50, 30, 15), "twice the wall 30 must be less than height 30"),
    (lambda: shapes.box(100, 100, 4, 40, 0), "void 0 crosses the outer loop"),
    (lambda: shapes.tee(50, 50, 60, 4), "thickness at the web 60 must be less than depth 50"),
    (lambda: shapes.tee(50, 50, 6, 50), "web_thickness 50 must be less than flange_width 50"),
    (lambda: shapes.wide_flange(100, 50, 50, 6), "twice .* at the web 100 must be less than depth 100"),
    (
        lambda: shapes.channel(100, 50, 8, 6, flange_slope=0.4),
        r"flange_slope \* thickness_at 10 must be less than flange_thickness 8",
    ),
    (
        lambda: shapes.channel(100, 50, 8, 6, flange_slope=0.1, toe_radius=6),
        "toe_radius 6 must be at most the flange's thickness at its toe 5.5",
    ),
    (lambda: shapes.channel(100, 50, 8, 6, thickness_at=60), "thickness_at 60 must be at most flange_width 50"),
    (lambda: shapes.zee(20, 50, 10, 6), "twice the flange_thickness 20 must be less than depth 20"),
    (lambda: shapes.cross(60, 60, 60), "thickness 60 must be less than height 60"),
    (lambda: shapes.regular(2, 9), "sides must be a whole number from 3 to 1000, got 2"),
    (lambda: shapes.regular(6.5, 9), "sides must be a whole number"),
    (lambda: shapes.flatted_bar(40, 40), "across_flat 40 must be less than diameter 40"),
    (lambda: shapes.flatted_bar(40, 30, flats=3), "flats must be a whole number from 1 to 2, got 3"),
    (lambda: shapes.keyed_shaft(50, 50, 5), "key_width 50 must be less than diameter 50"),
    (lambda: shapes.keyed_shaft(50, 14, 0.5), "height over the keyway's edges 1 must be less than key_depth 0.5"),
    (lambda: shapes.keyed_shaft(50, 14, 49.5), "key_depth 49.5 must be less than .* 49"),
    (lambda: shapes.keyed_shaft(50, 14, 5, bore_diameter=41), "bore_diameter 41 must be less than .* 40"),
    (lambda: shapes.splined_shaft(6, 28, 30, 6), "root_diameter 30 must be less than outer_diameter 28"),
    (lambda: shapes.splined_shaft(6, 28, 23, 12), r"tooth_width 12 must be less than .* 11\.5"),
    (lambda: shapes.ellipse(1, 0.0005), "longer axis 1 must be at most 1000 times the shorter 0.5"),
    (lambda: shapes.multi_cell(20, 20, 2, 9, web=2), r"\(columns - 1\) web 20 must be less than width 20"),
    (lambda: shapes.extrusion(20, 20, [(2, 2, 18, 5)]), "void 0: its right side at 20 .* width 20"),
    (lambda: shapes.extrusion(20, 20, [(2, 2, -1, 5)]), "void 0: width must be greater than 0, got -1"),
    (lambda: shapes.extrusion(20, 20, [(2, 2, 5)]), r"void 0 must be \(left, bottom, width, height\)"),
    (lambda: shapes.extrusion(20, 20, [(2, 2, 5, 5), (6, 6, 5, 5)]), "voids 0 and 1 touch or overlap at"),
    (lambda: shapes.round_bar(-3), "diameter must be greater than 0, got -3"),
    (lambda: shapes.round_bar(math.nan), "diameter must be finite"),
    (lambda: shapes.round_bar("9"), "diameter must be a number, got '9'"),
    (lambda: shapes.rectangle(True, 3), "width must be a number, got True"),
    (lambda: shapes.rectangle(3, 3, -1), "corner_radius must be 0 or more, got -1"),
    (lambda: shapes.round_bar(1e300), "diameter must be from 1e-40 to 1e.40, got 1e.300"),
]


@pytest.mark.parametrize(("make", "message"), IMPOSSIBLE)
def test_impossible_dimensions_say_which_inequality_failed(make, message):
    with pytest.raises(OutlineError, match=message):
        make()


@settings(max_examples=60, deadline=None)
@given(st.data())
def test_any_dimensions_give_a_shape_or_an_outline_error(data):
    def size():
        return data.draw(st.floats(-1.0, 30.0))

    makers = [
        lambda: shapes.angle(size(), size(), size(), size(), size()),
        lambda: shapes.channel(size(), size(), size(), size(), size(), flange_slope=size() / 100.0),
        lambda: shapes.wide_flange(size(), size(), size(), size(), size(), toe_radius=size()),
        lambda: shapes.box(size(), size(), size(), size(), size()),
        lambda: shapes.keyed_shaft(size(), size(), size(), size()),
        lambda: shapes.splined_shaft(int(size()), size(), size(), size(), size()),
        lambda: shapes.flatted_bar(size(), size()),
    ]
    try:
        shape = data.draw(st.sampled_from(makers))()
    except OutlineError:
        return
    assert shape.area > 0.0
    np.testing.assert_allclose(shape.polygon(1e-6 * shape.size).area, shape.area, rtol=1e-3)
