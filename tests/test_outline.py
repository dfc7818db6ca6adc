"""Outlines: validation, moments, transforms, comparison, union and difference."""

import math
import pickle

import numpy as np
import pytest
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from torsionfe.errors import InputError, OutlineError
from torsionfe.outline import shapes
from torsionfe.outline.boolean import union
from torsionfe.outline.outline import Outline

SQUARE = Outline([(0, 0), (10, 0), (10, 10), (0, 10)])
SLOT = shapes.rectangle(2, 30).translated(5, 5)
TURN = st.floats(-7.0, 7.0)
STEP = st.tuples(st.floats(-50.0, 50.0), st.floats(-50.0, 50.0))


@st.composite
def outlines(draw):
    """Star-shaped loops of straight edges and arcs, some with a round void."""
    n = draw(st.integers(3, 9))
    radius = np.array(draw(st.lists(st.floats(5.0, 12.0), min_size=n, max_size=n)))
    angle = 2.0 * math.pi * (np.arange(n) + 0.5 * np.array(draw(st.lists(st.floats(0, 1), min_size=n, max_size=n)))) / n
    bulges = draw(st.lists(st.sampled_from([0.0, 0.1, -0.1, 0.2]), min_size=n, max_size=n))
    voids = [shapes.round_bar(1.0).translated(0.3, 0.1)] if draw(st.booleans()) else []
    try:
        return Outline(radius[:, None] * np.stack([np.cos(angle), np.sin(angle)], axis=1), bulges, voids)
    except OutlineError:  # a bulge or a wide step may reach the void or fold the loop
        return Outline([(0, 0), (30, 0), (30, 8), (8, 8), (8, 20), (0, 20)], [0, 0.3, 0, 0, 0, 0])


# --- validation ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("vertices", "bulges", "message", "at"),
    [
        ([(0, 0), (10, 10), (10, 0), (0, 10)], None, r"crosses itself at \(5, 5\)", (5, 5)),
        ([(0, 0), (10, 0), (10, 10), (5, 0), (0, 10)], None, r"touches itself at \(5, 0\)", (5, 0)),
        ([(0, 0), (10, 0), (10, 10), (5, 1e-8), (0, 10)], None, r"edges 0 and 3 touch at \(5, ", (5, 0)),
        ([(0, 0), (10, 0), (10, 0), (0, 10)], None, r"vertices 1 and 2 are the same point, \(10, 0\)", (10, 0)),
        ([(0, 0), (10, 0), (0, 10), (0, 0)], None, "3 and 0 are the same .* not repeated at the end", (0, 0)),
        ([(0, 0), (5, 0), (10, 0)], None, "encloses no area", (0, 0)),
        ([(3, 4)] * 3, None, r"every vertex is at \(3, 4\)", (3, 4)),
        ([(0, 0), (10, 0), (10, 10), (9.99, 0.01)], None, "fold back on each other", None),
        ([(0, 0), (10, 0)], None, "a loop needs 3 vertices", None),
        ([(0, 0), (10, 0), (5, 5)], [0, 0], "one bulge an edge is needed: 3 vertices but 2 bulges", None),
        ([(0, 0), (10, 0), (5, 5)], [0, 60, 0], r"bulge 60 of edge 1 at \(10, 0\) is nearly a full circle", (10, 0)),
        ([(0, 0), (10, 0), (5, 5)], [0, math.nan, 0], r"bulges\[1\] is not finite", None),
        ([(0, 0), (math.inf, 0), (5, 5)], None, r"vertices\[1\] is not finite", None),
        ([(0, 0, 0), (1, 0, 0), (0, 1, 0)], None, r"shape \(n, 2\), got \(3, 3\)", None),
        ("abc", None, "vertices must be numbers", None),
        ([], None, "vertices must have the shape", None),
        ([(0, 0), (1e50, 0), (0, 1e50)], None, "too far out", (1e50, 0)),
        ([(0, 0), (1e-50, 0), (0, 1e-50)], None, "1e-50 across", (0, 0)),
        ([(1e12, 0), (1e12 + 1, 0), (1e12, 1)], None, "lose their digits: move it nearer", (1e12 + 1, 0)),
    ],
)
def test_what_is_no_outline_is_named_with_its_place(vertices, bulges, message, at):
    with pytest.raises(OutlineError, match=message) as caught:
        Outline(vertices, bulges)
    if at is not None:
        assert caught.value.at == pytest.approx(at, abs=1e-6)


