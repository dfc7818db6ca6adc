"""The hand method that a job asks for: plates of its shape, plates found in its outline, plates given, or cells."""

from __future__ import annotations

from torsionfe.closed_form.plates import PlateSet, plate_sum
from torsionfe.errors import InputError
from torsionfe.job.job import Job
from torsionfe.outline.shapes import TradeShape
from torsionfe.study.compare import Comparison, compare
from torsionfe.study.hand import HandMethod, derived_methods, shape_methods
from torsionfe.torsion.solution import TorsionSolution

__all__ = ["compared"]


def compared(job: Job, solution: TorsionSolution) -> Comparison | None:
    """Return the hand method by each idealisation that a job names beside its answer; None where it wants none.

    Raises
    ------
    InputError
        The shape is no set of plates, but the job says that it is; no plates are found in the outline.
    """
    methods = _methods(job)
    return compare(solution, {method.name: method for method in methods}) if methods else None


def _methods(job: Job) -> tuple[HandMethod, ...]:
    hand, outline = job.hand, job.section.outline
    if hand.plates == "none":
        return ()
    if isinstance(hand.plates, tuple):
        plates = PlateSet(hand.plates)
        return (HandMethod("given by hand", plate_sum(plates, hand.rule, "given by hand"), plates),)
    try:
        if hand.plates == "derive" or not isinstance(outline, TradeShape):
            return derived_methods(outline, hand.idealisations, hand.rule)
        return shape_methods(outline, hand.idealisations, hand.rule)
    except InputError as error:
        if hand.plates == "auto":  # a shaft, say: nobody asked for plates
            return ()
        raise InputError(f"compare.plates = {hand.plates!r}: {error}") from error
