"""Plates drawn over the outline that they stand for, to be accepted, edited or rejected."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import numpy as np
import shapely
from shapely.geometry.polygon import orient

from torsionfe.checks import Floats
from torsionfe.closed_form.derive import DERIVED, derive_plates
from torsionfe.closed_form.derived import DerivedPlates
from torsionfe.closed_form.plates import Plate
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.output.section_view import points_per_length
from torsionfe.output.style import ACCENTS, HATCH, INK, MATERIAL, QUIET, frame_section, look, new_axes
from torsionfe.text import number, percent

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.lines import Line2D
    from matplotlib.patches import PathPatch
    from matplotlib.text import Text
    from shapely import Polygon

    Label = tuple[str, Floats, float, Polygon]

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
_THROUGH = ("straight_through", "web_through")  # which plate runs through: of equal ones, either
_CROWDED = 0.06  # of a label: where more of it is hidden, it is broken in two lines, then left without a name
_SHARES = (0.5, 0.65, 0.35, 0.8, 0.2)  # along a plate, where its label may stand


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
        Name and ``b x t`` of each plate that has a place; the size alone where there is no room.
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
    with look():
        _frame(axes, outline, placed, unplaced, unit)
        labels = _labels(axes, outline, placed)
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
    stated = getattr(plates, "idealisation", "")
    names = (stated, *_THROUGH) if stated in _THROUGH else (stated,) if stated in DERIVED else DERIVED
    choices = [_assigned(outline, given, derive_plates(outline, name)) for name in dict.fromkeys(names)]
    found, lines, _ = max(choices, key=lambda choice: choice[2])
    return replace(found, plates=tuple(given), idealisation=stated, centre_lines=lines, joints=())


def _assigned(
    outline: Outline, given: list[Plate], found: DerivedPlates
) -> tuple[DerivedPlates, tuple[Floats | None, ...], float]:
    """Return the middle line of each plate, as many as can be and each where its name says, and how well that went."""
    from scipy.optimize import linear_sum_assignment

    least = 4.0 * (len(given) + 1)  # one more plate in place outweighs all names
    score = np.zeros((len(given), len(found.plates)))
    for i, plate in enumerate(given):
        for k, other in enumerate(found.plates):
            if _alike(plate, other):
                score[i, k] = least + _towards(plate.name, found.centre_lines[k], outline) / outline.size
    rows, columns = linear_sum_assignment(score, maximize=True)
    lines: list[Floats | None] = [None] * len(given)
    for i, k in zip(rows.tolist(), columns.tolist(), strict=True):
        lines[i] = found.centre_lines[k] if score[i, k] > 0.0 else None
    return found, tuple(lines), float(score[rows, columns].sum())


def _alike(a: Plate, b: Plate) -> bool:
    sizes = np.sort([[a.width, a.thickness], [b.width, b.thickness]], axis=1)
    return bool(np.all(np.abs(sizes[0] / sizes[1] - 1.0) < _SAME))


def _towards(name: str, line: Floats | None, outline: Outline) -> float:
    """Return how far a line lies on the side that a plate's name speaks of: equal plates stay apart."""
    assert line is not None
    offset = line.mean(axis=0) - np.array(outline.centroid)
    aside = sum(_SIDES.get(word, np.zeros(2)) @ offset for word in name.split())
    return float(aside + sum(np.ptp(line[:, _ALONG[word]]) for word in name.split() if word in _ALONG))


# --- labels -----------------------------------------------------------------------------------------------


def _labels(axes: Axes, outline: Outline, placed: DerivedPlates) -> tuple[Text, ...]:
    """Write each plate's label beside it, where it hides the least."""
    ground = [outline.polygon(1e-3 * outline.size)]
    (x0, x1), (y0, y1) = axes.get_xlim(), axes.get_ylim()
    frame = shapely.box(x0, y0, x1, y1)
    drawn: list[Text] = []
    for plate, line in zip(placed.plates, placed.centre_lines, strict=True):
        if line is None:
            continue
        text, (x, y), angle, covered = _best(_choices(axes, outline, plate, line), ground, frame)
        ground.append(covered)
        style: dict[str, Any] = {"ha": "center", "va": "center", "fontsize": "small"}
        drawn.append(axes.text(x, y, text, rotation=angle, rotation_mode="anchor", **style))
    return tuple(drawn)