@pytest.mark.parametrize(
    ("void", "message"),
    [
        (shapes.round_bar(2).translated(20, 5), "void 0 at .* lies outside the outer loop"),
        (shapes.round_bar(2).translated(10, 5), "void 0 crosses the outer loop"),
        (shapes.rectangle(2, 2).translated(9, 5), r"void 0 touches the outer loop at \(10, "),
        (shapes.rectangle(40, 40), "void 0"),
        (shapes.tube(4, 1).translated(5, 5), "void 0 at .* has voids of its own"),
        ([(1, 1), (2, 1), (2, 2)], "void 0 must be an Outline, got list"),
    ],
)
def test_voids_that_are_none(void, message):
    with pytest.raises(OutlineError, match=message):
        Outline(SQUARE.vertices, voids=[void])


@pytest.mark.parametrize("voids", [5, None, True, SQUARE.scaled(0.1)])
def test_voids_that_are_no_list(voids):
    with pytest.raises(OutlineError, match=r"voids must be a list of Outlines, got \w+: write voids=\[void\]"):
        Outline(SQUARE.vertices, voids=voids)


def test_chords_never_cross_where_a_wall_is_thinner_than_they_are_coarse():
    void = shapes.round_bar(1.0).translated(0.4995, 0.0).rotated(0.7)  # 5e-4 from the outer arc
    outline = Outline([(-1, 0), (1, 0)], [1, 1], [void])
    for tolerance in (1e-2, 1e-3, 1e-5):
        polygon = outline.polygon(tolerance)
        assert polygon.is_valid
        assert polygon.area == pytest.approx(outline.area, rel=4.0 * tolerance)
    coarse = Outline([(-1, 0), (1, 0)], [1, 1]).polygon(1e-2)
    assert len(coarse.exterior.coords) < 40  # no finer than asked where nothing crosses


def test_voids_must_be_apart():
    left = shapes.rectangle(2, 2).translated(3, 5)
    with pytest.raises(OutlineError, match=r"voids 0 and 1 touch or overlap at \(4, "):
        Outline(SQUARE.vertices, voids=[left, left.translated(2, 0)])


def test_orientation_is_put_right_and_vertex_0_stays():
    clockwise = Outline([(0, 0), (0, 10), (10, 10), (10, 0)], [0, -0.2, 0, 0])
    assert clockwise.vertices.tolist() == [[0, 0], [10, 0], [10, 10], [0, 10]]
    assert clockwise.bulges.tolist() == [0, 0, 0.2, 0]
    assert clockwise.area > 100.0


def test_outlines_cannot_be_changed():
    with pytest.raises(ValueError, match="read-only"):
        SQUARE.vertices[0, 0] = 3.0
    with pytest.raises(AttributeError):
        SQUARE.vertices = 3.0
    with pytest.raises(ValueError, match="read-only"):
        SQUARE.edges.bulge[0] = 3.0
    given = np.array([(0.0, 0), (10, 0), (10, 10)])
    outline = Outline(given)
    given[0] = 7.0
    assert outline.vertices[0].tolist() == [0, 0]


def test_bulges_under_rounding_are_straight():
    assert Outline(SQUARE.vertices, [1e-12, 0, -1e-300, 0]) == SQUARE


# --- what it measures ----------------------------------------------------------------------------------


@settings(max_examples=50, deadline=None)
@given(outlines())
def test_moments_agree_with_shapely_and_a_fan_of_triangles(outline):
    polygon = outline.polygon(1e-7 * outline.size)
    area, centroid, second = outline.edges.moments()
    assert area == pytest.approx(outline.area, rel=1e-12)
    assert area == pytest.approx(polygon.area, rel=1e-6)
    assert outline.centroid == pytest.approx((polygon.centroid.x, polygon.centroid.y), abs=1e-6 * outline.size)
    # int y^2 and the like over the polygon, from triangles with the origin (exact for polygons)
    total = np.zeros(3)
    for number, ring in enumerate((polygon.exterior, *polygon.interiors)):
        p = np.asarray(shapely.geometry.polygon.orient(shapely.Polygon(ring)).exterior.coords) - centroid
        sign = -1.0 if number else 1.0
        (x, y), (u, v) = p[:-1].T, p[1:].T
        cross = x * v - u * y
        total[0] += sign * np.sum(cross * (y * y + y * v + v * v)) / 12.0
        total[1] += sign * np.sum(cross * (x * x + x * u + u * u)) / 12.0
        total[2] += sign * np.sum(cross * (x * v + 2.0 * x * y + 2.0 * u * v + u * y)) / 24.0
    np.testing.assert_allclose(second, total, rtol=1e-5, atol=1e-5 * total[:2].max())
    assert outline.bounds == pytest.approx(polygon.bounds, abs=1e-6 * outline.size)
    assert outline.perimeter == pytest.approx(polygon.length, rel=1e-6)


