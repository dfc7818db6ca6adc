"""Drawings in DXF, the drawing exchange format, read and written through ``ezdxf``.

The meaning of the entities (bulges, object coordinate systems, knot vectors, ``$INSUNITS``) is that of the
published DXF reference. Only what lies in the model space and is visible is read.
"""

from __future__ import annotations

import io
import logging
import re
from collections import Counter
from collections.abc import Iterator
from dataclasses import dataclass, field
from difflib import get_close_matches
from pathlib import Path
from typing import Any

import numpy as np

from torsionfe.errors import MissingExtraError, ReadError, TorsionError
from torsionfe.outline.files.chaining import chain
from torsionfe.outline.files.dxf_entities import ENTITIES, FLAT_ONLY, Pen
from torsionfe.outline.files.loops import Found, ReadOptions, SegmentList, too_many
from torsionfe.outline.outline import Outline

__all__ = ["dxf_text", "read_dxf"]

_BINARY = b"\r\n\x1a\x00"
_DEEPEST = 16
_ENTITIES_PER_EDGE = 2
_ITEMS_PER_EDGE = 4
_ITEM = re.compile(rb"\n[ ]*0\r?\n")
_FLAT = 1e-6

#: ``$INSUNITS`` of the header: its number for each unit that is known here.
_CODES = {
    "in": 1, "ft": 2, "mm": 4, "cm": 5, "m": 6, "km": 7, "mil": 9, "yd": 10, "nm": 12, "um": 13, "dm": 14,
    "ft_us": 21, "in_us": 22,
}  # fmt: skip
_UNITS = {code: unit for unit, code in _CODES.items()}

# what the library repairs by putting in a value of its own, or by leaving something out of the drawing
_DISTORTED = frozenset({
    "FOUND_TAG_OUTSIDE_SECTION", "MODELSPACE_NOT_FOUND", "UNDEFINED_BLOCK", "INVALID_BLOCK_REFERENCE_CYCLE",
    "INVALID_INTEGER_VALUE", "INVALID_FLOATING_POINT_VALUE", "INVALID_EXTRUSION_VECTOR", "INVALID_MAJOR_AXIS",
    "INVALID_VERTEX_COUNT", "INVALID_SPLINE_DEFINITION", "INVALID_SPLINE_CONTROL_POINT_COUNT",
    "INVALID_SPLINE_FIT_POINT_COUNT", "INVALID_SPLINE_KNOT_VALUE_COUNT", "INVALID_SPLINE_WEIGHT_COUNT",
    "INVALID_ELLIPSE_RATIO",
})  # fmt: skip
_MISSING = frozenset({
    "REMOVED_INVALID_GRAPHIC_ENTITY", "REMOVED_ENTITY_WITH_INVALID_OWNER_HANDLE", "ORPHANED_LAYOUT_ENTITY",
})  # fmt: skip


def read_dxf(path: Path, data: bytes, options: ReadOptions) -> Found:
    """Return the closed loops of a drawing.

    Parameters
    ----------
    path : Path
    data : bytes
        What the file holds, text or binary.
    options : ReadOptions

    Raises
    ------
    ReadError
        It is no DXF file, is cut short or damaged, or its lines make no closed loops.
    """
    document, notes, warnings = _document(path, data, options)
    sheet = _Sheet(options, Pen(SegmentList(options.max_edges), options.curve_tolerance))
    try:
        _draw(sheet, document)
    except TorsionError:
        raise
    except Exception as error:
        raise ReadError(f"the drawing holds something that cannot be read ({_short(error)})") from error
    sheet.refuse_nothing()
    notes += [*sheet.notes(), *_flattened(sheet.pen)]
    loops, more = chain(sheet.pen.lines.segments(), options.tolerance)
    return Found(tuple(loops), _unit(document), tuple(notes + more), tuple(warnings))


def _short(error: BaseException) -> str:
    return f"{type(error).__name__}: {error}"[:200]


