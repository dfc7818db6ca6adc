"""Figures: what they show is what was solved, they can be read, and their files are whole or not there."""

import math
import os
import re
import subprocess
import sys
from functools import cache
from io import BytesIO
from itertools import pairwise

import matplotlib
import numpy as np
import pytest
from matplotlib.colors import to_rgb
from matplotlib.figure import Figure
from scipy import integrate

import torsionfe as tf
from torsionfe.outline import shapes
from torsionfe.outline.samples import sample
from torsionfe.output import style
from torsionfe.output.boundary_plot import boundary_profiles, plot_boundary_stress
from torsionfe.output.contour import plot_stress
from torsionfe.output.convergence import plot_convergence
from torsionfe.output.figures import check_figure_path, figure_data, save_figure
from torsionfe.output.sampled import sampled, split_triangle
from torsionfe.output.section_view import Scale, level_values
from torsionfe.output.style import cielab, stress_colours, warping_colours
from torsionfe.output.warping_plot import plot_warping, plot_warping_surface
from torsionfe.output.zoom import plot_hot_spot


def star():
    turn = np.arange(10) * np.pi / 5.0
    reach = np.where(np.arange(10) % 2 == 0, 10.0, 4.0)
    return tf.Outline(np.stack([reach * np.cos(turn), reach * np.sin(turn)], axis=1))


SECTIONS = {
    "angle": lambda: shapes.angle(80.0, 80.0, 8.0, root_radius=8.0),
    "sharp angle": lambda: shapes.angle(80.0, 80.0, 8.0),
    "box": lambda: sample("paddle-tube"),
    "wide flange": lambda: sample("gate-beam"),
    "keyed shaft": lambda: sample("winch-shaft"),
    "plank": lambda: sample("deck-plank"),
    "channel": lambda: shapes.channel(80.0, 40.0, 6.0, 5.0, root_radius=6.0),
    "strip": lambda: shapes.rectangle(200.0, 10.0),
    "round": lambda: shapes.round_bar(50.0),
    "ellipse": lambda: shapes.ellipse(60.0, 30.0),
    "star": star,
    "tiny": lambda: shapes.tee(4e-6, 5e-6, 0.8e-6, 0.6e-6, root_radius=0.3e-6),
    "far": lambda: shapes.angle(80.0, 80.0, 8.0, root_radius=8.0).translated(1e6, -3e5),
}


@cache
def solved(name):
    return tf.solve_torsion(SECTIONS[name](), rel_tol=5e-3, peak_tol=1e-2)


# --- the look ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("colours", [stress_colours(), warping_colours()], ids=lambda c: c.name)
def test_colour_maps_are_even_and_keep_their_order_in_grey(colours):
    lab = cielab(colours.colors)
    steps = np.linalg.norm(np.diff(lab, axis=0), axis=1)
    assert steps.max() < 1.01 * steps.min()  # the same distance to the eye everywhere
    assert (np.diff(lab[:, 0]) < -0.1).all()  # darker at every step
    assert lab[0, 0] > 90.0
    assert 25.0 < lab[-1, 0] < 35.0  # ink on top stays visible
    assert cielab([colours.get_over()])[0, 0] < lab[-1, 0] - 10.0  # beyond the scale is told from its end


def test_lightness_is_that_of_the_standard():
    # CIE 15:2004 with the sRGB primaries of IEC 61966-2-1; values of sRGB red, green, blue and grey from memory
    known = {"#ff0000": (53.24, 80.09, 67.20), "#00ff00": (87.73, -86.18, 83.18), "#0000ff": (32.30, 79.19, -107.86)}
    for colour, lab in known.items():
        assert cielab([to_rgb(colour)])[0] == pytest.approx(lab, abs=0.05)
    assert cielab([to_rgb("#777777")])[0] == pytest.approx((50.03, 0.0, 0.0), abs=0.05)


def test_series_and_marks_are_told_apart_without_colour():
    light = sorted(cielab([to_rgb(accent.colour)])[0, 0] for accent in style.ACCENTS)
    assert min(np.diff(light)) > 9.0
    assert len({accent.marker for accent in style.ACCENTS}) == len(style.ACCENTS)
    assert len({str(accent.dashes) for accent in style.ACCENTS}) == len(style.ACCENTS)
    assert len({mark.shape for mark in (style.HOT_SPOT, style.SINGULAR, style.TWIST_CENTRE)}) == 3


