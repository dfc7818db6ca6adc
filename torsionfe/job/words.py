"""Numbers as engineers write them, with their units and no more digits than they are worth."""

from __future__ import annotations

import math

from torsionfe.output.style import with_unit, written_unit
from torsionfe.text import number
from torsionfe.torsion.bounds import Bounds

__all__ = [
    "between",
    "degrees",
    "figure",
    "measured",
    "place",
    "rounded_down",
    "signed",
    "sure",
    "with_unit",
    "written_unit",
]


def sure(value: float, rel_error: float, unit: str = "") -> str:
    """Return a number with its error: the error to two digits, the number to the same place.

    Examples
    --------
    >>> sure(84.31266, 0.0015, "MPa"), sure(2.8072e-4, 0.001, "1/mm^3"), sure(2.5, 0.0)
    ('84.31 ± 0.13 MPa', '(2.8072 ± 0.0029)×10⁻⁴ 1/mm³', '2.5')
    """
    error = abs(value * rel_error)
    if not math.isfinite(value) or not error > 1e-12 * abs(value) or not math.isfinite(error):
        return with_unit(figure(value, 6), unit)
    power = _power(value)
    error, value = error / 10.0**power, value / 10.0**power
    step = math.floor(math.log10(error)) - 1
    digits = max(0, -step)
    text = f"{round(value, -step):.{digits}f} ± {_ceiling(error, step):.{digits}f}"
    return with_unit(f"({text})×10{_raised(power)}" if power else text, unit)


def _power(value: float) -> int:
    """Return the power of ten that is taken out of a number: 0 where it is neither long nor small."""
    size = math.floor(math.log10(abs(value))) if value else 0
    return 0 if -3 <= size < 7 else size


def _raised(power: int) -> str:
    return written_unit(f"^{power}")


def figure(value: float, digits: int = 4) -> str:
    """Return a number, a power of ten taken out where it is long or small.

    Examples
    --------
    >>> figure(0.00022434, 4), figure(12345.6, 6), figure(11445123.0)
    ('2.243×10⁻⁴', '12345.6', '1.145×10⁷')
    """
    power = _power(value) if math.isfinite(value) else 0
    return f"{value / 10.0**power:.{digits - 1}f}×10{_raised(power)}" if power else number(value, digits)


def rounded_down(value: float, digits: int = 4) -> str:
    """Return a limit with some digits, rounded down, so that it stays one.

    Examples
    --------
    >>> rounded_down(390769.0), rounded_down(float("nan"))
    ('390700', 'not defined')
    """
    if not math.isfinite(value) or value <= 0.0:
        return number(value, digits)
    step = 10.0 ** (math.floor(math.log10(value)) - digits + 1)
    return figure(math.floor(value / step * (1.0 + 1e-12)) * step, digits)


def _ceiling(error: float, step: int) -> float:
    """Return an error rounded up, so that it stays one."""
    return math.ceil(error / 10.0**step - 1e-9) * 10.0**step


def between(bounds: Bounds, unit: str = "") -> str:
    """Return a value with its bounds, these rounded outwards.

    Examples
    --------
    >>> between(Bounds(99.04, 101.02), "mm^4")
    '100.0 mm⁴ (99.0 to 101.1)'
    """
    value, span = str(bounds).split(" ", 1)
    return f"{with_unit(value, unit)} {span}"


def measured(value: float, unit: str = "", digits: int = 6) -> str:
    """Return an input or an exact number with its unit."""
    return with_unit(figure(value, digits), unit)


def place(x: float, y: float, unit: str, size: float) -> str:
    """Return a point to a ten-thousandth of the section's size or finer.

    Examples
    --------
    >>> place(12.34567, -1e-12, "mm", 80.0)
    '(12.35, 0.00) mm'
    """
    digits = max(0, 4 - math.ceil(math.log10(size)))
    if digits > 6:
        return with_unit(f"({number(x)}, {number(y)})", unit)
    numbers = [f"{value + 0.0 if round(value, digits) else 0.0:.{digits}f}" for value in (x, y)]
    return with_unit(f"({', '.join(numbers)})", unit)


def degrees(angle: float) -> str:
    """Return an angle (rad) in degrees.

    Examples
    --------
    >>> degrees(0.0287)
    '1.644°'
    """
    return f"{number(math.degrees(angle))}°"


def signed(margin: float) -> str:
    """Return a margin with its sign, rounded down; in words where it is no number.

    Examples
    --------
    >>> signed(0.3456), signed(-0.0011), signed(float("nan"))
    ('+0.345', '-0.002', 'not defined')
    """
    if not math.isfinite(margin):
        return number(margin)
    return f"{math.floor(margin * 1000.0) / 1000.0:+.3f}"