def _document(path: Path, data: bytes, options: ReadOptions) -> tuple[Any, list[str], list[str]]:
    """Return the document, notes on repairs, and warnings of what they may have left out."""
    try:
        import ezdxf
        from ezdxf import recover
        from ezdxf.audit import AuditError
    except ImportError as error:
        raise MissingExtraError("reading a DXF file needs ezdxf: pip install ezdxf") from error
    if not data[-64:].rstrip(b"\x00\r\n\t \x1a").endswith(b"EOF"):
        lines = data.splitlines() or [b""]
        last = lines[-1][:40].decode(errors="replace")
        raise ReadError(f"it is no DXF file or is cut short: its last line, line {len(lines)}, is {last!r} and not EOF")
    # counted before the library sees it, which takes a second for ten thousand
    items = sum(1 for _ in _ITEM.finditer(data))
    if items > _ITEMS_PER_EDGE * options.max_edges:
        most = _ITEMS_PER_EDGE * options.max_edges
        raise ReadError(
            f"it has {items} entries, above the limit of {most}: take away what is no boundary, or pass a larger "
            "max_edges="
        )
    try:
        logging.getLogger("ezdxf").addHandler(logging.NullHandler())  # what it finds is told in the result
        if data[18:22] == _BINARY:
            document = ezdxf.readfile(path)  # type: ignore[attr-defined]
            auditor = document.audit()
        else:
            document, auditor = recover.read(io.BytesIO(data))
    except Exception as error:
        raise ReadError(f"it is no DXF file, or a damaged one ({_short(error)})") from error
    flaws = [*auditor.errors, *auditor.fixes]
    names = {int(code): code.name for code in AuditError}
    for flaw in flaws:
        if names.get(int(flaw.code)) in _DISTORTED:
            raise ReadError(f"the drawing is damaged ({str(flaw.message)[:200]}): have it saved again")
    lost = [flaw for flaw in flaws if names.get(int(flaw.code)) in _MISSING]
    notes = [f"repaired {len(flaws)} flaws of the file ({str(flaws[0].message)[:80]})"] if flaws else []
    warnings = [f"{len(lost)} damaged entities were left out ({str(lost[0].message)[:120]})"] if lost else []
    return document, notes, warnings


def _unit(document: Any) -> str | None:
    try:
        code = int(document.header.get("$INSUNITS", 0))
    except (TypeError, ValueError):
        code = -1
    return None if code == 0 else _UNITS.get(code, f"$INSUNITS = {code}")


# --- which entities ------------------------------------------------------------------------------------


@dataclass
class _Sheet:
    """The entities that are wanted, drawn with a pen, and a tally of all that are there."""

    options: ReadOptions
    pen: Pen
    layers: Counter[str] = field(default_factory=Counter)
    hidden: Counter[str] = field(default_factory=Counter)
    ignored: Counter[str] = field(default_factory=Counter)
    off: set[str] = field(default_factory=set)
    drawn: int = 0
    seen: int = 0

    def wants(self, layer: str) -> bool:
        """Return whether a layer is to be read."""
        if self.options.layers is not None:
            return layer.lower() in {name.lower() for name in self.options.layers}
        return layer.lower() not in self.off

    def notes(self) -> list[str]:
        """Return what was read and what was left out."""
        several = self.options.layers is None and len(self.layers) > 1
        read = [f"read from the layers {_tally(self.layers)}"] if several else []
        left = [f"left out {sum(self.hidden.values())} entities of hidden layers ({_tally(self.hidden)})"]
        other = [f"left out what is no boundary: {_tally(self.ignored)}"]
        return read + (left if self.hidden else []) + (other if self.ignored else [])

    def refuse_nothing(self) -> None:
        """Raise where no entity, or none of the layers asked for, was drawn."""
        present = {name.lower(): name for name in self.layers}
        for name in self.options.layers or ():
            if name.lower() not in present:
                near = get_close_matches(name, list(self.layers), n=1)
                hint = f"; did you mean {near[0]!r}?" if near else ""
                raise ReadError(
                    f"the layer {name!r} holds nothing: the drawing has {_tally(self.layers) or 'no entities'}{hint}"
                )
        if not self.drawn:
            there = _tally(self.layers + self.hidden)
            why = f"; there is only {_tally(self.ignored)}" if self.ignored else ""
            raise ReadError(
                f"no line, arc or curve is visible in the model space (layers: {there or 'none'}{why}): choose "
                "layers, or explode what is there into lines"
            )


def _tally(counts: Counter[str]) -> str:
    shown = [f"{name!r} ({count})" for name, count in sorted(counts.items())[:12]]
    return ", ".join(shown) + (", ..." if len(counts) > 12 else "")