def test_settings_join_those_of_the_user_and_leave_no_trace():
    with matplotlib.rc_context({"font.size": 13.0, "text.usetex": True}):
        with style.look():
            assert matplotlib.rcParams["font.size"] == 13.0  # theirs
            assert matplotlib.rcParams["axes.spines.top"] is False  # ours, where they set none
            assert matplotlib.rcParams["text.usetex"] is False
        assert matplotlib.rcParams["axes.spines.top"] is True
        assert matplotlib.rcParams["text.usetex"] is True
        ax = plot_stress(solved("round")).axes
        assert ax.xaxis.label.get_size() == pytest.approx(13.0)


def test_figures_need_no_display_and_leave_no_window():
    code = (
        "import sys, torsionfe as tf; s = tf.solve_torsion(tf.Outline([(0, 0), (3, 0), (3, 1), (0, 1)]), 0.05, "
        "peak_tol=1.0); s.plot(); s._repr_html_(); print('matplotlib.pyplot' in sys.modules)"
    )
    bare = {key: value for key, value in os.environ.items() if key not in ("DISPLAY", "MPLBACKEND")}
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True, env=bare)
    assert found.stdout.strip() == "False"


@pytest.mark.parametrize(
    ("value", "text"),
    [(34.1572, "34.16"), (0.00043937, "4.394 × 10⁻⁴"), (-2.5e9, "−2.5 × 10⁹"), (0.0, "0"), (math.nan, "not defined")],
)
def test_numbers_are_set_as_in_print(value, text):
    assert style.written_number(value) == text


@pytest.mark.parametrize(
    ("largest", "unit", "label"),
    [
        (3.3e-4, "1/mm^3", "s [10⁻⁶/mm³]"),
        (250.0, "MPa", "s [MPa]"),
        (3.0e7, "Pa", "s [10⁶ Pa]"),
        (3.0e-5, "", "s [10⁻⁶]"),
        (12.0, "", "s"),
    ],
)
def test_a_power_of_ten_goes_into_the_label(largest, unit, label):
    scale = Scale.of("s", unit, largest)
    assert scale.label == label
    assert float(scale.write(largest)) * 10.0**scale.power == pytest.approx(largest)


# --- the fields that are drawn ------------------------------------------------------------------------------


@pytest.mark.parametrize("parts", [1, 2, 3, 7, 10])
def test_a_split_triangle_is_covered_once(parts):
    from torsionfe.fem.elements import element

    corner = element(parts).nodes[split_triangle(parts)]
    u, v = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    area = 0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])
    assert area == pytest.approx(np.full(parts**2, 0.5 / parts**2))


def test_samples_of_a_round_bar_are_exact():
    # Coulomb: tau = T r / J, no warping
    samples = sampled(tf.solve_torsion(SECTIONS["round"](), rel_tol=1e-6))
    radius = np.hypot(*samples.points.T)
    assert radius.max() == pytest.approx(25.0, rel=1e-12)
    assert samples.magnitude == pytest.approx(2.0 * radius / (np.pi * 25.0**4), abs=1e-3 * 2.0 / (np.pi * 25.0**3))
    assert np.abs(samples.warping).max() < 1e-4 * 25.0**2


def test_samples_of_an_ellipse_are_those_of_its_formulas():
    # Saint-Venant's ellipse (Timoshenko and Goodier, Theory of Elasticity, art. 104), semi-axes a along x and b
    a, b = 30.0, 15.0
    samples = sampled(tf.solve_torsion(SECTIONS["ellipse"](), rel_tol=1e-5))
    x, y = samples.points.T
    stress = 2.0 / (np.pi * a * b) * np.stack([-y / b**2, x / a**2], axis=1)
    assert samples.stress == pytest.approx(stress, abs=5e-3 * np.abs(stress).max())
    phi = a**2 * b**2 / (a**2 + b**2) * (1.0 - (x / a) ** 2 - (y / b) ** 2)
    assert samples.stress_function == pytest.approx(phi, abs=2e-3 * phi.max())
    warping = -(a**2 - b**2) / (a**2 + b**2) * x * y
    assert samples.warping == pytest.approx(warping, abs=2e-3 * np.abs(warping).max())


