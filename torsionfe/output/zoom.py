"""The hot spot enlarged, with the stress along the boundary beside it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats, positive
from torsionfe.errors import InputError
from torsionfe.output.boundary_plot import boundary_profiles
from torsionfe.output.contour import StressScale, draw_flow, draw_marks, draw_mesh, stress_scale
from torsionfe.output.sampled import sampled
from torsionfe.output.section_view import Scale, draw_edge, fill, level_values, place_label, upright_bar
from torsionfe.output.style import ACCENTS, HOT_SPOT, INK, QUIET, frame_window, look, stress_colours
from torsionfe.text import percent
from torsionfe.torsion.solution import TorsionSolution

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.collections import LineCollection
    from matplotlib.colorbar import Colorbar
    from matplotlib.contour import ContourSet
    from matplotlib.lines import Line2D
    from matplotlib.patches import PathPatch
    from matplotlib.text import Annotation

__all__ = ["HotSpotPlot", "plot_hot_spot"]

_RADII = 2.2  # of the fillet at the hot spot: half the window
_SMALLEST, _LARGEST = 0.004, 0.3  # half the window, of the section's size


@dataclass(frozen=True)
class HotSpotPlot:
    """What `plot_hot_spot` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
        Of the contours.
    profile_axes : matplotlib.axes.Axes or None
        Of the stress along the boundary.
    window : tuple of float
        ``(x_min, y_min, x_max, y_max)``.
    contours : matplotlib.contour.ContourSet
    outline : matplotlib.patches.PathPatch
    mesh : matplotlib.collections.LineCollection or None
    label : matplotlib.text.Annotation
    bar : matplotlib.colorbar.Colorbar
    profile : matplotlib.lines.Line2D or None
    """

    axes: Axes
    profile_axes: Axes | None
    window: tuple[float, float, float, float]
    contours: ContourSet
    outline: PathPatch
    mesh: LineCollection | None
    label: Annotation
    bar: Colorbar
    profile: Line2D | None


def plot_hot_spot(
    solution: TorsionSolution,
    ax: Axes | None = None,
    *,
    profile_ax: Axes | None = None,
    spot: int = 0,
    half_width: float | None = None,
    torque: float | None = None,
    unit: str = "",
    stress_unit: str = "",
    levels: int | ArrayLike = 20,
    flow: bool = True,
    mesh: bool = True,
) -> HotSpotPlot:
    """Draw the surroundings of a hot spot, and the shear stress along the boundary through it.

    Parameters
    ----------
    solution : TorsionSolution
    ax : matplotlib.axes.Axes, optional
        Drawn into. By default a new figure is made, with axes for the profile below.
    profile_ax : matplotlib.axes.Axes, optional
        Takes the stress along the boundary; where ``ax`` is given and this is not, it is left out.
    spot : int
        Which of ``solution.hot_spots``.
    half_width : float, optional
        Half the side of the square that is shown (length); by default somewhat more than the fillet.
    torque : float, optional
        force * length; without it, stress per torque is drawn (1/length**3).
    unit, stress_unit : str
        Of the outline's lengths, and of stress; for labels only.
    levels : int or array_like of shape (n,)
        About how many bands between 0 and the peak, or the stresses between them.
    flow, mesh : bool
        Whether to draw lines of shear flow, and the elements.

    Returns
    -------
    HotSpotPlot

    Raises
    ------
    InputError
        No such hot spot: the message says how many there are, or why there is none.
    """
    shown = stress_scale(torque, unit, stress_unit)
    window = _window(solution, spot, half_width)
    samples = sampled(solution, window)
    peak = shown.at_hot_spot(solution)
    values = level_values(levels, 0.0, peak)
    size = samples.magnitude * abs(shown.factor)
    scale = Scale.of(shown.name, shown.unit, values[-1])
    with look():
        if ax is None:
            ax, profile_ax = _two_axes()
        frame_window(ax, window, unit)
        edge = draw_edge(ax, solution.outline, width=1.3)
        beyond = bool(len(solution.singular_corners))
        contours = fill(ax, samples, size, values, colours=stress_colours(), inside=edge, beyond=beyond)
        if flow:
            draw_flow(ax, solution, samples, shown.factor, span=window[2] - window[0])
        triangles = draw_mesh(ax, solution) if mesh else None
        draw_marks(ax, solution, window)
        at = solution.hot_spots[spot]
        label = place_label(ax, solution.outline, [(at.x, at.y)], scale.write_with_unit(peak))
        bar = upright_bar(ax, contours, values, scale)
        line = None
        if profile_ax is not None:
            line = _draw_profile(profile_ax, solution, spot=spot, shown=shown, scale=scale, window=window, unit=unit)
    return HotSpotPlot(ax, profile_ax, window, contours, edge, triangles, label, bar, line)


def _two_axes() -> tuple[Axes, Axes]:
    from matplotlib.figure import Figure

    above, below = Figure(figsize=(5.2, 6.6), layout="constrained").subplots(2, height_ratios=(2.6, 1.0))
    return above, below


def _window(solution: TorsionSolution, spot: int, half_width: float | None) -> tuple[float, float, float, float]:
    """Return the square around a hot spot."""
    spots = solution.hot_spots
    if not spots:
        why = "every flank of the stress rises into a sharp re-entrant corner"
        raise InputError(f"there is no finite peak to enlarge: {why}; give the corners a fillet")
    if isinstance(spot, bool) or not isinstance(spot, int) or not 0 <= spot < len(spots):
        raise InputError(f"spot must be a whole number from 0 to {len(spots) - 1}, got {spot!r}")
    x, y = spots[spot].x, spots[spot].y
    half = positive("half_width", half_width) if half_width is not None else _half_width(solution, x, y)
    return x - half, y - half, x + half, y + half


def _half_width(solution: TorsionSolution, x: float, y: float) -> float:
    """Return half the side of a window that shows the fillet at a hot spot, or what is around a smooth one."""
    boundary, size = solution.boundary, solution.outline.size
    here = solution.frame.inward_points(np.array([x, y]))
    nearest = int(np.argmin(np.hypot(*(boundary.points.reshape(-1, 2) - here).T)))
    row = boundary.edge[nearest // boundary.points.shape[1]]
    edges = boundary.mesh.edges
    fillet = edges.bulge[row] < 0.0
    wanted = _RADII * float(edges.radius[row]) * solution.frame.scale if fillet else 0.15 * size
    return float(np.clip(wanted, _SMALLEST * size, _LARGEST * size))


def _draw_profile(
    ax: Axes,
    solution: TorsionSolution,
    *,
    spot: int,
    shown: StressScale,
    scale: Scale,
    window: tuple[float, float, float, float],
    unit: str,
) -> Line2D:
    """Draw the stress against the distance from the hot spot along its loop, as far as the window shows."""
    at = solution.hot_spots[spot]
    profiles = boundary_profiles(solution)
    near = [profile.place_of(at.x, at.y) for profile in profiles]
    loop = int(np.argmin([distance for _, distance in near]))
    profile, centre = profiles[loop], near[loop][0]
    reach = 0.75 * (window[2] - window[0])
    along = (profile.arc_length - centre + 0.5 * profile.length) % profile.length - 0.5 * profile.length
    order = np.argsort(along)
    x, stress = along[order], profile.stress[order] * abs(shown.factor)
    inside = np.abs(x) <= reach
    (line,) = ax.plot(x, stress, color=ACCENTS[0].colour, linewidth=1.3, marker=".", markersize=3.5, zorder=3.0)
    peak = at.stress_per_torque * abs(shown.factor)
    ax.axhspan(peak * (1.0 - at.rel_error), peak * (1.0 + at.rel_error), color=QUIET, alpha=0.3, linewidth=0.0)
    ax.plot([0.0], [peak], **HOT_SPOT.options(), zorder=5.0)
    vertices = (profile.vertices - centre + 0.5 * profile.length) % profile.length - 0.5 * profile.length
    for place in vertices[np.abs(vertices) < reach]:
        ax.axvline(place, color=QUIET, linewidth=0.5, alpha=0.7, zorder=1.0)
    ax.set_xlim(-min(reach, float(-x.min())), min(reach, float(x.max())))
    ax.set_ylim(0.9 * float(min(stress[inside].min(), peak)), 1.06 * max(peak, _finite_top(stress[inside], solution)))
    ax.yaxis.set_major_formatter(scale.write)
    ax.set_ylabel(scale.label.replace(" [", "\n["), fontsize="small")
    along_scale = Scale.of("arc length from the hot spot", unit, reach)
    ax.xaxis.set_major_formatter(along_scale.write)
    ax.set_xlabel(along_scale.label)
    ax.set_title(f"peak ± {percent(at.rel_error)}; lines where edges meet", fontsize="small", color=INK)
    return line


def _finite_top(stress: Floats, solution: TorsionSolution) -> float:
    return 0.0 if len(solution.singular_corners) else float(stress.max())