def _choices(axes: Axes, outline: Outline, plate: Plate, line: Floats) -> Iterator[list[Label]]:
    """Yield the labels that a plate may have, from the most telling to the shortest."""
    size = f"{number(plate.width)} × {number(plate.thickness)}"
    for words in (f"{plate.name}: {size}", f"{plate.name}\n{size}", size) if plate.name else (size,):
        yield list(_places(axes, outline, plate, line, words))


def _best(choices: Iterable[list[Label]], ground: list[Polygon], frame: Polygon) -> Label:
    """Return the first label that hides next to nothing where it stands best, else the one that hides the least."""
    found: list[tuple[float, Label]] = []
    for labels in choices:
        costs = [_hidden(label[3], ground, frame) + 0.01 * k for k, label in enumerate(labels)]
        k = int(np.argmin(costs))
        found.append((costs[k], labels[k]))
        if costs[k] < _CROWDED + 0.01 * k:
            return labels[k]
    return min(found, key=lambda pair: pair[0])[1]


def _places(axes: Axes, outline: Outline, plate: Plate, line: Floats, words: str) -> Iterator[Label]:
    """Yield where a label may stand beside a plate, with what it covers: outside of the section first."""
    from matplotlib.font_manager import FontProperties

    size = FontProperties(size="small").get_size_in_points() / points_per_length(axes)
    rows = words.split("\n")
    half = size * np.array([0.31 * max(map(len, rows)), 0.6 * len(rows)])
    for share in _SHARES:
        middle, along = _along(line, share)
        normal = np.array([-along[1], along[0]])
        if normal @ (middle - np.array(outline.centroid)) < 0.0:
            normal = -normal
        angle = (np.degrees(np.arctan2(along[1], along[0])) + 90.0 - 1e-6) % 180.0 - 90.0 + 1e-6
        for side in (normal, -normal):
            at = middle + side * (0.5 * plate.thickness + half[1] + 0.25 * size)
            steps = [half[0] * along * i + half[1] * normal * j for i, j in ((-1, -1), (1, -1), (1, 1), (-1, 1))]
            yield words, at, round(float(angle), 3), shapely.Polygon(at + np.array(steps))


def _along(line: Floats, share: float) -> tuple[Floats, Floats]:
    """Return the point at a share of a line's length, and the unit direction there."""
    steps = np.hypot(*np.diff(line, axis=0).T)
    walked = share * steps.sum()
    k = min(int(np.searchsorted(np.cumsum(steps), walked)), len(steps) - 1)
    along = (line[k + 1] - line[k]) / steps[k]
    return line[k] + along * (walked - steps[:k].sum()), along


def _hidden(label: Polygon, ground: list[Polygon], frame: Polygon) -> float:
    """Return the share of a label that lies on the section, on other labels or outside the frame, weighed."""
    section, *others = (label.intersection(piece).area for piece in ground)
    outside = label.area - label.intersection(frame).area
    return float((section + 2.0 * sum(others) + 2.0 * outside) / label.area)


def _frame(axes: Axes, outline: Outline, placed: DerivedPlates, unplaced: tuple[int, ...], unit: str) -> None:
    frame_section(axes, outline, unit, room=0.1)
    room = 18.0 / (points_per_length(axes) * outline.size)  # for a line of text on every side
    if room > 0.1:
        frame_section(axes, outline, unit, room=min(room, 0.3))
    parts = [f"Plates: {placed.idealisation.replace('_', ' ') or 'given by hand'}"]
    if unplaced:
        parts.append(f"no place found for {', '.join(placed.plates[k].label(k) for k in unplaced)}")
    else:
        parts.append(f"{percent(placed.covered, 3)} of the area")
    wide = axes.get_window_extent().width * 72.0 / axes.figure.dpi
    broken = unplaced or 5.0 * len(", ".join(parts)) > wide
    axes.set_title(("\n" if broken else ", ").join(parts))
