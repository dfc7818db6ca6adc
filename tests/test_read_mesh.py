"""The boundary of flat meshes, in formats that meshio writes: the outline that was meshed comes back."""

import meshio
import numpy as np
import pytest
from fuzz_files import plate_mesh, quiet

from torsionfe.errors import ReadError
from torsionfe.outline.files import meshes, read_outline, read_outline_report
from torsionfe.outline.files.loops import ReadOptions

# in one process, where the tests are about the boundary; the process of its own has tests below
OPTIONS = ReadOptions()


def boundary(points, cells):
    arrays = {"points": np.asarray(points, dtype=float)}
    return meshes.boundary_of(arrays | {f"{k:06d} {name}": np.asarray(c) for k, (name, c) in enumerate(cells)}, OPTIONS)


@pytest.fixture
def mesh_file(tmp_path):
    """A function that writes a mesh and returns its path."""

    def save(name, points, cells, **options):
        flat = np.column_stack([points, np.zeros(len(points))]) if np.shape(points)[1] == 2 else points
        path = tmp_path / name
        with quiet():
            meshio.write(path, meshio.Mesh(flat, cells), **options)
        return path

    return save


@pytest.mark.parametrize("name", ["plate.vtk", "plate.vtu", "plate.msh", "plate.stl", "plate.obj", "plate.inp"])
def test_a_plate_with_a_hole_in_many_formats(mesh_file, name):
    points, cells = plate_mesh()
    result = read_outline_report(mesh_file(name, points, cells))
    # the hole's 16 chords are a circle again, the nodes along the straight edges are gone
    assert result.outline.area == pytest.approx(900 - 25 * np.pi, rel=1e-6)
    assert len(result.outline.vertices) == 4
    assert result.arcs_restored == 1
    assert result.unit is None


def test_quadratic_cells_bring_their_nodes_halfway(mesh_file):
    points, cells = plate_mesh(order=2)
    path = mesh_file("plate.vtk", points, cells)
    assert read_outline_report(path).restored.arcs[0].chords == 32
    assert read_outline(path).area == pytest.approx(900 - 25 * np.pi, rel=1e-12)
    as_it_is = read_outline(path, restore_arcs=False)
    assert as_it_is.area == pytest.approx(900 - 25 * 16 * np.sin(np.pi / 16), rel=1e-12)


def test_quadrilaterals_polygons_and_mixed_cells():
    x, y = np.meshgrid([0.0, 10.0, 20.0, 30.0], [0.0, 5.0, 10.0])
    points = np.stack([x.ravel(), y.ravel()], axis=1)
    quads = np.array([[0, 1, 5, 4], [1, 2, 6, 5], [4, 5, 9, 8], [5, 6, 10, 9], [6, 7, 11, 10]])
    triangles = [[2, 3, 6], [3, 7, 6]]
    found = boundary(points, [("quad", quads), ("triangle", triangles), ("line", [[0, 1]]), ("vertex", [[0]])])
    assert [len(loop.vertices) for loop in found.loops] == [4]
    whole = boundary(points, [("polygon6", [[0, 1, 2, 3, 11, 8]])])
    np.testing.assert_allclose(sorted(whole.loops[0].vertices.tolist()), [[0, 0], [0, 10], [30, 0], [30, 10]])


def test_nodes_in_one_place_are_one_and_cells_twice_are_once():
    points = [[0, 0], [10, 0], [10, 10], [0, 0], [10, 10], [0, 10]]
    found = boundary(points, [("triangle", [[0, 1, 2], [3, 4, 5], [2, 0, 1]])])
    assert [len(loop.vertices) for loop in found.loops] == [4]


def test_a_mesh_at_a_height_is_flattened_and_told():
    points, cells = plate_mesh()
    found = boundary(np.column_stack([points, np.full(len(points), 2.5)]), cells)
    assert found.notes == ("flattened from z = 2.5",)


