"""Elastic torsional buckling of a centrally compressed bar."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from torsionfe.cautions import BUCKLING, cautions
from torsionfe.checks import positive
from torsionfe.errors import InputError
from torsionfe.member.bar import Bar
from torsionfe.text import number, table

__all__ = ["TorsionalBuckling", "torsional_buckling"]

_COINCIDE = 1e-2


@dataclass(frozen=True)
class TorsionalBuckling:
    """The elastic critical loads of a perfect bar. ``print`` shows a table with cautions.

    Attributes
    ----------
    load : float
        Torsional buckling, ``(G J + pi^2 E C_w / (K L)^2) / r0^2`` (force), with the lower bound of ``J``.
    shear_part, warping_part : float
        Its two terms, force.
    flexural_load : float
        Euler's load about the weak axis, ``pi^2 E I_min / (K L)^2`` (force), for comparison.
    stress : float
        ``load / A``, force / length**2: above the material's yield stress the elastic load has no meaning.
    polar_radius : float
        ``r0``, about the centre of twist, length.
    effective_length : float
        ``K L``, length.
    """

    load: float
    shear_part: float
    warping_part: float
    flexural_load: float
    stress: float
    polar_radius: float
    effective_length: float

    @property
    def torsion_governs(self) -> bool:
        """Whether the bar buckles by twisting before it does by bending about its weak axis."""
        return self.load < self.flexural_load

    def __str__(self) -> str:
        rows = [
            ("torsional buckling load", f"{number(self.load)}  [force]"),
            ("from G J", f"{number(self.shear_part)}  [force]"),
            ("from warping", f"{number(self.warping_part)}  [force]"),
            ("stress at that load", f"{number(self.stress)}  [force/length^2]"),
            ("flexural buckling load", f"{number(self.flexural_load)}  [force]"),
            ("governs", "torsion" if self.torsion_governs else "flexure"),
            ("polar radius r0", f"{number(self.polar_radius)}  [length]"),
            ("effective length K L", f"{number(self.effective_length)}  [length]"),
        ]
        return "\n".join([table(rows, "Elastic buckling of the perfect bar"), cautions(BUCKLING)])


def torsional_buckling(bar: Bar, elastic_modulus: float, length_factor: float = 1.0) -> TorsionalBuckling:
    """Return the elastic torsional buckling load of a section whose centre of twist is its centroid.

    Parameters
    ----------
    bar : Bar
        Doubly symmetric, cruciform or point-symmetric section.
    elastic_modulus : float
        ``E``, force / length**2.
    length_factor : float
        ``K``: 1 where both ends cannot rotate about the bar's axis and are free to warp, 0.5 where neither end
        can rotate or warp. The same factor serves the flexural load.

    Raises
    ------
    InputError
        The centre of twist is off the centroid, where torsion and bending buckle together and this formula is
        unsafe; a number out of its range.

    Notes
    -----
    Timoshenko and Gere, Theory of Elastic Stability, 2nd ed. 1961, art. 5.4.
    """
    modulus, factor = positive("elastic_modulus", elastic_modulus), positive("length_factor", length_factor)
    outline = bar.solution.outline
    area, centroid, (i_x, i_y, i_xy) = outline.edges.moments()
    centre = np.array(bar.solution.centre_of_twist)
    if np.hypot(*(centre - centroid)) > _COINCIDE * outline.size:
        raise InputError(
            f"the centre of twist ({centre[0]:g}, {centre[1]:g}) is off the centroid ({centroid[0]:g}, "
            f"{centroid[1]:g}): torsion and bending buckle together; use a flexural-torsional check"
        )
    effective = factor * bar.length
    radius = math.sqrt((i_x + i_y) / area)
    weak = 0.5 * (i_x + i_y) - math.hypot(0.5 * (i_x - i_y), i_xy)
    euler = math.pi**2 * modulus / effective**2
    shear = bar.stiffness_bounds.lower * bar.length / radius**2
    warping = euler * bar.solution.warping_constant / radius**2
    load = float(shear + warping)
    return TorsionalBuckling(load, shear, warping, float(euler * weak), load / area, radius, effective)
