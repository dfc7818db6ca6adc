"""An outline from a file, by the file's ending: what was found there, what was done to it, in which unit."""

from __future__ import annotations

import os
import warnings
from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from torsionfe.checks import one_of, positive
from torsionfe.errors import InputError, OutlineError, OutlineWarning, ReadError, UnitError
from torsionfe.outline import facets
from torsionfe.outline.files.dxf import read_dxf
from torsionfe.outline.files.geojson import read_geojson
from torsionfe.outline.files.loops import Found, ReadOptions
from torsionfe.outline.files.meshes import mesh_endings, read_mesh
from torsionfe.outline.files.nesting import nest
from torsionfe.outline.files.points import read_points
from torsionfe.outline.files.wkt import read_wkt
from torsionfe.outline.outline import Outline
from torsionfe.text import number, table
from torsionfe.units import length_factor, parse_unit

__all__ = ["FORMATS", "ReadResult", "format_of", "read_outline", "read_outline_report"]

#: The formats by their endings; any other ending is tried as that of a mesh.
FORMATS = {
    ".dxf": "dxf",
    ".wkt": "wkt",
    ".geojson": "geojson",
    ".json": "geojson",
    ".csv": "csv",
    ".tsv": "csv",
    ".txt": "csv",
}
_NAMES = ("dxf", "wkt", "geojson", "csv", "mesh")
_TEXTS: dict[str, Callable[[str, ReadOptions], Found]] = {
    "wkt": read_wkt,
    "geojson": read_geojson,
    "csv": read_points,
}


@dataclass(frozen=True)
class ReadResult:
    """An outline read from a file, and what was found on the way.

    Attributes
    ----------
    path : str
    format : str
        ``dxf``, ``wkt``, ``geojson``, ``csv`` or ``mesh``.
    outline : Outline
    unit : str or None
        The outline's unit of length, None where nobody stated one.
    file_unit : str or None
        The file's unit, from the file or from the caller.
    restored : RestoredArcs or None
        The arcs made of chains of chords, None where that was switched off.
    notes : tuple of str
        What was done to the drawing: gaps closed, edges dropped, entities left out.
    warnings : tuple of str
        What may be wrong with the outline, or with the stress found on it.
    """

    path: str
    format: str
    outline: Outline
    unit: str | None
    file_unit: str | None
    restored: facets.RestoredArcs | None
    notes: tuple[str, ...]
    warnings: tuple[str, ...]

    @property
    def arcs_restored(self) -> int:
        """How many chains of chords became arcs."""
        return 0 if self.restored is None else self.restored.arcs_restored

    def __str__(self) -> str:
        x0, y0, x1, y1 = self.outline.bounds
        unit = "" if self.unit is None else f" {self.unit}"
        said = "not stated" if self.file_unit is None else self.file_unit
        edges = self.outline.edges
        arcs = int((edges.bulge != 0.0).sum())
        rows = [
            ["unit of the file", said],
            ["size", f"{number(x1 - x0, 6)} x {number(y1 - y0, 6)}{unit}"],
            ["area", number(self.outline.area, 6) + (f"{unit}^2" if unit else "")],
            ["edges", f"{len(edges) - arcs} straight, {arcs} arcs"],
            ["voids", str(len(self.outline.voids))],
            ["arcs restored from chords", "switched off" if self.restored is None else str(self.arcs_restored)],
            *(["note", note] for note in self.notes),
            *(["warning", warning] for warning in self.warnings),
        ]
        return table(rows, f"{Path(self.path).name} ({self.format})")


def read_outline(path: str | os.PathLike[str], **options: Any) -> Outline:
    """Return the outline that a file holds.

    Parameters
    ----------
    path : path
        DXF, well-known text (``.wkt``), GeoJSON (``.geojson``, ``.json``), a table of points (``.csv``, ``.tsv``,
        ``.txt``), or a flat mesh in any format that ``meshio`` reads.
    **options
        As for `read_outline_report`.

    Returns
    -------
    Outline

    Warns
    -----
    OutlineWarning
        A chain of chords stays as drawn, which falsifies the stress there, or part of the file was damaged.

    Raises
    ------
    ReadError
        The file holds no readable outline; the message says why, and ``at`` where there is a place.
    UnitError
        A unit is wanted and the file states none, or two that are stated contradict each other.
    """
    result = read_outline_report(path, **options)
    for warning in result.warnings:
        warnings.warn(f"{Path(path).name}: {warning}", OutlineWarning, stacklevel=2)
    return result.outline


