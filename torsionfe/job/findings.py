"""The results of a job, worded for its sheet."""

from __future__ import annotations

from typing import Any

from torsionfe.job.job import Job
from torsionfe.job.running import JobResult
from torsionfe.job.words import between, figure, measured, place, sure
from torsionfe.outline.outline import Outline
from torsionfe.output.section_view import sideways
from torsionfe.output.sheet import GUTTER, WIDTH, Beside, Block, Cells, Facts, Lines, Picture, SheetSection
from torsionfe.text import number, percent

__all__ = ["constant", "fitted", "ratio", "section_torque", "stress", "warnings", "where"]

_TALL = 0.9  # height over width


def where(job: Job, x: float, y: float) -> str:
    """Return a point of the section in words."""
    return place(x, y, job.system.length, job.section.outline.size)


def ratio(outline: Outline, width: float, *, around: float, beside: float, below: float) -> float:
    """Return height over width of a picture of a section drawn to scale.

    Parameters
    ----------
    outline : Outline
    width : float
        Of the picture, inches.
    around : float
        Room that the drawing leaves around the section, in sizes of the section.
    beside, below : float
        Inches that labels and colour bar take of the picture's width and height.
    """
    x0, y0, x1, y1 = outline.bounds
    shape = (y1 - y0 + around * outline.size) / (x1 - x0 + around * outline.size)
    return min(1.1, (max(width - beside, 0.3 * width) * shape + below) / width)


def fitted(outline: Outline, share: float, **room: float) -> tuple[float, float]:
    """Return what share of the width a picture of a section gets, less for a tall one, and its height over width."""
    for part in (share, 0.72 * share):
        shape = ratio(outline, part * (WIDTH - GUTTER), **room)
        if shape < _TALL:
            break
    return part, shape


# --- torsion constant ---------------------------------------------------------------------------------------


def constant(result: JobResult) -> SheetSection:
    """Return the torsion constant with its bounds, and how they closed in."""
    solution, job = result.solution, result.job
    j, unit = solution.torsion_constant, job.system.power(4)
    rows = (
        ("torsion constant J", between(j, unit)),
        ("width of the bracket", f"{percent(j.rel_gap)}, {percent(job.tolerance.torsion_constant)} asked for"),
        ("centre of twist", where(job, *solution.centre_of_twist)),
        ("warping constant", measured(solution.warping_constant, job.system.power(6), 4)),
        ("mesh", f"{len(solution.mesh.triangles)} triangles of degree {solution.order}"),
    )
    head = ("unknowns", "lower", "upper", "bracket", "peak / torque", "error")
    passes = tuple(
        (
            str(step.unknowns),
            number(step.lower, 6),
            number(step.upper, 6),
            percent(2.0 * (step.upper - step.lower) / (step.upper + step.lower)),
            figure(step.stress_per_torque, 5),
            percent(step.rel_error) if step.rel_error < 1.0 else "",
        )
        for step in solution.passes
    )
    caption = "The bounds of J and the error of the peak stress as the mesh was refined."
    picture = Picture("convergence", caption, lambda canvas: _draw_convergence(canvas, result), 0.41)
    return SheetSection("Torsion constant", (Beside((Facts(rows), Cells(head, passes)), (picture,), 0.48),))


def _draw_convergence(canvas: Any, result: JobResult) -> None:
    from torsionfe.output.convergence import plot_convergence

    drawn = plot_convergence(result.solution, canvas.subplots(1, 2), unit=result.job.system.length)
    drawn.axes[0].tick_params(labelbottom=True)  # side by side, each has its own numbers
    drawn.axes[0].set_xlabel(drawn.axes[1].get_xlabel())
    for axes in drawn.axes:  # narrow
        axes.set_title(axes.get_title(loc="left").split(";")[0], loc="left", fontsize="small")
    drawn.axes[0].legend(loc="lower right", frameon=False, fontsize="x-small")


# --- stress -------------------------------------------------------------------------------------------------


