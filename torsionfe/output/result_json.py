"""Results as JSON, after a documented and versioned schema (``schema/result-1.json``; JSON Schema draft 2020-12).

A number that is not finite is written as null: JSON has no other. The same result gives the same bytes.
"""

from __future__ import annotations

import json
import math
import os
import re
from collections.abc import Callable, Iterable, Mapping
from dataclasses import fields, is_dataclass
from importlib.resources import files
from pathlib import Path, PurePath
from typing import Any

import numpy as np

from torsionfe.checks import finite
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.storing import store
from torsionfe.torsion.bounds import Bounds
from torsionfe.torsion.solution import TorsionSolution
from torsionfe.units import parse_unit

__all__ = [
    "SCHEMA_NAME",
    "SCHEMA_VERSION",
    "json_text",
    "outline_of",
    "plain_data",
    "result_schema",
    "to_json",
    "write_json",
]

#: What a document calls itself. The version rises when a member changes its meaning or goes; members may be added.
SCHEMA_NAME, SCHEMA_VERSION = "torsionfe-result", 1


def to_json(
    solution: TorsionSolution,
    *,
    unit: str = "",
    torque: float | None = None,
    parts: Mapping[str, Any] | None = None,
) -> dict[str, Any]:
    """Return a solution as plain data that ``json.dumps`` takes.

    Parameters
    ----------
    solution : TorsionSolution
    unit : str
        Of the outline's lengths; null in the document where it is not known.
    torque : float, optional
        force * length; each hot spot then carries its stress, too.
    parts : mapping of str to object, optional
        Further results by name, such as margins of safety: dataclasses, arrays, numbers and text, as
        `plain_data` takes them.

    Returns
    -------
    dict
        Valid after `result_schema`.

    Raises
    ------
    InputError
        The torque is no finite number; a part holds something that is no data.
    UnitError
        The unit is unknown.
    """
    from torsionfe import __version__

    load = None if torque is None else finite("torque", torque)
    return {
        "schema": SCHEMA_NAME,
        "schema_version": SCHEMA_VERSION,
        "software": {"name": "torsionfe", "version": __version__},
        "length_unit": parse_unit(unit) if unit else None,
        "torque": load,
        "solution": _solution(solution, load),
        "parts": {str(name): plain_data(value) for name, value in (parts or {}).items()},
    }


def write_json(
    solution: TorsionSolution | Mapping[str, Any],
    path: str | os.PathLike[str],
    *,
    unit: str = "",
    torque: float | None = None,
    parts: Mapping[str, Any] | None = None,
) -> Path:
    """Write a solution, or a document that `to_json` returned, as a JSON file.

    Raises
    ------
    InputError
        As in `to_json`; or the file can't be written: an older one of that name is as it was.
    """
    if isinstance(solution, TorsionSolution):
        solution = to_json(solution, unit=unit, torque=torque, parts=parts)
    return store(path, json_text(solution).encode("ascii"))


#: A list of numbers that ``json.dumps`` has spread over lines; no line break stands inside a JSON string.
_SPREAD = re.compile(r"\[\n\s*((?:-?\d[-+.\deE]*|null)(?:,\n\s*(?:-?\d[-+.\deE]*|null))*)\n\s*\]")


def json_text(document: Any) -> str:
    """Return data as JSON text: indented, lists of numbers on one line, every digit kept, ASCII."""
    text = json.dumps(plain_data(document), indent=2, allow_nan=False)
    return _SPREAD.sub(lambda found: "[" + re.sub(r",\n\s*", ", ", found[1]) + "]", text) + "\n"


def result_schema() -> dict[str, Any]:
    """Return the JSON Schema of the documents that `to_json` makes."""
    text = (files("torsionfe.output") / "schema" / f"result-{SCHEMA_VERSION}.json").read_text(encoding="utf-8")
    return dict(json.loads(text))