@pytest.mark.parametrize("name", ["angle", "plank", "keyed shaft"])
def test_samples_cover_the_section_and_reach_the_hot_spot(name):
    solution = solved(name)
    samples = sampled(solution)
    corner = samples.points[samples.triangles]
    u, v = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    area = 0.5 * (u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0])
    assert area.min() > 0.0
    assert area.sum() == pytest.approx(solution.outline.area, rel=2e-3)
    assert samples.magnitude.max() == pytest.approx(solution.hot_spot.stress_per_torque, rel=0.02)
    middle = corner[::97].mean(axis=1)
    inside = samples.stress[samples.triangles[::97]].mean(axis=1)
    top = solution.hot_spot.stress_per_torque
    off = np.hypot(*(inside - solution.stress_at(middle)).T) / top  # one is smoothed over nodes, the other not
    assert np.sqrt(np.mean(off**2)) < 0.02
    assert off.max() < 0.1


def test_a_window_takes_only_what_it_touches():
    solution = solved("angle")
    spot = solution.hot_spot
    window = (spot.x - 4.0, spot.y - 4.0, spot.x + 4.0, spot.y + 4.0)
    part, whole = sampled(solution, window, parts=3), sampled(solution, parts=3)
    assert 0 < len(part.triangles) < 0.5 * len(whole.triangles)
    within = ((whole.points > window[:2]) & (whole.points < window[2:])).all(axis=1)
    known = {tuple(point) for point in part.points}
    assert {tuple(point) for point in whole.points[within]} <= known


# --- contour ------------------------------------------------------------------------------------------------


def test_contour_shows_the_hot_spot_and_its_units():
    solution = solved("angle")
    drawn = plot_stress(solution, torque=4.5e5, unit="mm", stress_unit="MPa", mesh=True)
    peak = 4.5e5 * solution.hot_spot.stress_per_torque
    assert drawn.levels[0] == 0.0
    assert drawn.levels[-1] == pytest.approx(peak)
    assert drawn.contours.extend == "neither"
    assert drawn.hot_spots.get_xydata() == pytest.approx(np.array([[solution.hot_spot.x, solution.hot_spot.y]]))
    assert drawn.corners is None
    assert drawn.label.get_text() == f"{peak:.3g} MPa"
    assert drawn.bar.ax.get_ylabel() == "shear stress [MPa]"
    assert [t.get_text() for t in drawn.bar.ax.get_yticklabels()][-1] == f"{peak:.3g}"
    assert (drawn.axes.get_xlabel(), drawn.axes.get_ylabel()) == ("x [mm]", "y [mm]")
    assert drawn.axes.get_aspect() == 1.0
    assert [text.get_text() for text in drawn.legend.get_texts()] == ["hot spot", "shear flow"]
    inner = len(solution.mesh.links) - len(solution.mesh.sides)
    assert len(drawn.mesh.get_segments()) == inner


def test_contour_without_a_torque_is_per_torque():
    drawn = plot_stress(solved("wide flange"), unit="mm", flow=False, legend=False)
    assert drawn.bar.ax.get_ylabel() == "shear stress / torque [10⁻⁶/mm³]"
    assert drawn.label.get_text().endswith(" × 10⁻⁶/mm³")
    assert (drawn.flow, drawn.arrows, drawn.mesh, drawn.legend) == (None, None, None, None)
    assert len(drawn.hot_spots.get_xdata()) == 4


def test_stress_beyond_the_hot_spot_has_a_colour_of_its_own_at_sharp_corners():
    solution = solved("sharp angle")
    drawn = plot_stress(solution)
    assert drawn.contours.extend == "max"
    assert drawn.levels[-1] == pytest.approx(solution.hot_spot.stress_per_torque)
    assert drawn.corners.get_xydata() == pytest.approx(np.array([[8.0, 8.0]]))
    assert drawn.corners.get_marker() != drawn.hot_spots.get_marker()
    words = [text.get_text() for text in drawn.legend.get_texts()]
    assert words[0] == "sharp re-entrant corner: stress unbounded"
    assert words[1].startswith("largest stress elsewhere")
    assert words[2] == "above that, off the scale"


