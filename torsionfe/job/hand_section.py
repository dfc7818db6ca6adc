"""The hand method, worded for the sheet: what it takes the section for, and how far off it is."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from typing import Any

from torsionfe.closed_form.cells import CellSum
from torsionfe.closed_form.derived import DerivedPlates
from torsionfe.closed_form.rectangle import RULES
from torsionfe.job.by_hand import HandAnswer
from torsionfe.job.findings import ratio
from torsionfe.job.running import JobResult
from torsionfe.job.words import figure, sure, with_unit, written_unit
from torsionfe.output.pdf import legible
from torsionfe.output.sheet import GUTTER, WIDTH, Beside, Block, Cells, Lines, Picture, SheetSection
from torsionfe.output.style import plain
from torsionfe.text import number, percent

__all__ = ["hand_references", "hand_section"]

_COVERED = 0.9  # of the area: below, the sheet warns
_SHARE = 0.44  # of the width: the drawing


def hand_section(result: JobResult) -> SheetSection | None:
    """Return the hand method beside the answer; None where the job has none."""
    if not result.hand:
        return None
    system = result.job.system
    length = written_unit(system.power(4)), written_unit(f"1/{system.power(3)}")
    head = ("method", f"J [{length[0]}]", "off", "stiffness", f"peak / torque [{length[1]}]", "off", "strength")
    blocks: list[Block] = [_idealisation(result), Cells(head, tuple(_methods(result)))]
    if len(result.solution.singular_corners):
        blocks.append(Lines(("* Beside sharp re-entrant corners, where the elastic stress is unbounded.",)))
    drawn = result.hand[0].plates
    if isinstance(drawn, DerivedPlates) and drawn.covered < _COVERED:
        share = percent(drawn.covered, 3)
        line = f"Plates and walls stand for only {share} of the section: the method hardly suits it."
        blocks.append(Lines((line,), "warning"))
    notes = tuple(dict.fromkeys(note for answer in result.hand for note in answer.notes))
    if notes:
        blocks.append(Lines(notes, "list"))
    return SheetSection("Hand method", tuple(blocks))


def _methods(result: JobResult) -> Iterator[tuple[str, ...]]:
    """Yield a row of each method, the answer first."""
    spot, sharp = result.solution.hot_spot, len(result.solution.singular_corners) > 0
    tau = sure(spot.stress_per_torque, spot.rel_error) if spot is not None else "none finite"
    yield "this calculation", str(result.solution.torsion_constant), "", "", f"{tau} *" if sharp else tau, "", ""
    for answer in result.hand:
        yield _method(result, answer)


def _method(result: JobResult, answer: HandAnswer) -> tuple[str, ...]:
    j, spot = result.solution.torsion_constant, result.solution.hot_spot
    constant, stress = answer.torsion_constant, answer.stress_per_torque
    stiff = "too stiff" if constant > j.upper else "too soft" if constant < j.lower else "within the bounds"
    cells = (answer.name.replace("_", " "), number(constant, 6), percent(constant / j.value - 1.0), stiff)
    if spot is None or len(result.solution.singular_corners):
        return (*cells, figure(stress), "", "unbounded *")
    off = stress / spot.stress_per_torque - 1.0
    safe = "safe side" if off > spot.rel_error else "unsafe side" if off < -spot.rel_error else "the same"
    return (*cells, figure(stress), percent(off), safe)


def _idealisation(result: JobResult) -> Block:
    """Return the drawing of the first idealisation, and its plates beside it."""
    first, system = result.hand[0], result.job.system
    caption = f"What the hand method takes the section for: {first.name.replace('_', ' ')}."
    shape = ratio(result.solution.outline, _SHARE * (WIDTH - GUTTER), around=0.2, beside=0.6, below=0.7)
    picture = Picture("plates", caption, lambda canvas: _draw_plates(canvas, result), shape)
    if isinstance(first.answer, CellSum):
        cells = first.answer.cells
        sizes = [(wall.name or f"wall {k}", wall.length, wall.thickness) for k, wall in enumerate(cells.walls)]
        sizes += [(fin.name or f"fin {k}", fin.width, fin.thickness) for k, fin in enumerate(cells.fins)]
        areas = ", ".join(number(area, 6) for area in cells.areas)
        how = f"Thin cells by Bredt and Batho; enclosed areas {with_unit(areas, system.power(2))}."
    else:
        plates = first.answer.plates
        sizes = [(plate.name or f"plate {k}", plate.width, plate.thickness) for k, plate in enumerate(plates)]
        how = f"Coefficients: {RULES.get(first.answer.rule, first.answer.rule)}."
    rows = tuple((name, number(width), number(thickness)) for name, width, thickness in sizes)
    table = Cells(("plate", f"width [{system.length}]", f"thickness [{system.length}]"), rows)
    return Beside((picture,), (table, Lines((how, f"Its largest stress: {first.governing}."))), _SHARE)


def _draw_plates(canvas: Any, result: JobResult) -> None:
    from torsionfe.output.plate_plot import plot_plates

    first = result.hand[0].plates
    named = tuple(replace(plate, name=plain(legible(plate.name))) for plate in first.plates)
    plates = replace(first, plates=named)
    drawn = plot_plates(result.solution.outline, plates, canvas.add_subplot(), result.job.system.length)
    for text in drawn.labels:
        text.set_fontsize("medium")
    for side in ("left", "center"):
        drawn.axes.set_title(drawn.axes.get_title(side), loc=side, fontsize="medium")


def hand_references(result: JobResult) -> list[str]:
    """Return the sources of the hand method that are not those of the answer."""
    if not any(isinstance(answer.answer, CellSum) for answer in result.hand):
        return []
    return [
        "Bredt, R. (1896): Kritische Bemerkungen zur Drehungselastizität. Z. VDI 40.",
        "Batho, C. (1915): Torsion stresses in framed structures and thin-walled prisms. Brit. Assoc. Adv. Sci.",
    ]
