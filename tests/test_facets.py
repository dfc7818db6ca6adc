"""Arcs restored from chains of chords.

The check is the outline that the chords were made from: its arcs, its area, its tangents. What chords do to
the peak stress (15 % at 8 chords a fillet, 5 % at 16) was measured in the design study for this package.
"""

import numpy as np
import pytest
import shapely
from drawn import angle, assert_same_shape, circle, faceted, rectangle
from hypothesis import given, settings
from hypothesis import strategies as st

from torsionfe.errors import InputError
from torsionfe.outline.facets import restore_arcs
from torsionfe.outline.outline import Outline

RNG = np.random.default_rng(4)
SHAPES = {
    "fillet": angle().filleted(8.0),
    "small fillet": angle().filleted(0.5),
    "fillet and toe": angle().filleted(6.0).filleted(4.0, at=[2]),
    "rounded plate": rectangle(60.0, 40.0).filleted(6.0, at=[0, 1, 2, 3]),
    "void with fillets": Outline(
        rectangle(60.0, 40.0).vertices,
        voids=[rectangle(40.0, 20.0, 10.0, 10.0).filleted(5.0, at=[0, 1, 2, 3])],
    ),
    "slot": Outline([(0, 0), (60, 0), (60, 40), (0, 40)], [0, 1, 0, 1]),
}


@pytest.mark.parametrize("name", SHAPES)
@pytest.mark.parametrize("spacing", ["even", "random", "partial", "graded"])
@pytest.mark.parametrize("chords", [10, 16, 64])
def test_the_outline_that_the_chords_came_from_is_restored(name, spacing, chords):
    outline = SHAPES[name]
    result = restore_arcs(faceted(outline, chords, spacing, rng=RNG))
    assert result.arcs_restored == np.count_nonzero(outline.edges.bulge)
    assert result.chains_left == ()
    assert_same_shape(outline, result.outline, rel=1e-10)


@pytest.mark.parametrize("decimals", [3, 4, 5, 6])
@pytest.mark.parametrize("name", SHAPES)
@pytest.mark.parametrize("chords", [6, 16, 40])
def test_rounded_coordinates_cost_what_they_were_rounded_by(name, decimals, chords):
    outline = SHAPES[name]
    result = restore_arcs(faceted(outline, chords, "even", decimals))
    assert result.chains_left == ()
    assert_same_shape(outline, result.outline, rel=5 * 10.0**-decimals / 40.0)
    # and the arcs are tangent to the straight edges beside them, however the points were rounded
    assert max(abs(kink) for arc in result.arcs for kink in arc.kinks) < 1e-8
    angles = result.outline.edges.interior_angle
    square = np.min(np.abs(angles[:, None] - np.pi * np.array([0.5, 1.0, 1.5])), axis=1)
    assert square.max() < 3e-4


@pytest.mark.parametrize("radians", [0.3, 1.0, 2.5])
def test_chords_that_were_moved_and_turned(radians):
    outline = SHAPES["fillet and toe"].rotated(radians).translated(123.4, -56.7)
    result = restore_arcs(faceted(outline, 12))
    assert_same_shape(outline, result.outline, rel=1e-10)


def test_three_chords_are_the_fewest_and_thirty_degrees_the_most():
    assert restore_arcs(faceted(SHAPES["fillet"], 3)).arcs_restored == 1
    two = restore_arcs(faceted(SHAPES["fillet"], 2))
    assert two.arcs_restored == 0
    assert two.chains_left == ()  # 45 degrees: a bevel, as far as anyone can tell


