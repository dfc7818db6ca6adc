"""What a little more material does, worded for the sheet: on each dimension, or on each edge of the outline."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import Any

from torsionfe.job.findings import ratio, where
from torsionfe.job.running import JobResult
from torsionfe.job.words import measured, sure, with_unit, written_unit
from torsionfe.output.section_view import sideways
from torsionfe.output.sheet import GUTTER, WIDTH, Beside, Block, Cells, Lines, Picture, SheetSection
from torsionfe.study.dimension import DimensionEffect, Sensitivity, peak_words
from torsionfe.text import number, signed_percent
from torsionfe.torsion.sensitivity import BoundarySensitivity, EdgeSensitivity, boundary_sensitivity

__all__ = ["sensitivity_section"]

_SHARE = 0.38  # of the width: the picture
_TALLEST = 0.7  # height over width of the picture
_MOST = 8  # edges


def sensitivity_section(result: JobResult) -> SheetSection:
    """Return what a step on each dimension does to J and to the peak stress; without dimensions, on each edge."""
    found = boundary_sensitivity(result.solution)
    outline = result.solution.outline
    room = {"beside": 0.65, "below": 1.2} if sideways(outline) else {"beside": 1.35, "below": 0.7}
    shape = min(_TALLEST, ratio(outline, _SHARE * (WIDTH - GUTTER), around=0.2, **room))
    caption = "What J gains for each area added."
    picture = Picture("sensitivity", caption, lambda canvas: _draw(canvas, result, found), shape)
    effects = result.sensitivity
    blocks = _dimensions(result, effects) if effects is not None else _edges(result, found)
    return SheetSection("Sensitivity", (Beside((picture,), tuple(blocks), _SHARE),))


def _draw(canvas: Any, result: JobResult, found: BoundarySensitivity) -> None:
    from torsionfe.output.sensitivity_plot import plot_sensitivity

    plot_sensitivity(found, canvas.add_subplot(), unit=result.job.system.length)


def _dimensions(result: JobResult, effects: Sensitivity) -> Iterator[Block]:
    system = result.job.system
    more = measured(effects.step, system.length)
    peaks = result.solution.hot_spot is not None
    head = ("dimension", "", f"J [{written_unit(system.power(4))}]", "J", *(("peak stress",) if peaks else ()))
    rows = tuple(_dimension(effect, system.length, peaks) for effect in effects if effect.varied)
    yield Lines((f"What {more} more on each dimension does, the others kept:",))
    yield Cells(head, rows)
    lines = [
        "To first order: J from the one solution (Hadamard's formula), the peak stress per torque from solving again; "
        "'undecided' where a change is within its error."
    ]
    rates = [effect.name.replace("_", " ") for effect in effects if effect.varied and effect.note]
    if rates:
        lines.append(f"The step is a large part of {', '.join(rates)}: read a rate there.")
    lines += [f"{effect.name.replace('_', ' ')}: {effect.note}." for effect in effects if not effect.varied]
    yield Lines(tuple(lines))


def _dimension(effect: DimensionEffect, unit: str, peaks: bool) -> tuple[str, ...]:
    name, value = effect.name.replace("_", " "), measured(effect.value, unit)
    change = sure(effect.constant_change, effect.constant_error / abs(effect.constant_change or 1.0))
    sign = "+" if effect.constant_change > 0.0 else ""
    share = "undecided" if effect.constant_undecided else signed_percent(effect.constant_share, 3)
    peak = () if not peaks else ("",) if math.isnan(effect.peak_share) else (peak_words(effect),)
    return (name, value, f"{sign}{change}", share, *peak)


def _edges(result: JobResult, found: BoundarySensitivity) -> Iterator[Block]:
    system, step = result.job.system, result.job.sensitivity.step
    more = measured(step, system.length)
    constant = result.solution.torsion_constant.value
    head = ("edge", "its middle", f"J [{written_unit(system.power(4))}]", "J")
    rows = []
    for edge in found.largest()[:_MOST]:
        gain = sure(edge.by_offset * step, edge.rel_error)
        middle = where(result.job, edge.x, edge.y)
        rows.append((_name(edge), middle, f"+{gain}", signed_percent(edge.by_offset * step / constant, 3)))
    yield Lines((f"What {more} more material along a whole edge does; the edges that count most:",))
    yield Cells(head, tuple(rows), words=2)
    lines = ["To first order, by Hadamard's formula from the one solution; edges by the numbers of their vertices."]
    fillets = [edge for edge in found if edge.kind == "fillet" and not math.isnan(edge.by_radius)]
    if fillets:
        best = max(fillets, key=lambda edge: edge.by_radius)
        gain = with_unit(f"+{number(best.by_radius * step)}", system.power(4))
        middle = where(result.job, best.x, best.y)
        lines.append(f"{more} more radius on the fillet at {middle}, tangent as it is: {gain}.")
    if len(found.edges) > _MOST:
        lines.append(f"{len(found.edges) - _MOST} more edges count less.")
    yield Lines(tuple(lines))


def _name(edge: EdgeSensitivity) -> str:
    loop = f"void {edge.loop - 1}, " if edge.loop else ""
    kind = "" if edge.kind == "straight" else f" ({edge.kind})"
    return f"{loop}{edge.start} to {edge.end}{kind}"
