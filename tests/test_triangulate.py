"""The triangulation: conforming, well shaped, coarse, the same every time."""

import json
import math
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from torsionfe.errors import MeshError, OutlineError
from torsionfe.mesh import triangulate as module
from torsionfe.mesh.draft import invalid_when_bent
from torsionfe.mesh.triangulate import SMALLEST_ANGLE, triangulate
from torsionfe.outline import arcs
from torsionfe.outline.outline import Outline

CASES = Path(__file__).parent / "reference" / "torsion_cases.json"
QUARTER = math.tan(math.pi / 8.0)
SHARP = math.radians(60.5)


# --- outlines -------------------------------------------------------------------------------------------


def reference_outlines():
    found = {}
    for case in json.loads(CASES.read_text()):
        loops = case["geometry"]["loops"]
        if any(edge and edge["type"] == "ellipse" for loop in loops for edge in loop["edges"]):
            continue
        made = {"outer": [], "hole": []}
        for loop in loops:
            bulges = [edge["bulge"] if edge else 0.0 for edge in loop["edges"]]
            made[loop["role"]].append((loop["vertices"], bulges))
        found[case["id"]] = Outline(*made["outer"][0], [Outline(*hole) for hole in made["hole"]])
    return found


def disc(diameter, x=0.0, y=0.0, voids=()):
    r = 0.5 * diameter
    return Outline([(x + r, y), (x, y + r), (x - r, y), (x, y - r)], [QUARTER] * 4, voids)


def tube(outer, inner, shift=0.0):
    return disc(outer, voids=[disc(inner, shift)])


def block(width, height, voids=()):
    return Outline([(0, 0), (width, 0), (width, height), (0, height)], None, voids)


def angle(leg=80.0, t=8.0, r=8.0):
    points = [(0, 0), (leg, 0), (leg, t), (t + r, t), (t, t + r), (t, leg), (0, leg)]
    return Outline(points, [0, 0, 0, -QUARTER, 0, 0, 0])


def needle(degrees, other=0.8):
    turn = math.radians(degrees)
    return Outline([(0, 0), (1, 0), (1, 1), (other * math.cos(turn), other * math.sin(turn))])


def sector(degrees):
    return Outline([(0, 0), (1, 0), (math.cos(math.radians(degrees)), math.sin(math.radians(degrees)))],
                   [0, math.tan(math.radians(degrees) / 4.0), 0])


def star(teeth, inner, outer):
    turn = np.pi * np.arange(2 * teeth) / teeth
    size = np.tile([outer, inner], teeth)
    return Outline(np.stack([size * np.cos(turn), size * np.sin(turn)], axis=1))


def comb(teeth, r=1.0):
    """A bar with rounded teeth: four fillets each."""
    points, bulges = [(0, 0), (10 * teeth, 0), (10 * teeth, 10)], [0, 0, 0]
    for k in reversed(range(teeth)):
        left, right = 10 * k + 2.5, 10 * k + 7.5
        points += [(right + r, 10), (right, 10 + r), (right, 20 - r), (right - r, 20)]
        points += [(left + r, 20), (left, 20 - r), (left, 10 + r), (left - r, 10)]
        bulges += [-QUARTER, 0, QUARTER, 0, QUARTER, 0, -QUARTER, 0]
    return Outline([*points, (0, 10)], [*bulges, 0])


def drilled(rows, share):
    """A square plate with rows of holes; ``share`` of the pitch is hole."""
    middles = np.arange(rows) * 10.0 + 5.0
    return block(10.0 * rows, 10.0 * rows, [disc(10.0 * share, x, y) for x in middles for y in middles])


def slotted(gap):
    return Outline([(0, 0), (1, 0), (1, 1), (0.5 + gap, 1), (0.5 + gap, 0.3), (0.5, 0.3), (0.5, 1), (0, 1)])


