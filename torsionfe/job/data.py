"""What a job found, as data: the parts of ``result.json``, and tables for spreadsheets."""

from __future__ import annotations

from typing import Any

from torsionfe.cautions import BUCKLING, MARGINS, PLASTIC, RESTRAINT
from torsionfe.job.findings import section_torque
from torsionfe.job.running import JobResult
from torsionfe.member.bar import BarResponse, SteppedBar
from torsionfe.member.restrained import RestrainedBar
from torsionfe.output.result_json import json_text, to_json
from torsionfe.output.tables import Table, csv_text
from torsionfe.study.compare import ComparedMethod
from torsionfe.torsion.sensitivity import boundary_sensitivity

__all__ = ["cautions_of", "csv_files", "result_document"]


def result_document(result: JobResult) -> str:
    """Return ``result.json``: the job's own section after the schema, everything else in its ``parts``."""
    job, load = result.job, section_torque(result)
    parts: dict[str, Any] = {
        "job": {
            "heading": job.heading,
            "units": {"length": job.system.length, "force": job.system.force, "stress": job.system.stress},
            "section": job.section.source,
            "stated": {".".join(map(str, item.path)): {"text": item.text, "value": item.value} for item in job.stated},
            "files": job.files,
            "digest": job.digest,
        },
        "cautions": cautions_of(result),
        "hand_method": [_hand(row) for row in result.hand.methods] if result.hand else [],
    }
    if result.bar is not None:
        parts["bar"] = _bar(result.bar)
        parts["cases"] = [_case(response) for response in result.responses]
    if result.margins is not None:
        parts["margins"] = [{**_fields(row), "largest_torque": row.largest_torque} for row in result.margins]
    if result.plastic is not None:
        parts["plastic"] = {**_fields(result.plastic), "shape_factor": result.plastic.shape_factor}
    if result.restrained:
        parts["restrained_warping"] = [
            _restrained(one, case.name) for one, case in zip(result.restrained, job.cases, strict=True)
        ]
    if result.buckling is not None and job.column is not None:
        parts["buckling"] = {**_fields(job.column), **_fields(result.buckling)}
    if "sensitivity" in job.sheet.sections:
        parts["sensitivity"] = _sensitivity(result)
    torque = load[0] if load else None
    return json_text(to_json(result.solution, unit=job.system.length, torque=torque, parts=parts))


def cautions_of(result: JobResult) -> tuple[str, ...]:
    """Return what the numbers of a job do not cover."""
    more = ((PLASTIC, result.plastic), (RESTRAINT, result.restrained), (BUCKLING, result.buckling))
    return (*MARGINS, *(line for group, there in more if there for line in group))


def _restrained(one: RestrainedBar, case: str) -> dict[str, Any]:
    names = ("elastic_modulus", "torque", "warping", "decay_length", "effect")
    largest = ("largest_twist", "largest_bimoment", "largest_normal_stress")
    found: dict[str, Any] = {"case": case, **{name: getattr(one, name) for name in names}}
    for name in largest:
        value, place = getattr(one, name)
        found[name] = {"value": value, "position": place}
    return found


def _sensitivity(result: JobResult) -> dict[str, Any]:
    """Return what a step on each dimension does, and what moving each edge outward by 1 does."""
    step, effects = result.job.sensitivity.step, result.sensitivity
    dimensions = [_fields(effect) for effect in effects] if effects is not None else []
    return {"step": step, "dimensions": dimensions, "edges": list(boundary_sensitivity(result.solution))}


def _fields(item: Any) -> dict[str, Any]:
    return {name: getattr(item, name) for name in item.__dataclass_fields__}


def _hand(row: ComparedMethod) -> dict[str, Any]:
    method = row.method
    words = ("constant_error", "stiffness", "constant_reason", "stress_error", "strength", "stress_reason")
    return {
        "idealisation": method.name,
        "plates": list(method.plates or ()),
        "torsion_constant": method.torsion_constant,
        "torsion_constant_stress": method.torsion_constant_stress,
        "stress_per_torque": method.stress_per_torque,
        "governing": method.governing,
        **{name: getattr(row, name) for name in words},
        "notes": method.notes,
    }


def _bar(bar: SteppedBar) -> dict[str, Any]:
    segments = [
        {
            "name": bar.label(k),
            "length": part.length,
            "shear_modulus": part.shear_modulus,
            "torsion_constant": part.solution.torsion_constant,
            "section_modulus": part.solution.section_modulus,
            "sharp_re_entrant_corners": len(part.solution.singular_corners),
        }
        for k, part in enumerate(bar.segments)
    ]
    return {"segments": segments, "held": bar.held, "stiffness": bar.stiffness_bounds}


def _case(response: BarResponse) -> dict[str, Any]:
    return {
        "name": response.case.name,
        "limit_factor": response.case.limit_factor,
        "ultimate_factor": response.case.ultimate_factor,
        "torques": response.torques,
        "twists": response.twists,
        "twist_errors": response.twist_errors,
        "reactions": response.reactions,
        "peaks": response.peaks,
    }


def csv_files(result: JobResult) -> dict[str, str]:
    """Return the tables for spreadsheets by the names of their files: the section, and each case and margin."""
    found = {"section.csv": csv_text(result.solution, result.job.system.length)}
    if result.hand is not None:
        found["hand_method.csv"] = csv_text(result.hand)
    if result.responses:
        columns = ("case", "segment", "torque", "twist at end", "twist error", "peak stress", "peak error", "x", "y")
        rows = [
            (response.case.name, response.bar.label(k), float(response.torques[k]), float(response.twists[k + 1]),
             float(response.twist_errors[k + 1]), peak.stress, peak.rel_error, peak.x, peak.y)
            for response in result.responses
            for k, peak in enumerate(response.peaks)
        ]  # fmt: skip
        found["cases.csv"] = csv_text(Table(columns, tuple(rows)))
    if result.margins is not None:
        found["margins.csv"] = csv_text(result.margins)
    if result.sensitivity is not None:
        found["sensitivity.csv"] = csv_text(result.sensitivity)
    return found