def _draw(sheet: _Sheet, document: Any) -> None:
    sheet.off = {layer.dxf.name.lower() for layer in document.layers if layer.is_off() or layer.is_frozen()}
    for entity, layer in _flat(document.modelspace(), "0", sheet, 0):
        kind = entity.dxftype()
        if entity.dxf.get("invisible", 0):
            sheet.ignored[f"invisible {kind}"] += 1
        elif kind not in ENTITIES:
            if kind in FLAT_ONLY and sheet.wants(layer):
                raise ReadError(
                    f"the layer {layer!r} holds a {kind}, which is no flat boundary of lines and arcs: draw the "
                    "cross-section's outline, or choose layers"
                )
            sheet.ignored[kind] += 1
        elif sheet.wants(layer):
            sheet.layers[layer] += 1
            sheet.drawn += 1
            ENTITIES[kind](entity, sheet.pen)
        else:
            (sheet.layers if sheet.options.layers is not None else sheet.hidden)[layer] += 1


def _flat(entities: Any, outer_layer: str, sheet: _Sheet, depth: int) -> Iterator[tuple[Any, str]]:
    """Yield each entity and its layer, blocks taken apart."""
    for entity in entities:
        sheet.seen += 1
        if sheet.seen > _ENTITIES_PER_EDGE * sheet.options.max_edges:
            raise too_many(sheet.seen, sheet.options.max_edges)
        own = str(entity.dxf.get("layer", "0"))
        layer = outer_layer if depth and own == "0" else own  # layer 0 of a block is that of its insertion
        if entity.dxftype() != "INSERT":
            yield entity, layer
            continue
        if depth >= _DEEPEST:
            raise ReadError(f"blocks are nested over {_DEEPEST} deep, or hold themselves: explode them")
        copies = max(1, int(entity.dxf.row_count)) * max(1, int(entity.dxf.column_count))
        if copies > sheet.options.max_edges:
            raise ReadError(f"a block is inserted {copies} times, above the limit of {sheet.options.max_edges}")
        if entity.block() is None:
            raise ReadError(f"the block {str(entity.dxf.get('name', ''))[:80]!r} is not in the drawing")
        for one in entity.multi_insert() if copies > 1 else (entity,):
            parts = one.virtual_entities(skipped_entity_callback=lambda e, _: sheet.ignored.update([e.dxftype()]))
            yield from _flat(parts, layer, sheet, depth + 1)


def _flattened(pen: Pen) -> list[str]:
    """Return the note that a drawing in a plane beside z = 0 was flattened, or raise where it is in none."""
    heights = np.array(pen.heights).reshape(-1, 3)
    if not len(heights):
        return []
    low, high = heights[np.argmin(heights[:, 2])], heights[np.argmax(heights[:, 2])]
    size = float(np.ptp(heights[:, :2], axis=0).max())
    if high[2] - low[2] > _FLAT * max(size, 1e-300):
        raise ReadError(
            f"the drawing is not flat: z is {low[2]:g} at ({low[0]:g}, {low[1]:g}) and {high[2]:g} at "
            f"({high[0]:g}, {high[1]:g}). Flatten it, or choose layers",
            (float(high[0]), float(high[1])),
        )
    return [f"flattened from z = {low[2]:g}"] if abs(low[2]) > _FLAT * size else []


# --- writing -------------------------------------------------------------------------------------------


def dxf_text(outline: Outline, unit: str | None) -> str:
    """Return a drawing with each loop as a closed polyline, arcs as bulges, on layers ``outer`` and ``voids``."""
    try:
        import ezdxf
    except ImportError as error:
        raise MissingExtraError("writing a DXF file needs ezdxf: pip install ezdxf") from error
    document = ezdxf.new("R2010")  # type: ignore[attr-defined]
    document.header["$INSUNITS"] = 0 if unit is None else _CODES[unit]
    space = document.modelspace()
    for loop, layer in ((outline, "outer"), *((void, "voids") for void in outline.voids)):
        if layer not in document.layers:
            document.layers.add(layer)
        rows = np.column_stack([loop.vertices, loop.bulges]).tolist()
        space.add_lwpolyline(rows, format="xyb", close=True, dxfattribs={"layer": layer})
    text = io.StringIO()
    document.write(text)
    return text.getvalue()
