"""A value with a proven lower and upper bound."""

from __future__ import annotations

import math
from dataclasses import dataclass

from torsionfe.text import number

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
    >>> print(Bounds(99.0, 101.0))
    100.0 (99 to 101)
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
        # as many digits as the bracket supports, and one more
        digits = 4 if self.rel_gap <= 0.0 else max(2, min(12, 2 - math.floor(math.log10(self.rel_gap))))
        lower, upper = number(self.lower, digits + 1), number(self.upper, digits + 1)
        return f"{self.value:#.{digits}g} ({lower} to {upper})"
