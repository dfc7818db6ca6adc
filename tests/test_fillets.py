"""Fillets: tangent, of the right radius, and honest about what does not fit."""

import math
import pickle
import re

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from torsionfe.errors import InputError, OutlineError
from torsionfe.outline import arcs, shapes
from torsionfe.outline.fillets import fillet, round_corners
from torsionfe.outline.outline import Outline

BRACKET = Outline([(0, 0), (80, 0), (80, 8), (8, 8), (8, 80), (0, 80)])
SQUARE = Outline([(0, 0), (10, 0), (10, 10), (0, 10)])


def new_arcs(before, after, radius):
    """The rows of the filleted outline's edges that are the fillets."""
    edges = after.edges
    return np.flatnonzero(np.isclose(edges.radius, radius, rtol=1e-9))


def assert_smooth(outline, rows):
    edges = outline.edges
    np.testing.assert_allclose(edges.interior_angle[rows], math.pi, atol=1e-7)
    np.testing.assert_allclose(edges.interior_angle[edges.following[rows]], math.pi, atol=1e-7)


def test_default_rounds_the_re_entrant_corner_only():
    rounded = BRACKET.filleted(8.0)
    assert len(rounded.vertices) == 7
    assert rounded.area == pytest.approx(BRACKET.area + (1.0 - math.pi / 4.0) * 64.0, rel=1e-14)
    np.testing.assert_allclose(rounded.vertices[3:5], [(16, 8), (8, 16)], atol=1e-12)
    assert_smooth(rounded, new_arcs(BRACKET, rounded, 8.0))


def test_bulge_of_a_fillet_is_negative_and_of_a_rounding_positive():
    rounded = BRACKET.filleted(3.0, at=[3, 1])
    assert np.sign(rounded.bulges).tolist() == [0, 1, 0, 0, -1, 0, 0, 0]
    np.testing.assert_allclose(np.abs(rounded.bulges[[1, 4]]), math.tan(math.pi / 8.0), rtol=1e-13)


@settings(max_examples=60, deadline=None)
@given(
    st.floats(20.0, 340.0).filter(lambda degrees: abs(degrees - 180.0) > 5.0),
    st.floats(0.01, 1.0),
    st.floats(0.0, 6.3),
)
def test_area_of_a_fillet_between_straight_edges(degrees, share, turn):
    # a corner of angle a loses, or if re-entrant gains, r^2 (cot(a/2) - (pi - a)/2), a the smaller angle
    a = math.radians(degrees)
    arms = [(100.0, 0.0), (0.0, 0.0), (100.0 * math.cos(a), 100.0 * math.sin(a))]
    far = np.arange(1, 4) * a / 4.0  # between the arms, where the material is
    wedge = Outline([*arms, *(150.0 * np.stack([np.cos(far), np.sin(far)], axis=1))[::-1]]).rotated(turn)
    tip = int(np.argmin(np.hypot(*wedge.vertices.T)))
    small = min(a, 2.0 * math.pi - a)
    radius = 90.0 * share * math.tan(small / 2.0)
    rounded = wedge.filleted(radius, at=[tip])
    change = radius**2 * (1.0 / math.tan(small / 2.0) - (math.pi - small) / 2.0)
    expected = change if a > math.pi else -change
    assert rounded.area - wedge.area == pytest.approx(expected, rel=1e-8, abs=1e-9 * wedge.area)
    assert_smooth(rounded, new_arcs(wedge, rounded, radius))


