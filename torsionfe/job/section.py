"""The cross-section of a job: a packaged section, a file, a trade shape, or points."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

from torsionfe.errors import InputError
from torsionfe.job.keys import KEYS, SHAPES, shape_keys
from torsionfe.job.places import InputFile, inside, read_bytes
from torsionfe.job.table import Table
from torsionfe.outline import shapes
from torsionfe.outline.files.read import ReadResult, read_outline_report
from torsionfe.outline.fillets import round_corners, sharp_corners
from torsionfe.outline.outline import Outline
from torsionfe.outline.samples import SAMPLE_UNIT, SAMPLES
from torsionfe.units import length_factor

__all__ = ["JobSection", "build_shape", "read_section"]

_SOURCES = ("section", "file", "shape", "vertices")
_MOST_FILE_BYTES = 50_000_000
_MOST_POINTS = 20_000


@dataclass(frozen=True)
class JobSection:
    """A cross-section as a job describes it.

    Attributes
    ----------
    outline : Outline
    source : str
        Where it comes from, in a line.
    file : InputFile or None
        The file that it was read from.
    notes, warnings : tuple of str
        What reading it brought to light.
    shape : str
        The trade shape's name; empty for others.
    dimensions : mapping
        The trade shape's dimensions that the job states.
    """

    outline: Outline
    source: str
    file: InputFile | None = None
    notes: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
    shape: str = ""
    dimensions: Mapping[str, Any] | None = None


def build_shape(shape: str, fixed: Mapping[str, Any], **changed: Any) -> Outline:
    """Return a trade shape by name, some of its dimensions changed."""
    outline: Outline = getattr(shapes, shape)(**{**fixed, **changed})
    return outline


def read_section(holder: Table, key: str = "outline") -> JobSection:
    """Return the cross-section that a table of a job file describes.

    Raises
    ------
    JobError
        None or several sources, a value that is out of range, an outline that cannot be built.
    """
    data = holder.data.get(key)
    dimensions: list[str] = []
    if isinstance(data, dict) and "shape" in data:
        every = Table(holder.source, (*holder.path, key), data, list(data))
        dimensions = list(shape_keys(every.choice("shape", SHAPES)))
    table = holder.table(key, list(dict.fromkeys([*KEYS["outline"], *dimensions])))
    if table is None:
        holder.need(key)
        raise AssertionError
    given = [source for source in _SOURCES if source in table]
    if len(given) != 1:
        found = " and ".join(given) or "none of them"
        wanted = ", ".join(_SOURCES[:-1]) + f" or {_SOURCES[-1]}"
        raise table.error(given[1] if given else "", f"[{table.name()}] must have one of {wanted}, got {found}")
    _refuse_strays(table, given[0], dimensions)
    section = {"section": _packaged, "file": _file, "shape": _shape, "vertices": _points}[given[0]](table)
    return _filleted(table, section)


def _refuse_strays(table: Table, source: str, dimensions: list[str]) -> None:
    """Raise where a key belongs to another source of the outline."""
    of_source = {
        "section": [],
        "file": ["file_unit", "layers", "restore_arcs", "facet_tolerance"],
        "shape": dimensions,
        "vertices": ["bulges", "voids"],
    }[source]
    for key in table.data:
        if key not in (source, "fillets", *of_source):
            raise table.error(key, f"{table.name(key)} has no meaning beside {source!r}; leave it out")


# --- the four sources ---------------------------------------------------------------------------------------


def _packaged(table: Table) -> JobSection:
    name = table.choice("section", tuple(SAMPLES))
    item = SAMPLES[name]
    outline = item.build().scaled(length_factor(SAMPLE_UNIT, table.source.system.length))
    return JobSection(outline, f"packaged section {name} (invented): {item.title}, in {SAMPLE_UNIT}")


def _shape(table: Table) -> JobSection:
    name = table.choice("shape", SHAPES)
    keys = shape_keys(name)
    table.need(*(key for key, (_, needed) in keys.items() if needed))
    sizes = {key: _dimension(table, key, kind) for key, (kind, _) in keys.items() if key in table}
    with table.blame():
        outline = build_shape(name, sizes)
    return JobSection(outline, f"trade shape: {name.replace('_', ' ')}", shape=name, dimensions=sizes)


def _dimension(table: Table, key: str, kind: str) -> Any:
    if kind == "whole":
        return table.whole(key, 1, 1, 10_000)
    if kind == "number":
        return table.number(key, 0.0)
    if kind == "voids":
        rows = table.data[key]
        if not isinstance(rows, list) or not rows or not all(isinstance(row, list) and len(row) == 4 for row in rows):
            raise table.error(key, f"{table.name(key)} must be a list of [left, bottom, width, height]")
        return [tuple(table.measure((key, k, m), row[m], "length") for m in range(4)) for k, row in enumerate(rows)]
    return table.needed(key, "length")


def _points(table: Table) -> JobSection:
    voids = [_loop(void) for void in table.tables("voids", list(KEYS["outline.voids"]))]
    outer = _loop(table)
    with table.blame():
        outline = Outline(outer.vertices, outer.bulges, voids)
    return JobSection(outline, "points of the job file")


def _loop(table: Table) -> Outline:
    table.need("vertices")
    rows = table.data["vertices"]
    pairs = isinstance(rows, list) and all(isinstance(row, list) and len(row) == 2 for row in rows)
    if not pairs or not 2 <= len(rows) <= _MOST_POINTS:
        raise table.error(
            "vertices", f"{table.name('vertices')} must be a list of [x, y], 2 to {_MOST_POINTS} of them"
        )
    stated = table.source.stated
    before = len(stated)
    points = [[table.measure(("vertices", k, m), row[m], "length") for m in range(2)] for k, row in enumerate(rows)]
    del stated[before:]  # the drawing shows them; a list of inputs would drown in them
    bulges = table.data.get("bulges", [0.0] * len(rows))
    plain = isinstance(bulges, list) and all(isinstance(b, (int, float)) and not isinstance(b, bool) for b in bulges)
    if not plain or len(bulges) != len(rows):
        raise table.error("bulges", f"{table.name('bulges')} must be a list of {len(rows)} numbers, one a vertex")
    with table.blame("vertices"):
        return Outline(points, bulges)


def _file(table: Table) -> JobSection:
    name = table.text("file", longest=500)
    source = table.source
    with table.blame("file"):
        path = inside(source.path.parent, name, source.folders)
        data = read_bytes(path, _MOST_FILE_BYTES)
        facet = table.data.get("facet_tolerance")
        found = read_outline_report(
            path,
            unit=source.system.length,
            file_unit=table.text("file_unit") or None,
            layers=table.texts("layers") or None,
            restore_arcs=table.flag("restore_arcs", True),
            facet_tolerance=None if facet is None else table.number("facet_tolerance", 0.0),
            max_bytes=_MOST_FILE_BYTES,
        )
    return JobSection(found.outline, _read_in_words(name, found), _input(name, data), found.notes, found.warnings)


def _input(name: str, data: bytes) -> InputFile:
    import hashlib

    return InputFile(name.replace("\\", "/"), hashlib.sha256(data).hexdigest())


def _read_in_words(name: str, found: ReadResult) -> str:
    unit = f", in {found.file_unit}" if found.file_unit else ""
    arcs = f", {found.arcs_restored} arcs restored from chords" if found.arcs_restored else ""
    return f"file {name} ({found.format}{unit}{arcs})"


# --- fillets ------------------------------------------------------------------------------------------------


def _filleted(table: Table, section: JobSection) -> JobSection:
    """Return the section with every fillet made at once, so that vertices keep their numbers."""
    rows = table.tables("fillets", list(KEYS["outline.fillets"]))
    if not rows:
        return section
    asked = [(row, row.needed("radius", "length"), row.wholes("at")) for row in rows]
    rest = [row for row, _, at in asked if at is None]
    if len(rest) > 1:
        raise rest[1].error("", f"{rest[1].name()}: only one radius can be without 'at', for all other corners")
    outline = section.outline
    with table.blame("fillets"):
        if len(asked) == 1:
            return replace(section, outline=outline.filleted(asked[0][1], asked[0][2]))
        radii = {(0, k): (radius, "fillet radius") for row, radius, at in asked for k in _corners(row, outline, at)}
        for _, radius, at in asked:
            if at is None:
                edges = outline.edges
                sharp = {(int(edges.loop[k]), int(edges.vertex[k])) for k in sharp_corners(edges)}
                radii |= dict.fromkeys(sorted(sharp - set(radii)), (radius, "fillet radius"))
        return replace(section, outline=round_corners(outline, radii))


def _corners(row: Table, outline: Outline, at: tuple[int, ...] | None) -> tuple[int, ...]:
    for k in at or ():
        if k >= len(outline.vertices):
            raise InputError(f"there is no vertex {k}: the outer loop has 0 to {len(outline.vertices) - 1}")
    return at or ()
