"""Plates of any outline, from its medial axis: to accept, to edit or to reject."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np
from shapely import LineString, MultiPoint, Polygon

from torsionfe.checks import Floats, one_of, positive
from torsionfe.closed_form.cell_lines import cells_around_voids, middle_line
from torsionfe.closed_form.derived import DerivedPlates, Joint, band, place
from torsionfe.closed_form.idealise import IDEALISATIONS
from torsionfe.closed_form.joints import Ending, endings, extended, merged
from torsionfe.closed_form.medial import inscribed_circles
from torsionfe.closed_form.plates import Plate
from torsionfe.closed_form.strips import WALL_TAPER, Strip, find_runs, find_strips
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.text import number, percent

__all__ = ["DERIVED", "derive_plates"]

#: The idealisations that can be derived from an outline.
DERIVED = ("centreline", "full_depth", "straight_through", "web_through")

_FILLED = 0.85  # of its rectangle a plate must fill
_WHOLE = 0.95  # of its bounding rectangle a section must fill to be one plate
_STUBBY = 0.8  # of its thickness: a plate must be at least as wide
_COVERED = 0.9  # of the area: below, a note says so
_TAPERED = 1.05  # largest to smallest thickness: from here on a note says so


def derive_plates(
    outline: Outline, idealisation: str = "centreline", taper: float = WALL_TAPER
) -> DerivedPlates:
    """Return the plates that an outline is made of, found on its medial axis.

    Stretches whose two faces run side by side become plates; those in one line with material between become
    one. ``t`` is the mean thickness, ``b`` runs to the section's own end and, at a joint, to where the
    idealisation says. Fillets count for nothing. What is no plate stays in `DerivedPlates.unplated`.

    Parameters
    ----------
    outline : Outline
    idealisation : str
        ``'centreline'``, ``'full_depth'``, ``'straight_through'`` or ``'web_through'``: see
        `IDEALISATIONS`.
    taper : float
        Slope of one face against the other up to which a stretch still counts as a plate.

    Raises
    ------
    InputError
        ``outline`` is no `Outline`; an unknown idealisation; a taper that is not above 0 or reaches 1.
    """
    if not isinstance(outline, Outline):
        raise InputError(f"outline must be an Outline, got {type(outline).__name__}")
    one_of("idealisation", idealisation, DERIVED)
    if positive("taper", taper) >= 1.0:
        raise InputError(f"taper must be below 1 (45 degrees), got {taper:g}")
    circles = inscribed_circles(outline)
    runs = find_runs(circles, taper)
    polygon = outline.polygon(1e-5 * outline.size)
    found = _found(find_strips(circles, runs), polygon, outline.size, idealisation)
    if not found.kept and not outline.voids:
        whole = _whole(polygon)
        if whole is not None:
            found = whole
    voids = len(outline.voids)
    derived = DerivedPlates(
        plates=tuple(Plate(_length(found.lines[k]), found.thickness[k]) for k in found.kept),
        idealisation=idealisation,
        meaning=IDEALISATIONS[idealisation],
        notes=tuple(_notes(found, voids, outline.size)),
        outline=outline,
        centre_lines=tuple(found.lines[k] for k in found.kept),
        joints=tuple(_joints(found)),
        closed=cells_around_voids(circles, runs, voids) if voids else None,
        cell_lines=tuple(circles.centre[middle_line(circles, k + 1)] for k in range(voids)),
    )
    return replace(derived, notes=derived.notes + tuple(_doubts(derived)))


@dataclass(frozen=True)
class _Found:
    """Open strips, how they end, their lines and thicknesses as plates, and which are sound."""

    strips: list[Strip]
    ends: list[tuple[Ending, Ending]]
    lines: list[Floats]
    thickness: list[float]
    filled: list[float]
    kept: list[int]
    halves: frozenset[int] = frozenset()


def _found(strips: list[Strip], polygon: Polygon, size: float, idealisation: str) -> _Found:
    walls = [strip for strip in strips if strip.loops[0] != strip.loops[1]]
    groups = merged([strip for strip in strips if strip.loops[0] == strip.loops[1]], polygon)
    divided = _divided(groups, idealisation)
    open_strips = [strip for k, (strip, _) in enumerate(groups) if k not in divided]
    parts = [part for k in divided for part in groups[k][1]]
    open_strips = sorted(open_strips + parts, key=lambda strip: -strip.length * strip.thickness)
    halves = frozenset(k for k, strip in enumerate(open_strips) if any(strip is part for part in parts))
    ends = endings(open_strips + walls, polygon, size)[: len(open_strips)]
    found = _Found(open_strips, ends, [], [], [], [], halves)
    for k, strip in enumerate(open_strips):
        reach = _reach(k, 0, found, idealisation), _reach(k, 1, found, idealisation)
        line, thickness = extended(strip.line, reach), strip.thickness_beyond(reach)
        area = band(line, thickness)
        filled = area.intersection(polygon).area / area.area
        found.lines.append(line)
        found.thickness.append(thickness)
        found.filled.append(filled)
        if filled >= _FILLED and _length(line) >= _STUBBY * thickness:
            found.kept.append(k)
    return found


def _divided(groups: list[tuple[Strip, list[Strip]]], idealisation: str) -> list[int]:
    """Return which of the strips that were joined across a joint are parted there again.

    Where a web runs through, that is its flanges. Of two plates that cross, it is the smaller, or, where a
    web runs through, the larger.
    """
    if not idealisation.endswith("through"):
        return []
    web = idealisation == "web_through"
    joined = [k for k, (_, parts) in enumerate(groups) if len(parts) > 1]
    joined.sort(key=lambda k: groups[k][0].length * groups[k][0].thickness, reverse=True)
    if web:
        joined.reverse()  # not sorted anew: of two alike, the other one is parted
    lines = {k: LineString(groups[k][0].line) for k in joined}
    parted: list[int] = []
    for index, k in enumerate(joined):
        crossed = [j for j in joined if j != k and lines[j].intersects(lines[k])]
        behind = any(j in joined[:index] and j not in parted for j in crossed)
        if behind or (web and not crossed):
            parted.append(k)
    return parted


def _reach(k: int, end: int, found: _Found, idealisation: str) -> float:
    """Return how far plate ``k`` runs beyond its strip's end, by the idealisation."""
    ending = found.ends[k][end]
    if ending.kind != "joint" or idealisation == "centreline":
        return ending.to_end
    if idealisation.endswith("through") and not _runs_through(k, ending, found, idealisation):
        return ending.to_end - ending.half
    return min(ending.to_exit, ending.to_end + ending.half)