def test_chords_that_touch_the_arc_instead_of_ending_on_it():
    # a fillet of radius 8 drawn by its tangents: the vertices lie outside, the legs run on to the first one
    turn = np.radians(90.0) / 8
    vertex = np.arange(8)[::-1] + 0.5
    radius = 8.0 / np.cos(0.5 * turn)
    at = np.pi + turn * vertex
    fillet = np.stack([16 + radius * np.cos(at), 16 + radius * np.sin(at)], axis=1)
    outline = Outline(np.vstack([[(0, 0), (80, 0), (80, 8)], fillet, [(8, 80), (0, 80)]]))
    result = restore_arcs(outline)
    assert_same_shape(SHAPES["fillet"], result.outline, rel=1e-10)


@pytest.mark.parametrize("sides", [3, 4, 5, 6, 8, 10, 12, 14, 15])
@pytest.mark.parametrize("decimals", [None, 3])
def test_polygons_that_are_meant_stay(sides, decimals):
    turn = 2.0 * np.pi * np.arange(sides) / sides
    points = 20.0 * np.stack([np.cos(turn), np.sin(turn)], axis=1)
    nut = Outline(points if decimals is None else points.round(decimals), voids=[circle(0, 0, 5)])
    result = restore_arcs(nut)
    assert result.arcs_restored == 0
    assert result.outline == nut
    # from 12 sides on it might have been a circle, so that is told
    assert [chain.chords for chain in result.chains_left] == ([sides] if sides >= 12 else [])
    if sides >= 12:
        assert f"closed polygon of {sides} sides is taken as meant" in str(result)


@pytest.mark.parametrize("sides", [16, 17, 32, 500])
def test_closed_loops_of_many_chords_are_circles(sides):
    turn = 2.0 * np.pi * np.arange(sides) / sides
    points = np.stack([np.cos(turn), np.sin(turn)], axis=1)
    result = restore_arcs(Outline(20.0 * points, voids=[Outline(5.0 * points + [3.0, 4.0])]))
    assert [arc.radius for arc in result.arcs] == pytest.approx([20.0, 5.0], rel=1e-12)
    assert result.outline.area == pytest.approx(np.pi * 375.0, rel=1e-12)
    assert [arc.re_entrant for arc in result.arcs] == [False, True]
    assert result.arcs[1].centre == pytest.approx((3.0, 4.0))


def test_a_flat_on_a_round_bar_stays_flat():
    bar = Outline([(12.0, 16.0), (12.0, -16.0)], [np.tan((np.pi - np.arctan2(16, 12)) / 2.0), 0.0])
    result = restore_arcs(faceted(bar, 40))
    assert_same_shape(bar, result.outline, rel=1e-10)
    assert abs(np.degrees(result.arcs[0].kinks[1])) == pytest.approx(np.degrees(np.arctan2(16, 12)))


def test_two_arcs_that_run_into_each_other():
    # radius 20 over 40 degrees, then radius 8 over 50, then straight on
    a, b = np.radians(40.0), np.radians(50.0)
    joint = np.array([20 * np.sin(a), 20 - 20 * np.cos(a)])
    end = np.array([12 * np.sin(a) + 8, 20 - 12 * np.cos(a)])
    top = end[1] + 20
    points = [(0, 0), joint, end, (end[0], top), (-15, top), (-15, 0)]
    outline = Outline(points, [np.tan(a / 4), np.tan(b / 4), 0, 0, 0, 0])
    for spacing in ("even", "random", "partial"):
        result = restore_arcs(faceted(outline, 10, spacing, rng=RNG))
        assert_same_shape(outline, result.outline, rel=1e-10)


@pytest.mark.parametrize("count", [24, 32, 48, 100, 300, 1000])
@pytest.mark.parametrize("decimals", [None, 4])
def test_an_ellipse_is_no_chain_of_circles(count, decimals):
    turn = 2.0 * np.pi * np.arange(count) / count
    points = np.stack([50.0 * np.cos(turn), 25.0 * np.sin(turn)], axis=1)
    hole = Outline(points if decimals is None else points.round(decimals))
    result = restore_arcs(Outline(rectangle(140.0, 80.0, -70.0, -40.0).vertices, voids=[hole]))
    if decimals and count > 500:  # arcs that meet within 0.05 degrees, within the rounding of the points
        assert result.chains_left == ()
        assert result.outline.edges.interior_angle.max() < np.pi + np.radians(0.1)
        return
    assert result.arcs_restored == 0
    (left,) = result.chains_left
    assert (left.loop, left.chords, left.re_entrant) == (1, count, True)
    assert "void 0" in str(left)
    assert "the peak stress there reads high" in str(left)