@pytest.mark.parametrize(
    ("points", "cells", "message"),
    [
        (plate_mesh()[0], [("line", [[0, 1]])], "holds no triangle or quadrilateral"),
        ([[0, 0, 0], [1, 0, 0], [0, 1, 0], [0, 0, 1]], [("tetra", [[0, 1, 2, 3]])], "cells of the type 'tetra'"),
        ([[0, 0, 0], [9, 0, 0], [0, 9, 4]], [("triangle", [[0, 1, 2]])], r"not flat: z is 0 at .* and 4 at \(0, 9\)"),
        ([[0, 0, 0], [0, 0, 9], [0, 9, 0]], [("triangle", [[0, 1, 2]])], "not flat"),
        ([[0, 0], [1, 0], [0, 1]], [("triangle", [[0, 1, 3]])], "names a node 3"),
        ([[0, 0], [1, 0], [0, 1]], [("triangle", [[0, 1, -1]])], "names a node 1 .or -1. and has 3"),
        ([[0, 0], [1, np.nan], [0, 1]], [("triangle", [[0, 1, 2]])], "not finite"),
        ([[0, 0], [0, 0], [0, 0]], [("triangle", [[0, 1, 2]])], "has no size"),
        ([[0, 0], [1, 0], [2, 0]], [("triangle", [[0, 1, 2]])], "no area|folds? back|encloses|same point|crosses"),
        ([[0], [1], [2]], [("triangle", [[0, 1, 2]])], "2 or 3 coordinates"),
        ([[0, 0], [1, 0], [0, 1]], [("triangle", [[0.0, 1.0, 2.0]])], "no lists of node numbers"),
        (
            [[0, 0], [9, 0], [0, 9], [9, 9], [4, 4]],
            [("triangle", [[0, 1, 2], [1, 2, 3], [1, 2, 4]])],
            r"3 cells share the edge at \(9, 0\)|at \(0, 9\)",
        ),
        ([[0, 0], [9, 0], [0, 9], [-9, 0], [0, -9]], [("triangle", [[0, 1, 2], [0, 3, 4]])], r"4 edges meet at \(0, 0"),
    ],
)
def test_meshes_that_are_no_cross_section(points, cells, message):
    from torsionfe.outline.files.nesting import nest

    with pytest.raises(ReadError, match=message):
        nest(boundary(points, cells).loops)


def test_damaged_files_are_errors_with_the_reason(mesh_file):
    points, cells = plate_mesh()
    path = mesh_file("plate.vtk", points, cells, binary=False)
    text = path.read_text()
    path.write_text(text[: len(text) // 2])
    with pytest.raises(ReadError, match=r"plate\.vtk: it is no mesh that can be read, or a damaged one \("):
        read_outline(path)
    path.write_bytes(b"\0" * 2000)
    with pytest.raises(ReadError, match=r"plate\.vtk: it is no mesh"):
        read_outline(path)


def test_a_reader_that_never_ends_is_stopped(mesh_file):
    points, cells = plate_mesh()
    path = mesh_file("plate.msh", points, cells, binary=False, file_format="ansys")
    path.write_bytes(path.read_bytes()[:400])  # cut short among the points, for which its reader waits for ever
    with pytest.raises(ReadError, match=r"could not be read within 1 s"):
        read_outline(path, max_seconds=1.0)


def test_entities_of_a_document_are_not_expanded(mesh_file):
    points, cells = plate_mesh()
    path = mesh_file("plate.vtu", points, cells)
    data = path.read_bytes()
    path.write_bytes(b'<!DOCTYPE a [<!ENTITY b SYSTEM "file:///etc/passwd">]>' + data)
    with pytest.raises(ReadError, match="declares entities"):
        read_outline(path)


def test_a_reader_that_cannot_be_started(mesh_file, monkeypatch):
    points, cells = plate_mesh()
    path = mesh_file("plate.vtk", points, cells)
    monkeypatch.setattr(meshes.sys, "executable", str(path))
    with pytest.raises(ReadError, match="cannot be started"):
        read_outline(path)