REFERENCE = reference_outlines()
HARD = {
    "wall_50_to_1": (block(50, 1), 80),
    "aspect_100_to_1": (block(1, 100), 160),
    "tube_wall_1_of_100": (tube(50, 49), 400),
    "tube_wall_1_of_1000": (tube(50, 49.9), 3000),
    "eccentric": (tube(50, 40, 4.9), 250),
    "eccentric_gap_1e-3": (tube(50, 25, 12.45), 400),
    "hole_1_of_5000": (block(1, 1, [disc(2e-4, 0.3, 0.4)]), 250),
    "fillet_1_of_5000": (angle(80, 8, 0.016), 150),
    "fillet_1e-6": (angle(1, 0.1, 1e-6), 300),
    "step_1e-6": (Outline([(0, 0), (1, 0), (1, 1), (0.5, 1), (0.5, 1 - 1e-6), (0, 1 - 1e-6)]), 250),
    "slot_1e-4": (slotted(1e-4), 250),
    "unequal_edges": (Outline([(0, 0), (1e-5, 0), (1, 0), (1, 1), (0, 1)]), 100),
    "collinear": (Outline([(0, 0), (1, 0), (1.2, 0), (5, 0), (7, 0), (7, 2), (3, 2), (2.9, 2), (0, 2)]), 80),
    "hundred_voids": (drilled(10, 0.7), 3000),
    "holes_nearly_touching": (drilled(3, 0.99), 950),
    "bolt_circle_at_the_rim": (disc(100, voids=[disc(20, 39.5 * math.cos(a), 39.5 * math.sin(a))
                                                for a in np.arange(8) * math.pi / 4]), 1200),
    "clover_of_arcs": (Outline([(1, 0), (0, 1), (-1, 0), (0, -1)], [1.0] * 4), 80),
    "deep_arc": (Outline([(0, 0), (1, 0)], [20.0, 0.0]), 120),
}  # fmt: skip
NEEDLES = {
    **{f"needle_{d:g}": needle(d) for d in (0.6, 1, 2, 5, 10, 20, 33, 45, 59)},
    **{f"uneven_needle_{d:g}": needle(d, 0.3) for d in (2, 10, 30)},
    **{f"sector_{d:g}": sector(d) for d in (1, 10, 45)},
    "lens": Outline([(0, 0), (1, 0)], [0.2, -0.1]),
    "crescent": Outline([(0, 0), (1, 0)], [-0.5, 0.6]),
    "star": star(12, 0.4, 1.0),
    "notch": Outline([(0, 0), (1, 0), (1, 1), (0.51, 1), (0.5, 0.2), (0.49, 1), (0, 1)]),
}


# --- checks ---------------------------------------------------------------------------------------------


def true_area(mesh):
    p, q = mesh.nodes[mesh.sides[:, 0]], mesh.nodes[mesh.sides[:, 1]]
    return mesh.areas.sum() + arcs.segment_area(p, q, mesh.side_bulge).sum()


def corner_bulges(mesh):
    """The bulge of the side opposite to each corner, 0 inside."""
    n = len(mesh.nodes)
    key = np.roll(mesh.triangles, -1, axis=1) * n + np.roll(mesh.triangles, -2, axis=1)
    sides = mesh.sides[:, 0] * n + mesh.sides[:, 1]
    order = np.argsort(sides)
    place = np.minimum(np.searchsorted(sides[order], key), len(sides) - 1)
    return np.where(sides[order][place] == key, mesh.side_bulge[order][place], 0.0)


def check_mesh(mesh, outline):
    """Assert everything that later stages rely on."""
    sides, triangles, n = mesh.sides, mesh.triangles, len(mesh.nodes)
    # every node is used, every triangle counter-clockwise, and together they are the outline
    assert np.array_equal(np.unique(triangles), np.arange(n))
    assert mesh.areas.min() > 0.0
    assert true_area(mesh) == pytest.approx(outline.area, rel=1e-9)
    # each edge of a triangle has one twin, or is a side with the material on its left
    first, second = np.roll(triangles, -1, axis=1), np.roll(triangles, -2, axis=1)
    ahead, back = (first * n + second).ravel(), (second * n + first).ravel()
    assert len(np.unique(ahead)) == ahead.size
    rim = np.sort(ahead[~np.isin(ahead, back)])
    assert np.array_equal(rim, np.sort(sides[:, 0] * n + sides[:, 1]))
    # sides lie on the true edges, cover each from 0 to 1, and close into loops
    start = mesh.edges.points(mesh.side_edge, mesh.side_span[:, 0])
    assert np.array_equal(start, mesh.nodes[sides[:, 0]])
    share = np.bincount(mesh.side_edge, np.diff(mesh.side_span, axis=1)[:, 0])
    assert share == pytest.approx(np.ones(len(mesh.edges)), abs=1e-12)
    assert np.array_equal(np.sort(sides[:, 0]), np.sort(sides[:, 1]))
    for loop in (outline, *outline.voids):
        assert np.isin(loop.vertices.view(complex), mesh.nodes.view(complex)).all()
    # arcs are followed closely, and no triangle folds when its sides are bent
    assert np.abs(arcs.sweep(mesh.side_bulge)).max() <= math.radians(30.0) * (1.0 + 1e-9)
    assert not invalid_when_bent(mesh.nodes[triangles], corner_bulges(mesh)).any()
    # the longest side is opposite to the first node
    assert (mesh.angles[:, 0] >= mesh.angles.max(axis=1) - 1e-9).all()
    # the angles are good, but for what sharp corners force
    sharpest = outline.edges.interior_angle.min()
    least = SMALLEST_ANGLE if sharpest > SHARP else min(SMALLEST_ANGLE, 0.75 * sharpest)
    assert mesh.angles.min() >= least * (1.0 - 1e-6)


