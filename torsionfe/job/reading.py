"""A job file, from bytes to a checked `Job`."""

from __future__ import annotations

import datetime
import hashlib
import os
import re
import tomllib
from dataclasses import replace
from pathlib import Path
from typing import Any

from torsionfe.closed_form.derive import DERIVED
from torsionfe.closed_form.idealise import IDEALISATIONS
from torsionfe.closed_form.plates import Plate
from torsionfe.closed_form.rectangle import RULES
from torsionfe.errors import JobError
from torsionfe.job.job import Column, Hand, Heading, Job, JobBar, Material, Outputs, Segment, SheetChoice, Tolerance
from torsionfe.job.keys import KEYS, SHEET_SECTIONS
from torsionfe.job.lines import key_lines
from torsionfe.job.places import MOST_BYTES, InputFile, read_bytes
from torsionfe.job.section import JobSection, read_section
from torsionfe.job.table import Source, Table
from torsionfe.job.varying import read_sensitivity, read_sweep
from torsionfe.member.bar import TorqueCase
from torsionfe.member.margins import CRITERIA, Allowables
from torsionfe.member.restrained import ENDS
from torsionfe.quantities import UnitSystem

__all__ = ["read_job"]

_PLATES = ("auto", "shape", "derive", "none")


def read_job(path: str | os.PathLike[str]) -> Job:
    """Return the job that a TOML file describes.

    Parameters
    ----------
    path : path
        Of the job file. Files that it names are found relative to it, and only beside it, below it, or in the
        folders that it names.

    Returns
    -------
    Job

    Raises
    ------
    JobError
        Anything in the file that is not allowed; the message names line, key, what was found, what is allowed.
    InputError
        There is no such file, or it is too large.
    """
    file = Path(path)
    data = read_bytes(file, MOST_BYTES)
    source, content = _parsed(file, data)
    top = Table(source, (), content, list(KEYS[""]))
    top.need("title", "unit", "outline")
    with top.blame_plain("unit"):
        unit = top.text("unit")
        source.system = UnitSystem(unit, top.text("force")) if unit else source.system
    if not unit:
        raise top.error("unit", "unit must be a unit of length, such as 'mm'")
    source.folders += _folders(top)
    section = read_section(top)
    bar_table = top.table("bar", list(KEYS["bar"]))
    material = _material(top, bar_table)
    bar = _bar(bar_table, material) if bar_table is not None else None
    cases = _cases(top, 1 if bar is None else len(bar.segments))
    job = Job(
        path=file,
        heading=_heading(top),
        system=source.system,
        section=section,
        material=material,
        cases=cases,
        bar=bar,
        column=_column(top, material, bar),
        hand=_hand(top, section),
        sensitivity=read_sensitivity(top, section),
        tolerance=_tolerance(top),
        sheet=_sheet(top),
        outputs=_outputs(top),
        sweep=read_sweep(top, section),
        stated=tuple(source.stated),
        files=_files(file, data, section, bar),
    )
    _refuse_incomplete(top, job)
    return job


def _parsed(file: Path, data: bytes) -> tuple[Source, dict[str, Any]]:
    try:
        text = data.decode("utf-8-sig").replace("\r\n", "\n")
        content = tomllib.loads(text)
    except UnicodeDecodeError as error:
        line = data.count(b"\n", 0, error.start) + 1
        raise JobError(f"{file.name}, line {line}: the file is no text in UTF-8", line) from None
    except tomllib.TOMLDecodeError as error:
        found = re.search(r"\(at line (\d+), column (\d+)\)", str(error))
        line = int(found[1]) if found else text.count("\n") + 1
        why = re.sub(r"\s*\(at .*\)\s*$", "", str(error))
        raise JobError(f"{file.name}, line {line}: this is no valid TOML: {why}", line) from None
    except (RecursionError, ValueError) as error:  # brackets in brackets; whole numbers of thousands of digits
        raise JobError(f"{file.name}: this is no valid TOML: {error}") from None
    return Source(file, key_lines(text)), content