def read_outline_report(
    path: str | os.PathLike[str],
    *,
    format: str | None = None,
    unit: str | None = None,
    file_unit: str | None = None,
    ignore_file_unit: bool = False,
    layers: str | Iterable[str] | None = None,
    tolerance: float | None = None,
    restore_arcs: bool = True,
    facet_tolerance: float | None = None,
    curve_tolerance: float | None = None,
    max_bytes: int = 50_000_000,
    max_edges: int = 50_000,
    max_seconds: float = 20.0,
) -> ReadResult:
    """Return the outline that a file holds, with all that was found and done on the way.

    Loops are nested by containment: the one that holds all the others is the outer one, those inside are voids.

    Parameters
    ----------
    path : path
        As for `read_outline`.
    format : str, optional
        ``dxf``, ``wkt``, ``geojson``, ``csv`` or ``mesh``, where the file's ending does not tell.
    unit : str, optional
        The unit that the outline is wanted in; by default it keeps the file's numbers.
    file_unit : str, optional
        The unit of the file's numbers, where the file states none.
    ignore_file_unit : bool
        Whether ``file_unit`` holds even if the file states another one (headers are often wrong).
    layers : str or iterable of str, optional
        Layers of a DXF file to read, whatever their case; by default all that are on and thawed.
    tolerance : float, optional
        The largest gap between ends of lines to close, in the file's unit; by default a hundred-thousandth of
        the drawing's size.
    restore_arcs : bool
        Whether chains of chords on a circle become arcs: see `torsionfe.outline.facets.restore_arcs`.
    facet_tolerance : float, optional
        How far the ends of such chords may lie from the circle, in the file's unit.
    curve_tolerance : float, optional
        How far arcs may lie from an ellipse or spline, in the file's unit; by default a hundred-thousandth of
        the curve's size.
    max_bytes, max_edges : int
        Larger files are refused.
    max_seconds : float
        How long the reading of a mesh may take.

    Returns
    -------
    ReadResult

    Raises
    ------
    ReadError, UnitError
        As for `read_outline`.
    InputError
        An option is out of its range.
    """
    file = _path(path)
    kind = format_of(file, format)
    options = ReadOptions(
        _layers(layers, kind),
        None if tolerance is None else positive("tolerance", tolerance),
        None if curve_tolerance is None else positive("curve_tolerance", curve_tolerance),
        int(positive("max_edges", max_edges)),
    )
    chords = None if facet_tolerance is None else positive("facet_tolerance", facet_tolerance)
    wanted = None if unit is None else parse_unit(unit)
    given = None if file_unit is None else parse_unit(file_unit)
    try:
        found = _found(file, kind, options, int(positive("max_bytes", max_bytes)), positive("max_seconds", max_seconds))
        stated = _stated(found, given, wanted, ignore_file_unit)
        outline = nest(found.loops)
        restored = facets.restore_arcs(outline, chords) if restore_arcs else None
    except OutlineError as error:
        raise ReadError(f"{file.name}: {error}", error.at) from error
    except UnitError as error:
        raise UnitError(f"{file.name}: {error}") from error
    outline = outline if restored is None else restored.outline
    if stated is not None and wanted is not None and stated != wanted:
        outline = outline.scaled(length_factor(stated, wanted))
    return ReadResult(
        path=str(file),
        format=kind,
        outline=outline,
        unit=wanted or stated,
        file_unit=stated,
        restored=restored,
        notes=found.notes,
        warnings=(*found.warnings, *(restored.warnings if restored is not None else ())),
    )


def _path(path: Any) -> Path:
    try:
        file = Path(os.fspath(path) if not isinstance(path, bytes) else os.fsdecode(path))
        there, regular = file.exists(), file.is_file()
    except (TypeError, ValueError, OSError) as error:
        raise ReadError(f"{path!r:.80} is no path to a file ({error})") from None
    if not there:
        raise ReadError(f"there is no file {str(file)!r}")
    if not regular:
        raise ReadError(f"{str(file)!r} is no file")
    return file


def format_of(path: Path, given: str | None) -> str:
    """Return the format of a file by its ending, or the one given.

    Raises
    ------
    ReadError
        The ending is that of no format that is known here.
    """
    if given is not None:
        return one_of("format", given, _NAMES)
    ending = path.suffix.lower()
    if ending in FORMATS:
        return FORMATS[ending]
    meshes = mesh_endings()
    if ending in meshes or "".join(path.suffixes[-2:]).lower() in meshes:
        return "mesh"
    raise ReadError(
        f"{path.name}: the ending {ending!r} tells no format that can be read ({', '.join(FORMATS)}, and of meshes "
        f"{', '.join(end for end in meshes if end not in FORMATS)}): pass format="
    )


def _layers(layers: Any, kind: str) -> tuple[str, ...] | None:
    if layers is None:
        return None
    names = (layers,) if isinstance(layers, str) else tuple(layers)
    if not names or not all(isinstance(name, str) for name in names):
        raise InputError(f"layers must be one name or several, got {layers!r:.80}")
    if kind != "dxf":
        raise InputError(f"only a DXF file has layers, not one of the format {kind!r}: leave layers= out")
    return names


def _found(file: Path, kind: str, options: ReadOptions, most: int, seconds: float) -> Found:
    """Return what a file holds."""
    try:
        with open(file, "rb") as handle:
            data = handle.read(most + 1)
    except OSError as error:
        raise ReadError(f"it cannot be opened ({error.strerror})") from error
    if len(data) > most:
        raise ReadError(f"it has over {most} bytes: simplify the drawing, or pass a larger max_bytes=")
    if not data.strip():
        raise ReadError("it is empty")
    if kind == "dxf":
        return read_dxf(file, data, options)
    if kind == "mesh":
        if b"<!ENTITY" in data:
            raise ReadError("it declares entities of its own, which are not expanded here")
        return read_mesh(file, options, seconds=seconds)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise ReadError(f"it is no text in UTF-8 (byte {error.start})") from None
    if "\0" in text:
        raise ReadError(f"it is no text: it holds a zero byte (character {text.index(chr(0))})")
    return _TEXTS[kind](text.replace("\r\n", "\n").replace("\r", "\n"), options)


def _stated(found: Found, given: str | None, wanted: str | None, ignore: bool) -> str | None:
    """Return the unit of the file's numbers, or raise `UnitError`."""
    own = None if found.unit is None or (ignore and given is not None) else parse_unit(found.unit)
    if own is not None and given is not None and own != given:
        raise UnitError(
            f"the file says that it is in {own!r}, file_unit says {given!r}: leave file_unit out, or pass "
            "ignore_file_unit=True if the file is wrong"
        )
    stated = given or own
    if stated is None and wanted is not None:
        raise UnitError(f"the file states no unit, so it cannot be turned into {wanted!r}: pass file_unit=")
    return stated