def test_the_half_circle_has_its_textbook_moments():
    half = Outline([(-3, 0), (3, 0)], [0.0, 1.0])  # Timoshenko: centroid 4 r / (3 pi), I_x = r^4 (pi/8 - 8/(9 pi))
    area, centroid, second = half.edges.moments()
    assert area == pytest.approx(4.5 * math.pi)
    np.testing.assert_allclose(centroid, (0.0, 4.0 / math.pi), atol=1e-14)
    np.testing.assert_allclose(
        second, (81.0 * (math.pi / 8.0 - 8.0 / (9.0 * math.pi)), 81.0 * math.pi / 8.0, 0.0), atol=1e-12
    )
    assert half.bounds == pytest.approx((-3, 0, 3, 3))


def test_polygon_holds_the_tolerance():
    ring = shapes.tube(20, 2)
    for tolerance in (0.1, 1e-3, 1e-5):
        polygon = ring.polygon(tolerance)
        x = np.asarray(polygon.exterior.segmentize(0.01).coords)
        assert 10.0 - np.hypot(*x.T).min() < tolerance * 1.0001
    with pytest.raises(InputError, match="tolerance must be greater than 0"):
        ring.polygon(0.0)


# --- changed copies ------------------------------------------------------------------------------------


@settings(max_examples=50, deadline=None)
@given(outlines(), TURN, STEP, st.floats(0.01, 100.0))
def test_transforms_keep_what_they_should(outline, turn, step, factor):
    moved = outline.rotated(turn, step).translated(*step)
    assert moved.area == pytest.approx(outline.area, rel=1e-10)
    assert moved.perimeter == pytest.approx(outline.perimeter, rel=1e-10)
    np.testing.assert_allclose(np.sort(moved.edges.length), np.sort(outline.edges.length), rtol=1e-8)
    second, before = moved.edges.moments()[2], outline.edges.moments()[2]
    assert second[:2].sum() == pytest.approx(before[:2].sum(), rel=1e-8)
    assert second[0] * second[1] - second[2] ** 2 == pytest.approx(before[0] * before[1] - before[2] ** 2, rel=1e-7)
    assert moved.translated(-step[0], -step[1]).rotated(-turn, step).matches(outline, 1e-10 * (60 + outline.size))
    scaled = outline.scaled(factor, step)
    assert scaled.area == pytest.approx(outline.area * factor**2, rel=1e-9)
    np.testing.assert_allclose(scaled.edges.moments()[2], before * factor**4, rtol=1e-7, atol=1e-8 * factor**4)
    assert scaled.bulges.tolist() == outline.bulges.tolist()


@settings(max_examples=50, deadline=None)
@given(outlines(), TURN, STEP)
def test_a_mirror_twice_is_nothing_and_once_turns_the_product_moment(outline, angle, about):
    once = outline.mirrored(angle, about)
    assert once.area == pytest.approx(outline.area, rel=1e-10)
    assert once.mirrored(angle, about).matches(outline, 1e-10 * (60 + outline.size))
    level = outline.mirrored(0.0)
    assert level.vertices[0].tolist() == pytest.approx([outline.vertices[0, 0], -outline.vertices[0, 1]])
    before, after = outline.edges.moments()[2], level.edges.moments()[2]
    np.testing.assert_allclose(after, before * [1, 1, -1], rtol=1e-8, atol=1e-7)


def test_the_default_mirror_swaps_left_and_right():
    assert shapes.angle(30, 20, 3).mirrored().bounds == pytest.approx((-30, 0, 0, 20))
    assert shapes.angle(30, 20, 3).rotated(math.pi / 2.0).bounds == pytest.approx((-20, 0, 0, 30))
    assert shapes.angle(30, 20, 3).scaled(2.0, about=(30, 0)).bounds == pytest.approx((-30, 0, 30, 40))


@pytest.mark.parametrize(
    "change",
    [
        lambda o: o.translated(math.nan, 0),
        lambda o: o.rotated("1"),
        lambda o: o.scaled(0.0),
        lambda o: o.scaled(-1.0),
        lambda o: o.mirrored(0.0, (0, math.inf)),
        lambda o: o.rotated(True),
    ],
)
def test_transforms_refuse_what_is_no_number(change):
    with pytest.raises(InputError, match="must be"):
        change(SQUARE)


# --- comparing and showing -----------------------------------------------------------------------------