def _folders(top: Table) -> list[Path]:
    here = top.source.path.parent
    found = []
    for name in top.texts("folders"):
        folder = Path(os.path.realpath(here / name)) if "\0" not in name else here / "\N{REPLACEMENT CHARACTER}"
        if not folder.is_dir():
            raise top.error("folders", f"folders: there is no folder {name!r} (looked for {str(folder)!r})")
        found.append(folder)
    return found


def _files(file: Path, data: bytes, section: JobSection, bar: JobBar | None) -> tuple[InputFile, ...]:
    own = InputFile(file.name, hashlib.sha256(data).hexdigest())
    sections = [section, *(part.section for part in (bar.segments if bar else ()) if part.section is not None)]
    others = {item.file.name: item.file for item in sections if item.file is not None}
    return (own, *others.values())


# --- words --------------------------------------------------------------------------------------------------


def _heading(top: Table) -> Heading:
    date = top.data.get("date", "")
    if isinstance(date, (datetime.date, datetime.datetime)):
        top.data = {**top.data, "date": date.isoformat(" ") if isinstance(date, datetime.datetime) else str(date)}
    title = top.text("title", longest=1000)
    if not title.strip():
        raise top.error("title", "title must not be empty")
    names = {key: top.text(key, longest=1000) for key in ("author", "checker", "revision", "date")}
    return Heading(title, remarks=top.text("remarks", longest=4000), **names)


# --- material, cases, bar -----------------------------------------------------------------------------------


def _material(top: Table, bar: Table | None) -> Material:
    table = top.table("material", list(KEYS["material"]))
    twist = rate = None
    if bar is not None:
        twist, rate = bar.quantity("allowed_twist", "angle"), bar.quantity("allowed_twist_rate", "twist rate")
    if table is None:
        return Material(allowables=_allowables(None, twist, rate, bar))
    shear, elastic = (table.quantity(key, "stress") for key in ("shear_modulus", "elastic_modulus"))
    for key, modulus in (("shear_modulus", shear), ("elastic_modulus", elastic)):
        if modulus is not None and not modulus > 0.0:
            raise table.error(key, f"{table.name(key)} must be greater than 0, got {modulus:g}")
    if shear is not None and elastic is not None and elastic <= shear:
        raise table.error("elastic_modulus", "elastic_modulus is not above shear_modulus: are they exchanged?")
    numbers = [key for key in table.data if key not in ("name", "source", "criterion")]
    if numbers and not table.text("source", longest=500).strip():
        raise table.error(
            "", "[material] needs 'source': name the standard, data sheet or test that its numbers come from"
        )
    allowables = _allowables(table, twist, rate, bar)
    return Material(table.text("name"), table.text("source", longest=500), shear, allowables, elastic)


def _allowables(table: Table | None, twist: float | None, rate: float | None, bar: Table | None) -> Allowables | None:
    keys = ("shear_yield", "shear_ultimate", "tensile_yield", "tensile_ultimate")
    given = {key: table.quantity(key, "stress") for key in keys if key in table} if table is not None else {}
    tension = [key for key in given if key.startswith("tensile")]
    shear = [key for key in given if key.startswith("shear")]
    holder = table if given else bar
    if holder is None or not (given or twist is not None or rate is not None):
        return None
    if tension and shear:
        raise holder.error(tension[0], f"give strengths in shear or in tension, not both: {shear[0]}, {tension[0]}")
    with holder.blame(next(iter(given), "")):
        if tension and table is not None:
            if "criterion" not in table:
                raise table.error(tension[0], "tensile strengths need criterion = 'von Mises' or 'Tresca'")
            return Allowables.from_tension(
                given.get("tensile_yield"),
                given.get("tensile_ultimate"),
                criterion=table.choice("criterion", tuple(CRITERIA)),
                twist=twist,
                twist_rate=rate,
            )
        return Allowables(given.get("shear_yield"), given.get("shear_ultimate"), twist, rate)


