"""Plates drawn over the outline that they stand for, to be accepted, edited or rejected."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np
from shapely.geometry.polygon import orient

from torsionfe.checks import Floats
from torsionfe.closed_form.derive import DERIVED, derive_plates
from torsionfe.closed_form.derived import DerivedPlates
from torsionfe.closed_form.plates import Plate
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.output.style import ACCENTS, HATCH, INK, MATERIAL, QUIET, label_axes, look, new_axes
from torsionfe.text import number, percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.lines import Line2D
    from matplotlib.patches import PathPatch
    from matplotlib.text import Text
    from shapely import Polygon

__all__ = ["PlateDrawing", "plot_plates"]

_PLATE, _CELL = ACCENTS[0].colour, ACCENTS[1].colour
_SIDES = {
    **dict.fromkeys(("top", "y"), np.array([0.0, 1.0])),
    **dict.fromkeys(("right", "x"), np.array([1.0, 0.0])),
    "bottom": np.array([0.0, -1.0]),
    "left": np.array([-1.0, 0.0]),
}
#: Names that speak of a direction: that of the plate's middle line.
_ALONG = {"level": 0, "upright": 1}
_SAME = 0.02  # of a size: plates given by hand are drawn where derived ones are as nearly as large


@dataclass(frozen=True)
class PlateDrawing:
    """What `plot_plates` drew.

    Attributes
    ----------
    axes : matplotlib.axes.Axes
    section : matplotlib.patches.PathPatch
        The section, voids left open.
    rectangles : tuple of matplotlib.patches.PathPatch
        One a plate that has a place, dashed.
    centre_lines : tuple of matplotlib.lines.Line2D
        Of the plates, then of the cells.
    regions : tuple of matplotlib.patches.PathPatch
        What no plate stands for, hatched; none as long as a plate has no place.
    labels : tuple of matplotlib.text.Text
        ``b x t`` of each plate that has a place.
    unplaced : tuple of int
        Plates whose place in the outline is not known; the title names them.
    """

    axes: Axes
    section: PathPatch
    rectangles: tuple[PathPatch, ...]
    centre_lines: tuple[Line2D, ...]
    regions: tuple[PathPatch, ...]
    labels: tuple[Text, ...]
    unplaced: tuple[int, ...]


def plot_plates(
    outline: Outline, plates: Iterable[Plate], ax: Axes | None = None, unit: str = ""
) -> PlateDrawing:
    """Draw plates as dashed rectangles, each labelled ``b x t``, over the outline that they stand for.

    Parameters
    ----------
    outline : Outline
    plates : iterable of Plate
        `DerivedPlates` know their places. Others, of a trade shape or given by hand, are drawn where plates
        of the same size are found in the outline; those that are not found are named in the title.
    ax : matplotlib.axes.Axes, optional
        Where to draw; a new figure by default.
    unit : str
        Of the outline, for the axes' labels.

    Raises
    ------
    InputError
        ``plates`` are no plates, or none.
    """
    given = list(plates)
    if not all(isinstance(plate, Plate) for plate in given):
        raise InputError(f"plates must be a sequence of Plate, got {given!r:.80}")
    placed = plates if isinstance(plates, DerivedPlates) else _placed(outline, given, plates)
    if not given and placed.closed is None:
        raise InputError("plates is empty: there is nothing to draw")
    with look():
        axes = new_axes((6.4, 6.0)) if ax is None else ax
    section = _patch(outline.polygon(1e-4 * outline.size), facecolor=MATERIAL, edgecolor=INK, lw=1.2)
    axes.add_patch(section)
    unplaced = tuple(k for k, line in enumerate(placed.centre_lines) if line is None)
    regions = tuple(
        _patch(piece, facecolor="none", edgecolor=QUIET, hatch=HATCH, lw=0.0)
        for piece in ([] if unplaced else placed.unplated_regions())
    )
    rectangles = tuple(
        _patch(shape, facecolor="none", edgecolor=_PLATE, ls="--", lw=1.3)
        for shape in placed.rectangles()
        if shape is not None
    )
    for patch in (*regions, *rectangles):
        axes.add_patch(patch)
    drawn = [line for line in placed.centre_lines if line is not None]
    lines = [axes.plot(*line.T, color=_PLATE, ls="-.", lw=0.8)[0] for line in drawn]
    closed = [np.append(line, line[:1], axis=0) for line in placed.cell_lines]
    lines += [axes.plot(*line.T, color=_CELL, ls=":", lw=1.6)[0] for line in closed]
    labels = tuple(
        _label(axes, outline, plate, line)
        for plate, line in zip(placed.plates, placed.centre_lines, strict=True)
        if line is not None
    )
    _finish(axes, outline, placed, unplaced, unit)
    return PlateDrawing(axes, section, rectangles, tuple(lines), regions, labels, unplaced)


def _patch(polygon: Polygon, **style: object) -> PathPatch:
    from matplotlib.patches import PathPatch
    from matplotlib.path import Path

    turned = orient(polygon)  # voids against the outside, so that they stay open
    rings = [np.asarray(ring.coords) for ring in (turned.exterior, *turned.interiors)]
    path = Path.make_compound_path(*(Path(ring, closed=True) for ring in rings))
    return PathPatch(path, **style)


def _placed(outline: Outline, given: list[Plate], plates: Iterable[Plate]) -> DerivedPlates:
    """Return the plates on the middle lines of derived plates of the same size, None where there is none."""
    name = getattr(plates, "idealisation", "")
    found = derive_plates(outline, name if name in DERIVED else "centreline")
    free = list(range(len(found.plates)))
    lines: list[Floats | None] = []
    for plate in given:
        fits = [k for k in free if _alike(plate, found.plates[k])]
        fits.sort(key=lambda k: -_towards(plate.name, found.centre_lines[k], outline))
        lines.append(found.centre_lines[fits[0]] if fits else None)
        free = [k for k in free if k not in fits[:1]]
    return replace(found, plates=tuple(given), idealisation=name, centre_lines=tuple(lines), joints=())


def _alike(a: Plate, b: Plate) -> bool:
    sizes = np.sort([[a.width, a.thickness], [b.width, b.thickness]], axis=1)
    return bool(np.all(np.abs(sizes[0] / sizes[1] - 1.0) < _SAME))


def _towards(name: str, line: Floats | None, outline: Outline) -> float:
    """Return how far a line lies on the side that a plate's name speaks of: equal plates stay apart."""
    assert line is not None
    offset = line.mean(axis=0) - np.array(outline.centroid)
    aside = sum(_SIDES.get(word, np.zeros(2)) @ offset for word in name.split())
    return float(aside + sum(np.ptp(line[:, _ALONG[word]]) for word in name.split() if word in _ALONG))


