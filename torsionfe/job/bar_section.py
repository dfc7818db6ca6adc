"""The bar, worded for the sheet: twist and stress of each case, margins, fully plastic torque."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from torsionfe.job.running import JobResult
from torsionfe.job.words import between, figure, measured, rounded_down, signed, sure, with_unit, written_unit
from torsionfe.member.bar import SteppedBar
from torsionfe.member.margins import Margin, MarginTable
from torsionfe.member.plastic import PlasticTorque
from torsionfe.member.restrained import RestrainedBar
from torsionfe.output.sheet import Beside, Block, Cells, Facts, Lines, SheetSection
from torsionfe.quantities import UnitSystem
from torsionfe.text import number, percent

__all__ = ["bar_section"]


def bar_section(result: JobResult) -> SheetSection | None:
    """Return the bar's twist and stress under each case, its margins and its buckling; None without a bar."""
    bar, system = result.bar, result.job.system
    if bar is None:
        column = _column(result)
        return None if column is None else SheetSection("Column", (column,))
    blocks: list[Block] = [_stiffness(bar, system)]
    if result.plastic is not None:
        blocks = [Beside((blocks[0],), (_plastic(result.plastic, system),), 0.56)]
    if len(bar.segments) > 1:
        blocks.append(_segments(bar, system))
    torque, stress = written_unit(system.torque), written_unit(system.stress)
    head = ("case", "segment", f"torque [{torque}]", "twist at its end [rad]", "[°]", f"peak stress [{stress}]")
    blocks.append(Cells(head, tuple(_responses(result)), words=2))
    if any(peak.undefined for response in result.responses for peak in response.peaks):
        blocks.append(Lines(("* Beside a sharp re-entrant corner, where the elastic stress is unbounded.",)))
    if result.margins is not None:
        blocks += _margins(result.margins, bar, system)
    facts = [made for made in (_held_ends(result), _column(result)) if made is not None]
    if facts:
        blocks.append(Beside((facts[0],), (facts[1],)) if len(facts) > 1 else facts[0])
    return SheetSection("Bar", (*blocks, *_restrained(result)))


def _stiffness(bar: SteppedBar, system: UnitSystem) -> Block:
    stations = f"station{'s'[: len(bar.held) > 1]} {', '.join(map(str, bar.held))} of 0 to {len(bar.segments)}"
    return Facts(
        (
            ("length", measured(float(bar.positions[-1]), system.length)),
            ("kept from rotating", f"{stations}; taken as free to warp"),
            ("spring constant, end to end", between(bar.stiffness_bounds, f"{system.torque}/rad")),
        )
    )


def _segments(bar: SteppedBar, system: UnitSystem) -> Block:
    units = [system.length, system.power(4), system.power(3), system.stress]
    names = ("length", "J", "W_t", "G")
    head = ("segment", *(f"{name} [{written_unit(unit)}]" for name, unit in zip(names, units, strict=True)))
    rows = []
    for k, part in enumerate(bar.segments):
        spot = part.solution.hot_spot
        modulus = sure(1.0 / spot.stress_per_torque, spot.rel_error) if spot is not None else "none"
        numbers = (number(part.length, 6), str(part.solution.torsion_constant), modulus, number(part.shear_modulus, 6))
        rows.append((bar.label(k), *numbers))
    return Cells(head, tuple(rows))


def _responses(result: JobResult) -> Iterator[tuple[str, ...]]:
    """Yield a row of each segment under each case, factors left out."""
    for response in result.responses:
        for k, peak in enumerate(response.peaks):
            turn, error = float(response.twists[k + 1]), float(response.twist_errors[k + 1])
            label = response.bar.label(k) if len(response.peaks) > 1 else "whole bar"
            twist = sure(turn, error / abs(turn)) if turn else "0"
            stress = sure(peak.stress, peak.rel_error) + (" *" if peak.undefined else "")
            torque = number(float(response.torques[k]), 6)
            yield response.case.name, label, torque, twist, number(math.degrees(turn)), stress


def _margins(table: MarginTable, bar: SteppedBar, system: UnitSystem) -> list[Block]:
    torque = written_unit(system.torque)
    head = ("case", "criterion", f"torque [{torque}]", "factor", "applied", "allowable", "margin", "largest torque")
    rows = tuple(_margin(row, len(bar.segments) > 1, system) for row in table)
    reasons = dict.fromkeys(f"Margin {row.note}" for row in table if not row.defined)
    blocks: list[Block] = [Cells(head, rows, words=2)]
    return [*blocks, Lines(tuple(reasons), "warning")] if reasons else blocks


