"""The shear stress along the boundary, loop by loop."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats, Ints
from torsionfe.outline.fillets import sharp_corners
from torsionfe.output.contour import StressScale, stress_scale
from torsionfe.output.section_view import Scale, legend_above
from torsionfe.output.style import ACCENTS, HOT_SPOT, INK, QUIET, SINGULAR, look, new_axes
from torsionfe.torsion.solution import TorsionSolution

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.legend import Legend
    from matplotlib.lines import Line2D
    from matplotlib.text import Text

__all__ = ["BoundaryPlot", "BoundaryProfile", "boundary_profiles", "plot_boundary_stress"]

_ABOVE = 1.25  # times the hot spot: where the axis ends when corners are singular
_MOST_NUMBERS = 40


@dataclass(frozen=True)
class BoundaryProfile:
    """The shear stress along one loop, walked with the material on the left.

    Attributes
    ----------
    loop : int
        0 for the outer loop, ``k`` for void ``k - 1``.
    arc_length : ndarray of shape (n,)
        From the loop's first vertex, rising.
    stress : ndarray of shape (n,)
        Size of the stress for unit torque, 1/length**3, where elements know it best (their sides' Gauss points).
    points : ndarray of shape (n, 2)
    vertices : ndarray of shape (v,)
        Arc length of each vertex.
    numbers : ndarray of shape (v,)
        Their numbers on the loop.
    sharp : ndarray of shape (v,)
        Whether each is a sharp re-entrant corner.
    length : float
        Of the loop.
    """

    loop: int
    arc_length: Floats
    stress: Floats
    points: Floats
    vertices: Floats
    numbers: Ints
    sharp: NDArray[np.bool_]
    length: float

    def place_of(self, x: float, y: float) -> tuple[float, float]:
        """Return the arc length of the sample nearest to a point, and how far that is."""
        distance = np.hypot(*(self.points - (x, y)).T)
        nearest = int(np.argmin(distance))
        return float(self.arc_length[nearest]), float(distance[nearest])


def boundary_profiles(solution: TorsionSolution) -> tuple[BoundaryProfile, ...]:
    """Return the stress along every loop of a solution, the outer one first."""
    boundary, edges = solution.boundary, solution.boundary.mesh.edges
    scale = solution.frame.scale
    per_torque = scale / solution.torsion_constant.value
    sharp = np.zeros(len(edges), dtype=bool)
    sharp[sharp_corners(edges)] = True
    found = []
    for loop in range(int(edges.loop.max()) + 1):
        rows = np.flatnonzero(edges.loop == loop)
        begin = np.append(0.0, np.cumsum(edges.length[rows])) * scale
        mine = edges.loop[boundary.edge] == loop
        at = begin[boundary.edge[mine] - rows[0]][:, None] + boundary.position[mine] * scale
        points = solution.frame.outward_points(boundary.points[mine]).reshape(-1, 2)
        stress = np.abs(boundary.tau[mine]).ravel() * per_torque
        named = begin[:-1], edges.vertex[rows], sharp[rows], float(begin[-1])
        found.append(BoundaryProfile(loop, at.ravel(), stress, points, *named))
    return tuple(found)


@dataclass(frozen=True)
class BoundaryPlot:
    """What `plot_boundary_stress` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    lines : tuple of matplotlib.lines.Line2D
        One a loop.
    hot_spots, corners : matplotlib.lines.Line2D or None
    numbers : tuple of matplotlib.text.Text
        Vertex numbers, above the axes.
    legend : matplotlib.legend.Legend
    """

    axes: Axes
    lines: tuple[Line2D, ...]
    hot_spots: Line2D | None
    corners: Line2D | None
    numbers: tuple[Text, ...]
    legend: Legend


def plot_boundary_stress(
    solution: TorsionSolution,
    ax: Axes | None = None,
    *,
    torque: float | None = None,
    unit: str = "",
    stress_unit: str = "",
) -> BoundaryPlot:
    """Draw the size of the shear stress along the outline, one loop after the other.

    Parameters
    ----------
    solution : TorsionSolution
    ax : matplotlib.axes.Axes, optional
        Drawn into; by default those of a new figure.
    torque : float, optional
        force * length; without it, stress per torque is drawn (1/length**3).
    unit, stress_unit : str
        Of the outline's lengths, and of stress; for labels only.

    Returns
    -------
    BoundaryPlot

    Raises
    ------
    InputError
        The torque is 0 or no number.
    """
    shown = stress_scale(torque, unit, stress_unit)
    profiles = boundary_profiles(solution)
    factor = abs(shown.factor)
    # where nothing else is finite, the scale is that of most of the boundary
    every = np.concatenate([profile.stress for profile in profiles]) * factor
    top = shown.at_hot_spot(solution) if solution.hot_spot else float(np.quantile(every, 0.9))
    scale = Scale.of(shown.name, shown.unit, top)
    with look():
        ax = new_axes((6.4, 3.4)) if ax is None else ax
        high = top * (_ABOVE if len(solution.singular_corners) else 1.08)
        lines, numbers = _draw_loops(ax, profiles, factor)
        spots, corners = _draw_places(ax, solution, profiles, shown, 0.97 * high)
        ax.set_ylim(0.0, high)
        total = sum(profile.length for profile in profiles)
        along = Scale.of("arc length along the outline, from vertex 0", unit, total)
        ax.set_xlim(0.0, total)
        for axis, measure in ((ax.xaxis, along), (ax.yaxis, scale)):
            axis.set_major_formatter(measure.write)
            axis.set_label_text(measure.label)
        marks = [mark for mark in (spots, corners) if mark is not None]
        key = legend_above(ax, [*lines, *marks] if len(lines) > 1 else marks, columns=2)
    return BoundaryPlot(ax, lines, spots, corners, numbers, key)


def _draw_loops(
    ax: Axes, profiles: tuple[BoundaryProfile, ...], factor: float
) -> tuple[tuple[Line2D, ...], tuple[Text, ...]]:
    """Draw the curve of each loop, a line where each edge begins, and the vertices' numbers in the plot."""
    lines: list[Line2D] = []
    numbers: list[Text] = []
    numbered = sum(len(profile.vertices) for profile in profiles) <= _MOST_NUMBERS
    total, start, last = sum(profile.length for profile in profiles), 0.0, -1.0
    for profile in profiles:
        accent = ACCENTS[profile.loop % len(ACCENTS)]
        name = f"void {profile.loop - 1}" if profile.loop else "outer loop"
        drawn: dict[str, Any] = {"color": accent.colour, "linestyle": accent.dashes, "label": name}
        lines += ax.plot(start + profile.arc_length, profile.stress * factor, **drawn, linewidth=1.3, zorder=3.0)
        for place, number in zip(start + profile.vertices, profile.numbers, strict=True):
            first = place == start
            ax.axvline(place, color=INK if first else QUIET, linewidth=0.8 if first else 0.4, alpha=0.6, zorder=1.0)
            if numbered and place - last > 0.02 * total:
                where: dict[str, Any] = {"transform": ax.get_xaxis_transform(), "ha": "center", "va": "bottom"}
                numbers.append(ax.text(place, 1.0, str(number), fontsize="x-small", color=QUIET, **where))
                last = place
        start += profile.length
    return tuple(lines), tuple(numbers)


def _draw_places(
    ax: Axes, solution: TorsionSolution, profiles: tuple[BoundaryProfile, ...], shown: StressScale, height: float
) -> tuple[Line2D | None, Line2D | None]:
    """Mark the hot spots at their stress, and the sharp corners at the top of the axes."""
    starts = np.append(0.0, np.cumsum([profile.length for profile in profiles]))
    places = []
    for spot in solution.hot_spots:
        near = [profile.place_of(spot.x, spot.y) for profile in profiles]
        loop = int(np.argmin([distance for _, distance in near]))
        places.append((starts[loop] + near[loop][0], spot.stress_per_torque * abs(shown.factor)))
    sharp = [
        starts[k] + place
        for k, profile in enumerate(profiles)
        for place in profile.vertices[profile.sharp]
    ]
    spots = corners = None
    if places:
        named = "largest stress elsewhere" if sharp else "hot spot"
        (spots,) = ax.plot(*np.transpose(places), **HOT_SPOT.options(), label=named, zorder=5.0)
    if sharp:
        at = [height] * len(sharp)
        named = "sharp re-entrant corner: stress unbounded"
        (corners,) = ax.plot(sharp, at, **SINGULAR.options(), label=named, zorder=5.0)
    return spots, corners
