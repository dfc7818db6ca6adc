"""A value with a proven lower and upper bound."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import ROUND_CEILING, ROUND_FLOOR, ROUND_HALF_EVEN, Decimal

__all__ = ["Bounds"]


@dataclass(frozen=True, slots=True)
class Bounds:
    """A value that lies between two proven bounds.

    Attributes
    ----------
    lower, upper : float
        The true value lies between them.

    Examples
    --------
    >>> print(Bounds(99.04, 101.02))
    100.0 (99.0 to 101.1)
    """

    lower: float
    upper: float

    @property
    def value(self) -> float:
        """The middle of the bracket, the best single number."""
        return 0.5 * (self.lower + self.upper)

    @property
    def rel_gap(self) -> float:
        """Width of the bracket over the value; ``value`` is at most half of this off."""
        return (self.upper - self.lower) / self.value if self.value else math.inf

    def scaled(self, factor: float) -> Bounds:
        """Return the bounds times a factor above 0."""
        return Bounds(self.lower * factor, self.upper * factor)

    def __format__(self, spec: str) -> str:
        return format(self.value, spec) if spec else str(self)

    def __str__(self) -> str:
        gap = self.upper - self.lower
        # the bounds to two digits of their distance, rounded outwards so that they stay bounds
        place = math.floor(math.log10(max(gap, abs(self.value) * 1e-12))) - 1 if self.value else 0
        step = Decimal(1).scaleb(place)
        lower = Decimal(self.lower).quantize(step, ROUND_FLOOR)
        upper = Decimal(self.upper).quantize(step, ROUND_CEILING)
        value = Decimal(self.value).quantize(step, ROUND_HALF_EVEN)
        return f"{_written(value, place)} ({_written(lower, place)} to {_written(upper, place)})"


def _written(value: Decimal, place: int) -> str:
    """Return a decimal plainly where that stays short, else with an exponent."""
    size = value.adjusted()
    if -4 <= size < 9:
        return f"{value:.{max(0, -place)}f}"
    return f"{value:.{max(0, size - place)}e}"
