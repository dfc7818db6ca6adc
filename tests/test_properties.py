"""What must hold for every section: order and nesting of bounds, motion, scale, growth, circulation, torque."""

import math
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st
from random_outlines import KINDS, random_outline

import torsionfe as tf
from torsionfe.errors import OutlineError
from torsionfe.fem.elements import rule
from torsionfe.fem.geometry import reference_map
from torsionfe.outline.outline import Outline
from torsionfe.torsion.recover import stress_in_triangles

few = settings(max_examples=12, deadline=None, derandomize=True, database=None)
QUICK = {"rel_tol": 2e-2, "peak_tol": math.inf}


@st.composite
def outlines(draw, kinds=KINDS, most=100.0):
    """Random outlines, aspect ratios up to ``most``."""
    aspect = draw(st.sampled_from([1.0, 3.0, 10.0, most]))
    try:
        return random_outline(draw(st.integers(0, 2**32 - 1)), draw(st.sampled_from(kinds)), aspect)
    except OutlineError:
        assume(False)


def overlap(a, b, slack=1e-9):
    """Whether two brackets can hold one number."""
    return a.lower <= b.upper * (1.0 + slack) and b.lower <= a.upper * (1.0 + slack)


@few
@given(outlines())
def test_bounds_are_in_order_and_enclose_a_much_tighter_bracket(outline):
    rough = tf.solve_torsion(outline, **QUICK).torsion_constant
    tight = tf.solve_torsion(outline, rel_tol=1e-5, order=3, peak_tol=math.inf).torsion_constant
    assert 0.0 < rough.lower < rough.upper
    assert rough.lower <= tight.upper
    assert tight.lower <= rough.upper
    assert tight.rel_gap <= 1e-5
    assert rough.lower <= tight.value <= rough.upper


@few
@given(outlines(), st.floats(0.0, 2.0 * np.pi), st.sampled_from([0.0, 3.0, 1e6]), st.sampled_from([1e-6, 1.0, 1e6]))
def test_motion_reflection_and_scale(outline, angle, away, scale):
    here = tf.solve_torsion(outline, **QUICK)
    size = outline.size
    # a void is an outline too, and lies at most 1e8 of its own sizes from the origin
    assume(all(void.size > 0.03 * away / 1e6 * size for void in outline.voids))
    there = outline.rotated(angle).mirrored(0.3).translated(away * size, -0.5 * away * size)
    moved = tf.solve_torsion(there, **QUICK)
    # a million sizes from the origin, a coordinate keeps ten digits of the size
    assert overlap(here.torsion_constant, moved.torsion_constant, 1e-8)
    large = tf.solve_torsion(outline.scaled(scale), **QUICK).torsion_constant
    fourth = scale**4
    assert large.lower <= here.torsion_constant.upper * fourth * (1.0 + 1e-9)
    assert here.torsion_constant.lower * fourth <= large.upper * (1.0 + 1e-9)


@few
@given(outlines(), st.integers(-20, 20))
def test_powers_of_two_change_no_digit(outline, power):
    scale = math.ldexp(1.0, power)
    here, there = (tf.solve_torsion(o, rel_tol=1e-2, peak_tol=0.1) for o in (outline, outline.scaled(scale)))
    assert there.torsion_constant.lower == pytest.approx(here.torsion_constant.lower * scale**4, rel=1e-11)
    if here.hot_spot is not None:
        assert there.section_modulus == pytest.approx(here.section_modulus * scale**3, rel=1e-9)


@few
@given(outlines(kinds=("shape", "perforated")), st.floats(1.02, 1.5))
def test_more_material_is_never_softer(outline, growth):
    solid = Outline(outline.vertices, outline.bulges)
    here, filled = (tf.solve_torsion(o, **QUICK).torsion_constant for o in (outline, solid))
    assert filled.upper >= here.lower
    if not outline.voids:
        return
    # voids shrunk about their own middles leave more of the plate
    shrunk = [void.scaled(1.0 / growth, about=void.centroid) for void in outline.voids]
    more = tf.solve_torsion(Outline(outline.vertices, outline.bulges, shrunk), **QUICK).torsion_constant
    assert more.upper >= here.lower


@few
@given(outlines())
def test_refinement_never_widens_the_bracket(outline):
    passes = tf.solve_torsion(outline, rel_tol=1e-4, peak_tol=1e-2).passes
    for before, after in pairwise(passes):
        assert after.lower >= before.lower * (1.0 - 1e-11)
        assert after.upper <= before.upper * (1.0 + 1e-11)


@few
@given(outlines(most=20.0))
def test_the_stress_goes_round_every_loop_by_its_area(outline):
    # Bredt's theorem for G theta' = 1: the integral of the boundary stress round a loop is twice the area inside
    solution = tf.solve_torsion(outline, rel_tol=1e-3, peak_tol=1e-2)
    stress, scale = solution.boundary, solution.frame.scale
    mesh = stress.mesh
    weight = 0.5 * np.polynomial.legendre.leggauss(stress.tau.shape[1])[1]
    flow = stress.length * (stress.tau @ weight)
    loop = mesh.edges.loop[stress.edge]
    for k, area in enumerate(np.abs(mesh.edges.loop_area)):
        turned = np.sum(flow[loop == k])
        assert abs(turned) * scale**2 == pytest.approx(2.0 * area * scale**2, rel=5e-3)
        assert np.sign(turned) == (1.0 if k == 0 else -1.0)  # the material is on the left
    if solution.hot_spot is not None and not len(solution.singular_corners):
        mean = np.sum(stress.length * (np.abs(stress.tau) @ weight)) / stress.length.sum()
        assert solution.hot_spot_height >= 0.99 * mean


@few
@given(outlines(most=10.0), st.sampled_from([1, 2, 3]))
def test_the_stress_field_carries_the_torque(outline, order):
    solution = tf.solve_torsion(outline, rel_tol=0.2, order=order, peak_tol=math.inf)
    fields, quadrature = solution.fields, rule(2 * order + 4)
    points, stress = stress_in_triangles(fields, quadrature.points)
    every = np.arange(len(fields.space.mesh.triangles))
    _, jacobian = reference_map(fields.space.mesh, every, quadrature.points)
    area = np.abs(np.linalg.det(jacobian)) * quadrature.weights
    torque = np.sum(area * (points[..., 0] * stress[..., 1] - points[..., 1] * stress[..., 0]))
    # the means of both fields' torques, which are the bounds: Prager and Synge 1947
    assert torque == pytest.approx(0.5 * (fields.lower + fields.upper), rel=1e-5)