def outline_of(document: Mapping[str, Any]) -> Outline:
    """Return the section that a document describes, to the last digit.

    Raises
    ------
    InputError
        No document of this schema, or of a later version.
    """
    if document.get("schema") != SCHEMA_NAME or document.get("schema_version") != SCHEMA_VERSION:
        found = f"{document.get('schema')!r}, version {document.get('schema_version')!r}"
        raise InputError(f"a document of {SCHEMA_NAME!r}, version {SCHEMA_VERSION}, is needed, got {found:.80}")
    try:
        loops = [Outline(loop["vertices"], loop["bulges"]) for loop in document["solution"]["outline"]["loops"]]
    except (KeyError, TypeError) as error:
        raise InputError(f"the document's outline can't be read: {error}") from None
    if not loops:
        raise InputError("the document's outline has no loops")
    return Outline(loops[0].vertices, loops[0].bulges, voids=loops[1:])


# --- plain data -------------------------------------------------------------------------------------------


def plain_data(value: Any) -> Any:
    """Return a value as what JSON knows: null, truth values, numbers, text, lists and objects.

    Numbers that are not finite become null, arrays lists, dataclasses objects of their public fields; solutions and
    outlines are written as in the schema.

    Raises
    ------
    InputError
        Something else, such as a function.
    """
    if value is None or isinstance(value, (bool, str)):
        return value
    if isinstance(value, (int, float, np.number, np.bool_)):
        number = value.item() if isinstance(value, (np.number, np.bool_)) else value
        return number if not isinstance(number, float) or math.isfinite(number) else None
    converters: tuple[tuple[type, Callable[[Any], Any]], ...] = (
        (TorsionSolution, _solution),
        (Outline, _outline),
        (Bounds, _bounds),
        (np.ndarray, lambda array: plain_data(array.tolist())),
        (Mapping, lambda mapping: {str(key): plain_data(item) for key, item in mapping.items()}),
        (PurePath, str),
    )
    for kind, convert in converters:
        if isinstance(value, kind):
            return convert(value)
    if is_dataclass(value) and not isinstance(value, type):
        names = [field.name for field in fields(value) if not field.name.startswith("_")]
        return {name: plain_data(getattr(value, name)) for name in names}
    if isinstance(value, Iterable):
        return [plain_data(item) for item in value]
    raise InputError(f"{type(value).__name__} can't be written as JSON: numbers, text, arrays and dataclasses can")


def _bounds(bounds: Bounds) -> dict[str, Any]:
    numbers = {"value": bounds.value, "lower": bounds.lower, "upper": bounds.upper, "rel_gap": bounds.rel_gap}
    return {name: plain_data(value) for name, value in numbers.items()}


def _outline(outline: Outline) -> dict[str, Any]:
    loops = [{"vertices": loop.vertices.tolist(), "bulges": loop.bulges.tolist()} for loop in (outline, *outline.voids)]
    measures = {"area": outline.area, "centroid": list(outline.centroid), "bounds": list(outline.bounds)}
    return {"loops": loops, **measures}


def _solution(solution: TorsionSolution, torque: float | None = None) -> dict[str, Any]:
    spots = []
    for spot in solution.hot_spots:
        stress = None if torque is None else abs(torque) * spot.stress_per_torque
        where = {"x": spot.x, "y": spot.y, "stress_per_torque": spot.stress_per_torque, "rel_error": spot.rel_error}
        spots.append({**where, "stress": stress})
    body = {
        "outline": solution.outline,
        "torsion_constant": solution.torsion_constant,
        "section_modulus": solution.section_modulus,
        "hot_spots": spots,
        "singular_corners": solution.singular_corners,
        "corner_stresses": solution.corner_stresses,
        "warping_constant": solution.warping_constant,
        "warping_extremes": solution.warping_extremes,
        "centre_of_twist": solution.centre_of_twist,
        "converged": solution.converged,
        "shortfall": solution.shortfall,
        "order": solution.order,
        "passes": solution.passes,
    }
    return {name: plain_data(value) for name, value in body.items()}
