"""Numbers with units, brought into one consistent system of a length and a force.

A length of N and mm gives stresses in N/mm^2 = MPa; of lbf and in, in psi. Factors: the SI brochure; the pound
of 0.45359237 kg (international agreement of 1959) under the standard gravity of 9.80665 m/s^2.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass
from difflib import get_close_matches
from typing import Any

from torsionfe.checks import finite
from torsionfe.errors import UnitError
from torsionfe.units import UNITS, length_factor, parse_unit

__all__ = ["Quantity", "UnitSystem", "parse_quantity"]

_POUND = 0.45359237 * 9.80665
_FORCES: Mapping[str, float] = {"N": 1.0, "kN": 1e3, "MN": 1e6, "lbf": _POUND, "kip": 1e3 * _POUND}
_STRESSES: Mapping[str, float] = {
    "Pa": 1.0,
    "kPa": 1e3,
    "MPa": 1e6,
    "GPa": 1e9,
    "psi": _POUND / 0.0254**2,
    "ksi": 1e3 * _POUND / 0.0254**2,
}
_ANGLES: Mapping[str, float] = {"rad": 1.0, "deg": math.pi / 180.0}
#: (force, length, angle) exponents of each kind of number
_KINDS: Mapping[str, tuple[int, int, int]] = {
    "length": (0, 1, 0),
    "force": (1, 0, 0),
    "torque": (1, 1, 0),
    "stress": (1, -2, 0),
    "angle": (0, 0, 1),
    "twist rate": (0, -1, 1),
}
_EXAMPLES: Mapping[str, str] = {
    "length": "600 mm",
    "force": "20 kN",
    "torque": "450 N*m",
    "stress": "27 GPa",
    "angle": "1.5 deg",
    "twist rate": "2 deg/m",
}
_NUMBER = re.compile(r"\s*([-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)\s*(.*?)\s*\Z", re.DOTALL)
_LONGEST = 80


@dataclass(frozen=True, slots=True)
class Quantity:
    """A number of SI units (N, m, rad), or a bare number.

    Attributes
    ----------
    value : float
        In N, m and rad where the unit was given; else as it was.
    kind : str
        ``length``, ``force``, ``torque``, ``stress``, ``angle`` or ``twist rate``.
    unit : str
        As given; empty for a bare number.
    """

    value: float
    kind: str
    unit: str = ""


def parse_quantity(name: str, given: Any, kind: str) -> Quantity:
    """Return a number with its unit, such as ``'450 N*m'``, or a bare number.

    Parameters
    ----------
    name : str
        What messages call it.
    given : str or float
    kind : str
        What it must be: ``length``, ``force``, ``torque``, ``stress``, ``angle`` or ``twist rate``.

    Raises
    ------
    UnitError
        The unit is unknown or of another kind.
    InputError
        No number.

    Examples
    --------
    >>> parse_quantity("torque", "450 N*m", "torque").value
    450.0
    >>> parse_quantity("modulus", "27 GPa", "stress").value
    27000000000.0
    """
    if not isinstance(given, str):
        return Quantity(finite(name, given), kind)
    match = _NUMBER.match(given) if len(given) <= _LONGEST else None
    if match is None:
        raise UnitError(f"{name} must be a number with a unit, such as {_EXAMPLES[kind]!r}, got {given[:_LONGEST]!r}")
    value, unit = finite(name, float(match[1])), match[2]
    return Quantity(value * _si(name, unit, kind), kind, unit) if unit else Quantity(value, kind)


def _si(name: str, unit: str, kind: str) -> float:
    """Return the unit in N, m and rad, checking its kind."""
    factor, found = 1.0, [0, 0, 0]
    text = unit.replace("·", "*").replace("²", "^2").replace("**", "^").replace(" ", "*")
    text = re.sub(r"^(k?N|MN)(mm|cm|m)$", r"\1*\2", text)
    for sign, part in re.findall(r"(^|[*/])([^*/]+)", text):
        symbol, _, power = part.partition("^")
        if power not in ("", "2", "3", "4", "-1", "-2"):
            raise UnitError(f"{name}: the unit {unit!r} can't be read; write it as in {_EXAMPLES[kind]!r}")
        exponent = int(power or 1) * (-1 if sign == "/" else 1)
        size, dimensions = _base(name, symbol, kind)
        factor *= size**exponent
        found = [f + exponent * d for f, d in zip(found, dimensions, strict=True)]
    if tuple(found) != _KINDS[kind]:
        raise UnitError(f"{name} must be a {kind}, such as {_EXAMPLES[kind]!r}: {unit!r} is none")
    return factor


def _base(name: str, symbol: str, kind: str) -> tuple[float, tuple[int, int, int]]:
    if symbol in _FORCES:
        return _FORCES[symbol], (1, 0, 0)
    if symbol in _STRESSES:
        return _STRESSES[symbol], (1, -2, 0)
    if symbol in _ANGLES:
        return _ANGLES[symbol], (0, 0, 1)
    if symbol in UNITS:
        return length_factor(symbol, "m"), (0, 1, 0)
    known = [*_FORCES, *_STRESSES, *_ANGLES, *UNITS]
    near = get_close_matches(symbol, known, n=1)
    hint = f"; did you mean {near[0]!r}?" if near else f", such as in {_EXAMPLES[kind]!r}"
    raise UnitError(f"{name}: {symbol!r} is no unit that is known here{hint}")


@dataclass(frozen=True, slots=True)
class UnitSystem:
    """A consistent system: one length, one force, and what follows from them.

    Parameters
    ----------
    length : str
        A unit of length; empty for numbers without units, which are taken as consistent.
    force : str, optional
        N by default; lbf where the length is an inch or a foot.

    Examples
    --------
    >>> system = UnitSystem("mm")
    >>> system.torque, system.stress
    ('N*mm', 'MPa')
    >>> system.of(parse_quantity("torque", "1.5 kN*m", "torque"))
    1500000.0
    """

    length: str = ""
    force: str = ""

    def __post_init__(self) -> None:
        if self.length:
            object.__setattr__(self, "length", parse_unit(self.length))
            imperial = self.length in ("in", "ft", "mil", "yd", "in_us", "ft_us")
            object.__setattr__(self, "force", self.force or ("lbf" if imperial else "N"))
            if self.force not in _FORCES:
                raise UnitError(f"{self.force!r} is no unit of force that is known here ({', '.join(_FORCES)})")

    @property
    def torque(self) -> str:
        """Unit of torque."""
        return f"{self.force}*{self.length}" if self.length else ""

    @property
    def stress(self) -> str:
        """Unit of stress."""
        short = {("N", "mm"): "MPa", ("N", "m"): "Pa", ("lbf", "in"): "psi", ("kip", "in"): "ksi"}
        return short.get((self.force, self.length), f"{self.force}/{self.length}^2") if self.length else ""

    def power(self, exponent: int) -> str:
        """Return the unit of length to a power, such as ``mm^4``; empty without units."""
        return f"{self.length}^{exponent}" if self.length else ""

    def of(self, quantity: Quantity) -> float:
        """Return a quantity's number in this system; a bare number is taken as consistent already.

        Raises
        ------
        UnitError
            The quantity has a unit, but the system has none to bring it into.
        """
        if not quantity.unit:
            return quantity.value
        force, length, _ = _KINDS[quantity.kind]
        if not self.length and (force or length):
            raise UnitError(
                f"{quantity.unit!r} can't be combined with an outline without a unit: "
                "state the outline's unit, or give every number without one"
            )
        if not self.length:
            return quantity.value
        return quantity.value / (_FORCES[self.force] ** force * length_factor(self.length, "m") ** length)