def test_without_a_finite_peak_the_scale_leaves_out_two_percent_of_the_area():
    solution = solved("star")
    assert solution.hot_spot is None
    drawn = plot_stress(solution)
    samples = sampled(solution)
    corner = samples.points[samples.triangles]
    u, v = corner[:, 1] - corner[:, 0], corner[:, 2] - corner[:, 0]
    area = u[:, 0] * v[:, 1] - u[:, 1] * v[:, 0]
    above = samples.magnitude[samples.triangles].mean(axis=1) > drawn.levels[-1]
    assert area[above].sum() / area.sum() == pytest.approx(0.02, abs=2e-3)
    assert drawn.hot_spots is None
    assert drawn.label is None
    assert "5 sharp re-entrant corners: stress unbounded" in [t.get_text() for t in drawn.legend.get_texts()]


@pytest.mark.parametrize("torque", [1e5, -1e5])
def test_arrows_turn_with_the_torque(torque):
    drawn = plot_stress(solved("round"), torque=torque)
    places = np.asarray(drawn.arrows.get_offsets())
    tips = np.array([path.vertices[0] for path in drawn.arrows.get_paths()])
    assert len(places) >= 8
    turning = (places[:, 0] * tips[:, 1] - places[:, 1] * tips[:, 0]) / np.hypot(*places.T) / np.hypot(*tips.T)
    # along the circle, counter-clockwise for a positive torque (right-hand rule about z)
    assert turning == pytest.approx(np.full(len(tips), np.sign(torque)), abs=0.05)


def test_lines_of_flow_are_equal_steps_of_the_stress_function():
    solution = solved("plank")
    drawn = plot_stress(solution)
    levels = np.asarray(drawn.flow.levels)
    phi = sampled(solution).stress_function
    assert np.diff(levels) == pytest.approx(np.full(len(levels) - 1, (phi.max() - phi.min()) / len(levels)))


def test_fill_is_an_image_clipped_to_the_true_outline():
    drawn = plot_stress(solved("keyed shaft"))
    assert drawn.contours.get_rasterized()
    clip, _ = drawn.contours.get_clip_path().get_transformed_path_and_affine()
    vertices = drawn.outline.get_path().vertices
    assert np.hypot(*vertices.T).max() < 22.0 * 1.02  # handles of cubic arcs reach a little beyond
    assert len(clip.vertices) == len(vertices)


def test_plots_compose_into_axes_of_the_user():
    figure = Figure(figsize=(9.0, 4.0), layout="constrained")
    left, right = figure.subplots(1, 2)
    first = plot_stress(solved("angle"), left, unit="mm")
    second = plot_stress(solved("box"), right, unit="mm")
    assert (first.axes, second.axes) == (left, right)
    assert len(figure.axes) == 4
    figure.draw_without_rendering()


@pytest.mark.parametrize("torque", [0.0, math.nan, math.inf, True, "450", None])
def test_torque_must_be_a_number_that_is_not_zero(torque):
    if torque is None:
        plot_stress(solved("round"))
        return
    with pytest.raises(tf.InputError, match="torque"):
        plot_stress(solved("round"), torque=torque)
    with pytest.raises(tf.InputError, match="torque"):
        plot_hot_spot(solved("round"), torque=torque)
    with pytest.raises(tf.InputError, match="torque"):
        plot_boundary_stress(solved("round"), torque=torque)


@pytest.mark.parametrize("levels", [1, 101, True, "many", [1.0], [0.0, 0.0], [2.0, 1.0], [0.0, math.nan]])
def test_levels_must_rise(levels):
    with pytest.raises(tf.InputError, match="levels"):
        plot_stress(solved("round"), levels=levels)


def test_levels_are_round_numbers_that_end_at_the_peak():
    assert level_values(12, 0.0, 197.7).tolist() == [*range(0, 181, 20), 197.7]
    assert level_values([0.0, 1.0, 5.0], 0.0, 9.0).tolist() == [0.0, 1.0, 5.0]


# --- can it be read? ----------------------------------------------------------------------------------------


def boxes(drawn):
    """Return the extents in dots of what must neither be cut off nor lie on each other."""
    figure = drawn.axes.figure
    figure.draw_without_rendering()
    renderer = figure._get_renderer()
    inside = {"legend": drawn.legend, "colour bar": drawn.bar.ax, "axes": drawn.axes}
    return figure, {name: artist.get_tightbbox(renderer) for name, artist in inside.items()}


