"""What dimensions, edges and points of the boundary do to the torsion constant and the peak stress."""

import math
from functools import cache, partial

import numpy as np
import pytest

from torsionfe.closed_form import exact
from torsionfe.errors import InputError
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline
from torsionfe.output.sensitivity_plot import plot_sensitivity
from torsionfe.study.dimension import sensitivity
from torsionfe.torsion.sensitivity import boundary_sensitivity
from torsionfe.torsion.solve import solve_torsion

ANGLE = {"leg_x": 80, "leg_y": 60, "thickness": 8, "root_radius": 8, "toe_radius": 4}
KEYED = {"diameter": 44, "key_width": 12, "key_depth": 5, "root_radius": 0.8}
BOX = {"width": 80, "height": 50, "wall": 4, "outer_radius": 6, "inner_radius": 4}
TEE = {"flange_width": 60, "depth": 50, "flange_thickness": 8, "web_thickness": 7}
TRADE = {"angle": ANGLE, "keyed_shaft": KEYED, "box": BOX, "tee": TEE}


@cache
def solved(name, rel_tol=1e-3, order=2):
    return solve_torsion(getattr(shapes, name)(**TRADE[name]), rel_tol, order)


@cache
def effects(name):
    return sensitivity(getattr(shapes, name), TRADE[name], solution=solved(name))


@cache
def boundary(name):
    return boundary_sensitivity(solved(name))


# --- closed forms -------------------------------------------------------------------------------------------


def test_round_bar():
    """``J = pi r^4 / 2`` and ``tau_max = 2 T / (pi r^3)`` (Coulomb)."""
    found = sensitivity(shapes.round_bar, {"diameter": 20.0}, 0.2)["diameter"]
    exactly = 2.0 * math.pi * 10.0**3 * 0.1
    assert found.constant_change == pytest.approx(exactly, rel=1e-4)
    assert abs(found.constant_change - exactly) <= found.constant_error
    assert found.constant_share == pytest.approx(4 * 0.01, rel=1e-4)
    assert found.peak_share == pytest.approx(-3 * 0.01, rel=1e-4)
    assert found.peak_share_back == pytest.approx(3 * 0.01, rel=1e-4)
    edges = boundary_sensitivity(solve_torsion(shapes.round_bar(20.0)))
    assert edges.density == pytest.approx(np.full(len(edges.points), 100.0), rel=1e-5)
    assert sum(edge.by_radius for edge in edges) == pytest.approx(2.0 * math.pi * 1000.0, rel=2e-5)
    assert edges.change(np.ones(len(edges.points))) == pytest.approx(2.0 * math.pi * 1000.0, rel=2e-5)


def test_tube():
    """``J = pi (R^4 - r^4) / 2``; the peak is ``T R / J``."""
    big, small, wall = 20.0, 17.0, 3.0
    constant = 0.5 * math.pi * (big**4 - small**4)
    found = sensitivity(shapes.tube, {"outer_diameter": 2 * big, "wall": wall}, 0.1)
    grown = math.pi * (big**3 - small**3) * 0.1  # both radii by half of the step
    assert found["outer_diameter"].constant_change == pytest.approx(grown, rel=1e-6)
    assert found["outer_diameter"].peak_share == pytest.approx(0.05 / big - grown / constant, rel=1e-6)
    assert found["wall"].constant_change == pytest.approx(2.0 * math.pi * small**3 * 0.1, rel=1e-6)
    edges = boundary_sensitivity(found.solution)
    by_loop = [sum(edge.by_radius for edge in edges if edge.loop == loop) for loop in range(2)]
    assert by_loop == pytest.approx([2.0 * math.pi * big**3, -2.0 * math.pi * small**3], rel=1e-5)


def test_ellipse():
    """``J = pi a^3 b^3 / (a^2 + b^2)``, ``phi`` quadratic (Saint-Venant 1855)."""
    a, b = 20.0, 10.0
    found = sensitivity(shapes.ellipse, {"width": 2 * a, "height": 2 * b}, 0.1)
    square = a * a + b * b
    shares = [0.05 * (3.0 / side - 2.0 * side / square) for side in (a, b)]
    assert [effect.constant_share for effect in found] == pytest.approx(shares, rel=1e-5)
    # tau_max = 2 T / (pi a b^2)
    assert [effect.peak_share for effect in found] == pytest.approx([-0.05 / a, -2 * 0.05 / b], rel=1e-4)
    edges = boundary_sensitivity(found.solution)
    steep = 2.0 * a * a * b * b / square
    x, y = edges.points.T
    assert edges.density == pytest.approx(steep**2 * (x**2 / a**4 + y**2 / b**4), rel=2e-3)


