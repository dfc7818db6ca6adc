"""The hand method, worded for the sheet: what it takes the section for, and how far off it is."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from typing import Any

from torsionfe.closed_form.cells import CellSum
from torsionfe.closed_form.derived import DerivedPlates
from torsionfe.closed_form.plates import PlateSet
from torsionfe.closed_form.rectangle import RULES
from torsionfe.job.findings import ratio
from torsionfe.job.running import JobResult
from torsionfe.job.words import figure, sure, with_unit, written_unit
from torsionfe.output.pdf import legible
from torsionfe.output.sheet import GUTTER, WIDTH, Beside, Block, Cells, Lines, Picture, SheetSection
from torsionfe.output.style import plain
from torsionfe.study.compare import Comparison
from torsionfe.text import number, percent

__all__ = ["hand_references", "hand_section"]

_COVERED = 0.9  # of the area: below, the sheet warns
_SHARE = 0.44  # of the width: the drawing


def hand_section(result: JobResult) -> SheetSection | None:
    """Return the hand method beside the answer; None where the job has none."""
    found = result.hand
    if found is None:
        return None
    system = result.job.system
    length = written_unit(system.power(4)), written_unit(f"1/{system.power(3)}")
    head = ("method", f"J [{length[0]}]", "off", "for stiffness", f"peak / torque [{length[1]}]", "off", "for strength")
    blocks: list[Block] = [_idealisation(result, found), Cells(head, tuple(_methods(found))), _errors(result, found)]
    drawn = found.methods[0].method.plates
    if isinstance(drawn, DerivedPlates) and drawn.covered < _COVERED:
        share = percent(drawn.covered, 3)
        line = f"Plates and walls stand for only {share} of the section: the method hardly suits it."
        blocks.append(Lines((line,), "warning"))
    notes = tuple(dict.fromkeys(note for row in found.methods for note in row.method.notes))
    if notes:
        blocks.append(Lines(notes, "list"))
    return SheetSection("Hand method", tuple(blocks))


def _methods(found: Comparison) -> Iterator[tuple[str, ...]]:
    """Yield a row of each method, the answer first."""
    spot, sharp = found.solution.hot_spot, len(found.solution.singular_corners) > 0
    tau = sure(spot.stress_per_torque, spot.rel_error) if spot is not None else "none finite"
    yield "this calculation", str(found.solution.torsion_constant), "", "", f"{tau} *" if sharp else tau, "", ""
    for row in found.methods:
        method = row.method
        off = "" if math.isnan(row.stress_error) else percent(row.stress_error)
        constant = number(method.torsion_constant, 6), percent(row.constant_error), row.stiffness
        yield method.name.replace("_", " "), *constant, figure(method.stress_per_torque), off, row.strength


def _errors(result: JobResult, found: Comparison) -> Block:
    """Return the errors as a picture, and the reasons beside it."""
    caption = "How far off the hand method is; hatched: not conservative."
    height = 0.28 + 0.075 * len(found.methods)
    picture = Picture("comparison", caption, lambda canvas: _draw_errors(canvas, result, found), height)
    lines = ["Conservative for stiffness: the twist is not understated; for strength: the peak stress is not."]
    if len(found.solution.singular_corners):
        lines.append("* Beside sharp re-entrant corners, where the elastic stress is unbounded.")
    lines += [f"{reason[0].upper()}{reason[1:]}." for reason in found.reasons]
    return Beside((picture,), (Lines(tuple(lines)),), 0.56)


def _draw_errors(canvas: Any, result: JobResult, found: Comparison) -> None:
    from torsionfe.output.compare_plot import draw_errors

    left, right = canvas.subplots(1, 2)
    draw_errors(found, (left, right), unit=result.job.system.length, brief=True)
    right.set_yticks([])  # the names stand beside the panel on the left


def _idealisation(result: JobResult, found: Comparison) -> Block:
    """Return the drawing of the first idealisation, and its plates beside it."""
    first, system = found.methods[0].method, result.job.system
    caption = f"What the hand method takes the section for: {first.name.replace('_', ' ')}."
    shape = ratio(result.solution.outline, _SHARE * (WIDTH - GUTTER), around=0.2, beside=0.6, below=0.7)
    picture = Picture("plates", caption, lambda canvas: _draw_plates(canvas, result, first.plates), shape)
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


def _draw_plates(canvas: Any, result: JobResult, first: PlateSet | None) -> None:
    from torsionfe.output.plate_plot import plot_plates

    assert first is not None  # a job's methods are all placed
    named = tuple(replace(plate, name=plain(legible(plate.name))) for plate in first.plates)
    plates = replace(first, plates=named)
    plot_plates(result.solution.outline, plates, canvas.add_subplot(), result.job.system.length)


def hand_references(result: JobResult) -> list[str]:
    """Return the sources of the hand method that are not those of the answer."""
    methods = result.hand.methods if result.hand else ()
    if not any(isinstance(row.method.answer, CellSum) for row in methods):
        return []
    return [
        "Bredt, R. (1896): Kritische Bemerkungen zur Drehungselastizität. Z. VDI 40.",
        "Batho, C. (1915): Torsion stresses in framed structures and thin-walled prisms. Brit. Assoc. Adv. Sci.",
    ]
