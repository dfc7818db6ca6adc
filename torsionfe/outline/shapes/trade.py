"""An outline that remembers which trade shape it is, and the checks and steps that all shapes share."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from torsionfe.checks import non_negative, positive
from torsionfe.errors import OutlineError
from torsionfe.outline.fillets import round_corners
from torsionfe.outline.outline import Outline

if TYPE_CHECKING:
    from torsionfe.closed_form.cells import ThinCells
    from torsionfe.closed_form.plates import PlateSet

__all__ = ["TradeShape", "above_zero", "at_most", "build", "count", "less", "zero_or_more"]

#: Dimensions that are no lengths: a scaled copy keeps them.
_NUMBERS = frozenset({"sides", "flats", "teeth", "columns", "rows", "voids", "flange_slope", "tolerance"})
_SMALLEST = 1e-40
#: What the fillet of every sharp re-entrant corner is called.
_FILLETS = ("root_radius", "inner_radius")


@dataclass(frozen=True, eq=False, repr=False)
class TradeShape(Outline):
    """The outline of a trade shape, with its kind and dimensions.

    It compares equal to any outline with the same loops. Copies that were moved, turned or mirrored keep
    kind and dimensions, which are the shape's own (``leg_x`` stays ``leg_x`` when the angle is turned);
    scaled ones scale the lengths.

    Parameters
    ----------
    outline : Outline
        The shape's loops.
    kind : str
        The name of the function that made it.
    dimensions : mapping of str to float
        That function's parameters by name (length; counts, slopes and shares are plain numbers).
    """

    kind: str
    dimensions: Mapping[str, float]

    def __init__(self, outline: Outline, kind: str, dimensions: Mapping[str, float]) -> None:
        # the loops were checked when the outline was made
        object.__setattr__(self, "vertices", outline.vertices)
        object.__setattr__(self, "bulges", outline.bulges)
        object.__setattr__(self, "voids", outline.voids)
        object.__setattr__(self, "kind", kind)
        object.__setattr__(self, "dimensions", MappingProxyType(dict(dimensions)))

    def plates(self, idealisation: str = "centreline") -> PlateSet:
        """Return the plates that stand for the shape in the hand method; fillets are left out.

        Parameters
        ----------
        idealisation : str
            Where plates end at a joint; `torsionfe.closed_form.idealise` lists them.

        Raises
        ------
        InputError
            The shape is no set of plates, or has none by that idealisation.
        """
        from torsionfe.closed_form.idealise import plates_of

        return plates_of(self.kind, self.dimensions, idealisation)

    def thin_cells(self) -> ThinCells:
        """Return the thin-walled cell that stands for a tube or a box in the hand method.

        Raises
        ------
        InputError
            The shape is no single closed cell.
        """
        from torsionfe.closed_form.cells import thin_cells_of

        return thin_cells_of(self.kind, self.dimensions)

    def _still(self, outline: Outline, changed: Mapping[str, float] | None = None) -> TradeShape:
        return TradeShape(outline, self.kind, {**self.dimensions, **(changed or {})})

    def translated(self, dx: float, dy: float) -> TradeShape:
        """Return a copy moved by ``(dx, dy)`` (length)."""
        return self._still(super().translated(dx, dy))

    def rotated(self, angle: float, about: tuple[float, float] = (0.0, 0.0)) -> TradeShape:
        """Return a copy turned by ``angle`` (radians, counter-clockwise) about a point."""
        return self._still(super().rotated(angle, about))

    def scaled(self, factor: float, about: tuple[float, float] = (0.0, 0.0)) -> TradeShape:
        """Return a copy ``factor`` (above 0) times as large, its lengths scaled."""
        scaled = super().scaled(factor, about)
        lengths = {name: value * factor for name, value in self.dimensions.items() if name not in _NUMBERS}
        return self._still(scaled, lengths)

    def mirrored(self, angle: float = math.pi / 2.0, about: tuple[float, float] = (0.0, 0.0)) -> TradeShape:
        """Return a copy mirrored in the line through ``about`` at ``angle`` to the x axis (radians)."""
        return self._still(super().mirrored(angle, about))

    def filleted(self, radius: float, at: Iterable[int] | None = None) -> Outline:
        """Return a copy with corners rounded, as `Outline.filleted` does.

        Where every sharp re-entrant corner is rounded (``at=None``), as the shape's own root radius would,
        the copy is the same trade shape with that radius; otherwise it is a plain outline.
        """
        rounded = super().filleted(radius, at)
        names = [name for name in _FILLETS if self.dimensions.get(name) == 0.0]
        return self._still(rounded, {names[0]: float(radius)}) if at is None and names else rounded

    def __reduce__(self) -> tuple[Any, ...]:
        plain = Outline(self.vertices, self.bulges, self.voids)
        return TradeShape, (plain, self.kind, dict(self.dimensions))

    def __repr__(self) -> str:
        sizes = ", ".join(f"{name} {value:.6g}" for name, value in self.dimensions.items() if value)
        return f"<{self.kind.replace('_', ' ')} {sizes}: {super().__repr__()[1:]}"


# --- dimensions, checked -------------------------------------------------------------------------------


def _checked(check: Any, sizes: Mapping[str, Any]) -> dict[str, float]:
    try:
        numbers = {name: check(name, value) for name, value in sizes.items()}
    except ValueError as error:
        raise OutlineError(str(error)) from None
    for name, value in numbers.items():
        if value and not _SMALLEST <= value <= 1.0 / _SMALLEST:
            raise OutlineError(f"{name} must be from {_SMALLEST:g} to {1.0 / _SMALLEST:g}, got {value:g}")
    return numbers


def above_zero(**sizes: float) -> dict[str, float]:
    """Return sizes by name, all above zero, or raise `OutlineError`."""
    return _checked(positive, sizes)


def zero_or_more(**sizes: float) -> dict[str, float]:
    """Return sizes by name, none below zero, or raise `OutlineError`."""
    return _checked(non_negative, sizes)


def count(name: str, value: Any, least: int, most: int) -> int:
    """Return a whole number within limits, or raise `OutlineError`."""
    whole = isinstance(value, float) and value.is_integer()
    if isinstance(value, bool) or not (whole or hasattr(value, "__index__")) or not least <= value <= most:
        raise OutlineError(f"{name} must be a whole number from {least} to {most}, got {value!r}")
    return int(value)


def less(small: str, value: float, large: str, limit: float) -> None:
    """Raise `OutlineError` unless one length is less than another; both are named."""
    if not value < limit:
        raise OutlineError(f"{small} {value:g} must be less than {large} {limit:g}")


def at_most(small: str, value: float, large: str, limit: float) -> None:
    """Raise `OutlineError` unless one length is another at most (to rounding); both are named."""
    if not value <= limit * (1.0 + 1e-9):
        raise OutlineError(f"{small} {value:g} must be at most {large} {limit:g}")


def build(
    kind: str,
    dimensions: Mapping[str, float],
    outline: Outline,
    corners: Mapping[str, Sequence[int]] | None = None,
) -> TradeShape:
    """Return a trade shape, some corners of its outer loop rounded by the dimensions of that name.

    Parameters
    ----------
    kind : str
    dimensions : mapping of str to float
    outline : Outline
        With sharp corners.
    corners : mapping of str to sequence of int
        Dimension, a radius, to the vertices of the outer loop that it rounds.

    Raises
    ------
    OutlineError
        A radius does not fit.
    """
    radii = {(0, k): (dimensions[name], name) for name, rows in (corners or {}).items() for k in rows}
    return TradeShape(round_corners(outline, radii), kind, dimensions)