def test_rectangle_against_the_series():
    """The series of Saint-Venant (1855), differentiated by differences."""
    found = sensitivity(shapes.rectangle, {"width": 30.0, "height": 10.0}, 0.1)
    h = 1e-3
    for effect, ahead, back in zip(found, [(30 + h, 10), (30, 10 + h)], [(30 - h, 10), (30, 10 - h)], strict=True):
        after, before = exact.rectangle(*ahead), exact.rectangle(*back)
        slope = (after.torsion_constant - before.torsion_constant) / (2.0 * h)
        assert effect.constant_change == pytest.approx(0.1 * slope, rel=1e-4)
        assert abs(effect.constant_change - 0.1 * slope) <= effect.constant_error
        peak = math.log(after.stress_per_torque / before.stress_per_torque) / (2.0 * h)
        assert effect.peak_share == pytest.approx(0.1 * peak, rel=1e-4)
        assert abs(effect.peak_share - 0.1 * peak) <= effect.peak_error + 1e-7


def test_equal_peaks_that_part_are_told_for_both_ways():
    found = sensitivity(shapes.rectangle, {"width": 20.0, "height": 20.0}, 0.1)["width"]
    h = 1e-3
    wider, narrower = (exact.rectangle(20.0 + way * h, 20.0).stress_per_torque for way in (1, -1))
    square = exact.rectangle(20.0, 20.0).stress_per_torque
    assert found.peak_share == pytest.approx(0.1 / h * (wider / square - 1.0), rel=1e-3)
    assert found.peak_share_back == pytest.approx(0.1 / h * (narrower / square - 1.0), rel=1e-3)
    assert "back +0.85" in str(sensitivity(shapes.rectangle, {"width": 20.0, "height": 20.0}, of="width"))


# --- against solving again ----------------------------------------------------------------------------------


#: What is solved again, larger and smaller: all of two shapes, the hardest of two more.
SOLVED_AGAIN = {"angle": ANGLE, "keyed_shaft": KEYED, "box": ("outer_radius",), "tee": ("web_thickness",)}


@pytest.mark.parametrize("name", SOLVED_AGAIN)
def test_torsion_constant_against_solving_again(name):
    build, sizes = getattr(shapes, name), TRADE[name]
    for effect in map(effects(name).__getitem__, SOLVED_AGAIN[name]):
        h = 5e-3 * effect.value
        ends = [build(**{**sizes, effect.name: effect.value + way * h}) for way in (1, -1)]
        ahead, back = (solve_torsion(end, 1e-5, 4, peak_tol=math.inf).torsion_constant.value for end in ends)
        slope = (ahead - back) / (2.0 * h)
        assert effect.constant_change == pytest.approx(0.1 * slope, rel=2e-3, abs=2e-7 * ahead / h)
        assert abs(effect.constant_change - 0.1 * slope) <= effect.constant_error + 3e-3 * abs(0.1 * slope)


@pytest.mark.parametrize(("name", "dimension"), [("angle", "root_radius"), ("keyed_shaft", "diameter")])
def test_peak_against_solving_again(name, dimension):
    sizes, effect = TRADE[name], effects(name)[dimension]
    h = 0.03 * effect.value
    ends = [getattr(shapes, name)(**{**sizes, dimension: effect.value + way * h}) for way in (1, -1)]
    ahead, back = (solve_torsion(end, 1e-5, 4, peak_tol=2e-4).hot_spot.stress_per_torque for end in ends)
    share = math.log(ahead / back) / (2.0 * h) * 0.1
    assert effect.peak_share == pytest.approx(share, rel=0.02)
    assert effect.peak_error < 0.02 * abs(share)


def test_a_fillets_radius_is_that_of_its_edge():
    for name, dimension, kind in (("angle", "root_radius", "fillet"), ("box", "outer_radius", "rounding")):
        by_radius = sum(edge.by_radius for edge in boundary(name) if edge.kind == kind and edge.loop == 0)
        if name == "angle":  # the toes are rounded, the root is not
            assert sum(edge.kind == "rounding" for edge in boundary(name)) == 2
        assert 0.1 * by_radius == pytest.approx(effects(name)[dimension].constant_change, rel=5e-3)