@pytest.mark.parametrize("name", SECTIONS)
def test_nothing_is_cut_off_or_lies_on_something_else(name):
    solution = solved(name)
    drawn = plot_stress(solution, unit="mm")
    figure, found = boxes(drawn)
    for part, box in found.items():
        assert box.x0 >= figure.bbox.x0 - 1.0, part
        assert box.y0 >= figure.bbox.y0 - 1.0, part
        assert box.x1 <= figure.bbox.x1 + 1.0, part
        assert box.y1 <= figure.bbox.y1 + 1.0, part
    assert not found["legend"].overlaps(found["colour bar"])
    assert not found["legend"].overlaps(drawn.axes.get_window_extent())
    if drawn.label is not None:
        label = drawn.label.get_window_extent()
        for mark in (drawn.hot_spots, drawn.corners):
            for place in drawn.axes.transData.transform(mark.get_xydata()) if mark is not None else ():
                assert not label.contains(*place)


@pytest.mark.parametrize("name", ["tiny", "far", "strip", "angle"])
def test_ticks_are_told_apart_and_do_not_run_into_each_other(name):
    drawn = plot_stress(solved(name), unit="mm")
    drawn.axes.figure.draw_without_rendering()
    for axis in (drawn.axes.xaxis, drawn.axes.yaxis):
        labels = [label for label in axis.get_ticklabels() if label.get_text() and label.get_visible()]
        assert len({label.get_text() for label in labels}) == len(labels) >= 2
        extents = [label.get_window_extent() for label in labels]
        assert not any(a.overlaps(b) for a, b in pairwise(extents))
        assert axis.get_offset_text().get_text() == ""


@pytest.mark.parametrize("unit", [r"$\alpha_2$", "<script>", "mm^", "a$b", "µm"])
def test_units_are_words_and_nothing_else(unit):
    drawn = plot_stress(solved("round"), unit=unit, stress_unit=unit, torque=1.0)
    data = figure_data(drawn, ".svg").decode()
    assert "<script>" not in data.split("<!--")[0]
    assert drawn.axes.get_xlabel().replace("\\$", "$") == f"x [{unit}]"


# --- the other figures --------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", ["angle", "box", "keyed shaft", "round"])
def test_zoom_is_around_the_hot_spot_and_its_profile_peaks_there(name):
    solution = solved(name)
    spot = solution.hot_spot
    drawn = plot_hot_spot(solution, torque=2.0, unit="mm", stress_unit="MPa")
    x0, y0, x1, y1 = drawn.window
    assert (0.5 * (x0 + x1), 0.5 * (y0 + y1)) == pytest.approx((spot.x, spot.y), abs=1e-9)
    assert drawn.axes.get_xlim() == pytest.approx((x0, x1))
    along, stress = drawn.profile.get_data()
    near = np.abs(along) < 0.1 * (x1 - x0)
    assert stress[near].max() == pytest.approx(2.0 * spot.stress_per_torque, rel=0.02)
    assert (np.diff(along) > 0.0).all()
    assert "[mm]" in drawn.profile_axes.get_xlabel()


def test_zoom_into_axes_of_the_user_and_onto_another_spot():
    solution = solved("wide flange")
    ax = Figure().add_subplot()
    drawn = plot_hot_spot(solution, ax, spot=2, half_width=5.0, mesh=False, flow=False)
    assert drawn.profile_axes is None
    assert drawn.window[2] - drawn.window[0] == pytest.approx(10.0)
    assert 0.5 * (drawn.window[0] + drawn.window[2]) == pytest.approx(solution.hot_spots[2].x)


def test_there_is_nothing_to_enlarge_without_a_finite_peak():
    with pytest.raises(tf.InputError, match="no finite peak"):
        plot_hot_spot(solved("star"))
    for spot in (1, -1, True, 0.0):
        with pytest.raises(tf.InputError, match="spot must be a whole number from 0 to 0"):
            plot_hot_spot(solved("angle"), spot=spot)


