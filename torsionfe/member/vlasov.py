"""The ordinary differential equation of restrained warping, in dimensionless form.

    f'''' - lambda^2 f'' = load,   0 <= x <= 1,   lambda = L sqrt(G J / (E C_w)).

(Vlasov, Thin-Walled Elastic Beams, 1940; Timoshenko, J. Franklin Inst. 239, 1945, 201-219.) The solution is a
combination of four closed-form functions and a particular one. Below lambda = 4 they are power series in
lambda^2, which stay independent as lambda goes to 0; above, decaying exponentials, which never overflow.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats

__all__ = ["End", "Span", "solve_span"]

_SERIES_BELOW = 4.0
_TERMS = 16


@dataclass(frozen=True, slots=True)
class End:
    """What one end allows, and the torque applied there if it can rotate.

    ``torque`` is dimensionless, ``T L^3 / (E C_w)``: the torque in the bar at that end.
    """

    rotates: bool
    warps: bool
    torque: float = 0.0


@dataclass(frozen=True)
class Span:
    """A solution ``f``: four coefficients, the spread load and the point load.

    Attributes
    ----------
    ratio : float
        ``lambda``.
    coefficients : ndarray of shape (4,)
    spread : float
        Load all along, ``m L^4 / (E C_w)``.
    point : float
        Jump of the torque at the middle, ``T L^3 / (E C_w)``.
    """

    ratio: float
    coefficients: Floats
    spread: float
    point: float

    def derivative(self, order: int, x: Floats) -> Floats:
        """Return ``f`` differentiated ``order`` times (0 to 3) at ``x``, shape of ``x``."""
        own = self.coefficients @ _basis(self.ratio, order, x)
        return np.asarray(own + _particular(self.ratio, self.spread, self.point, order, x), dtype=float)


def solve_span(ratio: float, near: End, far: End, spread: float, point: float) -> Span:
    """Return the solution for the conditions at both ends, a spread load and a point load at the middle."""
    ends = np.array([0.0, 1.0])
    basis = [_basis(ratio, r, ends) for r in range(4)]
    loads = [_particular(ratio, spread, point, r, ends) for r in range(4)]
    # rows of like size whatever the ratio is
    size = max(ratio, 1.0)
    matrix, right = np.zeros((4, 4)), np.zeros(4)
    for k, end in enumerate((near, far)):
        torque = ratio**2 * basis[1][:, k] - basis[3][:, k], ratio**2 * loads[1][k] - loads[3][k]
        rotation = (torque[0] / size**2, (end.torque - torque[1]) / size**2)
        if not end.rotates:
            rotation = (basis[0][:, k], -loads[0][k])
        r = 2 if end.warps else 1
        matrix[2 * k], right[2 * k] = rotation
        matrix[2 * k + 1], right[2 * k + 1] = basis[r][:, k] / size**r, -loads[r][k] / size**r
    coefficients = np.asarray(np.linalg.solve(matrix, right), dtype=float)
    return Span(ratio, coefficients, spread, point)


def _basis(ratio: float, order: int, x: Floats) -> Floats:
    """Return four independent solutions without load, differentiated; shape (4, n)."""
    straight = [np.ones_like(x), x] if order == 0 else [np.zeros_like(x), np.full_like(x, float(order == 1))]
    if ratio < _SERIES_BELOW:
        return np.array([*straight, _series(ratio, 2 - order, x), _series(ratio, 3 - order, x)])
    falling, rising = np.exp(-ratio * x), np.exp(-ratio * (1.0 - x))
    return np.array([*straight, (-ratio) ** order * falling, ratio**order * rising])


def _particular(ratio: float, spread: float, point: float, order: int, x: Floats) -> Floats:
    """Return a solution for the loads, differentiated; shape (n,)."""
    offset = x - 0.5
    if ratio < _SERIES_BELOW:
        beyond = np.where(offset > 0.0, _series(ratio, 3 - order, np.maximum(offset, 0.0)), 0.0)
        return np.asarray(spread * _series(ratio, 4 - order, x) + point * beyond, dtype=float)
    parabola = -(math.perm(2, order) if order <= 2 else 0) * x ** max(2 - order, 0) / (2.0 * ratio**2)
    side, decay = np.where(offset < 0.0, -1.0, 1.0), np.exp(-ratio * np.abs(offset))
    kink = [
        -decay / (2.0 * ratio**3) - np.abs(offset) / (2.0 * ratio**2),
        side * (decay - 1.0) / (2.0 * ratio**2),
        -decay / (2.0 * ratio),
        side * decay / 2.0,
    ][order]
    return np.asarray(spread * parabola + point * kink, dtype=float)


def _series(ratio: float, power: int, x: Floats) -> Floats:
    """Return ``sum over j of ratio^(2 j) x^(2 j + n) / (2 j + n)!``; its derivative is that of ``n - 1``.

    ``n = 2`` is ``(cosh(ratio x) - 1) / ratio^2``, ``n = 3`` is ``(sinh(ratio x) - ratio x) / ratio^3``.
    """
    j = np.arange(_TERMS)
    powers = 2 * j + power
    scale = [ratio ** (2 * k) / math.factorial(p) if p >= 0 else 0.0 for k, p in zip(j, powers, strict=True)]
    return np.asarray(np.array(scale) @ x[None, :] ** np.maximum(powers, 0)[:, None], dtype=float)
