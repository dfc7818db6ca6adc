"""Numbers as engineers write them, with their units and no more digits than they are worth."""

from __future__ import annotations

import math

from torsionfe.output.style import with_unit, written_unit
from torsionfe.text import number
from torsionfe.torsion.bounds import Bounds

__all__ = ["between", "degrees", "measured", "place", "signed", "sure", "with_unit", "written_unit"]


def sure(value: float, rel_error: float, unit: str = "") -> str:
    """Return a number with its error: the error to two digits, the number to the same place.

    Examples
    --------
    >>> sure(84.31266, 0.0015, "MPa"), sure(1234567.0, 0.02), sure(2.5, 0.0)
    ('84.31 ± 0.13 MPa', '1235000 ± 25000', '2.5')
    """
    error = abs(value * rel_error)
    if not math.isfinite(value) or not error > 1e-12 * abs(value) or not math.isfinite(error):
        return with_unit(number(value, 6), unit)
    step = math.floor(math.log10(error)) - 1
    if -4 <= math.floor(math.log10(abs(value))) < 9:
        digits = max(0, -step)
        return with_unit(f"{round(value, -step):.{digits}f} ± {_ceiling(error, step):.{digits}f}", unit)
    figures = max(0, math.floor(math.log10(abs(value))) - step)
    return with_unit(f"{value:.{figures}e} ± {error:.1e}", unit)


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
    return with_unit(number(value, digits), unit)


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