# --- tests ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", REFERENCE)
def test_every_reference_case(name):
    mesh = triangulate(REFERENCE[name])
    check_mesh(mesh, REFERENCE[name])
    assert len(mesh.nodes) < 300


@pytest.mark.parametrize("name", HARD)
def test_hard_outlines_take_few_nodes(name):
    outline, most = HARD[name]
    mesh = triangulate(outline)
    check_mesh(mesh, outline)
    assert len(mesh.nodes) <= most


@pytest.mark.parametrize("name", NEEDLES)
def test_sharp_corners_spoil_only_the_triangles_in_them(name):
    outline = NEEDLES[name]
    mesh = triangulate(outline)
    check_mesh(mesh, outline)
    edges = mesh.edges
    sharp = np.flatnonzero(edges.interior_angle < SHARP)
    poor = mesh.triangles[mesh.angles.min(axis=1) < SMALLEST_ANGLE * (1.0 - 1e-9)]
    on = [set() for _ in mesh.nodes]
    for (a, b), edge in zip(mesh.sides.tolist(), mesh.side_edge.tolist(), strict=True):
        on[a].add(edge)
        on[b].add(edge)
    pairs = [(int(k), int(edges.previous[k])) for k in sharp]
    for corners in poor:  # two of its nodes lie on the two edges of one sharp corner
        held = [on[node] for node in corners]
        assert any(
            any(a in s for s in held) and any(b in s for s in held) for a, b in pairs
        ), mesh.nodes[corners]


def test_a_thousand_fillets_take_few_nodes():
    outline = comb(250)
    mesh = triangulate(outline)
    check_mesh(mesh, outline)
    assert len(mesh.nodes) < 11_000


def test_a_plain_square_is_two_triangles():
    mesh = triangulate(block(1, 1))
    assert len(mesh.triangles) == 2
    assert len(mesh.nodes) == 4


def test_small_details_are_graded():
    # size doubles over a bounded number of triangles: nodes grow with the logarithm of the ratio
    counts = [len(triangulate(angle(r=r)).nodes) for r in (1.0, 0.1, 0.01, 0.001)]
    assert max(np.diff(counts)) < 50


def test_the_same_outline_gives_the_same_mesh():
    outline = REFERENCE["keyway_50_14_5p5_r1"]
    one, two = triangulate(outline), triangulate(outline)
    for name in ("nodes", "triangles", "sides", "side_edge", "side_span"):
        assert np.array_equal(getattr(one, name), getattr(two, name))


@pytest.mark.parametrize("power", [-40, -7, 1, 30])
def test_scaling_by_a_power_of_two_changes_nothing(power):
    outline = REFERENCE["groove_25_2"]
    factor = 2.0**power
    one = triangulate(outline)
    two = triangulate(Outline(outline.vertices * factor, outline.bulges))
    assert np.array_equal(one.triangles, two.triangles)
    assert np.array_equal(one.nodes * factor, two.nodes)


@pytest.mark.parametrize("shift", [1e3, 1e5])
def test_far_from_the_origin(shift):
    outline = angle(r=1.0).translated(shift, -2.0 * shift)
    mesh = triangulate(outline)
    assert mesh.angles.min() >= SMALLEST_ANGLE * (1.0 - 1e-6)
    assert true_area(mesh) == pytest.approx(outline.area, rel=1e-9)


def test_a_void_in_the_sliver_between_chord_and_arc():
    # the coarsest chords of the disc leave the small void outside
    outline = disc(2.0, voids=[disc(0.01, 0.985 * math.cos(math.pi / 12), 0.985 * math.sin(math.pi / 12))])
    check_mesh(triangulate(outline), outline)


def test_walls_too_thin_are_named_soon(monkeypatch):
    monkeypatch.setattr(module, "_MOST_NODES", 10_000)
    with pytest.raises(MeshError, match="walls and details so thin need more than 10000 nodes") as caught:
        triangulate(block(1, 2e-6))
    x, y = caught.value.at
    assert 0.0 <= x <= 1.0
    assert 0.0 <= y <= 2e-6


def test_details_too_fine_are_named():
    with pytest.raises(MeshError, match="drop the detail") as caught:
        triangulate(block(1, 1, [disc(1.5e-7, 0.4, 0.3)]))
    assert caught.value.at == pytest.approx((0.4, 0.3), abs=1e-5)


def test_rounds_are_limited(monkeypatch):
    monkeypatch.setattr(module, "_MOST_ROUNDS", 3)
    with pytest.raises(MeshError, match="not settled in 3 rounds"):
        triangulate(angle(r=1.0))