@pytest.mark.parametrize("name", ["angle", "plank", "round"])
def test_boundary_is_walked_once(name):
    solution = solved(name)
    profiles = boundary_profiles(solution)
    assert len(profiles) == 1 + len(solution.outline.voids)
    assert sum(profile.length for profile in profiles) == pytest.approx(solution.outline.perimeter)
    for profile in profiles:
        assert (np.diff(profile.arc_length) > 0.0).all()
        chords = np.hypot(*np.diff(profile.points, axis=0).T)
        assert (chords <= np.diff(profile.arc_length) * (1.0 + 1e-9)).all()
    drawn = plot_boundary_stress(solution, unit="mm")
    assert len(drawn.lines) == len(profiles)
    top = max(line.get_ydata().max() for line in drawn.lines)
    assert top == pytest.approx(solution.hot_spot.stress_per_torque, rel=0.02)


def test_circulation_of_the_stress_is_twice_the_area():
    # Stokes: int tau ds around a loop = 2 G theta' A = 2 A T / J (Bredt), the void's walked the other way
    solution = solved("box")
    j = solution.torsion_constant.value
    for profile, loop in zip(boundary_profiles(solution), (solution.outline, solution.outline.voids[0]), strict=True):
        at = np.concatenate([profile.arc_length, profile.arc_length[:1] + profile.length])
        stress = np.concatenate([profile.stress, profile.stress[:1]])
        area = tf.Outline(loop.vertices, loop.bulges).area
        assert integrate.trapezoid(stress, at) == pytest.approx(2.0 * area / j, rel=0.01)


def test_boundary_plot_ends_above_the_largest_finite_stress_at_sharp_corners():
    solution = solved("sharp angle")
    drawn = plot_boundary_stress(solution)
    assert drawn.axes.get_ylim()[1] == pytest.approx(1.25 * solution.hot_spot.stress_per_torque)
    assert drawn.corners.get_xdata() == pytest.approx([80.0 + 8.0 + 72.0])  # from the heel along the lower leg
    assert {text.get_text() for text in drawn.numbers} <= {str(k) for k in range(6)}


def test_convergence_shows_every_pass():
    solution = tf.solve_torsion(SECTIONS["angle"](), rel_tol=1e-3)
    drawn = plot_convergence(solution, unit="mm")
    assert drawn.lower.get_ydata() == pytest.approx([step.lower for step in solution.passes])
    assert drawn.upper.get_xdata() == pytest.approx([step.unknowns for step in solution.passes])
    assert drawn.peaks.lines[0].get_ydata() == pytest.approx([step.stress_per_torque for step in solution.passes])
    assert drawn.axes[0].get_ylabel() == "torsion constant J\n[10³ mm⁴]"
    assert plot_convergence(solved("star")).peaks is None
    assert len(plot_convergence(solved("round")).lower.get_xdata()) == len(solved("round").passes)


def test_convergence_needs_a_pair_of_axes():
    for given in (Figure().add_subplot(), (1, 2), Figure().subplots(3)):
        with pytest.raises(tf.InputError, match="ax must be two axes"):
            plot_convergence(solved("angle"), given)
    pair = Figure().subplots(2)
    assert plot_convergence(solved("angle"), pair).axes == tuple(pair)
    left, right = plot_convergence(solved("angle"), Figure().subplots(1, 2)).axes
    assert left.get_xlabel() == right.get_xlabel() == "unknowns"  # side by side, each has its own


def test_warping_is_drawn_between_its_extremes_about_the_centre_of_twist():
    solution = solved("channel")
    drawn = plot_warping(solution, unit="mm")
    low, high = solution.warping_extremes
    assert (drawn.contours.levels[0], drawn.contours.levels[-1]) == pytest.approx((low, high))
    x, y = solution.centre_of_twist
    assert drawn.centre.get_xydata()[0] == pytest.approx((x, y))
    assert x < solution.outline.bounds[0]  # a channel's lies outside, behind its web
    assert drawn.axes.get_xlim()[0] < x
    assert drawn.zero is not None
    assert drawn.bar.ax.get_ylabel() == "warping function [mm²]"


def test_a_round_bar_does_not_warp_and_the_plot_says_so():
    drawn = plot_warping(solved("round"))
    assert "does not warp" in drawn.bar.ax.get_ylabel()
    assert drawn.zero is None
    assert "does not warp" in plot_warping_surface(solved("round")).bar.ax.get_ylabel()


