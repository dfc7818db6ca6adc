"""The calculation sheet of a job: which sections it has, and what stands in the plain ones.

`torsionfe.job.findings` words the results.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from typing import Any

from torsionfe import __version__
from torsionfe.job import findings
from torsionfe.job.bar_section import bar_section
from torsionfe.job.data import cautions_of
from torsionfe.job.hand_section import hand_references, hand_section
from torsionfe.job.job import Job
from torsionfe.job.keys import KEYS
from torsionfe.job.running import JobResult
from torsionfe.job.sensitivity_section import sensitivity_section
from torsionfe.job.table import Stated
from torsionfe.job.words import between, measured, signed, sure, written_unit
from torsionfe.output.sheet import GUTTER, WIDTH, Beside, Block, Cells, Facts, Lines, Picture, Sheet, SheetSection

__all__ = ["sheet_of", "verdict"]


def sheet_of(result: JobResult) -> Sheet:
    """Return the calculation sheet of a job's result.

    Parameters
    ----------
    result : JobResult

    Returns
    -------
    Sheet
        The same for the same inputs and the same version; it holds no date but the job's own.
    """
    job = result.job
    makers: dict[str, Callable[[], SheetSection | None]] = {
        "section": lambda: _section(job),
        "inputs": lambda: _inputs(job),
        "method": lambda: _method(result),
        "constant": lambda: findings.constant(result),
        "stress": lambda: findings.stress(result),
        "hand": lambda: hand_section(result),
        "bar": lambda: bar_section(result),
        "sensitivity": lambda: sensitivity_section(result),
    }
    chosen = [makers[name]() for name in job.sheet.sections if name in makers]
    last = [_references(result)] if "references" in job.sheet.sections else []
    sections = [_heading(result), *chosen, findings.warnings(result), _cautions(result), *last, _again(job)]
    marks = (f"Revision {job.heading.revision}",) if job.heading.revision else ()
    return Sheet(
        title=job.heading.title,
        marks=marks,
        sections=tuple(section for section in sections if section is not None),
        paper=job.sheet.paper,
        origin=f"torsionfe {__version__}, inputs {job.digest[:16]}",
    )


# --- the head -----------------------------------------------------------------------------------------------


def _heading(result: JobResult) -> SheetSection:
    job = result.job
    head = job.heading
    named = [
        ("revision", head.revision),
        ("author", head.author),
        ("checked by", head.checker or "not stated"),
        ("date", head.date),
        ("remarks", head.remarks),
    ]
    rows = tuple((name, text) for name, text in named if text)
    return SheetSection("", (Facts(rows), Lines(tuple(verdict(result)), "verdict")))


def verdict(result: JobResult) -> Iterator[str]:
    """Yield the answer, a line a fact."""
    solution, system = result.solution, result.job.system
    yield f"Torsion constant J = {between(solution.torsion_constant, system.power(4))}"
    spot = solution.hot_spot
    if spot is not None:
        load = findings.section_torque(result)
        named = f"per torque {sure(spot.stress_per_torque, spot.rel_error, f'1/{system.power(3)}')}"
        if load and load[0]:
            stress = sure(spot.stress_per_torque * load[0], spot.rel_error, system.stress)
            named = f"{stress} in case {load[1]}, before factors"
        beside = "Largest shear stress beside sharp corners" if len(solution.singular_corners) else "Peak shear stress"
        yield f"{beside} {named}"
    if spot is not None and not len(solution.singular_corners):
        yield f"Section modulus W_t = {sure(1.0 / spot.stress_per_torque, spot.rel_error, system.power(3))}"
    if len(solution.singular_corners):
        count = len(solution.singular_corners)
        yield f"{count} sharp re-entrant corner{'s'[: count > 1]}, where the elastic stress is unbounded"
    if result.margins is not None:
        worst = result.margins.governing
        where = f", segment {worst.segment}" if worst.segment and len(result.bar.segments) > 1 else ""  # type: ignore[union-attr]
        size = signed(worst.margin) if worst.defined else worst.note
        yield f"Smallest margin of safety {size}; case {worst.case}{where}, {worst.criterion}"
    held = max(result.restrained, key=lambda one: one.largest_normal_stress[0], default=None)
    if held is not None and held.warps:
        added = measured(held.largest_normal_stress[0], system.stress, 4)
        yield f"Warping held adds normal stress of up to {added}, which is in no margin"
    if result.buckling is not None:
        least = min(result.buckling.load, result.buckling.flexural_load)
        way = "twisting" if result.buckling.torsion_governs else "bending"
        yield f"As a column it buckles elastically by {way}, at {measured(least, system.force, 4)}"
    if any(not one.converged for one in result.solutions):
        yield "The tolerance was not met: see the warnings"


# --- what went in -------------------------------------------------------------------------------------------


def _section(job: Job) -> SheetSection:
    outline, unit = job.section.outline, job.system.length
    x0, y0, x1, y1 = outline.bounds
    edges = outline.edges
    arcs = int((edges.bulge != 0.0).sum())
    x, y = outline.centroid
    rows = [
        ("described by", job.section.source),
        ("overall size", f"{measured(x1 - x0)} × {measured(y1 - y0, unit)}"),
        ("area", measured(outline.area, job.system.power(2))),
        ("centroid", findings.where(job, x, y)),
        ("edges", f"{len(edges) - arcs} straight, {arcs} circular arcs"),
        ("voids", str(len(outline.voids))),
        *(("note", note) for note in job.section.notes),
    ]
    caption = f"The section to scale, axes in {unit}; the numbers are those of its vertices."
    shape = findings.ratio(outline, 0.36 * (WIDTH - GUTTER), around=0.32, beside=0.6, below=0.5)
    picture = Picture("section", caption, lambda canvas: _draw_section(canvas, job), shape)
    return SheetSection("Section", (Beside((picture,), (Facts(tuple(rows)),), 0.36),))


def _draw_section(canvas: Any, job: Job) -> None:
    from torsionfe.output.outline_plot import plot_outline

    plot_outline(job.section.outline, canvas.add_subplot(), unit=job.system.length)


_LONG = 6  # rows: more inputs are set in two columns
_UNITS = {"length": "length", "force": "force", "torque": "torque", "stress": "stress"}


def _inputs(job: Job) -> SheetSection:
    """Return every number of the job file, as it stands there and as it was used."""
    order = list(KEYS[""])
    used = [item for item in job.stated if item.path[0] != "sweep"]
    used.sort(key=lambda item: order.index(str(item.path[0])))
    rows = tuple((_name(job, item), item.text, _used(job, item)) for item in used)
    words = [
        ("material", job.material.name),
        ("source of its numbers", job.material.source),
        ("strengths", job.material.allowables.basis if job.material.allowables else ""),
        ("units", f"{job.system.length}, {job.system.force}; stress in {written_unit(job.system.stress)}"),
    ]
    head = ("input", "as stated", "as used")
    blocks: list[Block] = [Facts(tuple((name, text) for name, text in words if text))]
    if len(rows) > _LONG:
        half = (len(rows) + 1) // 2
        blocks.append(Beside((Cells(head, rows[:half]),), (Cells(head, rows[half:]),)))
    elif rows:
        blocks.append(Cells(head, rows))
    return SheetSection("Inputs", tuple(blocks))


def _name(job: Job, item: Stated) -> str:
    """Return what the sheet calls a number: its table, the name given there, and its key."""
    head, *rest = item.path
    parts = [str(head)] if head != "cases" else ["case"]
    for part in rest:
        if isinstance(part, int):
            if head == "cases" and len(parts) == 1:
                parts.append(job.cases[part].name)
            elif rest[0] == "segments" and job.bar is not None and parts[-1] == "segments":
                parts[-1] = f"segment {job.bar.segments[part].name}"
            else:
                parts[-1] += f" {part}"
        else:
            parts.append(part.replace("_", " "))
    return ", ".join(part.replace("_", " ") if k == 0 else part for k, part in enumerate(parts))


def _used(job: Job, item: Stated) -> str:
    if item.kind == "angle":
        return measured(item.value, "rad")
    if item.kind == "twist rate":
        return measured(item.value, f"rad/{job.system.length}")
    unit = getattr(job.system, _UNITS[item.kind]) if item.kind in _UNITS else ""
    return measured(item.value, unit)


# --- how it was done ----------------------------------------------------------------------------------------


def _method(result: JobResult) -> SheetSection:
    job, order = result.job, result.solution.order
    asked = job.tolerance
    lines = [
        "Saint-Venant's torsion of a prismatic bar, free to warp; linear elastic, homogeneous, isotropic material.",
        f"Stress function (Prandtl) and warping function (Saint-Venant), each by finite elements of degree {order} "
        "on the same mesh; elements on arcs follow the true arc.",
        "Their torsion constants bound the true one from below and above (Prager and Synge); the value given is the "
        "middle. The difference, element by element, says where to refine.",
        "The peak stress comes from the warping function along the boundary, refined around it until it settles; "
        "its error is an estimate, not a bound. Sharp re-entrant corners are left out of it.",
        f"Asked for: bracket of J within {measured(100.0 * asked.torsion_constant)} %, peak stress within "
        f"{measured(100.0 * asked.peak_stress)} %.",
    ]
    if result.margins is not None:
        lines.append(
            "Margins of safety are allowable / applied − 1, with J at its lower bound and the peak stress at the upper "
            "end of its error; limit torque against yield and twist, ultimate torque against the ultimate strength."
        )
    return SheetSection("Method and assumptions", (Lines(tuple(lines), "list"),))


def _cautions(result: JobResult) -> SheetSection:
    return SheetSection("Cautions", (Lines(cautions_of(result), "caution"),))


def _references(result: JobResult) -> SheetSection:
    lines = [
        "Saint-Venant, A. B. de (1855): De la torsion des prismes. Mém. prés. par divers savants 14.",
        "Prandtl, L. (1903): Zur Torsion von prismatischen Stäben. Phys. Z. 4.",
        "Prager, W.; Synge, J. L. (1947): Approximations in elasticity based on the concept of function space. "
        "Q. Appl. Math. 5.",
        "Timoshenko, S. P.; Goodier, J. N.: Theory of Elasticity, 3rd ed. 1970, chapter 10.",
        *hand_references(result),
    ]
    allowables = result.job.material.allowables
    if allowables is not None and "von Mises" in allowables.basis:
        lines.append("Mises, R. von (1913): Mechanik der festen Körper im plastisch-deformablen Zustand. "
                     "Nachr. Ges. Wiss. Göttingen.")
    if allowables is not None and "Tresca" in allowables.basis:
        lines.append("Tresca, H. (1864): Sur l'écoulement des corps solides soumis à de fortes pressions. "
                     "C. R. Acad. Sci. 59.")
    if result.plastic is not None:
        lines.append("Nadai, A. (1923): Der Beginn des Fließvorganges in einem tordierten Stab. Z. angew. Math. "
                     "Mech. 3.")
    if result.restrained:
        lines.append("Vlasov, V. Z. (1940): Thin-walled Elastic Beams.")
    if result.buckling is not None:
        lines.append("Timoshenko, S. P.; Gere, J. M.: Theory of Elastic Stability, 2nd ed. 1961, article 5.4.")
    if "sensitivity" in result.job.sheet.sections:
        lines.append("Hadamard, J. (1908): Sur un problème d'analyse relatif à l'équilibre des plaques élastiques "
                     "encastrées. Mém. prés. par divers savants 33.")
    return SheetSection("References", (Lines(tuple(lines), "list"),))


def _again(job: Job) -> SheetSection:
    files = tuple((file.name, file.sha256) for file in job.files)
    rows = (("program", f"torsionfe {__version__}"), ("digest of the inputs", job.digest))
    how = (
        "Same files, version and libraries: same bytes (torsionfe run). Digests: SHA-256; that of the inputs over the "
        "lines 'digest, two spaces, name'."
    )
    return SheetSection(
        "To make this sheet again", (Facts(rows), Cells(("input file", "SHA-256"), files, words=2), Lines((how,)))
    )