def _cases(top: Table, segments: int) -> tuple[TorqueCase, ...]:
    found = []
    for k, table in enumerate(top.tables("cases", list(KEYS["cases"]))):
        name = table.text("name", str(k + 1))
        stations = table.tables("at", list(KEYS["cases.at"]))
        if bool(stations) == ("torque" in table):
            raise table.error("", f"{table.name()} needs 'torque', or torques at stations, [[cases.at]]; one of them")
        torque: float | dict[int, float] = {}
        for row in stations:
            row.need("station", "torque")
            station = row.whole("station", 0, 0, segments)
            assert isinstance(torque, dict)
            torque[station] = torque.get(station, 0.0) + row.needed("torque", "torque")
            stated = top.source.stated
            stated[-1] = replace(stated[-1], path=(*table.path, f"torque at station {station}"))
        if not stations:
            torque = table.needed("torque", "torque")
        with table.blame():
            limit, ultimate = table.number("limit_factor", 1.0), table.number("ultimate_factor", 1.5)
            found.append(TorqueCase(name, torque, limit, ultimate))
    names = [case.name for case in found]
    for k, name in enumerate(names):
        if name in names[:k]:
            raise top.source.error(("cases", k, "name"), f"two cases are called {name!r:.80}: give each its own name")
    return tuple(found)


def _bar(table: Table, material: Material) -> JobBar:
    rows = table.tables("segments", list(KEYS["bar.segments"]), most=100)
    if bool(rows) == ("length" in table):
        raise table.error("", "[bar] needs 'length', or segments, [[bar.segments]]; one of them")
    segments = tuple(_segment(row, k, material) for k, row in enumerate(rows))
    if not rows:
        segments = (Segment("", _above_zero(table, "length"), _modulus(table, material)),)
    held = table.wholes("held")
    for station in held or ():
        if station > len(segments):
            raise table.error("held", f"bar.held: there is no station {station}, only 0 to {len(segments)}")
    if held is not None and not held:
        raise table.error("held", "bar.held is empty: at least one station must be kept from rotating")
    return JobBar(segments, (0,) if held is None else held, _warping_held(table, material, segments, held))


def _warping_held(table: Table, material: Material, segments: tuple[Segment, ...], held: tuple[int, ...] | None) -> str:
    """Return the ends that cannot warp; the theory here is of one prismatic bar, turned at its far end."""
    if "warping_held" not in table:
        return ""
    ends = table.choice("warping_held", ENDS[1:])
    if len(segments) > 1 or held not in (None, (0,)):
        raise table.error("warping_held", "bar.warping_held needs one bar of one length that is held at station 0 only")
    if material.elastic_modulus is None:
        raise table.error("warping_held", "bar.warping_held needs elastic_modulus in [material]")
    return ends


def _column(top: Table, material: Material, bar: JobBar | None) -> Column | None:
    table = top.table("buckling", list(KEYS["buckling"]))
    if table is None:
        return None
    if material.elastic_modulus is None or material.shear_modulus is None:
        raise table.error("", "[buckling] needs elastic_modulus and shear_modulus in [material]")
    several = bar is not None and len(bar.segments) > 1
    if "length" not in table and (bar is None or several):
        raise table.error("", "[buckling] needs 'length': there is no [bar] of one length to take it from")
    length = _above_zero(table, "length") if "length" in table else bar.segments[0].length  # type: ignore[union-attr]
    force = _above_zero(table, "force", "force") if "force" in table else None
    factor = table.number("length_factor", 1.0)
    if factor <= 0.0:
        raise table.error("length_factor", f"buckling.length_factor must be greater than 0, got {factor:g}")
    return Column(length, factor, force)


def _segment(row: Table, k: int, material: Material) -> Segment:
    row.need("length")
    own = _above_zero(row, "shear_modulus", "stress") if "shear_modulus" in row else _modulus(row, material)
    section = read_section(row) if "outline" in row else None
    return Segment(row.text("name", str(k)), _above_zero(row, "length"), own, section)


def _above_zero(table: Table, key: str, kind: str = "length") -> float:
    value = table.needed(key, kind)
    if value <= 0.0:
        raise table.error(key, f"{table.name(key)} must be greater than 0, got {table.data[key]!r}")
    return value


