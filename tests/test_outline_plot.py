"""The drawing of an outline, by its artists."""

import subprocess
import sys
from pathlib import Path

import matplotlib as mpl

mpl.use("Agg")

import matplotlib.pyplot as plt
import numpy as np
import pytest
import shapely
from matplotlib.path import Path as DrawnPath

from torsionfe.outline import shapes
from torsionfe.output.outline_plot import outline_path, plot_outline

BRACKET = shapes.angle(80, 60, 8, 8, 4)


@pytest.fixture(autouse=True)
def _closed():
    yield
    plt.close("all")


@pytest.mark.parametrize("shape", [BRACKET, shapes.tube(30, 4), shapes.splined_shaft(6, 28, 23, 6, 0.3)])
def test_the_path_follows_the_true_arcs(shape):
    path = outline_path(shape)
    assert np.count_nonzero(path.codes == DrawnPath.MOVETO) == len(shape.voids) + 1
    # matplotlib breaks curves into chords finely enough once they are large
    rings = path.transformed(mpl.transforms.Affine2D().scale(1e4)).to_polygons(closed_only=True)
    assert len(rings) == len(shape.voids) + 1
    area = sum(0.5 * np.sum(p[:-1, 0] * p[1:, 1] - p[1:, 0] * p[:-1, 1]) for p in rings)  # voids run clockwise
    assert area / 1e8 == pytest.approx(shape.area, rel=1e-5)


def test_the_cubics_are_on_the_circle():
    path = outline_path(shapes.round_bar(2))
    points = path.vertices
    cubic = np.stack([np.vstack([points[:1], points[3:-1:3]])[:-1], points[1:-1:3], points[2:-1:3], points[3:-1:3]])
    t = np.linspace(0.0, 1.0, 21)[:, None, None]
    x = (1 - t) ** 3 * cubic[0] + 3 * t * (1 - t) ** 2 * cubic[1] + 3 * t**2 * (1 - t) * cubic[2] + t**3 * cubic[3]
    assert np.abs(np.hypot(x[..., 0], x[..., 1]) - 1.0).max() < 5e-7


def test_a_drawing_says_sizes_units_and_numbers():
    drawing = BRACKET.plot(unit="mm")
    assert [text.get_text() for text in drawing.dimensions] == ["80 mm", "60 mm"]
    assert (drawing.axes.get_xlabel(), drawing.axes.get_ylabel()) == ("x [mm]", "y [mm]")
    assert drawing.axes.get_aspect() == 1.0
    x0, x1 = drawing.axes.get_xlim()
    y0, y1 = drawing.axes.get_ylim()
    assert x0 < 0 < 80 < x1
    assert y0 < 0 < 60 < y1
    for k, label in drawing.numbers.items():  # each label beside its own vertex, clear of the material
        assert label.get_text() == str(k)
        assert label.xy == tuple(BRACKET.vertices[k])
        away = np.array(label.xyann) / np.hypot(*label.xyann)
        assert not BRACKET.polygon().contains(shapely.Point(BRACKET.vertices[k] + 0.5 * away))
    dots = drawing.vertices.get_xydata()
    np.testing.assert_array_equal(dots, BRACKET.vertices[sorted(drawing.numbers)])


def test_all_corners_are_numbered_and_smooth_vertices_where_there_is_room():
    sharp = shapes.angle(80, 60, 8)
    assert sorted(sharp.plot().numbers) == [0, 1, 2, 3, 4, 5]
    toothed = shapes.splined_shaft(20, 28, 23, 1.5, 0.2)  # 160 vertices, of which 40 are the corners of the tips
    numbers = sorted(toothed.plot().numbers)
    corners = np.flatnonzero(np.abs(toothed.edges.interior_angle - np.pi) > 0.01)
    assert numbers == corners.tolist()
    assert sorted(shapes.ellipse(20, 10).plot().numbers) == []
    assert 3 in BRACKET.plot().numbers


def test_voids_carry_the_numbers_that_errors_use():
    axes = shapes.multi_cell(60, 30, 2, 2).plot().axes
    assert {"void 0", "void 1"} <= {text.get_text() for text in axes.texts}


def test_it_draws_into_given_axes_and_can_leave_things_out():
    ax = plt.subplots()[1]
    drawing = plot_outline(BRACKET, ax, vertex_numbers=False, dimensions=False)
    assert drawing.axes is ax
    assert drawing.numbers == {}
    assert drawing.dimensions == ()
    assert drawing.material in ax.patches
    assert ax.get_xlabel() == "x"
    assert not [text for text in ax.texts if text.get_text()]


def test_importing_the_package_leaves_the_plotting_library_alone():
    code = "import sys, torsionfe.outline.shapes, torsionfe.output.outline_plot; sys.exit('matplotlib' in sys.modules)"
    root = Path(__file__).parents[1]
    assert subprocess.run([sys.executable, "-c", code], check=False, cwd=root).returncode == 0
