"""Plates found in an outline, as an object to look at, to edit and to sum."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from functools import cached_property

import numpy as np
import shapely
from numpy.typing import ArrayLike
from shapely import LineString, Polygon

from torsionfe.checks import Floats, finite_array
from torsionfe.closed_form.cells import ThinCells
from torsionfe.closed_form.medial import Circles, inscribed_circles
from torsionfe.closed_form.plates import Plate, PlateSet
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.text import number, percent

__all__ = ["DerivedPlates", "Joint", "Unplated", "band", "place"]

_SMALLEST = 0.005  # of the area: smaller unplated regions are not listed


@dataclass(frozen=True)
class Joint:
    """Where one plate meets another.

    Attributes
    ----------
    plate, other : int
        The plate that ends here and the one that it meets; ``other`` is -1 for the wall of a cell.
    at : tuple of float
        Where the middle lines meet (length).
    kind : str
        ``'through'`` (the other runs on), ``'corner'`` (both end) or ``'step'`` (the thickness changes).
    """

    plate: int
    other: int
    at: tuple[float, float]
    kind: str


@dataclass(frozen=True)
class Unplated:
    """A region of the section that no plate stands for: a fillet, a boss, a stubby part.

    Attributes
    ----------
    at : tuple of float
        A point inside it (length).
    share : float
        Of the section's area, 0 to 1.
    """

    at: tuple[float, float]
    share: float


@dataclass(frozen=True, eq=False)
class DerivedPlates(PlateSet):
    """Plates found in an outline. A sequence of `Plate` that `plate_sum` takes; ``print`` shows a table.

    Accept it as it is; edit it with `without`, `with_plate` or `changed`, each of which returns a copy; or
    reject it and give plates by hand.

    Attributes
    ----------
    outline : Outline
        Where they were found.
    centre_lines : tuple of (ndarray of shape (m, 2) or None)
        The middle line of each plate (length); None for a plate given by hand without one.
    joints : tuple of Joint
    closed : ThinCells or None
        The closed cells, if the outline has voids; see `cells`.
    cell_lines : tuple of ndarray of shape (m, 2)
        The middle line around each void.
    """

    outline: Outline = field(kw_only=True)
    centre_lines: tuple[Floats | None, ...] = field(kw_only=True)
    joints: tuple[Joint, ...] = field(default=(), kw_only=True)
    closed: ThinCells | None = field(default=None, kw_only=True)
    cell_lines: tuple[Floats, ...] = field(default=(), kw_only=True)

    @property
    def cells(self) -> ThinCells | None:
        """The closed cells with the plates as their fins, for `cell_sum`; None without voids."""
        return None if self.closed is None else replace(self.closed, fins=self.plates)

    def rectangles(self) -> list[Polygon | None]:
        """Return what each plate covers: its middle line at its thickness (a band where it is curved)."""
        return [
            None if line is None else band(line, plate.thickness)
            for plate, line in zip(self.plates, self.centre_lines, strict=True)
        ]

    @cached_property
    def _section(self) -> Polygon:
        return self.outline.polygon(1e-4 * self.outline.size)

    @cached_property
    def _left_over(self) -> list[Polygon]:
        bands = [shape for shape in self.rectangles() if shape is not None]
        if self.closed is not None:
            bands.append(_ribs(inscribed_circles(self.outline)))
        rest = self._section.difference(shapely.union_all(bands)) if bands else self._section
        return [piece for piece in shapely.get_parts(rest) if isinstance(piece, Polygon)]

    @property
    def covered(self) -> float:
        """Share of the section's area, 0 to 1, that plates and walls of cells stand for."""
        return float(1.0 - sum(piece.area for piece in self._left_over) / self._section.area)

    @property
    def unplated(self) -> tuple[Unplated, ...]:
        """The regions that no plate stands for, the largest first; those under 0.5 % are left out."""
        places = [(piece.representative_point(), piece.area) for piece in self.unplated_regions()]
        return tuple(Unplated((place.x, place.y), area / self._section.area) for place, area in places)

    def unplated_regions(self) -> list[Polygon]:
        """Return the same regions as shapely polygons, to be drawn."""
        least = _SMALLEST * self._section.area
        return sorted((p for p in self._left_over if p.area >= least), key=lambda p: -p.area)

    def without(self, index: int) -> DerivedPlates:
        """Return a copy without one plate."""
        k = self._index(index)
        kept = [
            replace(joint, plate=joint.plate - (joint.plate > k), other=joint.other - (joint.other > k))
            for joint in self.joints
            if k not in (joint.plate, joint.other)
        ]
        return replace(
            self,
            plates=self.plates[:k] + self.plates[k + 1 :],
            centre_lines=self.centre_lines[:k] + self.centre_lines[k + 1 :],
            joints=tuple(kept),
            notes=(*self.notes, f"{self.plates[k].label(k)} was taken out by hand"),
        )

    def with_plate(self, plate: Plate, centre_line: ArrayLike | None = None) -> DerivedPlates:
        """Return a copy with one more plate; the middle line, (m, 2), lets it be drawn."""
        if not isinstance(plate, Plate):
            raise InputError(f"plate must be a Plate(width, thickness), got {plate!r:.80}")
        line = None if centre_line is None else finite_array("centre_line", centre_line, columns=2)
        if line is not None and (len(line) < 2 or not np.hypot(*np.diff(line, axis=0).T).all()):
            raise InputError("centre_line needs two different points or more, none repeated")
        k = len(self.plates)
        return replace(
            self,
            plates=(*self.plates, plate),
            centre_lines=(*self.centre_lines, line),
            notes=(*self.notes, f"{plate.label(k)} was given by hand"),
        )

    def changed(
        self,
        index: int,
        width: float | None = None,
        thickness: float | None = None,
        name: str | None = None,
    ) -> DerivedPlates:
        """Return a copy with one plate's width, thickness or name changed; it is drawn where it was."""
        k = self._index(index)
        old = self.plates[k]
        new = Plate(
            old.width if width is None else width,
            old.thickness if thickness is None else thickness,
            old.name if name is None else name,
        )
        notes = self.notes
        if (new.width, new.thickness) != (old.width, old.thickness):
            notes += (f"{new.label(k)} was changed by hand, from {old.width:g} x {old.thickness:g}",)
        return replace(self, plates=(*self.plates[:k], new, *self.plates[k + 1 :]), notes=notes)

    def _index(self, index: int) -> int:
        if isinstance(index, bool) or not isinstance(index, (int, np.integer)):
            raise InputError(f"index must be the whole number of a plate, got {index!r}")
        if not 0 <= index < len(self.plates):
            raise InputError(f"there is no plate {index}: they are numbered 0 to {len(self.plates) - 1}")
        return int(index)

    def __str__(self) -> str:
        lines = [super().__str__(), f"covered: {percent(self.covered, 3)} of the area"]
        if self.closed is not None:
            count = len(self.closed.areas)
            lines.append(f"closed cells: {count}, with {len(self.closed.walls)} walls (see .cells)")
        lines += [
            f"unplated: {percent(region.share, 3)} at {place(region.at, self.outline.size)}"
            for region in self.unplated
        ]
        return "\n".join(lines)


def place(point: Floats | tuple[float, float], size: float) -> str:
    """Return a point in words, what is zero but for rounding as 0."""
    x, y = (0.0 if abs(value) < 1e-9 * size else float(value) for value in point)
    return f"({number(x)}, {number(y)})"


def band(line: Floats, thickness: float) -> Polygon:
    """Return the rectangle, or curved band, of a thickness about a middle line."""
    return LineString(line).buffer(0.5 * thickness, cap_style="flat", join_style="mitre")


def _ribs(circles: Circles) -> Polygon:
    """Return the area of the walls between loops, swept by the ribs from foot to touch."""
    after = circles.following
    wall = (circles.touch_loop != circles.loop) & (circles.touch_loop[after] != circles.loop)
    rows, ahead = np.flatnonzero(wall), after[wall]
    corners = [circles.foot[rows], circles.foot[ahead], circles.touch[ahead], circles.touch[rows]]
    return shapely.union_all(shapely.convex_hull(shapely.multipoints(np.stack(corners, axis=1))))
