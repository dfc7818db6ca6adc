"""One section, one bar: the table that the command prints."""

from __future__ import annotations

import math
from dataclasses import dataclass

from torsionfe.checks import finite, positive
from torsionfe.errors import InputError
from torsionfe.quantities import UnitSystem
from torsionfe.study.compare import WITHIN, ComparedMethod, compare
from torsionfe.study.hand import hand_methods
from torsionfe.text import number, percent, signed_percent, table
from torsionfe.torsion.bounds import Bounds
from torsionfe.torsion.solution import TorsionSolution

__all__ = ["Answer", "answer"]


@dataclass(frozen=True)
class Answer:
    """A section's torsion in the user's units, with what a bar of it does under a torque.

    Attributes
    ----------
    solution : TorsionSolution
    system : UnitSystem
    torque : float or None
        force * length.
    twist : Bounds or None
        Rotation between the bar's ends, rad.
    hand : ComparedMethod or None
        The hand method by the first idealisation, where plates or thin cells stand for the section.
    """

    solution: TorsionSolution
    system: UnitSystem
    torque: float | None
    twist: Bounds | None
    hand: ComparedMethod | None

    def __str__(self) -> str:
        rows = [*self._section(), *self._stress(), *self._bar(), *self._by_hand()]
        if self.solution.shortfall:
            rows.append(("NOT CONVERGED", self.solution.shortfall))
        return table(rows, title="Torsion of the section")

    def _unit(self, name: str) -> str:
        return f" {name}" if name else ""

    def _section(self) -> list[tuple[str, str]]:
        j = self.solution.torsion_constant
        return [
            ("torsion constant J", f"{j}{self._unit(self.system.power(4))}, bracket {percent(j.rel_gap)} wide"),
            ("section modulus W_t", f"{number(self.solution.section_modulus)}{self._unit(self.system.power(3))}"),
        ]

    def _stress(self) -> list[tuple[str, str]]:
        factor = 1.0 if self.torque is None else abs(self.torque)
        name = "peak shear stress / torque" if self.torque is None else "peak shear stress"
        unit = f"1/{self.system.power(3)}" if self.torque is None and self.system.length else self.system.stress
        rows = []
        for spot in self.solution.hot_spots[:4]:
            value = f"{number(spot.stress_per_torque * factor)}{self._unit(unit)} +/- {percent(spot.rel_error)}"
            rows.append((name, f"{value} at ({number(spot.x)}, {number(spot.y)}){self._unit(self.system.length)}"))
            name = "  equal to it"
        more = len(self.solution.hot_spots) - 4
        if more > 0:
            rows.append(("", f"and at {more} more places"))
        if not rows:
            rows.append((name, "none finite: every flank rises into a sharp re-entrant corner"))
        for x, y in self.solution.singular_corners[:6]:
            rows.append(("sharp re-entrant corner", f"({number(x)}, {number(y)}): stress unbounded there; fillet it"))
        return rows

    def _bar(self) -> list[tuple[str, str]]:
        if self.twist is None:
            return []
        middle, spread = self.twist.value, 0.5 * self.twist.rel_gap
        degrees = math.degrees(middle)
        return [("twist", f"{number(middle)} rad = {number(degrees)} degrees +/- {percent(spread)}")]

    def _by_hand(self) -> list[tuple[str, str]]:
        if self.hand is None:
            return []
        by, factor = self.hand.method, 1.0 if self.torque is None else abs(self.torque)
        constant = f"J = {number(by.torsion_constant, 5)}{self._unit(self.system.power(4))}"
        name = f"by hand ({by.name.replace('_', ' ')})"
        rows = [(name, f"{constant}, {_off(self.hand.constant_error, self.hand.stiffness, 'stiffness')}")]
        rows.append(("  reason", self.hand.constant_reason))
        if not math.isnan(self.hand.stress_error):
            unit = self._unit(self.system.stress) if self.torque is not None else ""
            peak = f"{number(by.stress_per_torque * factor)}{unit}"
            off = _off(self.hand.stress_error, self.hand.strength, "strength")
            rows += [("  its peak shear stress", f"{peak}, {off}"), ("  reason", self.hand.stress_reason)]
        return rows


def _off(error: float, verdict: str, what: str) -> str:
    return f"{signed_percent(error)} off, {verdict}" + ("" if verdict == WITHIN else f" for {what}")


def answer(
    solution: TorsionSolution,
    system: UnitSystem,
    torque: float | None = None,
    length: float | None = None,
    shear_modulus: float | None = None,
) -> Answer:
    """Return what a section does under a torque, as a bar of a length and shear modulus.

    Parameters
    ----------
    solution : TorsionSolution
    system : UnitSystem
        Names the units of the table; numbers are consistent in it.
    torque : float, optional
        force * length.
    length : float, optional
        Of the bar.
    shear_modulus : float, optional
        force / length**2.

    Raises
    ------
    InputError
        Length without shear modulus or torque, or the reverse.
    """
    bar = {"torque": torque, "length": length, "shear modulus": shear_modulus}
    missing = [name for name, value in bar.items() if value is None]
    if (length is not None or shear_modulus is not None) and missing:
        raise InputError(f"the twist needs torque, length and shear modulus: {' and '.join(missing)} not given")
    load = None if torque is None else finite("torque", torque)
    twist = None
    if load is not None and length is not None and shear_modulus is not None:
        flexibility = positive("length", length) / positive("shear modulus", shear_modulus)
        j = solution.torsion_constant
        ends = sorted((load * flexibility / j.upper, load * flexibility / j.lower))
        twist = Bounds(*ends)
    try:
        hand = compare(solution, hand_methods(solution.outline)[0], torque=load).methods[0]
    except InputError:  # neither plates nor thin cells stand for it
        hand = None
    return Answer(solution, system, load, twist, hand)
