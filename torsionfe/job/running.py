"""A job, run: every section solved, the bar set against its allowables, the hand method beside it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from torsionfe.errors import InputError
from torsionfe.job.by_hand import compared
from torsionfe.job.job import Job, Tolerance
from torsionfe.member.bar import Bar, BarResponse, SteppedBar
from torsionfe.member.buckling import TorsionalBuckling, torsional_buckling
from torsionfe.member.margins import MarginTable, margins
from torsionfe.member.plastic import PlasticTorque, plastic_torque
from torsionfe.member.restrained import RestrainedBar, restrain
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline
from torsionfe.study.compare import Comparison
from torsionfe.study.dimension import Sensitivity, sensitivity
from torsionfe.torsion.solution import TorsionSolution
from torsionfe.torsion.solve import solve_torsion

__all__ = ["JobResult", "Progress", "run_job"]

#: Called with a line of text as each step begins.
Progress = Callable[[str], object]


@dataclass(frozen=True)
class JobResult:
    """What a job found. `torsionfe.job.content.sheet_of` makes the sheet of it.

    Attributes
    ----------
    job : Job
    solution : TorsionSolution
        Of the job's own section.
    bar : SteppedBar or None
        Its segments hold the solutions of their own sections.
    responses : tuple of BarResponse
        One a case; none without a bar.
    margins : MarginTable or None
        Where there are a bar, cases and allowables.
    plastic : PlasticTorque or None
        Where a yield strength in shear is known.
    hand : Comparison or None
        The hand method beside the answer, by each idealisation; the first one is drawn. None where the job wants none.
    restrained : tuple of RestrainedBar
        One a case, where an end cannot warp.
    buckling : TorsionalBuckling or None
        Where the bar is a column, too.
    sensitivity : Sensitivity or None
        Where the sheet shows it and the section is a trade shape as stated.
    """

    job: Job
    solution: TorsionSolution
    bar: SteppedBar | None
    responses: tuple[BarResponse, ...]
    margins: MarginTable | None
    plastic: PlasticTorque | None
    hand: Comparison | None
    restrained: tuple[RestrainedBar, ...] = ()
    buckling: TorsionalBuckling | None = None
    sensitivity: Sensitivity | None = None

    @property
    def solutions(self) -> tuple[TorsionSolution, ...]:
        """The solution of every section, each once, the job's own first."""
        found = [self.solution]
        for part in self.bar.segments if self.bar else ():
            if isinstance(part.solution, TorsionSolution) and not any(part.solution is known for known in found):
                found.append(part.solution)
        return tuple(found)


def run_job(job: Job, progress: Progress | None = None) -> JobResult:
    """Solve a job.

    Parameters
    ----------
    job : Job
        From `torsionfe.job.reading.read_job`.
    progress : callable, optional
        Called with a line of text as each step begins.

    Returns
    -------
    JobResult

    Raises
    ------
    TorsionError
        A section cannot be meshed or solved.
    """
    say = progress or (lambda line: None)
    known: list[TorsionSolution] = []
    solution = _solved(job.section.outline, job.tolerance, known, say, "the section")
    bar = _bar(job, known, say)
    responses = tuple(bar.response(case) for case in job.cases) if bar is not None else ()
    allowables = job.material.allowables
    found = None
    if bar is not None and job.cases and allowables is not None:
        found = margins(bar, job.cases, allowables)
    plastic = None
    if allowables is not None and allowables.shear_yield is not None:
        say("fully plastic torque")
        plastic = plastic_torque(job.section.outline, allowables.shear_yield, solution)
    say("hand method")
    hand = compared(job, solution)
    restrained, buckling = _restrained(job, bar), _buckling(job, solution)
    effects = _sensitivity(job, solution, say)
    return JobResult(job, solution, bar, responses, found, plastic, hand, restrained, buckling, effects)


def _restrained(job: Job, bar: SteppedBar | None) -> tuple[RestrainedBar, ...]:
    modulus = job.material.elastic_modulus
    if bar is None or job.bar is None or not job.bar.warping_held or modulus is None:
        return ()
    only = bar.segments[0]
    torques = [float(case.at_stations(2)[1]) for case in job.cases]
    return tuple(restrain(only, modulus, torque, warping=job.bar.warping_held) for torque in torques)


def _buckling(job: Job, solution: TorsionSolution) -> TorsionalBuckling | None:
    column, elastic, shear = job.column, job.material.elastic_modulus, job.material.shear_modulus
    if column is None or elastic is None or shear is None:
        return None
    try:
        return torsional_buckling(Bar(solution, column.length, shear), elastic, column.length_factor)
    except InputError as error:
        raise InputError(f"[buckling]: {error}; leave the table out") from None


def _sensitivity(job: Job, solution: TorsionSolution, say: Progress) -> Sensitivity | None:
    plan, section = job.sensitivity, job.section
    if "sensitivity" not in job.sheet.sections or not plan.of:
        return None
    say("sensitivity")
    sizes = dict(section.dimensions or {})
    try:
        return sensitivity(getattr(shapes, section.shape), sizes, plan.step, of=plan.of, solution=solution)
    except InputError:  # none of them can be varied: the sheet shows the edges
        return None


def _solved(
    outline: Outline, tolerance: Tolerance, known: list[TorsionSolution], say: Progress, name: str
) -> TorsionSolution:
    """Return the solution of a section, solved once however often it occurs."""
    for solution in known:
        if solution.outline == outline:
            return solution
    say(f"solving {name}")
    solution = solve_torsion(
        outline,
        tolerance.torsion_constant,
        tolerance.order,
        peak_tol=tolerance.peak_stress,
        max_unknowns=tolerance.most_unknowns,
    )
    known.append(solution)
    return solution


def _bar(job: Job, known: list[TorsionSolution], say: Progress) -> SteppedBar | None:
    if job.bar is None:
        return None
    parts = []
    for part in job.bar.segments:
        outline = (part.section or job.section).outline
        solution = _solved(outline, job.tolerance, known, say, f"segment {part.name}")
        parts.append(Bar(solution, part.length, part.shear_modulus, part.name))
    return SteppedBar(parts, job.bar.held)