def _label(axes: Axes, outline: Outline, plate: Plate, line: Floats) -> Text:
    """Write ``b x t`` beside the middle of the plate, on the side away from the section's centroid."""
    steps = np.hypot(*np.diff(line, axis=0).T)
    k = int(np.searchsorted(np.cumsum(steps), 0.5 * steps.sum()))
    share = (0.5 * steps.sum() - steps[:k].sum()) / steps[k]
    middle = line[k] + share * (line[k + 1] - line[k])
    along = (line[k + 1] - line[k]) / steps[k]
    normal = np.array([-along[1], along[0]])
    if normal @ (middle - np.array(outline.centroid)) < 0.0:
        normal = -normal
    place = middle + normal * (0.5 * plate.thickness + 0.035 * outline.size)
    angle = (np.degrees(np.arctan2(along[1], along[0])) + 90.0) % 180.0 - 90.0
    name = f"{plate.name}: " if plate.name else ""
    text = f"{name}{number(plate.width)} × {number(plate.thickness)}"
    x, y = place
    return axes.text(x, y, text, rotation=angle, rotation_mode="anchor", ha="center", va="center", fontsize=9)


def _finish(
    axes: Axes, outline: Outline, placed: DerivedPlates, unplaced: tuple[int, ...], unit: str
) -> None:
    x0, y0, x1, y1 = outline.bounds
    room = 0.1 * outline.size
    axes.set_xlim(x0 - room, x1 + room)
    axes.set_ylim(y0 - room, y1 + room)
    axes.set_aspect("equal")
    label_axes(axes, unit)
    title = f"Plates: {placed.idealisation.replace('_', ' ') or 'given by hand'}"
    if unplaced:
        title += f"\nno place found for {', '.join(placed.plates[k].label(k) for k in unplaced)}"
    else:
        title += f", {percent(placed.covered, 3)} of the area"
    axes.set_title(title, fontsize=10)
