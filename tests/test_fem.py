"""Elements, quadrature, arcs and assembly, each against something worked by hand or exact."""

import numpy as np
import pytest

from torsionfe.errors import SolveError
from torsionfe.fem import multigrid
from torsionfe.fem.assembly import assemble
from torsionfe.fem.direct import solve_positive
from torsionfe.fem.elements import element, line_gradient, line_nodes, line_values, rule
from torsionfe.fem.geometry import patches, reference_map, side_curve
from torsionfe.fem.solve import solve_constrained
from torsionfe.fem.space import space_of
from torsionfe.mesh.bisect import bisect
from torsionfe.mesh.triangulate import triangulate
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline
from torsionfe.torsion.fields import solve_fields
from torsionfe.torsion.solve import solve_torsion


def two_triangles():
    """The unit square cut along the diagonal from (0, 0) to (1, 1)."""
    outline = Outline([(0, 0), (1, 0), (1, 1), (0, 1)])
    nodes = np.array([[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]])
    sides = np.array([[0, 1], [1, 2], [2, 3], [3, 0]])
    spans = np.tile([0.0, 1.0], (4, 1))
    return TriMesh(nodes, np.array([[1, 2, 0], [3, 0, 2]]), sides, np.arange(4), spans, outline.edges)


@pytest.mark.parametrize("order", range(1, 7))
def test_basis_is_nodal_and_sums_to_one(order):
    basis = element(order)
    assert len(basis.nodes) == (order + 1) * (order + 2) // 2
    np.testing.assert_allclose(basis.values(basis.nodes), np.eye(len(basis.nodes)), atol=1e-10)
    points = rule(6).points
    np.testing.assert_allclose(basis.values(points).sum(axis=1), 1.0, atol=1e-10)
    np.testing.assert_allclose(basis.gradients(points).sum(axis=1), 0.0, atol=1e-9)
    step = 1e-6
    for axis in range(2):
        shift = step * np.eye(2)[axis]
        slope = (basis.values(points + shift) - basis.values(points - shift)) / (2 * step)
        np.testing.assert_allclose(basis.gradients(points)[:, :, axis], slope, atol=1e-6)


@pytest.mark.parametrize("order", range(1, 5))
def test_line_basis(order):
    nodes = line_nodes(order)
    np.testing.assert_allclose(line_values(order, nodes), np.eye(order + 1), atol=1e-12)
    t = np.linspace(0, 1, 5)
    slope = (line_values(order, t + 1e-6) - line_values(order, t - 1e-6)) / 2e-6
    np.testing.assert_allclose(line_gradient(order, t), slope, atol=1e-7)


@pytest.mark.parametrize("degree", [1, 2, 3, 4, 5, 6, 8, 12, 16])
def test_quadrature_is_exact_to_its_degree(degree):
    # int over the reference triangle of x^i y^j = i! j! / (i + j + 2)!
    from math import factorial

    quadrature = rule(degree)
    assert quadrature.weights.min() > 0
    for i in range(degree + 1):
        for j in range(degree + 1 - i):
            exact = factorial(i) * factorial(j) / factorial(i + j + 2)
            found = quadrature.weights @ (quadrature.points[:, 0] ** i * quadrature.points[:, 1] ** j)
            assert found == pytest.approx(exact, rel=1e-12)


def test_two_triangles_by_hand():
    # each right triangle with legs 1: 1/2 [[2, -1, -1], [-1, 1, 0], [-1, 0, 1]], the right angle first
    system = assemble(space_of(two_triangles(), 1))
    by_hand = np.array([[1, -0.5, 0, -0.5], [-0.5, 1, -0.5, 0], [0, -0.5, 1, -0.5], [-0.5, 0, -0.5, 1]])
    np.testing.assert_allclose(system.stiffness.toarray(), by_hand, atol=1e-14)
    np.testing.assert_allclose(system.load, [1 / 3, 1 / 6, 1 / 3, 1 / 6], atol=1e-14)


@pytest.mark.parametrize("order", [1, 2, 3, 4])
def test_stiffness_knows_constants_and_linear_functions(order):
    mesh = triangulate(shapes.angle(62, 46, 13, root_radius=7))
    system = assemble(space_of(mesh, order))
    scale = abs(system.stiffness).max()
    np.testing.assert_allclose(system.stiffness @ np.ones(system.space.size), 0.0, atol=1e-10 * scale)
    assert abs(system.stiffness - system.stiffness.T).max() < 1e-10 * scale
    assert system.load.sum() == pytest.approx(mesh_area(mesh), rel=1e-12)
    assert system.twist.sum() == pytest.approx(0.0, abs=1e-7 * abs(system.twist).max())