def test_equality_hash_and_pickle():
    a = shapes.box(20, 10, 2, 3, 1)
    b = pickle.loads(pickle.dumps(a))
    assert a == b
    assert hash(a) == hash(b)
    assert a != a.translated(1e-9, 0)
    assert a != "box"
    assert Outline(SQUARE.vertices, [0.1, 0, 0, 0]) != SQUARE
    assert len({a, b, SQUARE}) == 2


def test_matching_ignores_where_loops_start():
    p = [(0, 0), (10, 0), (10, 10), (0, 10)]
    holes = [shapes.round_bar(2).translated(3, 3), shapes.rectangle(2, 1).translated(7, 7)]
    a = Outline(p, [0, 0.1, 0, 0], holes)
    b = Outline(p[2:] + p[:2], [0, 0, 0, 0.1], holes[::-1])
    assert a != b
    assert a.matches(b)
    assert a.matches(b.translated(1e-10, 0))
    assert not a.matches(b.translated(1e-3, 0))
    assert a.matches(b.translated(1e-3, 0), tolerance=2e-3)
    assert not a.matches(Outline(p, [0, -0.1, 0, 0], holes))
    assert not a.matches(Outline(p, [0, 0.1, 0, 0], holes[:1]))
    assert not a.matches(Outline(p, [0, 0.1, 0, 0], [holes[0], holes[0].translated(4, 4)]))
    assert not a.matches(SQUARE)


def test_repr_tells_size_loops_arcs_and_area():
    assert repr(SQUARE) == "<Outline 10 x 10, 4 edges, 0 arcs, 0 voids, area 100>"
    bitten = Outline(SQUARE.vertices, [0, 0, 0, -0.5], [shapes.round_bar(2).translated(6, 5)])
    assert repr(bitten).startswith("<Outline 10 x 10, 8 edges, 5 arcs, 1 void, area ")


# --- shapely -------------------------------------------------------------------------------------------


def test_polygons_in_and_out():
    polygon = shapely.Polygon([(0, 0), (9, 0), (9, 9), (0, 9)], [[(2, 2), (4, 2), (4, 4), (2, 4)]])
    outline = Outline.from_polygon(polygon)
    assert outline.area == polygon.area == 77.0
    assert outline.polygon().equals(polygon)
    assert Outline.from_polygon(shapely.MultiPolygon([polygon])) == outline


def test_polygons_are_cleaned_of_repeated_points():
    doubled = shapely.Polygon([(0, 0), (9, 0), (9, 0), (9, 1e-9), (9, 9), (0, 9, ), (0, 9)])
    assert len(Outline.from_polygon(doubled).vertices) == 4
    high = shapely.Polygon([(0, 0, 5), (9, 0, 5), (9, 9, 5)])
    assert Outline.from_polygon(high).area == 40.5


@pytest.mark.parametrize(
    ("polygon", "message"),
    [
        (shapely.Polygon(), "a non-empty shapely Polygon is needed"),
        (shapely.MultiPolygon(), "a non-empty shapely Polygon is needed"),
        (shapely.Point(0, 0).buffer(0), "a non-empty shapely Polygon is needed"),
        (shapely.LineString([(0, 0), (1, 1)]), "a non-empty shapely Polygon is needed, got <LINESTRING"),
        ("POLYGON", "a non-empty shapely Polygon is needed, got 'POLYGON'"),
        (None, "needed, got None"),
        (shapely.Polygon([(0, 0), (9, 9), (9, 0), (0, 9)]), r"crosses itself at \(4\.5, 4\.5\)"),
        (shapely.Polygon([(0, 0), (9, 9), (18, 18)]), "encloses no area"),
        (
            shapely.MultiPolygon([shapely.box(0, 0, 1, 1), shapely.box(2, 0, 3, 1)]),
            r"has 2 parts, around \(0\.5, 0\.5\), \(2\.5, 0\.5\): .*polygon.geoms",
        ),
    ],
)
def test_what_is_no_polygon(polygon, message):
    with pytest.raises(OutlineError, match=message):
        Outline.from_polygon(polygon)


# --- union and difference ------------------------------------------------------------------------------


def test_abutting_parts_become_one_without_a_seam():
    joined = SQUARE.union(SQUARE.translated(10, 0))
    assert joined.matches(Outline([(0, 0), (20, 0), (20, 10), (0, 10)]))
    stepped = SQUARE.union(SQUARE.translated(10, 3))
    assert len(stepped.vertices) == 8
    assert stepped.area == 200.0
    corner = shapes.angle(20, 20, 3)
    leg_x, leg_y = shapes.rectangle(20, 3).translated(10, 1.5), shapes.rectangle(3, 17).translated(1.5, 11.5)
    assert corner.matches(leg_x.union(leg_y))