def section_torque(result: JobResult) -> tuple[float, str] | None:
    """Return the largest torque, without factor, in the job's own section, and its case; None without cases."""
    if not result.job.cases:
        return None
    found: list[tuple[float, str]] = []
    if result.bar is None:
        found = [(abs(float(case.at_stations(2)[1])), case.name) for case in result.job.cases]
    for response in result.responses:
        for part, torque in zip(response.bar.segments, response.torques, strict=True):
            if part.solution is result.solution:
                found.append((abs(float(torque)), response.case.name))
    return max(found, key=lambda pair: pair[0], default=None)


def stress(result: JobResult) -> SheetSection:
    """Return the stress contour, its hot spot, and a zoom on it."""
    solution = result.solution
    load = section_torque(result)
    under = f"under the torque of case {load[1]}, without factor" if load and load[0] else "per torque"
    room = {"beside": 0.65, "below": 1.55} if sideways(solution.outline) else {"beside": 1.35, "below": 0.85}
    share, shape = fitted(solution.outline, 0.58, around=0.12, **room)
    contour = Picture("contour", f"Shear stress {under}.", lambda canvas: _draw_contour(canvas, result), shape)
    zoom: list[Block] = []
    if solution.hot_spots:
        caption = f"The same around the hot spot, {under}."
        zoom.append(Picture("hot_spot", caption, lambda canvas: _draw_zoom(canvas, result), 0.82))
    blocks: list[Block] = [Beside((contour,), tuple(zoom), share)]
    rows = _spots(result, load)
    if rows:
        head = ("hot spot", "where", "stress per torque", *(("stress",) if load else ()))
        blocks.append(Cells(head, rows, words=2))
    else:
        blocks.append(Lines(("No finite peak: every flank rises into a sharp re-entrant corner.",), "warning"))
    return SheetSection("Shear stress", tuple(blocks))


def _spots(result: JobResult, load: tuple[float, str] | None) -> tuple[tuple[str, ...], ...]:
    system, spots = result.job.system, result.solution.hot_spots
    rows = []
    for k, spot in enumerate(spots[:4]):
        cells = ["largest" if k == 0 else "equal within its error", where(result.job, spot.x, spot.y)]
        cells.append(sure(spot.stress_per_torque, spot.rel_error, f"1/{system.power(3)}"))
        if load:
            cells.append(sure(spot.stress_per_torque * load[0], spot.rel_error, system.stress))
        rows.append(tuple(cells))
    if len(spots) > 4:
        rows.append((f"and {len(spots) - 4} more", *[""] * (len(rows[0]) - 1)))
    return tuple(rows)


def _shown(result: JobResult) -> dict[str, Any]:
    """Return what the stress figures are drawn for: the largest torque, in the job's units."""
    load, system = section_torque(result), result.job.system
    return {"torque": load[0] if load and load[0] else None, "unit": system.length, "stress_unit": system.stress}


def _draw_contour(canvas: Any, result: JobResult) -> None:
    from torsionfe.output.contour import plot_stress

    plot_stress(result.solution, canvas.add_subplot(), **_shown(result))


def _draw_zoom(canvas: Any, result: JobResult) -> None:
    from torsionfe.output.zoom import plot_hot_spot

    plot_hot_spot(result.solution, canvas.add_subplot(), **_shown(result))


# --- what to look at ----------------------------------------------------------------------------------------


def warnings(result: JobResult) -> SheetSection:
    """Return what may be wrong with the answer: corners, facets, tolerances; 'none' where there is nothing."""
    job = result.job
    lines = []
    for solution in result.solutions:
        corners = solution.singular_corners
        if len(corners):
            places = ", ".join(where(job, float(x), float(y)) for x, y in corners[:6])
            more = f" and {len(corners) - 6} more" if len(corners) > 6 else ""
            lines.append(
                f"Sharp re-entrant corners at {places}{more}: the elastic stress is unbounded there, and no strength "
                "margin is defined. Give each the fillet that it will be made with."
            )
        if solution.shortfall:
            lines.append(f"The tolerance was not met: {solution.shortfall}.")
    sections = [job.section, *(part.section for part in (job.bar.segments if job.bar else ()) if part.section)]
    lines += [f"{section.source}: {line}" for section in sections for line in section.warnings]
    if not lines:
        return SheetSection("Warnings", (Lines(("None: no sharp corners, no unrestored facets, tolerances met.",)),))
    return SheetSection("Warnings", (Lines(tuple(dict.fromkeys(lines)), "warning"),))