def mesh_area(mesh):
    return sum(patch.weights.sum() for patch in patches(mesh, 2))


@pytest.mark.parametrize(
    "outline",
    [
        shapes.round_bar(44),
        shapes.tube(50, 3),
        shapes.keyed_shaft(44, 12, 5, root_radius=0.8),
        shapes.box(70, 40, 5, outer_radius=8, inner_radius=3),
    ],
    ids=lambda o: o.kind,
)
def test_elements_fill_the_outline_exactly(outline):
    assert mesh_area(triangulate(outline)) == pytest.approx(outline.area, rel=1e-12)


def test_curved_map_puts_sides_on_the_arc():
    mesh = triangulate(shapes.round_bar(2.0))
    t = np.linspace(0, 1, 9)
    points, slope = side_curve(mesh, np.arange(len(mesh.sides)), t)
    np.testing.assert_allclose(np.hypot(*points.transpose(2, 0, 1)), 1.0, atol=1e-14)
    numeric = (side_curve(mesh, [0], t + 1e-6)[0] - side_curve(mesh, [0], t - 1e-6)[0]) / 2e-6
    np.testing.assert_allclose(slope[:1], numeric, atol=1e-7)


def test_curved_map_has_the_jacobian_of_its_points():
    mesh = triangulate(shapes.keyed_shaft(44, 12, 5, root_radius=0.8))
    every = np.arange(len(mesh.triangles))
    reference = rule(5).points
    _, jacobian = reference_map(mesh, every, reference)
    for axis in range(2):
        shift = 1e-6 * np.eye(2)[axis]
        ahead, behind = (reference_map(mesh, every, reference + s * shift)[0] for s in (1, -1))
        np.testing.assert_allclose(jacobian[..., axis], (ahead - behind) / 2e-6, atol=1e-6)


def test_bisection_keeps_the_outline_and_the_angles():
    outline = shapes.keyed_shaft(44, 12, 5, root_radius=0.8)
    mesh = triangulate(outline)
    first = np.degrees(mesh.angles.min())
    rng = np.random.default_rng(7)
    for _ in range(8):
        finer, parent = bisect(mesh, rng.random(len(mesh.triangles)) < 0.3)
        assert len(parent) == len(finer.triangles) > len(mesh.triangles)
        centres = finer.nodes[finer.triangles].mean(axis=1)
        corners = mesh.nodes[mesh.triangles[parent]]
        reach = np.abs(corners - corners.mean(axis=1, keepdims=True)).max(axis=(1, 2))
        assert (np.abs(centres - corners.mean(axis=1)).max(axis=1) <= reach).all()
        mesh = finer
        # every link is used twice inside, once on the boundary: the mesh conforms
        uses = np.bincount(mesh.triangle_links.ravel())
        assert set(np.unique(uses)) <= {1, 2}
        assert np.array_equal(np.flatnonzero(uses == 1), np.sort(mesh.side_link))
        assert mesh_area(mesh) == pytest.approx(outline.area, rel=1e-12)
    assert np.degrees(mesh.angles.min()) >= 0.4 * first
    assert mesh.areas.min() > 0


def test_bisection_of_nothing_changes_nothing():
    mesh = two_triangles()
    same, parent = bisect(mesh, np.zeros(2, dtype=bool))
    assert np.array_equal(same.triangles, mesh.triangles)
    assert parent.tolist() == [0, 1]


def test_unknowns_are_counted_before_they_are_made():
    mesh = triangulate(shapes.box(70, 40, 5, outer_radius=8, inner_radius=3))
    for order in (1, 2, 3, 5):
        assert mesh.unknowns(order) == space_of(mesh, order).size


def test_a_singular_matrix_is_a_typed_error():
    system = assemble(space_of(two_triangles(), 1))
    with pytest.raises(SolveError, match=r"singular|not finite"):
        solve_positive(system.stiffness, np.array([1.0, 0.0, 0.0, 0.0]))