def _modulus(table: Table, material: Material) -> float:
    if material.shear_modulus is None:
        raise table.error("", f"[{table.name()}] needs a shear modulus: set shear_modulus in [material]")
    return material.shear_modulus


# --- what to do ---------------------------------------------------------------------------------------------


def _hand(top: Table, section: JobSection) -> Hand:
    table = top.table("compare", list(KEYS["compare"]))
    if table is None:
        return Hand()
    plates: str | tuple[Plate, ...]
    if isinstance(table.data.get("plates"), list):
        plates = tuple(_plate(row) for row in table.tables("plates", list(KEYS["compare.plates"])))
        if not plates:
            raise table.error("plates", "compare.plates is empty: name one plate or more, or 'derive'")
        if "idealisations" in table:
            raise table.error("idealisations", "compare.idealisations has no meaning beside a list of plates")
    else:
        plates = table.choice("plates", _PLATES, "auto")
    allowed = DERIVED if plates == "derive" else tuple(IDEALISATIONS)
    named = table.choices("idealisations", allowed, ("centreline",)) or ("centreline",)
    return Hand(plates, named, table.choice("rule", tuple(RULES), "series"))


def _plate(row: Table) -> Plate:
    row.need("width", "thickness")
    with row.blame():
        return Plate(row.needed("width", "length"), row.needed("thickness", "length"), row.text("name"))


def _tolerance(top: Table) -> Tolerance:
    table = top.table("tolerance", list(KEYS["tolerance"]))
    if table is None:
        return Tolerance()
    usual = Tolerance()
    bracket = table.share("torsion_constant", usual.torsion_constant)
    peak = table.share("peak_stress", usual.peak_stress)
    for key, value, least in (("torsion_constant", bracket, 1e-9), ("peak_stress", peak, 1e-5)):
        if not least <= value <= 1.0:
            raise table.error(key, f"{table.name(key)} must be from {least:g} to 1, got {table.data[key]!r}")
    order = table.whole("order", usual.order, 1, 6)
    return Tolerance(bracket, peak, order, table.whole("most_unknowns", usual.most_unknowns, 1_000, 5_000_000))


def _sheet(top: Table) -> SheetChoice:
    table = top.table("sheet", list(KEYS["sheet"]))
    if table is None:
        return SheetChoice("a4", SHEET_SECTIONS)
    paper = table.choice("paper", ("a4", "letter"), "a4")
    chosen = table.choices("sections", SHEET_SECTIONS, SHEET_SECTIONS)
    return SheetChoice(paper, tuple(name for name in SHEET_SECTIONS if name in chosen))


def _outputs(top: Table) -> Outputs:
    table = top.table("outputs", list(KEYS["outputs"]))
    if table is None:
        return Outputs()
    usual = Outputs()
    flags = {key: table.flag(key, getattr(usual, key)) for key in ("html", "pdf", "json", "csv", "fields")}
    return Outputs(**flags, figures=table.choices("figures", ("svg", "pdf", "png"), usual.figures))


# --- what belongs together ----------------------------------------------------------------------------------


def _refuse_incomplete(top: Table, job: Job) -> None:
    if job.cases and job.bar is not None:
        stations = len(job.bar.segments) + 1
        for k, case in enumerate(job.cases):
            applied = case.at_stations(stations)
            if applied.any() and not any(applied[s] for s in range(stations) if s not in job.bar.held):
                raise top.source.error(
                    ("cases", k), f"case {case.name!r:.80} acts at held stations only: it twists nothing"
                )
    if job.bar is not None and not job.cases:
        raise top.error("bar", "[bar] needs a torque: add [[cases]]")
    if job.hand.plates == "shape" and not job.section.shape:
        raise top.source.error(("compare", "plates"), "compare.plates = 'shape' needs outline.shape; or say 'derive'")
    if any(isinstance(case.torque, dict) for case in job.cases) and job.bar is None:
        raise top.source.error(("cases", 0), "torques at stations need a [bar]")