def test_moving_one_edge_against_solving_again():
    corners = np.array([(0.0, 0.0), (60.0, 0.0), (60.0, 12.0), (14.0, 12.0), (14.0, 50.0), (0.0, 50.0)])
    found = boundary_sensitivity(solve_torsion(Outline(corners)))
    for k in (1, 2, 4):
        edge = found.edges[k]
        out = found.normals[found.edge == k][0]
        ends = []
        for way in (0.02, -0.02):
            moved = corners.copy()
            moved[[k, (k + 1) % 6]] += way * out
            ends.append(solve_torsion(Outline(moved), 2e-5, 4, peak_tol=math.inf).torsion_constant.value)
        slope = (ends[0] - ends[1]) / 0.04
        assert edge.by_offset == pytest.approx(slope, rel=0.012)
        assert abs(edge.by_offset - slope) <= edge.rel_error * slope + 2e-3 * slope
        assert (edge.start, edge.end, edge.kind) == (k, (k + 1) % 6, "straight")


# --- identities ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(("name", "close"), [("angle", 6e-3), ("keyed_shaft", 2e-3), ("box", 2e-3), ("tee", 8e-3)])
def test_scaling_moving_and_turning(name, close):
    """``int tau^2 x.n ds = 4 J`` since ``J`` scales as ``s^4``; rigid motions change nothing."""
    found = boundary(name)
    constant = solved(name).torsion_constant.value
    assert found.change(found.points) == pytest.approx(4.0 * constant, rel=close)
    assert abs(found.closure) < close
    x, y = found.points.T
    size = solved(name).outline.size
    for motion in (np.tile([1.0, 0.0], (len(x), 1)), np.tile([0.0, 1.0], (len(x), 1)), np.stack([-y, x], 1) / size):
        assert abs(found.change(motion)) < close * constant / (0.1 * size)
    along_normals = np.sum(found.points * found.normals, axis=1)
    assert found.change(along_normals) == found.change(found.points)


@pytest.mark.parametrize("name", TRADE)
def test_all_lengths_together_scale_the_section(name):
    """Euler: the sum of ``p dJ/dp`` over every length is ``4 J``, that of the peak's is ``-3``."""
    found = effects(name)
    assert sum(effect.value * effect.constant_change / 0.1 for effect in found) == pytest.approx(
        4.0 * found.solution.torsion_constant.value, rel=2e-4
    )
    assert sum(effect.value * effect.peak_share / 0.1 for effect in found) == pytest.approx(-3.0, rel=2e-3)


def test_place_and_unit_change_nothing():
    def build(**sizes):
        return shapes.keyed_shaft(**sizes).rotated(0.7).translated(3e3, -1e3)

    moved = sensitivity(build, KEYED)
    inches = sensitivity(shapes.keyed_shaft, {name: value / 25.4 for name, value in KEYED.items()}, 0.1 / 25.4)
    for effect, there, other in zip(effects("keyed_shaft"), moved, inches, strict=True):
        assert there.constant_share == pytest.approx(effect.constant_share, rel=2e-3)
        assert other.constant_share == pytest.approx(effect.constant_share, rel=2e-3)
        assert other.constant_change == pytest.approx(effect.constant_change / 25.4**4, rel=2e-3)
        assert other.peak_share == pytest.approx(effect.peak_share, rel=2e-2)


# --- what can't be varied, and bad input --------------------------------------------------------------------


def test_a_radius_of_zero_and_counts():
    found = sensitivity(shapes.tee, {**TEE, "root_radius": 0.0}, solution=solved("tee"), peak=False)
    assert not found["root_radius"].varied
    assert found["root_radius"].note == "can't be varied both ways: root_radius must be 0 or more, got -0.001"
    assert "not defined" in str(found)
    assert all(math.isnan(effect.peak_share) for effect in found)
    hexagon = sensitivity(shapes.regular, {"sides": 6, "across_flats": 30.0}, peak=False)
    assert [effect.name for effect in hexagon] == ["across_flats"]
    with pytest.raises(InputError, match=r"no dimension can be varied: sides = 6: .* must be a whole number"):
        sensitivity(shapes.regular, {"sides": 6, "across_flats": 30.0}, of=["sides"], solution=hexagon.solution)


def test_edges_that_come_and_go_and_jumps():
    def clipped(width, clip):
        corner = [(width, 10.0 - clip), (width - clip, 10.0)] if clip > 2.0 else [(width, 10.0)]
        return Outline([(0.0, 0.0), (width, 0.0), *corner, (0.0, 10.0)])

    found = sensitivity(clipped, {"width": 20.0, "clip": 2.0})
    assert found["width"].varied
    assert "changes its edges at this value, from 4 to 5" in found["clip"].note
    for jump in (lambda h: 10.0 + (0.2 if h > 10.0 else 0.0), lambda h: 10.0 + max(h - 10.0, 0.0)):
        with pytest.raises(InputError, match="h = 10: can't be varied both ways: the outline does not change smoothly"):
            sensitivity(lambda h, jump=jump: shapes.rectangle(20.0, jump(h)), {"h": 10.0})


