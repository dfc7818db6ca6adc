"""What the readers of all formats hand on: closed loops of edges, or edges to be chained into loops."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import ReadError

__all__ = ["LARGEST", "SMALLEST", "Found", "RawLoop", "ReadOptions", "Segments"]

#: The largest coordinate, radius or bulge: its fourth power still is a number.
LARGEST = 1e70
#: Smaller sizes, and bulges, are none.
SMALLEST = 1e-70


@dataclass(frozen=True)
class ReadOptions:
    """What the reader of a format is asked for.

    Attributes
    ----------
    layers : tuple of str or None
        Layers to read, None for all that are visible.
    tolerance : float or None
        The largest gap to close (length), None for a hundred-thousandth of the drawing's size.
    curve_tolerance : float or None
        How far arcs may lie from a curve (length), None for a hundred-thousandth of its size.
    max_edges : int
        How many edges a file may hold.
    """

    layers: tuple[str, ...] | None = None
    tolerance: float | None = None
    curve_tolerance: float | None = None
    max_edges: int = 50_000


@dataclass(frozen=True)
class RawLoop:
    """A closed loop as it stands in a file, not checked yet.

    Attributes
    ----------
    vertices : ndarray of shape (n, 2)
    bulges : ndarray of shape (n,)
    radii : ndarray of shape (n,) or None
        Radius by which each vertex is to be rounded (length), 0 for not.
    """

    vertices: Floats
    bulges: Floats
    radii: Floats | None = None

    @property
    def place(self) -> tuple[float, float]:
        """The first vertex."""
        return float(self.vertices[0, 0]), float(self.vertices[0, 1])


@dataclass(frozen=True)
class Found:
    """What a file holds.

    Attributes
    ----------
    loops : tuple of RawLoop
    unit : str or None
        The file's unit of length as it states it, None where it states none.
    notes : tuple of str
        What was done to the drawing on the way.
    warnings : tuple of str
        What may be wrong with it.
    """

    loops: tuple[RawLoop, ...]
    unit: str | None = None
    notes: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True)
class Segments:
    """Single edges, one row an edge.

    Attributes
    ----------
    start, end : ndarray of shape (n, 2)
    bulge : ndarray of shape (n,)
        ``tan(sweep / 4)``.
    """

    start: Floats
    end: Floats
    bulge: Floats

    def __len__(self) -> int:
        return len(self.bulge)


@dataclass
class SegmentList:
    """Edges as they are collected from the entities of a drawing."""

    most: int
    count: int = 0
    parts: list[tuple[Floats, Floats, Floats]] = field(default_factory=list)

    def path(self, points: Floats, bulges: Floats, closed: bool = False) -> None:
        """Add the edges of a path through points ``(n, 2)``; one bulge an edge (more are left out).

        Raises
        ------
        ReadError
            A coordinate is not finite or absurdly large, or there are too many edges.
        """
        bad = np.flatnonzero(~(np.abs(points) < LARGEST).all(axis=1))
        if len(bad):
            before = points[bad[0] - 1] if bad[0] else None
            where = "" if before is None else f" after ({before[0]:g}, {before[1]:g})"
            place = None if before is None else (float(before[0]), float(before[1]))
            raise ReadError(f"a coordinate{where} is not finite, or larger than {LARGEST:g}: {points[bad[0]]}", place)
        sharp = np.flatnonzero(~(np.abs(bulges) < LARGEST))
        if len(sharp):
            x, y = points[sharp[0]]
            raise ReadError(f"the bulge at ({x:g}, {y:g}) is not finite: {bulges[sharp[0]]}", (float(x), float(y)))
        ends = np.roll(points, -1, axis=0) if closed else points[1:]
        starts = points if closed else points[:-1]
        self.count += len(starts)
        if self.count > self.most:
            raise too_many(self.count, self.most)
        self.parts.append((starts, ends, _told(bulges[: len(starts)])))

    def segments(self) -> Segments:
        """Return all edges in the order in which they were added."""
        if not self.parts:
            return Segments(np.empty((0, 2)), np.empty((0, 2)), np.empty(0))
        starts, ends, bulges = zip(*self.parts, strict=True)
        return Segments(np.concatenate(starts), np.concatenate(ends), np.concatenate(bulges))


def too_many(count: int, most: int) -> ReadError:
    """Return the error for a file with more edges than are allowed."""
    return ReadError(
        f"it holds {count} edges or more, above the limit of {most}: simplify it, choose layers, or pass "
        "a larger max_edges="
    )


def closed_loop(points: Sequence[Sequence[float]] | Floats, bulges: Floats | None = None) -> RawLoop:
    """Return the loop of a ring of points ``(n, 2)`` whose last may repeat the first.

    Raises
    ------
    ReadError
        A coordinate is not finite or absurdly large.
    """
    array = np.asarray(points, dtype=float).reshape(-1, 2)
    turns = np.zeros(len(array)) if bulges is None else np.asarray(bulges, dtype=float)
    bad = np.flatnonzero(~(np.abs(array) < LARGEST).all(axis=1) | ~(np.abs(turns) < LARGEST))
    if len(bad):
        x, y = array[bad[0]]
        raise ReadError(f"point {bad[0]} of a loop, ({x}, {y}), or its bulge is not finite, or above {LARGEST:g}")
    if len(array) > 1 and np.array_equal(array[0], array[-1]):
        array, turns = array[:-1], turns[: len(array) - 1]
    return RawLoop(array, _told(turns[: len(array)]))


def _told(bulges: Floats) -> Floats:
    """Return bulges without those too small to be one."""
    return np.where(np.abs(bulges) < SMALLEST, 0.0, bulges)
