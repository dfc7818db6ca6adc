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
from torsionfe.job.job import Hand, Heading, Job, JobBar, Material, Outputs, Segment, SheetChoice, SweepPlan, Tolerance
from torsionfe.job.keys import KEYS, SHEET_SECTIONS, SWEEP_MAPS, shape_keys
from torsionfe.job.lines import key_lines
from torsionfe.job.places import MOST_BYTES, InputFile, read_bytes
from torsionfe.job.section import JobSection, read_section
from torsionfe.job.table import Source, Table
from torsionfe.member.bar import TorqueCase
from torsionfe.member.margins import CRITERIA, Allowables
from torsionfe.quantities import UnitSystem

__all__ = ["read_job"]

_PLATES = ("auto", "shape", "derive", "none")
_MOST_VALUES = 10_000


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
        hand=_hand(top, section),
        tolerance=_tolerance(top),
        sheet=_sheet(top),
        outputs=_outputs(top),
        sweep=_sweep(top, section),
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
    modulus = table.quantity("shear_modulus", "stress")
    if modulus is not None and not modulus > 0.0:
        raise table.error("shear_modulus", f"{table.name('shear_modulus')} must be greater than 0, got {modulus:g}")
    numbers = [key for key in table.data if key not in ("name", "source", "criterion")]
    if numbers and not table.text("source", longest=500).strip():
        raise table.error(
            "", "[material] needs 'source': name the standard, data sheet or test that its numbers come from"
        )
    allowables = _allowables(table, twist, rate, bar)
    return Material(table.text("name"), table.text("source", longest=500), modulus, allowables)


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
    return JobBar(segments, (0,) if held is None else held)


def _segment(row: Table, k: int, material: Material) -> Segment:
    row.need("length")
    own = _above_zero(row, "shear_modulus") if "shear_modulus" in row else _modulus(row, material)
    section = read_section(row) if "outline" in row else None
    return Segment(row.text("name", str(k)), _above_zero(row, "length"), own, section)


def _above_zero(table: Table, key: str) -> float:
    value = table.needed(key, "stress" if key == "shear_modulus" else "length")
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


# --- sweep --------------------------------------------------------------------------------------------------


def _sweep(top: Table, section: JobSection) -> SweepPlan | None:
    table = top.table("sweep", list(KEYS["sweep"]))
    if table is None:
        return None
    table.need("grid")
    if not section.shape:
        raise table.error("", "[sweep] varies the dimensions of a trade shape: set outline.shape")
    if "fillets" in top.data["outline"]:
        raise table.error("", "[sweep] can't vary a shape with outline.fillets: use the shape's own radii")
    kinds = shape_keys(section.shape)
    allowed = [key for key, (kind, _) in kinds.items() if kind != "voids"]
    grid = table.table("grid", allowed)
    if grid is None or not grid.data:
        raise table.error("grid", f"sweep.grid is empty: name a dimension, one of {', '.join(allowed)}")
    values = {key: _values(grid, key, kinds[key][0]) for key in grid.data}
    total = 1
    for column in values.values():
        total *= len(column)
    if total > 1_000_000:
        raise table.error("grid", f"sweep.grid has {total} sections; 1000000 at most")
    return SweepPlan(values, table.choices("maps", SWEEP_MAPS, SWEEP_MAPS[:4]))


def _values(grid: Table, key: str, kind: str) -> tuple[float, ...]:
    given = grid.data[key]
    measured = "length" if kind == "length" else "number"
    if isinstance(given, list):
        if not 1 <= len(given) <= _MOST_VALUES:
            raise grid.error(key, f"{grid.name(key)} must have 1 to {_MOST_VALUES} values, got {len(given)}")
        found = [_value(grid, (key, k), item, measured) for k, item in enumerate(given)]
        if len(set(found)) < len(found):
            raise grid.error(key, f"{grid.name(key)} has a value twice")
        return tuple(found)
    table = grid.table(key, list(KEYS["sweep.grid.*"]))
    assert table is not None
    table.need("from", "to", "count")
    if kind == "whole":
        raise grid.error(key, f"{grid.name(key)} counts something: list its values, [2, 3, 4]")
    first, last = (_value(table, (end,), table.data[end], measured) for end in ("from", "to"))
    count = table.whole("count", 2, 2, _MOST_VALUES)
    ratio = table.choice("spacing", ("even", "ratio"), "even") == "ratio"
    if first == last or (ratio and min(first, last) <= 0.0):
        raise table.error("to", f"{table.name()}: 'from' and 'to' must differ, and be above 0 for spacing = 'ratio'")
    steps = [k / (count - 1) for k in range(count)]
    if ratio:
        found = [first * (last / first) ** step for step in steps]
    else:
        found = [(1.0 - step) * first + step * last for step in steps]
    return tuple(float(f"{value:.12g}") for value in found)  # 8, not 7.999999999999999


def _value(table: Table, path: tuple[str | int, ...], given: Any, kind: str) -> float:
    if kind == "length":
        return table.measure(path, given, kind)
    if isinstance(given, bool) or not isinstance(given, (int, float)):
        name = table.name(str(path[0]))
        raise table.source.error((*table.path, *path), f"{name} must be plain numbers, got {given!r:.60}")
    return float(given)


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