@settings(max_examples=60, deadline=None)
@given(st.floats(-0.4, 0.9), st.floats(-0.4, 0.9), st.floats(0.05, 0.5), st.floats(0.0, 6.3))
def test_fillets_between_arcs_touch_both_circles(first, second, radius, turn):
    # a triangle with curved sides, every corner rounded; the circles are independent of the fillets' algebra
    sharp = Outline([(0, 0), (10, 0), (6, 9)], [first * 0.4, second * 0.4, 0.0]).rotated(turn)
    rounded = sharp.filleted(radius, at=range(3))
    edges = rounded.edges
    rows = np.arange(0, 6, 2)
    np.testing.assert_allclose(edges.radius[rows], radius, rtol=1e-7)
    assert_smooth(rounded, rows)
    centre = arcs.arc_centre(edges.start[rows], edges.end[rows], edges.bulge[rows])
    old = sharp.edges
    for k in range(3):
        for row in (k, (k - 1) % 3):  # the distance of the fillet's centre from either edge's circle or line
            p, q, b = (item[row : row + 1] for item in (old.start, old.end, old.bulge))
            if abs(b[0]) > 1e-6:
                gap = abs(np.hypot(*(arcs.arc_centre(p, q, b) - centre[k])[0]) - arcs.arc_radius(p, q, b)[0])
            else:
                along = (q - p)[0] / np.hypot(*(q - p)[0])
                gap = abs(np.dot(centre[k] - p[0], [-along[1], along[0]]))
            assert gap == pytest.approx(radius, rel=1e-5)


def test_fillet_between_a_flat_and_its_round():
    rounded = shapes.flatted_bar(40, 32).filleted(3.0, at=[0, 1])
    # the fillet's circle lies inside both: its centre is 17 from the middle and 3 under the flat
    edges = rounded.edges
    rows = new_arcs(None, rounded, 3.0)
    centre = arcs.arc_centre(edges.start[rows], edges.end[rows], edges.bulge[rows])
    np.testing.assert_allclose(np.hypot(*centre.T), 17.0, rtol=1e-12)
    np.testing.assert_allclose(centre[:, 1], 9.0, rtol=1e-12)
    assert_smooth(rounded, rows)


def test_fillets_of_every_loop_by_default():
    plate = Outline(
        [(0, 0), (100, 0), (100, 100), (0, 100)], voids=[Outline([(20, 20), (60, 20), (60, 40), (20, 40)])]
    )
    rounded = plate.filleted(5.0)
    assert rounded.vertices.tolist() == plate.vertices.tolist()
    assert len(rounded.voids[0].vertices) == 8
    assert rounded.area == pytest.approx(plate.area + (4.0 - math.pi) * 25.0, rel=1e-13)


def test_edges_eaten_by_their_fillets_disappear():
    assert SQUARE.filleted(5.0, at=range(4)).area == pytest.approx(25.0 * math.pi, rel=1e-12)
    assert len(SQUARE.filleted(5.0, at=range(4)).vertices) == 4
    assert len(SQUARE.filleted(5.0, at=[0, 1]).vertices) == 5


def test_filleting_and_moving_commute():
    sharp = shapes.keyed_shaft(50, 14, 5.5)
    moved = sharp.rotated(0.7).translated(3, -8).mirrored(0.2)
    assert moved.filleted(1.0).matches(sharp.filleted(1.0).rotated(0.7).translated(3, -8).mirrored(0.2))


@pytest.mark.parametrize(
    ("outline", "radius", "at", "vertex", "most"),
    [
        (BRACKET, 90.0, None, 3, 72.0),
        (BRACKET, 9.0, [1], 1, 8.0),
        (BRACKET, 9.0, [1, 2], 1, 4.0),  # the two share the short edge
        (SQUARE, 6.0, [0, 1, 2, 3], 0, 5.0),
        (SQUARE, 6.0, [2, 3], 2, 5.0),
        (SQUARE, 11.0, [2], 2, 10.0),
        (Outline([(-5, 0), (5, 0)], [0.4, 0.4]), 20.0, [0, 1], 0, 2.0),
    ],
)
def test_what_does_not_fit_names_the_largest_that_does(outline, radius, at, vertex, most):
    with pytest.raises(OutlineError) as caught:
        outline.filleted(radius, at=at)
    text = str(caught.value)
    x, y = outline.vertices[vertex]
    assert f"fillet radius {radius:g} does not fit at vertex {vertex} ({x:g}, {y:g})" in text
    limit = float(re.search(r"allow ([\d.e+-]+) at most", text).group(1))
    assert limit == pytest.approx(most, rel=1e-4)
    assert caught.value.at == (x, y)
    assert outline.filleted(limit, at=at).area > 0.0
    with pytest.raises(OutlineError):
        outline.filleted(limit * 1.001, at=at)