def test_an_explicit_tolerance_decides():
    noise = RNG.normal(0.0, 0.01, (16, 2))
    turn = 2.0 * np.pi * np.arange(16) / 16
    outline = Outline(20.0 * np.stack([np.cos(turn), np.sin(turn)], axis=1) + noise)
    assert restore_arcs(outline).arcs_restored == 0
    assert restore_arcs(outline, tolerance=0.05).arcs_restored == 1


def test_the_fillet_of_a_polygon_made_by_buffers():
    # out and in again rounds the re-entrant corner with a chain of 16 chords
    polygon = shapely.Polygon(angle().vertices).buffer(8.0, quad_segs=16, join_style="mitre").buffer(-8.0, 16)
    result = restore_arcs(Outline.from_polygon(polygon))
    assert_same_shape(SHAPES["fillet"], result.outline, rel=1e-9)


def test_arcs_that_are_there_already_are_left_alone():
    outline = SHAPES["fillet and toe"]
    result = restore_arcs(outline)
    assert result.outline is outline
    assert str(result).startswith("0 arcs restored, 0 chains left")


def test_arcs_that_would_spoil_the_outline_are_given_up():
    # a hair of material between a faceted hole and the edge: the true circle would break through
    hole = faceted(circle(0.0, 0.0, 10.0), 10)
    x = 10.0 * np.cos(np.pi / 20) + 0.01
    outline = Outline([(-30, -30), (x, -30), (x, 30), (-30, 30)], voids=[hole.rotated(np.pi / 20)])
    result = restore_arcs(outline)
    assert result.arcs_restored == 0
    assert result.outline == outline
    assert "spoil the outline" in result.chains_left[0].why


def test_an_arc_that_just_misses_being_tangent_is_told_of():
    fillet = faceted(SHAPES["fillet"], 8)
    points = fillet.vertices.copy()
    points[1, 1], points[2, 1] = 0.0, 9.2  # the leg's end moved, so that the leg meets the arc at a degree
    result = restore_arcs(Outline(points))
    assert result.arcs_restored == 1
    assert len(result.warnings) == 1
    assert "not quite tangent at (16, 8)" in result.warnings[0]


@pytest.mark.parametrize("tolerance", [0.0, -1.0, np.nan, np.inf, True, "1"])
def test_bad_tolerances(tolerance):
    with pytest.raises(InputError, match="tolerance"):
        restore_arcs(angle(), tolerance)


def test_only_outlines():
    with pytest.raises(InputError, match="an Outline is needed, got Polygon"):
        restore_arcs(shapely.box(0, 0, 1, 1))


def test_the_table():
    text = str(restore_arcs(faceted(SHAPES["void with fillets"], 8)))
    assert text.startswith("4 arcs restored, 0 chains left\n")
    assert "void 0" in text
    assert "-90" not in text
    assert text.count(" 5 ") >= 4


@settings(max_examples=40, deadline=None)
@given(st.lists(st.tuples(st.floats(4, 10), st.floats(0, 2 * np.pi)), min_size=3, max_size=40))
def test_anything_goes_through_and_keeps_its_area(polar):
    points = np.array([(r * np.cos(t), r * np.sin(t)) for r, t in sorted(polar, key=lambda item: item[1])])
    try:
        outline = Outline(points)
    except InputError:
        return
    result = restore_arcs(outline)
    assert result.outline.area == pytest.approx(outline.area, rel=0.05)
