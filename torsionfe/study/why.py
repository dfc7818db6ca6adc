"""Why the hand method is off: the share of the fillets is measured, by solving the section without them."""

from __future__ import annotations

import math
from functools import cached_property

import numpy as np

from torsionfe.closed_form.cells import CellSum
from torsionfe.closed_form.derived import DerivedPlates
from torsionfe.closed_form.plates import plate_sum
from torsionfe.errors import TorsionError
from torsionfe.outline.fillets import unfilleted
from torsionfe.study.hand import HandMethod
from torsionfe.text import number, percent, signed_percent
from torsionfe.torsion.solution import TorsionSolution
from torsionfe.torsion.solve import solve_torsion

__all__ = ["Section", "constant_reason", "stress_reason"]

_AGREES = 0.005
_COVERED = 0.9  # of the area: below, plates hardly stand for the section
_STUBBY = 3.0  # width to thickness
_SAMPLES = 129


class Section:
    """A solved section, and what is asked of it for every method alike."""

    def __init__(self, solution: TorsionSolution) -> None:
        self.solution = solution

    @cached_property
    def fillet_share(self) -> float:
        """What the fillets add to ``J``, as a share of it; 0 without fillets, NaN where that can't be told."""
        outline = self.solution.outline
        try:
            sharp = unfilleted(outline)
            if len(sharp.edges) == len(outline.edges):
                return 0.0
            without = solve_torsion(sharp, 2e-3, peak_tol=math.inf, max_unknowns=40_000).torsion_constant
        except TorsionError:
            return math.nan
        return 1.0 - without.value / self.solution.torsion_constant.value

    @cached_property
    def hot_fillet(self) -> float:
        """Radius of the fillet that the hot spot sits in, length; NaN where it sits elsewhere."""
        spot, edges = self.solution.hot_spot, self.solution.outline.edges
        if spot is None:
            return math.nan
        every, t = np.arange(len(edges)), np.linspace(0.0, 1.0, _SAMPLES)
        points = edges.points(np.repeat(every, _SAMPLES), np.tile(t, len(edges))) - (spot.x, spot.y)
        away = np.hypot(*points.T).reshape(len(edges), _SAMPLES).min(axis=1) - edges.length / _SAMPLES
        # at the end of a fillet either edge may be the nearer one by rounding
        near = np.flatnonzero((away <= max(0.0, float(away.min()))) & (edges.bulge < 0.0))
        return float(edges.radius[near].min()) if len(near) else math.nan


def constant_reason(section: Section, method: HandMethod) -> str:
    """Return why ``J`` by hand is off, in a line."""
    solution, answer = section.solution, method.answer
    j = solution.torsion_constant.value
    error = method.torsion_constant / j - 1.0
    if abs(error) <= max(_AGREES, solution.torsion_constant.rel_gap):
        return _agreement(error, solution.torsion_constant.rel_gap)
    if not isinstance(answer, CellSum) and solution.outline.voids:
        return "closed cell: plates are open and leave out the shear flow around it"
    fillets = section.fillet_share
    parts = [(-fillets, f"fillets left out ({signed_percent(-fillets)})")] if math.isfinite(fillets) else []
    rest = method.torsion_constant / (j * (1.0 - (fillets if math.isfinite(fillets) else 0.0)))
    if isinstance(answer, CellSum):
        parts.append((rest - 1.0, f"closed cell with walls that are not thin ({signed_percent(rest - 1.0)})"))
    else:
        series = plate_sum(answer.plates).torsion_constant_twist
        rule = method.torsion_constant / series
        stubby = f"stubby plate, coefficients by the rule '{answer.rule}'"
        parts.append((rule - 1.0, f"{stubby} ({signed_percent(rule - 1.0)})"))
        parts.append((rest / rule - 1.0, _joint(section, method, rest / rule - 1.0)))
    told = [words for share, words in sorted(parts, key=lambda part: -abs(part[0])) if abs(share) > 0.25 * abs(error)]
    return " and ".join(told[:2]) if told else "fillets, joints and coefficients nearly cancel"


def _agreement(error: float, doubt: float) -> str:
    return "agrees with the answer" if abs(error) <= doubt else f"agrees within {percent(_AGREES)}"


def _joint(section: Section, method: HandMethod, share: float) -> str:
    """Return what is left when fillets and coefficients are accounted for: the shape that plates don't have."""
    plates = method.plates
    if isinstance(plates, DerivedPlates) and plates.covered < _COVERED:
        return f"plates stand for only {percent(plates.covered)} of the section ({signed_percent(share)})"
    stubby = min((plate.ratio for plate in plates or ()), default=math.inf) < _STUBBY
    if plates is not None and len(plates) == 1:
        what = "stubby section, no rectangle" if stubby else "no rectangle: bends and ends that a strip has not"
        return f"{what} ({signed_percent(share)})"
    what = "joints of stubby plates" if stubby else "joints"
    if share < 0.0:
        return f"{what} stiffer than the plates that meet there ({signed_percent(share)})"
    return f"{what} counted for more than they carry ({signed_percent(share)})"


def stress_reason(section: Section, method: HandMethod, error: float) -> str:
    """Return why the peak stress by hand is off, in a line; ``error`` is NaN where no finite peak exists."""
    solution = section.solution
    corners = solution.singular_corners
    if len(corners):
        x, y = corners[0]
        more = f" and {len(corners) - 1} more" if len(corners) > 1 else ""
        return f"sharp re-entrant corner at ({number(x)}, {number(y)}){more}: unbounded, fillet it"
    if solution.hot_spot is None or math.isnan(error):
        return "no finite peak"
    if abs(error) <= max(_AGREES, solution.hot_spot.rel_error):
        return _agreement(error, solution.hot_spot.rel_error)
    if math.isfinite(section.hot_fillet):
        return f"hot spot in a fillet of radius {number(section.hot_fillet)}, a rise that plates and walls have not"
    return _flat_face(section, method, error)


def _flat_face(section: Section, method: HandMethod, error: float) -> str:
    if isinstance(method.answer, CellSum):
        return "stress taken constant through a wall that is not thin"
    off = method.torsion_constant_stress / section.solution.torsion_constant.value - 1.0
    if error * off < 0.0 and abs(off) > 0.5 * abs(error):
        return f"follows from J for stress ({signed_percent(off)})"
    return f"hot spot on a flat face, its stress not that of the thickest plate ({method.governing})"
