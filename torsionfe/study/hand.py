"""The hand method in all its forms, each as one answer with a name: plates, plates found in the outline, thin cells."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Any

from torsionfe.closed_form.cells import CellSum, ThinCells, cell_sum
from torsionfe.closed_form.derive import DERIVED, derive_plates
from torsionfe.closed_form.derived import DerivedPlates
from torsionfe.closed_form.plates import Plate, PlateSet, PlateSum, plate_sum
from torsionfe.closed_form.rectangle import CoefficientTable
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes import TradeShape

__all__ = ["HandMethod", "derived_methods", "hand_methods", "shape_methods"]

Rule = str | CoefficientTable
Answer = PlateSum | CellSum


@dataclass(frozen=True)
class HandMethod:
    """The hand method's answer by one idealisation.

    Attributes
    ----------
    name : str
        Of the idealisation.
    answer : PlateSum or CellSum
    plates : PlateSet or None
        What was summed, to be drawn; derived plates where thin cells were summed, None where nobody placed them.
    """

    name: str
    answer: PlateSum | CellSum
    plates: PlateSet | None = None

    @property
    def torsion_constant(self) -> float:
        """For twist, length**4."""
        return self.answer.torsion_constant if isinstance(self.answer, CellSum) else self.answer.torsion_constant_twist

    @property
    def torsion_constant_stress(self) -> float:
        """For stress, length**4: that for twist where cells have but one."""
        return self.answer.torsion_constant if isinstance(self.answer, CellSum) else self.answer.torsion_constant_stress

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


def shape_methods(
    shape: TradeShape, names: Iterable[str] | None = None, rule: Rule = "series"
) -> tuple[HandMethod, ...]:
    """Return the hand method for a trade shape by each idealisation named (all by default), or its thin cells.

    Raises
    ------
    InputError
        The shape is neither a set of plates nor of thin cells, or has none by such a name.
    """
    from torsionfe.closed_form.idealise import idealisations

    try:
        if names is None:
            found = _different(idealisations(shape.kind, shape.dimensions))
        else:
            found = {name: shape.plates(name) for name in names}
    except InputError as error:
        try:
            cells = shape.thin_cells()
        except InputError:
            raise error from None
        return (HandMethod("thin cells", cell_sum(cells, rule), derive_plates(shape)),)
    return tuple(HandMethod(name, plate_sum(plates, rule), plates) for name, plates in found.items())


def _different(sets: Mapping[str, PlateSet]) -> dict[str, PlateSet]:
    """Return the sets that differ from those before them: a lone rectangle has but one."""
    seen: dict[tuple[Plate, ...], str] = {}
    for name, plates in sets.items():
        seen.setdefault(plates.plates, name)
    return {name: sets[name] for name in seen.values()}


def derived_methods(
    outline: Outline, names: Iterable[str] = ("centreline",), rule: Rule = "series"
) -> tuple[HandMethod, ...]:
    """Return the hand method by the plates and cells found along the section's medial axis.

    Raises
    ------
    InputError
        No part of the section is a plate; no such idealisation.
    """
    return tuple(_derived(derive_plates(outline, name), name, rule) for name in names if name in DERIVED)


def _derived(plates: DerivedPlates, name: str, rule: Rule) -> HandMethod:
    if plates.cells is not None:
        fins = f", fins by {name.replace('_', ' ')}" if plates.cells.fins else ""
        return HandMethod(f"thin cells{fins}", cell_sum(plates.cells, rule), plates)
    if plates.plates:
        return HandMethod(name, plate_sum(plates, rule), plates)
    raise InputError("no part of the section is a plate: list the plates, or leave the hand method out")


def hand_methods(outline: Outline, given: Any = None, rule: Rule = "series") -> tuple[HandMethod, ...]:
    """Return the hand method's answers from whatever describes them.

    Parameters
    ----------
    outline : Outline
    given : None, HandMethod, PlateSum, CellSum, ThinCells, DerivedPlates, iterable of Plate, or mapping to these
        None takes every idealisation of a trade shape, or what is found in any other outline.
    rule : str or CoefficientTable
        Coefficients, where they are not chosen yet: see `torsionfe.rectangle_coefficients`.

    Raises
    ------
    InputError
        Something else; no plates at all.
    """
    if given is None:
        if isinstance(outline, TradeShape):
            try:
                return shape_methods(outline, None, rule)
            except InputError:  # a shaft, say: plates may be found in it all the same
                pass
        return derived_methods(outline, rule=rule)
    if isinstance(given, Mapping):
        if not given:
            raise InputError("plates is an empty mapping: name one idealisation or more")
        return tuple(_one(item, rule, str(name)) for name, item in given.items())
    return (_one(given, rule, ""),)


def _one(given: Any, rule: Rule, name: str) -> HandMethod:
    if isinstance(given, HandMethod):
        return replace(given, name=name or given.name)
    if isinstance(given, PlateSum):
        plates = PlateSet(given.plates, given.idealisation)
        return HandMethod(name or given.idealisation or "given by hand", given, plates)
    if isinstance(given, CellSum):
        return HandMethod(name or "thin cells", given)
    if isinstance(given, ThinCells):
        return HandMethod(name or "thin cells", cell_sum(given, rule))
    if isinstance(given, DerivedPlates):
        found = _derived(given, given.idealisation, rule)
        return HandMethod(name or found.name, found.answer, given)
    answer = plate_sum(given, rule)
    plates = given if isinstance(given, PlateSet) else PlateSet(answer.plates)
    return HandMethod(name or plates.idealisation or "given by hand", answer, plates)
