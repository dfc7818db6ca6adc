"""The hand method that a job asks for: plates of its shape, plates found in its outline, plates given, or cells."""

from __future__ import annotations

from dataclasses import dataclass

from torsionfe.closed_form.cells import CellSum, ThinCells, cell_sum
from torsionfe.closed_form.derive import DERIVED, derive_plates
from torsionfe.closed_form.plates import PlateSet, PlateSum, plate_sum
from torsionfe.errors import InputError
from torsionfe.job.job import Hand, Job
from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes import TradeShape

__all__ = ["HandAnswer", "hand_answers"]


@dataclass(frozen=True)
class HandAnswer:
    """The hand method's answer by one idealisation.

    Attributes
    ----------
    name : str
        Of the idealisation.
    plates : PlateSet
        What was summed, to be drawn; derived plates where thin cells were summed.
    answer : PlateSum or CellSum
    """

    name: str
    plates: PlateSet
    answer: PlateSum | CellSum

    @property
    def torsion_constant(self) -> float:
        """For twist, length**4."""
        return self.answer.torsion_constant if isinstance(self.answer, CellSum) else self.answer.torsion_constant_twist

    @property
    def stress_per_torque(self) -> float:
        """The largest stress for unit torque, 1/length**3."""
        return 1.0 / self.answer.section_modulus

    @property
    def governing(self) -> str:
        """The plate, wall or fin with that stress, in words."""
        if isinstance(self.answer, CellSum):
            return self.answer.governing
        return self.answer.plates[self.answer.governing].label(self.answer.governing)

    @property
    def notes(self) -> tuple[str, ...]:
        """What the reader of the result has to know."""
        return self.answer.notes


def hand_answers(job: Job) -> tuple[HandAnswer, ...]:
    """Return the hand method's answer by each idealisation that a job names; none where the job wants none.

    Raises
    ------
    InputError
        The shape is no set of plates, but the job says that it is; no plates are found in the outline.
    """
    hand, outline = job.hand, job.section.outline
    if hand.plates == "none":
        return ()
    if isinstance(hand.plates, tuple):
        plates = PlateSet(hand.plates)
        return (HandAnswer("given by hand", plates, plate_sum(plates, hand.rule, "given by hand")),)
    try:
        if hand.plates == "derive" or not isinstance(outline, TradeShape):
            return _derived(outline, hand)
        return _of_shape(outline, hand)
    except InputError as error:
        if hand.plates == "auto":  # a shaft, say: nobody asked for plates
            return ()
        raise InputError(f"compare.plates = {hand.plates!r}: {error}") from error


def _of_shape(shape: TradeShape, hand: Hand) -> tuple[HandAnswer, ...]:
    try:
        sets = [shape.plates(name) for name in hand.idealisations]
    except InputError as error:
        try:
            cells = shape.thin_cells()
        except InputError:
            raise error from None
        return (_cells("thin cells", derive_plates(shape), cells, hand),)
    return tuple(HandAnswer(plates.idealisation, plates, plate_sum(plates, hand.rule)) for plates in sets)


def _derived(outline: Outline, hand: Hand) -> tuple[HandAnswer, ...]:
    found = []
    for name in [name for name in hand.idealisations if name in DERIVED]:
        plates = derive_plates(outline, name)
        if plates.cells is not None:
            found.append(_cells(f"thin cells, fins by {name.replace('_', ' ')}", plates, plates.cells, hand))
        elif plates.plates:
            found.append(HandAnswer(name, plates, plate_sum(plates, hand.rule)))
        else:
            raise InputError("no part of the section is a plate; say plates = 'none', or list the plates")
    return tuple(found)


def _cells(name: str, plates: PlateSet, cells: ThinCells, hand: Hand) -> HandAnswer:
    return HandAnswer(name, plates, cell_sum(cells, hand.rule))