def test_surface_is_raised_by_the_warping_function():
    solution = solved("angle")
    drawn = plot_warping_surface(solution, unit="mm")
    low, high = solution.warping_extremes
    assert drawn.axes.get_zlim() == pytest.approx((low, high))
    assert (drawn.surface.get_array().min(), drawn.surface.get_array().max()) == pytest.approx((low, high), rel=0.1)
    with pytest.raises(tf.InputError, match="three-dimensional"):
        plot_warping_surface(solution, Figure().add_subplot())
    with pytest.raises(tf.InputError, match="height"):
        plot_warping_surface(solution, height=0.0)


# --- files --------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("ending", [".png", ".svg", ".pdf"])
def test_the_same_figure_gives_the_same_bytes(ending):
    first, second = (figure_data(plot_stress(solved("round"), unit="mm"), ending) for _ in range(2))
    assert first == second
    assert b"CreationDate" not in first
    assert not re.search(rb"<dc:date>", first)


def test_files_are_what_their_endings_say(tmp_path):
    from PIL import Image

    drawn = plot_stress(solved("box"))
    assert save_figure(drawn, tmp_path / "a.PDF").read_bytes().startswith(b"%PDF")
    assert b"<svg" in save_figure(drawn.axes, tmp_path / "a.svg").read_bytes()
    image = Image.open(BytesIO(save_figure(drawn.axes.figure, str(tmp_path / "a.png")).read_bytes()))
    wide, high = drawn.axes.figure.get_size_inches()
    assert image.size == pytest.approx((300.0 * wide, 300.0 * high), abs=1.0)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["a.PDF", "a.png", "a.svg"]


def test_a_figure_path_is_checked_before_any_work(tmp_path, monkeypatch):
    with pytest.raises(tf.InputError, match=r"\.png, \.svg, \.pdf.*did you mean 'a\.png'"):
        check_figure_path(tmp_path / "a.pngg")
    with pytest.raises(tf.InputError, match="by its ending"):
        check_figure_path(tmp_path / "a")
    with pytest.raises(tf.InputError, match="does not exist: make it first"):
        check_figure_path(tmp_path / "none" / "a.png")
    (tmp_path / "b.png").mkdir()
    with pytest.raises(tf.InputError, match="is a folder"):
        check_figure_path(tmp_path / "b.png")
    monkeypatch.setattr(os, "access", lambda path, mode: False)
    with pytest.raises(tf.InputError, match="no permission"):
        check_figure_path(tmp_path / "a.png")


@pytest.mark.parametrize("failure", [KeyboardInterrupt, MemoryError])
def test_a_failure_leaves_the_older_file_as_it_was(tmp_path, monkeypatch, failure):
    (tmp_path / "a.png").write_bytes(b"older")
    drawn = plot_stress(solved("round"))

    def fail(*_, **__):
        raise failure

    monkeypatch.setattr(os, "replace", fail)
    with pytest.raises(failure):
        save_figure(drawn, tmp_path / "a.png", dpi=50)
    assert [(path.name, path.read_bytes()) for path in tmp_path.iterdir()] == [("a.png", b"older")]


@pytest.mark.parametrize("dpi", [0.0, -1.0, math.nan, 1e6, "300"])
def test_dots_per_inch_must_make_sense(tmp_path, dpi):
    with pytest.raises(tf.InputError, match="dpi"):
        save_figure(Figure(), tmp_path / "a.png", dpi=dpi)


@pytest.mark.parametrize("thing", [None, 3, "figure", object()])
def test_only_figures_are_saved(tmp_path, thing):
    with pytest.raises(tf.InputError, match="figure, axes or the result of a plot function"):
        save_figure(thing, tmp_path / "a.png")
    assert not list(tmp_path.iterdir())


def test_ten_thousand_elements_are_drawn_into_small_files():
    solution = tf.solve_torsion(SECTIONS["angle"](), rel_tol=4e-3, order=1, peak_tol=math.inf)
    assert len(solution.mesh.triangles) > 7_000
    drawn = plot_stress(solution)
    if matplotlib.__version_info__ < (3, 11):
        pytest.skip("contours become images from matplotlib 3.11 on")
    assert len(figure_data(drawn, ".pdf")) < 400_000
    assert len(figure_data(drawn, ".svg")) < 1_000_000