def test_radii_of_their_own_name_the_one_that_does_not_fit():
    with pytest.raises(OutlineError, match=r"root 70 does not fit at vertex 3 \(8, 8\): .* allow 68 at most"):
        round_corners(BRACKET, {(0, 3): (70.0, "root"), (0, 2): (4.0, "toe")})
    with pytest.raises(OutlineError, match="toe 9 does not fit at vertex 2"):
        round_corners(BRACKET, {(0, 3): (7.0, "root"), (0, 2): (9.0, "toe"), (0, 4): (0.0, "end")})


def test_a_fillet_that_does_not_fit_a_void_names_it():
    plate = Outline(
        [(0, 0), (100, 0), (100, 100), (0, 100)], voids=[Outline([(20, 20), (60, 20), (60, 40), (20, 40)])]
    )
    with pytest.raises(OutlineError, match=r"of void 0 .*allow 10 at most"):
        plate.filleted(11.0)


def test_a_rounding_that_cuts_into_a_void_is_refused():
    plate = Outline([(0, 0), (20, 0), (20, 20), (0, 20)], voids=[shapes.round_bar(2).translated(2, 2)])
    with pytest.raises(OutlineError, match="void 0"):
        plate.filleted(10.0, at=[0])


def test_nothing_to_round_is_an_error_by_default_and_nothing_when_asked_for():
    with pytest.raises(OutlineError, match=r"no sharp re-entrant corner.*at=\["):
        SQUARE.filleted(1.0)
    assert SQUARE.filleted(1.0, at=[]) == SQUARE
    assert fillet(SQUARE, 1.0, at=(k for k in [2, 2, np.int64(0)])).area < 100.0


@pytest.mark.parametrize("at", [[4], [-1], [True], [0, 9]])
def test_vertices_that_do_not_exist(at):
    with pytest.raises(OutlineError, match=r"there is no vertex .* the outer loop has 0 to 3"):
        SQUARE.filleted(1.0, at=at)


@pytest.mark.parametrize("at", [3, ["a"], [1.5], "ab"])
def test_at_must_be_a_list_of_numbers(at):
    with pytest.raises(OutlineError, match="at must be a list of vertex numbers"):
        SQUARE.filleted(1.0, at=at)


def test_a_smooth_vertex_is_no_corner():
    with pytest.raises(OutlineError, match=r"vertex 1 \(5, 0\) is no corner.*180\.00 degrees"):
        Outline([(0, 0), (5, 0), (10, 0), (10, 10), (0, 10)]).filleted(1.0, at=[1])
    with pytest.raises(OutlineError, match="no sharp re-entrant corner"):
        BRACKET.filleted(8.0).filleted(2.0)


@pytest.mark.parametrize("radius", [0.0, -1.0, math.nan, math.inf, "3", True, None])
def test_radius_must_be_a_positive_number(radius):
    with pytest.raises(InputError, match="radius must be"):
        BRACKET.filleted(radius)


def test_errors_keep_their_place_when_pickled():
    with pytest.raises(OutlineError) as caught:
        BRACKET.filleted(90.0)
    again = pickle.loads(pickle.dumps(caught.value))
    assert (str(again), again.at) == (str(caught.value), (8.0, 8.0))


def test_a_radius_of_its_own_at_no_corner_is_refused():
    plank = Outline([(0, 0), (20, 0), (40, 0), (40, 10), (0, 10)])
    with pytest.raises(OutlineError, match=r"vertex 1 \(20, 0\) is no corner to round: its edges meet at 180.00"):
        round_corners(plank, {(0, 1): (2.0, "root radius")})


@pytest.mark.parametrize("radius", [80.0, 1e6, 1e15, 1e25, 1e160, 1e300])
def test_the_largest_radius_that_fits_is_named_however_large_the_one_asked(radius):
    outline = shapes.angle(80, 80, 8)
    with pytest.raises(OutlineError, match=r"fillet radius \S+ does not fit .* the edges allow 72 at most") as caught:
        outline.filleted(radius)
    assert f"radius {radius:g} does" in str(caught.value)
