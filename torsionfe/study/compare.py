"""The hand method beside the answer: how far off it is, on which side, and why."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from torsionfe.checks import finite, positive
from torsionfe.closed_form.rectangle import CoefficientTable
from torsionfe.errors import InputError
from torsionfe.study.hand import HandMethod, hand_methods
from torsionfe.study.why import Section, constant_reason, stress_reason
from torsionfe.text import number, percent, signed_percent, table
from torsionfe.torsion.solution import TorsionSolution

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["ComparedMethod", "Comparison", "compare"]

CONSERVATIVE, NOT_CONSERVATIVE = "conservative", "not conservative"
WITHIN, UNDEFINED = "within the bounds", "not defined"


@dataclass(frozen=True)
class ComparedMethod:
    """One hand method beside the answer.

    Attributes
    ----------
    method : HandMethod
    constant_error : float
        ``J`` by hand over the middle of the bounds, less 1.
    stiffness : str
        ``'conservative'`` where ``J`` by hand is below the lower bound, so that it overstates the twist;
        ``'not conservative'`` above the upper one; else ``'within the bounds'``.
    stress_error : float
        Peak stress by hand over that at the hot spot, less 1; NaN where no finite peak exists.
    strength : str
        ``'conservative'`` where the stress by hand is above the hot spot's by more than its error,
        ``'not conservative'`` below, else ``'within the bounds'``; ``'not defined'`` where the section has a sharp
        re-entrant corner.
    constant_reason, stress_reason : str
        Why, in a line each.
    """

    method: HandMethod
    constant_error: float
    stiffness: str
    stress_error: float
    strength: str
    constant_reason: str
    stress_reason: str


@dataclass(frozen=True, repr=False)
class Comparison:
    """The hand method, by one or more idealisations, beside the answer. ``print`` shows a table.

    Attributes
    ----------
    solution : TorsionSolution
    methods : tuple of ComparedMethod
    torque : float or None
        force * length; without it stresses are per unit torque.
    shear_modulus, length : float or None
        force / length**2 and length; with both and the torque, twists are given.
    """

    solution: TorsionSolution
    methods: tuple[ComparedMethod, ...]
    torque: float | None
    shear_modulus: float | None
    length: float | None

    def twist(self, torsion_constant: float) -> float:
        """Return the twist of the bar by a torsion constant, rad; NaN without torque, shear modulus and length."""
        if self.torque is None or self.shear_modulus is None or self.length is None:
            return math.nan
        return self.torque * self.length / (self.shear_modulus * torsion_constant)

    def as_table(self) -> tuple[tuple[str, ...], list[tuple[Any, ...]]]:
        """Return names of columns and a row of numbers a method, the answer first: for files."""
        solution, factor = self.solution, 1.0 if self.torque is None else abs(self.torque)
        j, spot = solution.torsion_constant, solution.hot_spot
        peak = math.nan if spot is None else factor * spot.stress_per_torque
        columns = ("method", "J for twist", "J for stress", "error of J", "stiffness", "peak stress")
        answer = ("solution", j.value, j.value, 0.0, "", peak, 0.0, "", self.twist(j.value), "", "")
        rows: list[tuple[Any, ...]] = [answer]
        for row in self.methods:
            by = row.method
            sizes = (by.name, by.torsion_constant, by.torsion_constant_stress, row.constant_error, row.stiffness)
            stress = (factor * by.stress_per_torque, row.stress_error, row.strength)
            rows.append((*sizes, *stress, self.twist(by.torsion_constant), row.constant_reason, row.stress_reason))
        return (*columns, "error of the peak", "strength", "twist", "reason for J", "reason for the peak"), rows

    @property
    def reasons(self) -> tuple[str, ...]:
        """Why the methods are off, a line a reason, methods with the same one together."""
        found: dict[tuple[str, str], list[str]] = {}
        for row in self.methods:
            for what, why in (("J", row.constant_reason), ("peak", row.stress_reason)):
                found.setdefault((what, why), []).append(row.method.name.replace("_", " "))
        lines = []
        for (what, why), names in sorted(found.items(), key=lambda item: item[0][0] != "J"):
            by = "" if len(names) == len(self.methods) else f" by {', '.join(names)}"
            lines.append(f"{what}{by}: {why}")
        return tuple(lines)

    @property
    def twofold(self) -> bool:
        """Whether a method has a torsion constant for stress other than that for twist."""
        pairs = [(row.method.torsion_constant, row.method.torsion_constant_stress) for row in self.methods]
        return any(not math.isclose(twist, stress, rel_tol=1e-6) for twist, stress in pairs)

    def _rows(self) -> list[list[str]]:
        solution, factor = self.solution, 1.0 if self.torque is None else abs(self.torque)
        spot, bounds = solution.hot_spot, solution.torsion_constant
        twisted = math.isfinite(self.twist(1.0))
        stress = "none finite"
        if spot is not None:
            mark = " *" if len(solution.singular_corners) else ""
            stress = f"{number(factor * spot.stress_per_torque)} +/- {percent(spot.rel_error)}{mark}"
        head = ["method", "J", "off", "for stiffness", "J for stress"]
        head += ["peak / torque" if self.torque is None else "peak stress", "off", "for strength", "twist, rad"]
        rows = [head, ["finite elements", str(bounds), "", "", "", stress, "", "", number(self.twist(bounds.value))]]
        for row in self.methods:
            by = row.method
            off = "" if math.isnan(row.stress_error) else signed_percent(row.stress_error)
            cells = [by.name.replace("_", " "), number(by.torsion_constant, 6), signed_percent(row.constant_error)]
            cells += [row.stiffness, number(by.torsion_constant_stress, 6), number(factor * by.stress_per_torque)]
            rows.append([*cells, off, row.strength, number(self.twist(by.torsion_constant))])
        left_out = {place for place, shown in ((4, self.twofold), (8, twisted)) if not shown}
        return [[cell for k, cell in enumerate(row) if k not in left_out] for row in rows]

    def _lines(self) -> list[str]:
        lines = ["conservative: for stiffness, J is not overstated, so the twist is not understated;"]
        lines.append("for strength, the peak stress is not understated; within the bounds: undecided")
        if len(self.solution.singular_corners):
            lines.append("* beside sharp re-entrant corners, where the elastic stress has no limit")
        if self.solution.shortfall:
            lines.append(f"NOT CONVERGED: {self.solution.shortfall}")
        lines += [f"why, {reason}" for reason in self.reasons]
        return lines + [f"note: {note}" for note in dict.fromkeys(n for row in self.methods for n in row.method.notes)]

    def __str__(self) -> str:
        return "\n".join([table(self._rows(), "The hand method beside the answer", head=True), *self._lines()])

    def __repr__(self) -> str:
        names = ", ".join(f"{row.method.name} {signed_percent(row.constant_error)}" for row in self.methods)
        return f"<Comparison J by {names}>"

    def plot(self, figure: Figure | None = None, **options: Any) -> Any:
        """Draw the stress beside the methods' values; see `torsionfe.output.compare_plot.plot_comparison`."""
        from torsionfe.output.compare_plot import plot_comparison

        return plot_comparison(self, figure, **options)

    def _repr_html_(self) -> str:
        from torsionfe.output.notebook import html_table, rich_html

        lines = html_table("", [[line] for line in self._lines()])
        return rich_html("The hand method beside the answer", self._rows(), self.plot, head=True) + lines