# --- the bent triangle ----------------------------------------------------------------------------------


def test_a_side_bent_through_the_opposite_corner_is_refused():
    corners = np.array([[(0.5, 0.2), (0.0, 0.0), (1.0, 0.0)]])  # the side below bulges by bulge / 2
    bulges = np.array([[-0.3, 0.0, 0.0], [0.3, 0.0, 0.0], [-0.6, 0.0, 0.0], [0.0, 0.0, 0.0]])
    refused = invalid_when_bent(np.repeat(corners, 4, axis=0), bulges)
    assert refused.tolist() == [True, False, True, False]


@pytest.mark.parametrize("half", [0.05, 0.26, 0.8])
def test_the_jacobian_vanishes_where_the_tangent_meets_the_neighbour(half):
    # over an inward arc of half sweep a on a chord L the Jacobian is least at the chord's ends, where it is
    # 1 - (L / 2) tan(a) / h of the straight triangle's of height h; 0.3 is asked for
    limit = 0.5 * math.tan(half) / 0.7
    bulges = np.array([[-math.tan(half / 2.0), 0.0, 0.0]])
    for factor, refused in ((0.999, True), (1.001, False)):
        corners = np.array([[(0.5, factor * limit), (0.0, 0.0), (1.0, 0.0)]])
        for turn in range(3):  # whichever side is bent
            given_corners, given_bulges = np.roll(corners, turn, axis=1), np.roll(bulges, turn, axis=1)
            assert invalid_when_bent(given_corners, given_bulges)[0] == refused


# --- any outline ----------------------------------------------------------------------------------------

FEW = settings(max_examples=25, deadline=None, suppress_health_check=list(HealthCheck))


def made(*parts):
    try:
        return Outline(*parts)
    except OutlineError:
        assume(False)


@FEW
@given(
    st.lists(st.tuples(st.floats(0.3, 1.0), st.floats(0.15, 1.0), st.floats(-0.4, 0.4)), min_size=3, max_size=14),
    st.floats(0.0, 6.0),
)
def test_any_star_shaped_outline(spokes, turn):
    step, radius, bulges = np.array(spokes).T
    bulges[np.abs(bulges) < 1e-9] = 0.0
    around = turn + 2.0 * np.pi * np.cumsum(step) / step.sum()
    outline = made(np.stack([radius * np.cos(around), radius * np.sin(around)], axis=1), bulges)
    check_mesh(triangulate(outline), outline)


@FEW
@given(
    st.lists(st.tuples(st.floats(0.05, 1.0), st.floats(0.05, 1.0)), min_size=1, max_size=6),
    st.floats(0.01, 0.45),
)
def test_any_stair_with_fillets(steps, share):
    # down the right-hand side of a stair, each re-entrant corner rounded, each outer corner too
    width, height = np.array(steps).T
    x, y = np.cumsum(width), np.cumsum(height[::-1])[::-1]
    r = share * min(width.min(), height.min())
    points, bulges = [(0.0, y[0]), (0.0, 0.0), (x[-1], 0.0)], [0.0, 0.0, 0.0]
    for k in reversed(range(len(x))):
        points += [(x[k], y[k] - r), (x[k] - r, y[k])]
        bulges += [QUARTER, 0.0]
        if k:
            points += [(x[k - 1] + r, y[k]), (x[k - 1], y[k] + r)]
            bulges += [-QUARTER, 0.0]
    outline = made(points, bulges)
    check_mesh(triangulate(outline), outline)


@FEW
@given(st.lists(st.tuples(st.floats(0.02, 0.98), st.floats(-1, 1), st.floats(-1, 1)), min_size=1, max_size=9))
def test_any_perforated_plate(holes):
    voids = []
    for k, (share, dx, dy) in enumerate(holes):
        slack = 0.49 * (1.0 - share)
        voids.append(disc(share, k % 3 + 0.5 + slack * dx, k // 3 + 0.5 + slack * dy))
    outline = made([(0, 0), (3, 0), (3, 3), (0, 3)], None, voids)
    check_mesh(triangulate(outline), outline)


def test_a_detail_at_the_end_of_rounding_is_refused_with_its_place():
    # an arc of 3e-7 of the size: two nodes fall on one place, which once was a division by zero
    vertices = [(0.0, 0.0), (0.5, 0.0), (0.5000003048055872, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)]
    outline = Outline(vertices, [0.0, 0.6681610954194896, 0.0, 0.0, 0.0, -0.25068742734314553])
    with pytest.raises(MeshError, match=r"no mesh near \(0\.5, .*thicken the wall, or drop the detail") as caught:
        triangulate(outline)
    assert caught.value.at == pytest.approx((0.5, 0.0), abs=1e-6)