def _margin(row: Margin, several: bool, system: UnitSystem) -> tuple[str, ...]:
    criterion = f"{row.criterion}, {row.segment}" if row.segment and several else row.criterion
    unit = {"twist": "rad", "twist rate": f"rad/{system.length}"}.get(row.criterion, system.stress)
    applied = with_unit(number(row.applied), unit) if row.defined else "not defined"
    largest = rounded_down(row.largest_torque) if row.defined else "not defined"
    numbers = (number(row.torque, 6), number(row.factor), applied, with_unit(number(row.allowable), unit))
    return (row.case, criterion, *numbers, signed(row.margin), largest)


def _plastic(plastic: PlasticTorque, system: UnitSystem) -> Block:
    rows = [("fully plastic torque", with_unit(rounded_down(plastic.torque), system.torque))]
    if plastic.first_yield > 0.0:
        rows.append(("torque at first yield", sure(plastic.first_yield, plastic.first_yield_error, system.torque)))
        rows.append(("shape factor", number(plastic.shape_factor)))
    elif plastic.first_yield == 0.0:
        rows.append(("shape factor", "not defined: a sharp re-entrant corner yields at once"))
    return Facts(tuple(rows))


# --- restrained warping -------------------------------------------------------------------------------------

_FADES = 0.05  # of the twist


def _held_ends(result: JobResult) -> Block | None:
    """Return which ends cannot warp, and how far along the bar that is felt."""
    if not result.restrained:
        return None
    system, first = result.job.system, result.restrained[0]
    held = "both ends" if first.warping == "both" else "station 0"
    rows = [("kept from warping", f"{held}, by Vlasov's theory")]
    if first.warps:
        beyond = measured(first.length_for_effect(_FADES), system.length, 4)
        rows.append(("decay length √(E C_w / (G J))", measured(first.decay_length, system.length, 4)))
        rows.append(("twist changes by less than 5 %", f"in bars longer than {beyond}"))
    else:
        rows.append(("which changes", "nothing: the section does not warp"))
    return Facts(tuple(rows))


def _restrained(result: JobResult) -> list[Block]:
    """Return what holding the warping does in each case: to the twist, and to the normal stress that it adds."""
    if not result.restrained or not result.restrained[0].warps:
        return []
    system = result.job.system
    moment, stress = written_unit(f"{system.force}*{system.power(2)}"), written_unit(system.stress)
    head = ("case, warping held", "twist [rad]", "less by", f"bimoment [{moment}]", "torque by warping there",
            f"added normal stress [{stress}]")  # fmt: skip
    rows = tuple(_held(one, case.name) for one, case in zip(result.restrained, result.job.cases, strict=True))
    note = "The added normal stress stands in none of the margins above, which are those of a bar free to warp."
    return [Cells(head, rows), Lines((note,), "warning")]


def _held(one: RestrainedBar, name: str) -> tuple[str, ...]:
    moment, place = one.largest_bimoment
    share = float(np.nan_to_num(one.warping_share(place))[0])
    turn, added = one.largest_twist[0], one.largest_normal_stress[0]
    return name, number(turn), percent(one.effect, 3), figure(moment), percent(share, 3), number(added)


# --- buckling -----------------------------------------------------------------------------------------------


def _column(result: JobResult) -> Block | None:
    """Return the elastic buckling loads of the bar as a column."""
    column, found, system = result.job.column, result.buckling, result.job.system
    if column is None or found is None:
        return None
    parts = [measured(part, system.force, 4) for part in (found.load, found.shear_part, found.warping_part)]
    rows = [
        ("as a column of length K L", measured(found.effective_length, system.length)),
        ("elastic torsional buckling", "{}: {} from J, {} from C_w".format(*parts)),
        ("stress at that load", f"{measured(found.stress, system.stress, 4)}; no meaning above the yield stress"),
        ("elastic flexural buckling", f"{measured(found.flexural_load, system.force, 4)}, about the weak axis"),
        ("buckles first by", "twisting" if found.torsion_governs else "bending"),
    ]
    if column.force is not None:
        ratio = rounded_down(min(found.load, found.flexural_load) / column.force, 3)
        force = measured(column.force, system.force)
        rows.append((f"lower load over {force}", f"{ratio}: no margin of safety, see the cautions"))
    return Facts(tuple(rows))
