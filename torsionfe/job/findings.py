"""The results of a job, worded for its sheet."""

from __future__ import annotations

from torsionfe.job.job import Job
from torsionfe.job.running import JobResult
from torsionfe.job.words import between, degrees, measured, place, signed, sure, with_unit, written_unit
from torsionfe.outline.outline import Outline
from torsionfe.output.sheet import Beside, Block, Cells, Facts, Lines, Picture, SheetSection
from torsionfe.text import number, percent

__all__ = ["bar", "constant", "hand", "hand_references", "ratio", "sensitivity", "stress", "warnings", "where"]


def where(job: Job, x: float, y: float) -> str:
    """Return a point of the section in words."""
    return place(x, y, job.system.length, job.section.outline.size)


def ratio(outline: Outline, room: float) -> float:
    """Return height over width of a picture of a section, with ``room`` of its width for labels."""
    x0, y0, x1, y1 = outline.bounds
    return min(1.1, max(0.4, (y1 - y0) / (x1 - x0) * (1.0 - room) + 0.5 * room))


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
    head = ("pass", "unknowns", "lower bound", "upper bound", "bracket", "peak / torque", "its error")
    passes = tuple(
        (
            str(k + 1),
            str(step.unknowns),
            number(step.lower, 6),
            number(step.upper, 6),
            percent(2.0 * (step.upper - step.lower) / (step.upper + step.lower)),
            number(step.stress_per_torque, 5),
            "first look" if k == 0 else percent(step.rel_error),
        )
        for k, step in enumerate(solution.passes)
    )
    caption = "The bounds of J and the error of the peak stress as the mesh was refined."
    picture = Picture("convergence", caption, lambda figure: _draw_convergence(figure, result), 0.62)
    beside = Beside((Facts(rows),), (picture,), 0.5)
    return SheetSection("Torsion constant", (beside, Cells(head, passes, words=1)))


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
    job, solution = result.job, result.solution
    load = section_torque(result)
    under = f"under the torque of case {load[1]}, without factor" if load else "for a torque of 1"
    outline = solution.outline
    pictures: list[Block] = [
        Picture("contour", f"Shear stress {under}.", lambda figure: _draw_contour(figure, result), ratio(outline, 0.35))
    ]
    if solution.hot_spots:
        zoomed = Picture("zoom", f"The same around the hot spot, {under}.", lambda figure: _draw_zoom(figure, result), 0.8)
        pictures.append(zoomed)
    blocks: list[Block] = [Beside((pictures[0],), tuple(pictures[1:]), 0.56)]
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


# --- bar ----------------------------------------------------------------------------------------------------


def bar(result: JobResult) -> SheetSection | None:
    """Return the bar's twist and stresses under each case, and its margins."""
    if result.bar is None:
        return None
    blocks: list[Block] = [_stiffness(result)]
    if len(result.bar.segments) > 1:
        blocks.append(_segments(result))
    blocks.append(_responses(result))
    if result.margins is not None:
        blocks.append(_margins(result))
    if result.plastic is not None:
        blocks.append(_plastic(result))
    return SheetSection("Bar", tuple(blocks))


def _stiffness(result: JobResult) -> Block:
    assert result.bar is not None
    system = result.job.system
    held = ", ".join(map(str, result.bar.held))
    total = float(result.bar.positions[-1])
    return Facts(
        (
            ("length", measured(total, system.length)),
            ("kept from rotating", f"station{'s' if len(result.bar.held) > 1 else ''} {held} of 0 to "
             f"{len(result.bar.segments)}; all ends free to warp"),
            ("spring constant, end to end", between(result.bar.stiffness_bounds, f"{system.torque}/rad")),
        )
    )


def _segments(result: JobResult) -> Block:
    assert result.bar is not None
    system = result.job.system
    head = ("segment", f"length [{system.length}]", f"J [{written_unit(system.power(4))}]",
            f"W_t [{written_unit(system.power(3))}]", f"G [{written_unit(system.stress)}]")
    rows = []
    for k, part in enumerate(result.bar.segments):
        j = part.solution.torsion_constant
        numbers = (number(part.length, 6), str(j), number(part.solution.section_modulus, 5), number(part.shear_modulus, 6))
        rows.append((result.bar.label(k), *numbers))
    return Cells(head, tuple(rows))


def _responses(result: JobResult) -> Block:
    system = result.job.system
    head = ("case", "segment", f"torque [{written_unit(system.torque)}]", "twist at its end [rad]", "[°]",
            f"peak stress [{written_unit(system.stress)}]")
    rows = []
    for response in result.responses:
        for k, peak in enumerate(response.peaks):
            turn, error = response.twists[k + 1], response.twist_errors[k + 1]
            twist = sure(float(turn), float(error / abs(turn))) if turn else "0"
            tau = sure(peak.stress, peak.rel_error) + (" *" if peak.undefined else "")
            label = response.bar.label(k) if len(response.peaks) > 1 else "whole bar"
            rows.append((response.case.name, label, number(response.torques[k], 6), twist, degrees(turn).rstrip("°"), tau))
    if any(peak.undefined for response in result.responses for peak in response.peaks):
        rows.append(("* beside a sharp re-entrant corner, where the elastic stress is unbounded", *[""] * 5))
    return Cells(head, tuple(rows), words=2)


def _margins(result: JobResult) -> Block:
    assert result.margins is not None
    system = result.job.system
    torque = written_unit(system.torque)
    head = ("case", "criterion", f"torque [{torque}]", "factor", "applied", "allowable", "margin", f"largest torque [{torque}]")
    rows = []
    for row in result.margins:
        name = f"{row.criterion}, segment {row.segment}" if row.segment and len(result.bar.segments) > 1 else row.criterion  # type: ignore[union-attr]
        if not row.defined:
            name += f" ({row.note})"
        unit = {"twist": "rad", "twist rate": f"rad/{system.length}"}.get(row.criterion, system.stress)
        applied, allowable = (with_unit(number(value), unit) for value in (row.applied, row.allowable))
        largest = number(row.largest_torque) if row.defined else "not defined"
        numbers = (number(row.torque, 6), number(row.factor), applied if row.defined else "not defined", allowable)
        rows.append((row.case, name, *numbers, signed(row.margin), largest))
    return Cells(head, tuple(rows), words=2)


def _plastic(result: JobResult) -> Block:
    assert result.plastic is not None
    system, plastic = result.job.system, result.plastic
    rows = [("fully plastic torque", measured(plastic.torque, system.torque, 5))]
    if plastic.first_yield > 0.0:
        rows.append(("torque at first yield", sure(plastic.first_yield, plastic.first_yield_error, system.torque)))
        rows.append(("shape factor", number(plastic.shape_factor)))
    elif plastic.first_yield == 0.0:
        rows.append(("shape factor", "not defined: a sharp re-entrant corner yields at once"))
    return Facts(tuple(rows))


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
                f"Sharp re-entrant corners at {places}{more}: the elastic stress is unbounded there, so that no strength "
                "margin is defined. Give the corner the fillet that it will be made with."
            )
        if solution.shortfall:
            lines.append(f"The tolerance was not met: {solution.shortfall}.")
    sections = [job.section, *(part.section for part in (job.bar.segments if job.bar else ()) if part.section)]
    lines += [f"{section.source}: {line}" for section in sections for line in section.warnings]
    lines += hand_warnings(result)
    if not lines:
        return SheetSection("Warnings", (Lines(("None: no sharp corners, no unrestored facets, tolerances met.",)),))
    return SheetSection("Warnings", (Lines(tuple(dict.fromkeys(lines)), "warning"),))
