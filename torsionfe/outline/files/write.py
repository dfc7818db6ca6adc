"""An outline to a file, by the file's ending, so that reading it back gives the same outline."""

from __future__ import annotations

import os
from collections.abc import Callable
from pathlib import Path

from torsionfe.checks import one_of
from torsionfe.errors import InputError
from torsionfe.outline.files.dxf import dxf_text
from torsionfe.outline.files.geojson import geojson_text
from torsionfe.outline.files.points import points_text
from torsionfe.outline.files.wkt import wkt_text
from torsionfe.outline.outline import Outline
from torsionfe.storing import store
from torsionfe.units import parse_unit

__all__ = ["write_outline"]

_WRITERS: dict[str, Callable[[Outline, str | None], str]] = {
    "dxf": dxf_text,
    "wkt": lambda outline, _: wkt_text(outline),
    "geojson": geojson_text,
    "csv": points_text,
}
_ENDINGS = {".dxf": "dxf", ".wkt": "wkt", ".geojson": "geojson", ".json": "geojson", ".csv": "csv"}


def write_outline(
    outline: Outline, path: str | os.PathLike[str], *, format: str | None = None, unit: str | None = None
) -> Path:
    """Write an outline to a file and return its path.

    The file is written beside and renamed, so an older one is replaced whole or not at all. Arcs are arcs in
    DXF (bulges), well-known text (CURVEPOLYGON) and CSV (a column of bulges); in GeoJSON, which has none, they
    are chords of 5 degrees, and a foreign member tells which arcs they were.

    Parameters
    ----------
    outline : Outline
    path : path
        Its ending tells the format: ``.dxf``, ``.wkt``, ``.geojson``, ``.json`` or ``.csv``.
    format : str, optional
        ``dxf``, ``wkt``, ``geojson`` or ``csv``, where the ending does not tell.
    unit : str, optional
        The outline's unit of length, to be stated in the file; well-known text has no place for one. Nothing
        is converted.

    Raises
    ------
    InputError
        The format is not known, or the file cannot be written.
    UnitError
        The unit is not known.
    """
    if not isinstance(outline, Outline):
        raise InputError(f"an Outline is needed, got {type(outline).__name__}")
    try:
        target = Path(path)
    except TypeError:
        raise InputError(f"{path!r:.80} is no path to a file") from None
    if format is None and target.suffix.lower() not in _ENDINGS:
        raise InputError(
            f"{target.name}: the ending {target.suffix!r} tells no format that can be written "
            f"({', '.join(_ENDINGS)}): pass format="
        )
    kind = _ENDINGS[target.suffix.lower()] if format is None else one_of("format", format, tuple(_WRITERS))
    text = _WRITERS[kind](outline, None if unit is None else parse_unit(unit))
    return store(target, text.encode())