def test_tied_unknowns_are_equal_and_fixed_ones_zero():
    system = assemble(space_of(two_triangles(), 1))
    field = solve_constrained(system.space, system.stiffness, system.load, np.array([-1, 0, 0, 1]))
    assert field[0] == 0.0
    assert field[1] == field[2]
    assert field[3] != field[1]


@pytest.mark.parametrize("order", [1, 2, 3])
@pytest.mark.parametrize(
    "outline", [shapes.multi_cell(120, 60, 6, 2, inner_radius=4), shapes.angle(62, 46, 13)], ids=lambda o: o.kind
)
def test_multigrid_agrees_with_the_direct_solve(order, outline, monkeypatch):
    mesh = triangulate(outline)
    corner = mesh.nodes[0]
    for k in range(40):  # graded towards a corner, as the adaptive loop leaves it
        distance = np.hypot(*(mesh.nodes[mesh.triangles].mean(axis=1) - corner).T)
        near = distance < np.quantile(distance, 0.3)
        mesh, _ = bisect(mesh, np.ones(len(near), dtype=bool) if k % 2 else near)
        if mesh.unknowns(order) > 12_000:
            break
    direct = solve_fields(mesh, order)
    monkeypatch.setattr("torsionfe.fem.solve.DIRECT_UP_TO", 0)
    monkeypatch.setattr("torsionfe.fem.multigrid._COARSEST", 500)
    iterated = solve_fields(mesh, order)
    for a, b in ((direct.phi, iterated.phi), (direct.omega, iterated.omega)):
        np.testing.assert_allclose(b, a, atol=1e-7 * np.abs(a).max())
    assert iterated.lower == pytest.approx(direct.lower, rel=1e-12)
    assert iterated.upper == pytest.approx(direct.upper, rel=1e-12)


def test_multigrid_needs_no_more_steps_on_finer_meshes(monkeypatch):
    steps = []
    cycle = multigrid._cycle
    monkeypatch.setattr("torsionfe.fem.solve.DIRECT_UP_TO", 0)
    monkeypatch.setattr("torsionfe.fem.multigrid._COARSEST", 300)
    monkeypatch.setattr(multigrid, "_cycle", lambda a, b, depth, r: (steps.append(depth), cycle(a, b, depth, r))[1])
    mesh = triangulate(shapes.angle(62, 46, 13, root_radius=7))
    counts = []
    for _ in range(3):
        for _ in range(4):
            mesh, _ = bisect(mesh, np.ones(len(mesh.triangles), dtype=bool))
        steps.clear()
        solve_fields(mesh, 2)
        counts.append(steps.count(0))
    assert counts[-1] <= counts[0] + 8  # two solves of about ten steps each
    assert counts[-1] <= 40


def refined_angle(rounds):
    mesh = triangulate(shapes.angle(62, 46, 13, root_radius=7))
    for _ in range(rounds):
        mesh, _ = bisect(mesh, np.ones(len(mesh.triangles), dtype=bool))
    return mesh


@pytest.mark.parametrize("size", [100_000, 0])
def test_an_iteration_that_stalls_is_factorised_after_all(monkeypatch, size):
    mesh = refined_angle(8)
    direct = solve_fields(mesh, 2)
    monkeypatch.setattr("torsionfe.fem.solve.DIRECT_UP_TO", 0)
    monkeypatch.setattr(multigrid, "_FACTORISED", size)
    monkeypatch.setattr(multigrid, "_FEW_STEPS" if size else "_MOST_STEPS", 1)
    stalled = solve_fields(mesh, 2)
    np.testing.assert_allclose(stalled.omega, direct.omega, atol=1e-10 * np.abs(direct.omega).max())
    np.testing.assert_allclose(stalled.phi, direct.phi, atol=1e-10 * direct.phi.max())


def test_two_needles_joined_are_solved():
    # tips of 1.2 and 16 degrees force triangles on which the smoother is slow: 200 steps were not enough
    tips = [(-3.24507074, -4.27836861), (-0.9574927, -1.31092274), (3.79889621, 4.85913751), (3.6636963, 4.75979757)]
    outline = Outline([*tips, (2.90900067, 3.90886845), (-0.95056138, -1.16899594)])
    rough = solve_torsion(outline, 1e-2, 1, peak_tol=0.1, max_unknowns=40_000).torsion_constant
    sure = solve_torsion(outline, 1e-4, 3, peak_tol=0.1).torsion_constant
    assert rough.lower <= sure.value <= rough.upper