def _runs_through(k: int, ending: Ending, found: _Found, idealisation: str) -> bool:
    """Say whether, where two plates end at a joint, plate ``k`` is the one that runs through."""
    if ending.passes or ending.other >= len(found.strips):
        return False

    def flange(j: int) -> tuple[bool, int, float, int]:
        """Rank a flange before a web, and the longer leg before the shorter."""
        free = sum(one.kind == "free" for one in found.ends[j])
        return j in found.halves, free, round(found.strips[j].length / found.strips[j].thickness, 6), -j

    first = flange(k) > flange(ending.other)
    return first if idealisation == "straight_through" else not first


def _crossings(found: _Found) -> Iterator[tuple[int, int]]:
    """Yield the pairs of plates that cross, each running on: the plates of a cruciform."""
    lines = [LineString(found.lines[k]) for k in found.kept]
    for i, one in enumerate(lines):
        for j, other in enumerate(lines[:i]):
            place = one.intersection(other)
            ends = MultiPoint([*one.coords[:1], *one.coords[-1:], *other.coords[:1], *other.coords[-1:]])
            if not place.is_empty and ends.distance(place) > found.strips[found.kept[i]].thickness:
                yield j, i


def _length(line: Floats) -> float:
    return float(np.hypot(*np.diff(line, axis=0).T).sum())


def _whole(polygon: Polygon) -> _Found | None:
    """Return the section as one rectangle, if it nearly is one: a square has no stretch of its own."""
    box = polygon.minimum_rotated_rectangle
    if polygon.area < _WHOLE * box.area:
        return None
    corners = np.asarray(box.exterior.coords)[:4]
    middles = 0.5 * (corners + np.roll(corners, -1, axis=0))
    lines = sorted((middles[[0, 2]], middles[[1, 3]]), key=_length)
    thickness = _length(lines[0])
    strip = Strip(lines[1], thickness, thickness, thickness, (0, 0))
    free = Ending("free", 0.0, 0.0)
    return _Found([strip], [(free, free)], [lines[1]], [thickness], [polygon.area / box.area], [0])


def _joints(found: _Found) -> Iterator[Joint]:
    """Yield each joint once, in the numbering of the plates that were kept."""
    place = {k: index for index, k in enumerate(found.kept)}
    seen = set()
    for k in found.kept:
        for ending in found.ends[k]:
            inside = ending.other < len(found.strips)
            if ending.other < 0 or (inside and ending.other not in place):
                continue
            other = place[ending.other] if inside else -1
            kind = "step" if ending.kind == "step" else "through" if ending.passes or not inside else "corner"
            pair = (min(k, ending.other), max(k, ending.other), kind)
            if kind != "through" and pair in seen:
                continue
            seen.add(pair)
            yield Joint(place[k], other, ending.at, kind)


def _doubts(derived: DerivedPlates) -> Iterator[str]:
    if not derived.plates and derived.closed is None:
        yield "no part of the section is a plate: the sum of thin plates does not apply"
    elif derived.covered < _COVERED:
        yield f"plates and walls cover only {percent(derived.covered, 3)} of the area: look at the rest"


def _notes(found: _Found, voids: int, size: float) -> Iterator[str]:
    if voids:
        yield "the section has closed cells; their walls are no plates: sum them with cell_sum(plates.cells)"
    for j, i in _crossings(found):
        yield f"plates {j} and {i} cross: where they do, the section is counted twice"
    for k, strip in enumerate(found.strips):
        if k not in found.kept:
            where, width = place(found.lines[k].mean(axis=0), size), number(_length(found.lines[k]))
            yield (
                f"a stretch at {where} was left out: {width} wide, "
                f"{number(found.thickness[k])} thick, filling {percent(found.filled[k], 3)} of that rectangle"
            )
            continue
        label = f"plate {found.kept.index(k)}"
        if strip.most > _TAPERED * strip.least:
            sizes = f"{number(strip.least)} to {number(strip.most)}"
            yield f"{label} tapers from {sizes}: the mean thickness is used"
        if strip.curved:
            yield f"{label} is curved: its developed width is used"
        for ending, point in zip(found.ends[k], found.lines[k][[0, -1]], strict=True):
            if ending.kind == "lost":
                yield f"{label} ends at {place(point, size)} in a region that is no plate"
