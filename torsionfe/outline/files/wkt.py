"""Well-known text: polygons of ISO 19125-1, and with arcs the curve polygons of ISO/IEC 13249-3 (SQL/MM).

A ring of a CURVEPOLYGON is a CIRCULARSTRING (start, any point between, end; the next arc goes on from there),
a COMPOUNDCURVE of those and of straight pieces, or a plain list of points.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from itertools import pairwise

import numpy as np

from torsionfe.checks import Floats
from torsionfe.errors import ReadError
from torsionfe.outline import arcs
from torsionfe.outline.files.loops import LARGEST, Found, RawLoop, ReadOptions, closed_loop, too_many
from torsionfe.outline.outline import Outline

__all__ = ["read_wkt", "wkt_text"]

_TOKEN = re.compile(r"\s*([A-Za-z]+|[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]+)?|[(),])")
_SRID = re.compile(r"\s*SRID\s*=\s*[0-9]+\s*;", re.IGNORECASE)
_OF_NUMBER = tuple("+-.0123456789")
_DIMENSIONS = ("Z", "M", "ZM")
_WRAPS = ("MULTIPOLYGON", "MULTISURFACE", "GEOMETRYCOLLECTION")
_CURVES = ("LINESTRING", "CIRCULARSTRING", "COMPOUNDCURVE")
_JOINED = 1e-9
_MOST_NUMBERS = 4
_LONGEST_TOKEN = 400

Path = tuple[Floats, Floats]  # points (n, 2) and bulges (n - 1,)


def read_wkt(text: str, options: ReadOptions) -> Found:
    """Return the rings of the one polygon of a text.

    Raises
    ------
    ReadError
        It is no polygon or more than one, a ring is open, or the text is no well-known text; the message
        tells the character.
    """
    if text.count(",") > 2 * options.max_edges:
        raise too_many(text.count(",") // 2, options.max_edges)
    prefix = _SRID.match(text)
    reader = _Reader(text, prefix.end() if prefix else 0)
    rings = _surface(reader)
    if reader.word or not reader.at_end():
        raise reader.unexpected("the end of the text")
    notes = (f"flattened from z = {reader.heights[0]:g}",) if reader.heights and reader.heights[0] else ()
    return Found(tuple(rings), None, notes)


@dataclass
class _Reader:
    """The text, token by token."""

    text: str
    at: int
    heights: tuple[float, ...] = ()
    word: str = ""

    def at_end(self) -> bool:
        return not self.text[self.at : self.at + 100].strip() and not self.text[self.at :].strip()

    def next(self) -> str:
        """Return the next token, upper case, "" at the end."""
        if self.word:
            token, self.word = self.word, ""
            return token
        found = _TOKEN.match(self.text, self.at)
        if found is None:
            if self.at_end():
                return ""
            raise self.unexpected("a number, a word or a bracket")
        if found.end() - found.start(1) > _LONGEST_TOKEN:
            raise self.unexpected(f"a number or word of at most {_LONGEST_TOKEN} characters")
        self.at = found.end()
        return found[1].upper()

    def peek(self) -> str:
        self.word = self.next()
        return self.word

    def expect(self, *tokens: str) -> str:
        token = self.next()
        if token not in tokens:
            raise self.unexpected(" or ".join(tokens), token)
        return token

    def unexpected(self, wanted: str, got: str = "") -> ReadError:
        got = got or self.word or self.text[self.at :].strip()[:20] or "the end"
        return ReadError(f"{wanted} is expected at character {self.at}, got {got!r:.40}: the text is cut or damaged")


def _surface(reader: _Reader, depth: int = 0) -> list[RawLoop]:
    """Read one polygon, whatever it is wrapped in."""
    tag = reader.next()
    if reader.peek() in _DIMENSIONS:
        reader.next()
    if reader.peek() == "EMPTY":
        raise ReadError(f"the {tag} is empty")
    if tag in _CURVES or tag == "LINEARRING":
        return [_ring(_curve(reader, tag))]
    if tag in {"POLYGON", "CURVEPOLYGON"}:
        return _rings(reader)
    if tag not in _WRAPS or depth > len(_WRAPS):
        raise ReadError(f"a POLYGON or CURVEPOLYGON is needed before character {reader.at}, got {tag!r:.40}")
    reader.expect("(")
    rings = _rings(reader) if reader.peek() == "(" else _surface(reader, depth + 1)
    if reader.next() == ",":
        raise ReadError(f"the {tag} holds more than one part, and a cross-section is one polygon: take one")
    return rings


def _rings(reader: _Reader) -> list[RawLoop]:
    reader.expect("(")
    rings = []
    while True:
        tag = reader.next() if reader.peek() in _CURVES else "LINESTRING"
        rings.append(_ring(_curve(reader, tag)))
        if reader.expect(",", ")") == ")":
            return rings


def _curve(reader: _Reader, tag: str) -> Path:
    """Read what follows the word of a curve."""
    if reader.peek() in _DIMENSIONS:
        reader.next()
    if tag != "COMPOUNDCURVE":
        points = _points(reader)
        return _circular(points) if tag == "CIRCULARSTRING" else (points, np.zeros(len(points) - 1))
    reader.expect("(")
    paths = []
    while True:
        part = reader.next() if reader.peek() in _CURVES[:2] else "LINESTRING"
        paths.append(_curve(reader, part))
        if reader.expect(",", ")") == ")":
            return _joined(paths)


def _points(reader: _Reader) -> Floats:
    """Read a bracket of points and return their x and y, ``(n, 2)``."""
    reader.expect("(")
    rows: list[list[float]] = [[]]
    while True:
        token = reader.next()
        if token in {",", ")"}:
            if not 2 <= len(rows[-1]) <= 4 or len(rows[-1]) != len(rows[0]):
                raise reader.unexpected("a point of 2 to 4 numbers, as many as the others have,", token)
            if token == ")":
                break
            rows.append([])
            continue
        if token[:1] not in _OF_NUMBER or not abs(float(token)) < LARGEST:
            raise reader.unexpected("a finite number", token or "the end")
        rows[-1].append(float(token))
        if len(rows[-1]) > _MOST_NUMBERS:
            raise reader.unexpected("a comma or a bracket after at most 4 numbers", token)
    points = np.array(rows)
    if points.shape[1] > 2:
        _flat(reader, points)
    return points[:, :2]


def _flat(reader: _Reader, points: Floats) -> None:
    heights = (*reader.heights, float(points[:, 2].min()), float(points[:, 2].max()))
    reader.heights = (min(heights), max(heights))
    if reader.heights[0] != reader.heights[1]:
        x, y = points[-1, :2]
        raise ReadError(f"the polygon is not flat: z goes from {min(heights):g} to {max(heights):g}", (x, y))


def _circular(points: Floats) -> Path:
    """Return the arcs through points, of which every second is one on the way."""
    if len(points) < 3 or len(points) % 2 == 0:
        x, y = points[0]
        raise ReadError(
            f"the CIRCULARSTRING at ({x:g}, {y:g}) has {len(points)} points: an odd number from 3 on is needed",
            (float(x), float(y)),
        )
    start, middle, end = points[:-2:2], points[1:-1:2], points[2::2]
    still = np.flatnonzero(np.all(start == middle, axis=1) | np.all(middle == end, axis=1))
    if len(still):
        x, y = start[still[0]]
        raise ReadError(f"an arc at ({x:g}, {y:g}) has the same point twice", (float(x), float(y)))
    full = np.all(start == end, axis=1)  # the point on the way is opposite: two half circles
    bulge = np.where(full, 1.0, arcs.arc_through(start, middle, np.where(full[:, None], 2 * middle - start, end)))
    ends = np.insert(end, np.flatnonzero(full), middle[full], axis=0)
    bulges = np.insert(bulge, np.flatnonzero(full), 1.0)
    return np.concatenate([points[:1], ends]), bulges


def _joined(paths: list[Path]) -> Path:
    """Return the paths of a COMPOUNDCURVE as one."""
    size = max(float(np.ptp(points, axis=0).max()) for points, _ in paths)
    for (one, _), (other, _) in pairwise(paths):
        _refuse_gap(one[-1], other[0], size, "the parts of a COMPOUNDCURVE")
    points = np.concatenate([paths[0][0], *(points[1:] for points, _ in paths[1:])])
    return points, np.concatenate([bulges for _, bulges in paths])


def _refuse_gap(end: Floats, start: Floats, size: float, what: str) -> None:
    gap = float(np.hypot(*(start - end)))
    if not gap <= _JOINED * size:
        x, y = end
        raise ReadError(
            f"{what} do not meet at ({x:g}, {y:g}): the next point is ({start[0]:g}, {start[1]:g}), a gap of {gap:.4g}",
            (float(x), float(y)),
        )


def _ring(path: Path) -> RawLoop:
    points, bulges = path
    _refuse_gap(points[-1], points[0], float(np.ptp(points, axis=0).max()), "the ends of a ring")
    return closed_loop(np.concatenate([points[:-1], points[:1]]), np.append(bulges, 0.0))


# --- writing -------------------------------------------------------------------------------------------


def wkt_text(outline: Outline) -> str:
    """Return a POLYGON, or a CURVEPOLYGON where the outline has arcs; it has no place for a unit."""
    curved = bool(outline.edges.bulge.any())
    rings = [_ring_text(loop) for loop in (outline, *outline.voids)]
    return f"{'CURVEPOLYGON' if curved else 'POLYGON'} ({', '.join(rings)})\n"


def _ring_text(loop: Outline) -> str:
    points = np.concatenate([loop.vertices, loop.vertices[:1]])
    if not loop.bulges.any():
        return _bracket(points)
    n = len(loop.bulges)
    middle = arcs.point_at(points[:-1], points[1:], loop.bulges, np.full(n, 0.5))
    curved = loop.bulges != 0.0
    parts = []
    starts = np.flatnonzero(np.concatenate([[True], curved[1:] != curved[:-1]]))
    for a, b in zip(starts, [*starts[1:], n], strict=True):
        if curved[a]:
            both = np.stack([points[a:b], middle[a:b]], axis=1).reshape(-1, 2)
            parts.append(f"CIRCULARSTRING {_bracket(np.concatenate([both, points[b : b + 1]]))}")
        else:
            parts.append(_bracket(points[a : b + 1]))
    return parts[0] if len(parts) == 1 else f"COMPOUNDCURVE ({', '.join(parts)})"


def _bracket(points: Floats) -> str:
    return f"({', '.join(f'{x!r} {y!r}' for x, y in points.tolist())})"
