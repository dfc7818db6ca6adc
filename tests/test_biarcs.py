"""Chains of arcs along curves."""

import math

import numpy as np
import pytest
import shapely
from scipy.interpolate import CubicSpline

from torsionfe.errors import InputError, OutlineError
from torsionfe.outline import arcs
from torsionfe.outline.biarcs import biarcs, fit_curve
from torsionfe.outline.outline import Outline


def ellipse(a, b):
    return (
        lambda t: np.stack([a * np.cos(t), b * np.sin(t)], axis=1),
        lambda t: np.stack([-a * np.sin(t), b * np.cos(t)], axis=1),
    )


def test_biarcs_on_a_circle_are_that_circle():
    t = np.array([0.3, 1.0, 1.9])
    p, d = np.stack([np.cos(t), np.sin(t)], axis=1), np.stack([-np.sin(t), np.cos(t)], axis=1)
    vertices, bulges = biarcs(5.0 * p, d)
    np.testing.assert_allclose(np.hypot(*vertices.T), 5.0, rtol=1e-14)
    np.testing.assert_allclose(np.hypot(*arcs.arc_centre(vertices[:-1], vertices[1:], bulges).T), 0.0, atol=1e-12)


def test_biarcs_pass_through_the_points_in_the_directions_and_are_smooth():
    rng = np.random.default_rng(3)
    p = np.cumsum(rng.uniform(0.5, 1.5, (20, 2)), axis=0)
    d = rng.normal(size=(20, 2)) * 0.3 + 1.0
    vertices, bulges = biarcs(p, d)
    np.testing.assert_array_equal(vertices[0::2], p)
    begin = arcs.tangent_at(vertices[:-1], vertices[1:], bulges, np.zeros(38))
    end = arcs.tangent_at(vertices[:-1], vertices[1:], bulges, np.ones(38))
    np.testing.assert_allclose(end[:-1], begin[1:], atol=1e-12)
    unit = d / np.hypot(*d.T)[:, None]
    np.testing.assert_allclose(begin[0::2], unit[:-1], atol=1e-12)
    np.testing.assert_allclose(end[1::2], unit[1:], atol=1e-12)


def test_the_error_falls_with_the_third_power_of_the_spacing():
    point, tangent = ellipse(3.0, 1.0)
    errors, counts = [], np.array([16, 32, 64, 128])
    for n in counts:
        t = np.linspace(0.0, math.pi / 2.0, n + 1)
        vertices, bulges = biarcs(point(t), tangent(t))
        rows = np.repeat(np.arange(2 * n), 9)
        x = arcs.point_at(vertices[rows], vertices[rows + 1], bulges[rows], np.tile(np.linspace(0, 1, 9), 2 * n))
        errors.append(np.abs(np.hypot(x[:, 0] / 3.0, x[:, 1]) - 1.0).max())
    rate = -np.polyfit(np.log(counts), np.log(errors), 1)[0]
    assert rate == pytest.approx(3.0, abs=0.15)


@pytest.mark.parametrize("tolerance", [1e-2, 1e-4, 1e-6])
def test_a_spline_is_fitted_within_the_tolerance(tolerance):
    knots = np.arange(6.0)
    spline = CubicSpline(knots, [(0, 0), (2, 3), (5, 1), (6, 5), (9, 6), (12, 2)])
    vertices, bulges = fit_curve(spline, spline.derivative(), 0.0, 5.0, tolerance, breaks=knots)
    np.testing.assert_allclose(vertices[[0, -1]], [(0, 0), (12, 2)], atol=1e-12)
    rows = np.repeat(np.arange(len(bulges)), 5)
    x = arcs.point_at(vertices[rows], vertices[rows + 1], bulges[rows], np.tile(np.linspace(0, 1, 5), len(bulges)))
    dense = shapely.LineString(spline(np.linspace(0.0, 5.0, 20_001)))  # its chords are 1e-8 off
    shapely.prepare(dense)
    assert dense.distance(shapely.points(x)).max() < 1.05 * tolerance + 1e-7


def test_lines_and_circles_stay_single_edges():
    line = fit_curve(
        lambda t: np.stack([3 * t, t], axis=1), lambda t: np.stack([3 + 0 * t, 1 + 0 * t], axis=1), 0, 1, 1e-6
    )
    assert line[1].tolist() == [0.0]
    vertices, bulges = fit_curve(*ellipse(2.0, 2.0), 0.0, 2.0 * math.pi, 1e-6)
    assert len(bulges) == 2
    assert Outline(vertices[:-1], bulges).area == pytest.approx(4.0 * math.pi, rel=1e-12)


def test_bad_curves_name_the_place():
    kink = (
        lambda t: np.stack([t, np.abs(t - 0.3)], axis=1),
        lambda t: np.stack([np.ones_like(t), np.sign(t - 0.3)], axis=1),
    )
    with pytest.raises(OutlineError, match=r"kink near \(0\.3,") as caught:
        fit_curve(*kink, 0.0, 1.0, 1e-6)
    assert caught.value.at[0] == pytest.approx(0.3, abs=1e-6)
    back = (
        lambda t: np.stack([t**2 - 0.2 * t, 0 * t], axis=1),
        lambda t: np.stack([2 * t - 0.2, 0 * t], axis=1),
    )
    with pytest.raises(OutlineError, match="kink"):
        fit_curve(*back, 0.0, 1.0, 1e-6)
    with pytest.raises(OutlineError, match="needs more than 20000 arcs"):
        fit_curve(*ellipse(2.0, 1.0), 0.0, 1.0, 1e-15)
    with pytest.raises(OutlineError, match="must grow along the curve"):
        fit_curve(*ellipse(2.0, 1.0), 1.0, 1.0, 1e-6)
    with pytest.raises(InputError, match="tolerance must be greater than 0"):
        fit_curve(*ellipse(2.0, 1.0), 0.0, 1.0, 0.0)


@pytest.mark.parametrize(
    ("points", "tangents", "message"),
    [
        ([(0, 0), (0, 0)], [(1, 0), (1, 0)], r"point 0 \(0, 0\) is followed by the same point"),
        ([(0, 0), (1, 0)], [(1, 0), (0, 0)], r"point 1 \(1, 0\) has no direction"),
        ([(0, 0)], [(1, 0)], "2 points or more"),
        ([(0, 0), (1, 0)], [(1, 0)], "each with a tangent"),
    ],
)
def test_bad_points(points, tangents, message):
    with pytest.raises(OutlineError, match=message):
        biarcs(points, tangents)
