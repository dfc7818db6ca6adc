"""The fully plastic torque: the whole section at the shear yield stress."""

from __future__ import annotations

import math
from dataclasses import dataclass

from torsionfe.cautions import PLASTIC
from torsionfe.checks import positive
from torsionfe.errors import InputError
from torsionfe.member.heap import sand_heap
from torsionfe.member.properties import TorsionProperties
from torsionfe.outline.outline import Outline
from torsionfe.text import number, percent, table

__all__ = ["PlasticTorque", "plastic_torque"]


@dataclass(frozen=True)
class PlasticTorque:
    """The fully plastic torque of a section. ``float(result)`` is the torque; ``print`` shows a table.

    Attributes
    ----------
    torque : float
        ``T_p = 2 k (int d + sum d_k A_k)``, force * length.
    shear_yield : float
        ``k``, force / length**2.
    plastic_modulus : float
        ``T_p / k``, length**3.
    plateaus : tuple of float
        Height ``d_k`` of the sand heap on each void (length): the thickness of wall that holds it up.
    rel_error : float
        Relative error of the volume's quadrature.
    first_yield : float
        Torque at which the hot spot starts to yield, force * length; NaN where no solution was given, 0 where a
        sharp re-entrant corner yields at once.
    first_yield_error : float
        Relative error of ``first_yield``; NaN where that is not defined.
    """

    torque: float
    shear_yield: float
    plastic_modulus: float
    plateaus: tuple[float, ...]
    rel_error: float
    first_yield: float = math.nan
    first_yield_error: float = math.nan

    @property
    def shape_factor(self) -> float:
        """``T_p`` over the torque at first yield; NaN where that is 0 or unknown.

        4/3 for a solid circle, 1.6 for a square, 5/3 for an equilateral triangle.
        """
        return self.torque / self.first_yield if self.first_yield > 0.0 else math.nan

    def __float__(self) -> float:
        return self.torque

    def __str__(self) -> str:
        rows = [
            ("fully plastic torque T_p", f"{number(self.torque, 6)}  [force*length]"),
            ("shear yield stress k", f"{number(self.shear_yield, 6)}  [force/length^2]"),
            ("plastic modulus T_p / k", f"{number(self.plastic_modulus, 6)}  [length^3]"),
            ("error of the quadrature", percent(self.rel_error)),
        ]
        if self.first_yield == 0.0:
            rows.append(("shape factor", "not defined: a sharp re-entrant corner yields at once; fillet it"))
        elif math.isfinite(self.first_yield):
            sure = f"+/- {percent(self.first_yield_error)}"
            rows.append(("torque at first yield", f"{number(self.first_yield, 6)}  {sure}  [force*length]"))
            rows.append(("shape factor", number(self.shape_factor)))
        rows += [
            (f"wall that carries void {k}", f"{number(height)}  [length]")
            for k, height in enumerate(self.plateaus)
        ]
        return "\n".join([table(rows, "Fully plastic torque"), *(f"caution: {line}" for line in PLASTIC)])


def plastic_torque(
    outline: Outline, shear_yield: float, solution: TorsionProperties | None = None
) -> PlasticTorque:
    """Return the fully plastic torque by the sand-heap rule, exact but for a quadrature along the boundary.

    Parameters
    ----------
    outline : Outline
        The section, with any voids.
    shear_yield : float
        Yield stress in shear, force / length**2.
    solution : TorsionProperties, optional
        The section's elastic solution: it adds the torque at first yield and the shape factor.

    Returns
    -------
    PlasticTorque

    Raises
    ------
    InputError
        Not an outline, or a yield stress that is not above 0.
    SolveError
        The outline has detail below the rounding of its coordinates.

    Notes
    -----
    Nadai (1923): the plastic stress function rises with slope ``k`` from the outer loop, like a heap of sand; on
    a void it is constant, at the least height that the slope allows, so that crossing a void costs nothing.

    Examples
    --------
    >>> bar = Outline([(0, 0), (30, 0), (30, 10), (0, 10)])  # t^2 (3 b - t) / 6
    >>> round(float(plastic_torque(bar, shear_yield=1.0)), 6)
    1333.333333
    """
    if not isinstance(outline, Outline):
        raise InputError(f"an Outline is needed, got {type(outline).__name__}: pass solution.outline")
    yield_ = positive("shear_yield", shear_yield)
    heap = sand_heap(outline)
    first, error = math.nan, math.nan
    if solution is not None:
        if solution.outline != outline:
            raise InputError("the solution is of another outline: pass solution.outline")
        if len(solution.singular_corners):
            first = 0.0
        elif solution.hot_spot is not None:
            first, error = yield_ / solution.hot_spot.stress_per_torque, solution.hot_spot.rel_error
    modulus = 2.0 * heap.volume
    plateaus = tuple(float(height) for height in heap.plateaus)
    return PlasticTorque(modulus * yield_, yield_, modulus, plateaus, heap.rel_error, first, error)