def test_arcs_stay_arcs():
    end = shapes.round_bar(10)
    stadium = shapes.rectangle(20, 10).union(end.translated(10, 0)).union(end.translated(-10, 0))
    assert len(stadium.vertices) == 6
    assert stadium.area == pytest.approx(200.0 + 25.0 * math.pi, rel=1e-13)
    np.testing.assert_allclose(stadium.edges.radius[stadium.bulges != 0], 5.0)


def test_a_hole_a_filled_hole_and_a_divided_hole():
    ring = shapes.round_bar(50).difference(shapes.round_bar(40))
    assert ring.matches(shapes.tube(50, 5))
    assert ring.union(shapes.round_bar(40)).matches(shapes.round_bar(50))
    bridged = ring.union(shapes.rectangle(45, 4))
    assert len(bridged.voids) == 2
    strip = 2.0 * (2.0 * math.sqrt(400.0 - 4.0) + 400.0 * math.asin(0.1))  # of the bore, 4 wide
    assert bridged.area == pytest.approx(ring.area + strip, rel=1e-12)


def test_the_same_twice():
    assert SQUARE.union(SQUARE).matches(SQUARE)
    assert SQUARE.union(shapes.rectangle(2, 2).translated(5, 5)).matches(SQUARE)
    shape = shapes.splined_shaft(6, 28, 23, 6, 0.3)
    assert shape.union(shape.rotated(math.pi / 3.0)).matches(shape, 1e-6)


@pytest.mark.parametrize(
    ("make", "message"),
    [
        (lambda: SQUARE.union(SQUARE.translated(20, 0)), r"union is in 2 pieces, around \(5, 5\), \(25, 5\)"),
        (lambda: SQUARE.union(SQUARE.translated(10, 10)), "union is in 2 pieces"),
        (lambda: SQUARE.difference(SLOT), r"in 2 pieces, around \(2, 5\), \(8, 5\)"),
        (lambda: SQUARE.difference(SQUARE), r"nothing is left of the outline at \(0, 0\)"),
        (lambda: SQUARE.difference(shapes.round_bar(50)), "nothing is left"),
        (lambda: shapes.round_bar(10).difference(shapes.round_bar(5).translated(2.5, 0)), "touches|fold back"),
        (lambda: SQUARE.union("box"), "the union needs two Outlines, the second is a str"),
        (lambda: union(None, SQUARE), "the first is a NoneType"),
    ],
)
def test_results_that_are_no_cross_section(make, message):
    with pytest.raises(OutlineError, match=message):
        make()


PARTS = [
    shapes.rectangle(10, 4), shapes.round_bar(7), shapes.tube(12, 2), shapes.angle(12, 10, 2, 2, 1),
    shapes.box(12, 8, 1, 2, 1), shapes.regular(6, 10), shapes.flatted_bar(10, 8), shapes.channel(12, 8, 2, 2, 2),
]  # fmt: skip


def combined(how, a, b):
    """The result, or None where it is no cross-section; never an unsure one."""
    try:
        return how(a, b)
    except OutlineError as error:
        if "cannot be told" in str(error):
            raise
        return None


@settings(max_examples=60, deadline=None)
@given(
    st.sampled_from(PARTS),
    st.sampled_from(PARTS),
    st.one_of(TURN, st.integers(0, 7).map(lambda k: k * math.pi / 4.0)),
    st.one_of(STEP.map(lambda s: (s[0] / 8, s[1] / 8)), st.tuples(st.integers(-8, 8), st.integers(-8, 8))),
    TURN,
)
def test_union_and_difference_add_up(first, second, turn, step, whole):
    a, b = first.rotated(whole), second.rotated(turn).translated(*step).rotated(whole)
    results = {"union": combined(Outline.union, a, b), "difference": combined(Outline.difference, a, b)}
    p, q = a.polygon(1e-6), b.polygon(1e-6)
    exact = {"union": p.union(q), "difference": p.difference(q)}
    results = {name: result for name, result in results.items() if result is not None}
    for name, result in results.items():
        assert result.area == pytest.approx(exact[name].area, abs=1e-4 * a.size)
    if len(results) == 2:  # |A or B| = |A less B| + |B|
        assert results["union"].area == pytest.approx(results["difference"].area + b.area, rel=1e-7)
        # every arc of the result lies on a circle of one of the two
        radii = np.unique(np.concatenate([a.edges.radius, b.edges.radius]).round(6))
        assert np.isin(results["union"].edges.radius.round(6), radii).all()
