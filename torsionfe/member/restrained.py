"""A bar whose ends are kept from warping: less twist, and normal stress where the section would have warped.

Vlasov's equation ``E C_w theta'''' - G J theta'' = m`` with ``m`` the torque spread along the bar (force): the
torque is ``G J theta' - E C_w theta'''``, its second part carried by warping; the bimoment is
``B = E C_w theta''`` and the normal stress ``B omega / C_w``.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from torsionfe.cautions import RESTRAINT, cautions
from torsionfe.checks import Floats, finite, one_of, positive
from torsionfe.errors import InputError
from torsionfe.member.bar import Bar
from torsionfe.member.vlasov import End, Span, solve_span
from torsionfe.text import number, percent, table

__all__ = ["RestrainedBar", "restrain"]

LOADS = ("end", "middle", "uniform")
_LOAD_WORDS = {"end": "at the far end", "middle": "at mid-span", "uniform": "spread evenly"}
ENDS = ("neither", "near", "both")
_CUT = 1e7  # ratio from which a bar warps as if it had no restraint
_GRID = 401


@dataclass(frozen=True, eq=False)
class RestrainedBar:
    """A bar with restrained warping under one torque. Positions run from 0 at the near end to the length.

    Attributes
    ----------
    bar : Bar
    elastic_modulus : float
        ``E``, force / length**2.
    torque : float
        Total torque applied, force * length.
    load : {'end', 'middle', 'uniform'}
        Where it acts: at the far end, at mid-span, or spread evenly.
    warping : {'neither', 'near', 'both'}
        Ends kept from warping.
    rotation : {'near', 'both'}
        Ends kept from rotating.
    """

    bar: Bar
    elastic_modulus: float
    torque: float
    load: str
    warping: str
    rotation: str

    # --- the bar's own numbers ------------------------------------------------------------------------

    @property
    def warping_rigidity(self) -> float:
        """``E C_w``, force * length**4."""
        return self.elastic_modulus * self.bar.solution.warping_constant

    @property
    def torsional_rigidity(self) -> float:
        """``G J``, force * length**2."""
        return self.bar.stiffness * self.bar.length

    @property
    def decay_length(self) -> float:
        """``sqrt(E C_w / (G J))``, length: a restraint fades by 1/e over it."""
        return math.sqrt(self.warping_rigidity / self.torsional_rigidity)

    @property
    def ratio(self) -> float:
        """Length over decay length, ``L sqrt(G J / (E C_w))``; infinity for a section that does not warp."""
        return self.bar.length / self.decay_length if self.decay_length > 0.0 else math.inf

    # --- along the bar --------------------------------------------------------------------------------

    @cached_property
    def _span(self) -> Span:
        return _dimensionless(min(self.ratio, _CUT), self.load, self.warping, self.rotation)

    def _theta(self, order: int, positions: float | Floats) -> Floats:
        z = np.atleast_1d(np.asarray(positions, dtype=float))
        length = self.bar.length
        if not ((z >= 0.0) & (z <= length)).all():
            raise InputError(f"positions must be from 0 to the length {length:g}, got {z.min():g} to {z.max():g}")
        # f is for T L^3 / (E C_w) = 1; written with G J, so that it holds where the ratio was cut
        unit = self.torque * length / self.torsional_rigidity * self._span.ratio**2
        return self._span.derivative(order, z / length) * (unit / length**order)

    def twist(self, positions: float | Floats) -> Floats:
        """Return the rotation ``theta`` (rad) at positions, shape (n,)."""
        return self._theta(0, positions)

    def twist_rate(self, positions: float | Floats) -> Floats:
        """Return ``theta'`` (rad / length) at positions, shape (n,)."""
        return self._theta(1, positions)

    def bimoment(self, positions: float | Floats) -> Floats:
        """Return ``B = E C_w theta''`` (force * length**2) at positions, shape (n,)."""
        return self.warping_rigidity * self._theta(2, positions)

    def warping_torque(self, positions: float | Floats) -> Floats:
        """Return the torque carried by warping, ``-E C_w theta'''`` (force * length), shape (n,)."""
        return -self.warping_rigidity * self._theta(3, positions)

    def shear_torque(self, positions: float | Floats) -> Floats:
        """Return the torque carried by Saint-Venant's shear, ``G J theta'`` (force * length), shape (n,)."""
        return self.torsional_rigidity * self._theta(1, positions)

    def warping_share(self, positions: float | Floats) -> Floats:
        """Return the share of the torque that warping carries, shape (n,); NaN where there is no torque."""
        warping = self.warping_torque(positions)
        whole = warping + self.shear_torque(positions)
        none = np.abs(whole) <= 1e-12 * abs(self.torque)
        return np.where(none, math.nan, warping / np.where(none, 1.0, whole))

    def normal_stress(self, positions: float | Floats) -> Floats:
        """Return the largest normal stress over the section, ``|B omega| / C_w`` (force / length**2), (n,)."""
        low, high = self.bar.solution.warping_extremes if self.warps else (0.0, 0.0)
        return self.elastic_modulus * np.abs(self._theta(2, positions)) * max(abs(low), abs(high))

    # --- what matters ---------------------------------------------------------------------------------

    def _largest(self, along: Callable[[Floats], Floats]) -> tuple[float, float]:
        """Return the largest absolute value along the bar and where it is."""
        from scipy.optimize import minimize_scalar

        length = self.bar.length
        near = np.geomspace(1e-6, 0.5, _GRID // 2)
        grid = length * np.unique(np.concatenate([[0.0], near, 1.0 - near, [1.0]]))
        values = np.abs(along(grid))
        k = int(np.argmax(values))
        best, place = float(values[k]), float(grid[k])
        if 0 < k < len(grid) - 1 and best > 0.0:
            around = (grid[k - 1], grid[k + 1])
            found = minimize_scalar(
                lambda z: -abs(float(along(np.array([z]))[0])) / best, bounds=around, method="bounded"
            )
            if -found.fun > 1.0:
                best, place = -float(found.fun) * best, float(found.x)
        return best, place

    @cached_property
    def largest_twist(self) -> tuple[float, float]:
        """The largest rotation (rad, 0 or more) and its position."""
        return self._largest(self.twist)

    @cached_property
    def largest_bimoment(self) -> tuple[float, float]:
        """The largest bimoment (force * length**2, 0 or more) and its position."""
        return self._largest(self.bimoment)

    @cached_property
    def largest_normal_stress(self) -> tuple[float, float]:
        """The largest normal stress (force / length**2, 0 or more) and its position along the bar."""
        return self._largest(self.normal_stress)

    @property
    def free_twist(self) -> float:
        """The largest rotation (rad) were the section free to warp everywhere: plain ``G J`` all along."""
        share = {"near": {"end": 1.0, "middle": 0.5, "uniform": 0.5}, "both": {"middle": 0.25, "uniform": 0.125}}
        return abs(self.bar.twist(self.torque)) * share[self.rotation][self.load]

    @property
    def effect(self) -> float:
        """By how much the largest rotation falls short of `free_twist`, 0 to 1; 0 without torque."""
        return 1.0 - self.largest_twist[0] / self.free_twist if self.torque and self.warps else 0.0

    def length_for_effect(self, effect: float) -> float:
        """Return the length beyond which warping stiffness changes the twist by less than ``effect``.

        Parameters
        ----------
        effect : float
            Between 0 and 1, such as 0.05.

        Returns
        -------
        float
            Length for the same section, load and ends; 0 where no length has that much effect.
        """
        from scipy.optimize import brentq

        wanted = positive("effect", effect)
        if wanted >= 1.0:
            raise InputError(f"effect must be below 1, got {wanted:g}")
        if not self.warps:
            return 0.0

        def excess(log_ratio: float) -> float:
            length = math.exp(log_ratio) * self.decay_length
            return replace(self, bar=replace(self.bar, length=length), torque=1.0).effect - wanted

        low, high = math.log(1e-3), math.log(1e5)
        if excess(low) <= 0.0:
            return 0.0
        if excess(high) >= 0.0:
            raise InputError(f"effect {wanted:g} is too small: give 1e-4 or more")
        return math.exp(float(brentq(excess, low, high, xtol=1e-10))) * self.decay_length

    @property
    def warps(self) -> bool:
        """Whether the section warps at all: a round bar does not, up to rounding."""
        return self.ratio < _CUT

    def __str__(self) -> str:
        twist, stress, moment = self.largest_twist, self.largest_normal_stress, self.largest_bimoment
        share = float(np.nan_to_num(self.warping_share(moment[1]))[0])
        degrees = number(math.degrees(twist[0]))
        rows = [
            ("torque", f"{number(self.torque, 6)}  [force*length], {_LOAD_WORDS[self.load]}"),
            ("kept from rotating", f"{self.rotation} end{'s'[: self.rotation == 'both']}"),
            ("kept from warping", f"{self.warping} end{'s'[: self.warping == 'both']}"),
            ("largest twist", f"{number(twist[0])} rad ({degrees} degrees) at {number(twist[1])}"),
        ]
        if self.warps:
            rows += [
                ("decay length sqrt(E C_w / (G J))", f"{number(self.decay_length)}  [length]"),
                ("length / decay length", number(self.ratio)),
                ("less than free to warp by", percent(self.effect, 3)),
                ("largest bimoment", f"{number(moment[0])}  [force*length^2] at {number(moment[1])}"),
                ("torque carried by warping there", percent(share if abs(share) > 1e-9 else 0.0, 3)),
                ("largest normal stress", f"{number(stress[0])}  [force/length^2] at {number(stress[1])}"),
            ]
            lengths = [(effect, self.length_for_effect(effect)) for effect in (0.1, 0.05, 0.01)]
            rows += [(f"effect below {percent(effect)} beyond", f"{number(z)}  [length]") for effect, z in lengths]
        else:
            rows.append(("restraint", "none: the section does not warp"))
        return "\n".join([table(rows, "Restrained warping"), cautions(RESTRAINT)])


def restrain(
    bar: Bar,
    elastic_modulus: float,
    torque: float,
    *,
    warping: str,
    load: str = "end",
    rotation: str | None = None,
) -> RestrainedBar:
    """Return the response of a bar whose ends are kept from warping.

    Parameters
    ----------
    bar : Bar
    elastic_modulus : float
        ``E``, force / length**2.
    torque : float
        Total torque, force * length.
    warping : {'neither', 'near', 'both'}
        Ends kept from warping. With ``'near'`` that is the end at position 0.
    load : {'end', 'middle', 'uniform'}
        Torque at the far end, at mid-span, or spread evenly along the bar.
    rotation : {'near', 'both'}, optional
        Ends kept from rotating. By default the near end for a torque at the far end, else both.

    Raises
    ------
    InputError
        A word that is not known, a torque at an end that cannot rotate, a number out of its range.

    Examples
    --------
    The far end of a cantilever, near end held, turns by ``T / (G J) (L - tanh(k L) / k)``.
    """
    one_of("load", load, LOADS)
    one_of("warping", warping, ENDS)
    held = ("near" if load == "end" else "both") if rotation is None else one_of("rotation", rotation, ENDS[1:])
    if load == "end" and held == "both":
        raise InputError("a torque at an end that is kept from rotating twists nothing: set rotation='near'")
    modulus = positive("elastic_modulus", elastic_modulus)
    return RestrainedBar(bar, modulus, finite("torque", torque), load, warping, held)


def _dimensionless(ratio: float, load: str, warping: str, rotation: str) -> Span:
    """Return the solution for a total torque of 1, ``T L^3 / (E C_w) = 1``."""
    near = End(rotates=False, warps=warping == "neither")
    far = End(rotates=rotation == "near", warps=warping != "both", torque=float(load == "end"))
    # the torque in the bar falls by the load on the way: G J theta'' - E C_w theta'''' = -m
    return solve_span(ratio, near, far, spread=float(load == "uniform"), point=float(load == "middle"))