def compare(
    solution: TorsionSolution,
    plates: Any = None,
    *,
    torque: float | None = None,
    shear_modulus: float | None = None,
    length: float | None = None,
    rule: str | CoefficientTable = "series",
) -> Comparison:
    """Set the hand method beside a solution: torsion constant, peak stress, which side is safe, and why.

    Parameters
    ----------
    solution : TorsionSolution
    plates : sequence of Plate, PlateSum, ThinCells, CellSum, or mapping of str to these, optional
        What the hand method takes the section for. A mapping names several choices side by side. By default every
        idealisation of a trade shape, or the plates and cells found in any other outline (`derive_plates`).
    torque : float, optional
        force * length; without it stresses are given per unit torque.
    shear_modulus, length : float, optional
        force / length**2, and of the bar; with all three the twist is given, too.
    rule : str or CoefficientTable
        Coefficients of plates that are not summed yet: see `rectangle_coefficients`.

    Returns
    -------
    Comparison

    Raises
    ------
    InputError
        An argument is out of its range; no plates are given or found.

    Examples
    --------
    >>> import torsionfe as tf
    >>> bar = tf.shapes.rectangle(40, 20)
    >>> row = compare(tf.solve_torsion(bar), bar.plates()).methods[0]
    >>> row.stiffness, row.constant_reason
    ('within the bounds', 'agrees with the answer')
    """
    if not isinstance(solution, TorsionSolution):
        raise InputError(f"a TorsionSolution is needed, got {type(solution).__name__}: see torsionfe.solve_torsion")
    load = None if torque is None else finite("torque", torque)
    modulus = None if shear_modulus is None else positive("shear_modulus", shear_modulus)
    span = None if length is None else positive("length", length)
    methods = hand_methods(solution.outline, plates, rule)
    section = Section(solution)
    return Comparison(solution, tuple(_compared(section, method) for method in methods), load, modulus, span)


def _compared(section: Section, method: HandMethod) -> ComparedMethod:
    solution = section.solution
    bounds, spot = solution.torsion_constant, solution.hot_spot
    constant = method.torsion_constant
    above, below = constant > bounds.upper, constant < bounds.lower
    error = constant / bounds.value - 1.0
    stiffness = NOT_CONSERVATIVE if above else CONSERVATIVE if below else WITHIN
    if spot is None or len(solution.singular_corners):
        off, strength = math.nan, UNDEFINED
    else:
        off = method.stress_per_torque / spot.stress_per_torque - 1.0
        # the true peak lies within the hot spot's error of its value
        low, high = (spot.stress_per_torque * (1.0 + sign * spot.rel_error) for sign in (-1.0, 1.0))
        stress = method.stress_per_torque
        strength = CONSERVATIVE if stress > high else NOT_CONSERVATIVE if stress < low else WITHIN
    why = constant_reason(section, method), stress_reason(section, method, off)
    return ComparedMethod(method, error, stiffness, off, strength, *why)
