"""Torsion coefficients of the solid rectangle, by four rules from exact to rough.

``tau_max = T / (alpha b t**2)`` and ``J = beta b t**3`` for a rectangle of width ``b`` and thickness
``t <= b``; both coefficients depend on ``b / t`` alone and are 1/3 for an infinitely thin strip.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats, one_of
from torsionfe.errors import InputError

__all__ = [
    "HANDBOOK",
    "RULES",
    "THIN_FROM",
    "CoefficientTable",
    "Coefficients",
    "rectangle_coefficients",
    "rectangle_series",
]

#: The rules for the coefficients, with the line that a result prints.
RULES: Mapping[str, str] = MappingProxyType(
    {
        "series": "exact rectangle series (Saint-Venant 1855)",
        "table": "handbook table, linear interpolation (common practice)",
        "thin": "alpha = beta = (1/3)(1 - 0.63 t/b), meant for b/t >= 5 (common practice)",
        "third": "alpha = beta = 1/3, the limit of thin strips",
    }
)

#: From this ratio b/t on, practice uses the rule 'thin'.
THIN_FROM = 5.0

_ZETA_5 = 1.0369277551433699263  # Riemann's zeta(5); the odd terms alone sum to 31/32 of it
_ODD = np.arange(1.0, 32.0, 2.0)  # exp(-31 pi / 2) < 1e-21: every digit for b/t >= 1


@dataclass(frozen=True)
class Coefficients:
    """The two coefficients of rectangles, one a ratio ``b / t``.

    Attributes
    ----------
    ratio, alpha, beta : ndarray
        ``b / t`` and the coefficients of stress and of twist (dimensionless), all of one shape.
    rule : str
        The rule that gave them.
    """

    ratio: Floats
    alpha: Floats
    beta: Floats
    rule: str


@dataclass(frozen=True)
class CoefficientTable:
    """A handbook's table of the coefficients, read with linear interpolation.

    Beyond the last finite ratio the interpolation to infinity is linear in ``t / b``.

    Parameters
    ----------
    ratio : sequence of float
        ``b / t``, rising from 1; the last may be infinity.
    alpha, beta : sequence of float
        Coefficients of stress and of twist at each ratio.
    name : str
        What results print: the book and its edition.

    Raises
    ------
    InputError
        Unequal lengths, ratios that do not rise from 1, coefficients outside 0 to 0.34.
    """

    ratio: tuple[float, ...]
    alpha: tuple[float, ...]
    beta: tuple[float, ...]
    name: str = "table given by hand"

    def __post_init__(self) -> None:
        columns = {"ratio": self.ratio, "alpha": self.alpha, "beta": self.beta}
        for key, column in columns.items():
            try:
                object.__setattr__(self, key, tuple(float(value) for value in column))
            except (TypeError, ValueError):
                raise InputError(f"{key} must be numbers, one a row of the table, got {column!r}") from None
        if not len(self.ratio) == len(self.alpha) == len(self.beta) >= 2:
            sizes = ", ".join(f"{len(column)} {key}" for key, column in columns.items())
            raise InputError(f"a table needs two or more rows of equal length, got {sizes}")
        if self.ratio[0] != 1.0 or not np.all(np.diff(self.ratio) > 0.0):
            raise InputError(f"ratio must rise from 1, got {self.ratio}")
        values = np.array([self.alpha, self.beta])
        if not np.all((values > 0.0) & (values < 0.34)):
            raise InputError("alpha and beta must lie between 0 and 0.34")

    def at(self, ratio: Floats) -> tuple[Floats, Floats]:
        """Return ``alpha`` and ``beta`` at the ratios ``b / t >= 1``.

        Raises
        ------
        InputError
            A ratio is beyond the table's last.
        """
        rows = np.array(self.ratio)
        if np.any(ratio > rows[-1]):
            raise InputError(f"b/t = {np.max(ratio):g} is beyond the table's last row, {rows[-1]:g}")
        last = rows[np.isfinite(rows)][-1]
        # up to the last finite ratio linear in b/t, beyond it linear in t/b
        knots = np.where(rows <= last, rows, last + 1.0)
        with np.errstate(divide="ignore"):
            place = np.where(ratio <= last, ratio, last + 1.0 - last / ratio)
        return np.interp(place, knots, self.alpha), np.interp(place, knots, self.beta)


#: The three-digit table of strength-of-materials books (common practice; the digits from memory, checked
#: against the series by the tests). Some books print 0.299 at 6, where the series gives 0.2983.
HANDBOOK = CoefficientTable(
    ratio=(1.0, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0, math.inf),
    alpha=(0.208, 0.219, 0.231, 0.246, 0.258, 0.267, 0.282, 0.291, 0.298, 0.307, 0.312, 0.333),
    beta=(0.141, 0.166, 0.196, 0.229, 0.249, 0.263, 0.281, 0.291, 0.298, 0.307, 0.312, 0.333),
    name="handbook table",
)


def rectangle_series(ratio: Floats) -> tuple[Floats, Floats]:
    """Return ``alpha`` and ``beta`` from the exact series, to rounding for every ratio from 1 to infinity.

    Saint-Venant (1855) in the form of Timoshenko and Goodier, *Theory of Elasticity*, art. 109. The slow
    part of ``sum tanh(n pi b / 2t) / n**5`` is summed in closed form: ``tanh x = 1 - 2 / (exp(2x) + 1)``.
    """
    with np.errstate(over="ignore"):  # exp of a large ratio: its term is then 0, as it should be
        grown = np.exp(_ODD * math.pi * ratio[..., None])
        tanh_sum = 31.0 / 32.0 * _ZETA_5 - np.sum(2.0 / (_ODD**5 * (grown + 1.0)), axis=-1)
        # 1 / cosh(x) = 2 e^-x / (1 + e^-2x)
        decayed = np.exp(-0.5 * _ODD * math.pi * ratio[..., None])
    sech_sum = np.sum(2.0 * decayed / (1.0 + decayed**2) / _ODD**2, axis=-1)
    beta = (1.0 - 192.0 / math.pi**5 * tanh_sum / ratio) / 3.0
    peak = 1.0 - 8.0 / math.pi**2 * sech_sum  # tau_max / (G theta' t), middle of the long side
    return beta / peak, beta


def rectangle_coefficients(ratio: ArrayLike, rule: str | CoefficientTable = "series") -> Coefficients:
    """Return the coefficients of rectangles: ``tau_max = T / (alpha b t**2)``, ``J = beta b t**3``.

    Parameters
    ----------
    ratio : array_like
        ``b / t``, 1 or more; infinity is the thin strip.
    rule : str or CoefficientTable
        ``'series'`` (exact), ``'table'`` (handbook, linear interpolation), ``'thin'``
        (``(1/3)(1 - 0.63 t/b)`` for both), ``'third'`` (1/3 for both), or a table of your own.

    Raises
    ------
    InputError
        A ratio below 1 or NaN; an unknown rule.

    Examples
    --------
    >>> square = rectangle_coefficients(1.0)
    >>> round(float(square.alpha), 4), round(float(square.beta), 4)
    (0.2082, 0.1406)
    """
    values = _ratios(ratio)
    if isinstance(rule, CoefficientTable):
        alpha, beta = rule.at(values)
        return Coefficients(values, alpha, beta, rule.name)
    name = one_of("rule", rule, tuple(RULES))
    if name == "series":
        alpha, beta = rectangle_series(values)
    elif name == "table":
        alpha, beta = HANDBOOK.at(values)
    else:
        beta = (1.0 - (0.63 if name == "thin" else 0.0) / values) / 3.0
        alpha = beta.copy()
    return Coefficients(values, alpha, beta, name)


def _ratios(ratio: Any) -> Floats:
    try:
        values = np.array(ratio, dtype=float)
    except (TypeError, ValueError, OverflowError):
        raise InputError(f"ratio must be numbers, b/t of each rectangle, got {ratio!r:.80}") from None
    wrong = values[~(values >= 1.0)]
    if wrong.size:
        raise InputError(f"ratio must be 1 or more (b is the longer side), got {wrong.flat[0]:g}")
    return values