def test_no_finite_peak_and_no_effect():
    turn = 2.0 * math.pi * np.arange(10) / 10.0
    star = np.where(np.arange(10) % 2, 0.2, 0.5)[:, None] * np.stack([np.cos(turn), np.sin(turn)], axis=1)
    found = sensitivity(lambda size, colour: Outline(star * size), {"size": 20.0, "colour": 3.0})
    assert found.solution.hot_spot is None
    assert found["colour"].constant_change == 0.0
    assert found["size"].constant_share == pytest.approx(4 * 0.1 / 20.0, rel=1e-6)
    assert math.isnan(found["size"].peak_share)
    assert "nan" not in str(found)


BUILD = shapes.rectangle
SIZES = {"width": 20.0, "height": 10.0}


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (partial(sensitivity, "rectangle", SIZES), "build must be a function"),
        (partial(sensitivity, BUILD, [20.0, 10.0]), "parameters must map"),
        (partial(sensitivity, BUILD, {"width": 20.0}), "missing a required argument: 'height'"),
        (partial(sensitivity, BUILD, {**SIZES, "hight": 2.0}), "unexpected keyword argument 'hight'"),
        (partial(sensitivity, BUILD, SIZES, of=["widht"]), "did you mean 'width'?"),
        (partial(sensitivity, lambda name: BUILD(2, 1), {"name": "x"}, of=["name"]), "name must be a number"),
        (partial(sensitivity, lambda name: BUILD(2, 1), {"name": "x"}), "no parameter is a number"),
        (partial(sensitivity, BUILD, SIZES, 0.0), "step must be greater than 0"),
        (partial(sensitivity, BUILD, SIZES, math.nan), "step must be finite"),
        (partial(sensitivity, BUILD, SIZES, True), "step must be a number"),
        (partial(sensitivity, lambda width: None, {"width": 2.0}), "build must return an Outline, got NoneType"),
        (partial(sensitivity, BUILD, {"width": -1.0, "height": 2.0}), "width must be greater than 0"),
        (lambda: sensitivity(BUILD, SIZES, solution=solved("tee")), "of another outline"),
        (lambda: effects("tee")["depht"], "no dimension 'depht' was varied"),
        (partial(boundary_sensitivity, BUILD(2, 1)), "call solve_torsion"),
        (lambda: boundary("tee").change([1.0]), "a row for each of the"),
        (lambda: boundary("tee").change(np.full(len(boundary("tee").points), np.nan)), "not finite"),
        (lambda: plot_sensitivity(BUILD(2, 1)), "call solve_torsion"),
    ],
)
def test_bad_input_is_named(call, words):
    with pytest.raises(InputError) as caught:
        call()
    assert words in str(caught.value)


# --- words and picture --------------------------------------------------------------------------------------


def test_tables():
    text = str(effects("keyed_shaft"))
    assert text.startswith("Sensitivity: what 0.1 more on each dimension does\n")
    assert "root_radius  0.8    +112.2" in text
    assert "the step is 12 % of it: read a rate" in text
    edges = str(boundary("keyed_shaft"))
    assert "Where material counts" in edges
    assert "fillet" in edges
    assert "int tau^2 x.n ds = 4 J is met to" in edges


def test_within_the_error_is_undecided():
    found = sensitivity(shapes.keyed_shaft, {**KEYED, "root_radius": 1.5, "edge_radius": 0.5}, of="edge_radius")
    effect = found["edge_radius"]
    assert effect.peak_undecided
    assert "undecided" in str(found)


def test_picture():
    solution = solved("keyed_shaft")
    drawn = plot_sensitivity(solution, unit="mm")
    assert drawn.axes.get_xlabel() == "x [mm]"
    assert drawn.bar.ax.get_ylabel() == "gain of J / area added [mm²]"
    assert drawn.label is not None
    peak = (solution.hot_spot.stress_per_torque * solution.torsion_constant.value) ** 2
    assert drawn.label.get_text() == f"{peak:.0f} mm²"
    widths = np.array(drawn.ribbon.get_linewidths())
    assert (np.diff(widths) >= 0.0).all()
    assert "more, off the scale" in [text.get_text() for text in drawn.legend.get_texts()]
    again = plot_sensitivity(boundary_sensitivity(solution), drawn.axes.figure.add_subplot())
    assert again.axes.figure is drawn.axes.figure
