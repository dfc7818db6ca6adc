"""What a worker does: one section solved, and its row of the table."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Mapping
from dataclasses import dataclass
from time import perf_counter
from types import MappingProxyType
from typing import Any

from torsionfe.checks import Floats
from torsionfe.closed_form.cells import cell_sum
from torsionfe.closed_form.plates import plate_sum
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes.trade import TradeShape
from torsionfe.study.blas import one_thread
from torsionfe.torsion.solve import checked_settings, solve_torsion

__all__ = ["FAILED", "LOST", "NUMBERS", "OK", "SHORT", "WORDS", "Parcel", "Row", "Settings", "failure", "solve_parcel"]

#: What became of a section.
OK, SHORT, FAILED, LOST = "ok", "not converged", "failed", "worker died"

#: Columns that hold numbers, NaN where there is none, with what they mean.
NUMBERS: Mapping[str, str] = MappingProxyType(
    {
        "torsion_constant": "J, length**4",
        "torsion_constant_lower": "its proven lower bound, length**4",
        "torsion_constant_upper": "its proven upper bound, length**4",
        "hot_spot_x": "place of the largest finite stress, length",
        "hot_spot_y": "place of the largest finite stress, length",
        "stress_per_torque": "largest finite shear stress for unit torque, 1/length**3",
        "stress_rel_error": "its estimated relative error",
        "section_modulus": "W_t, length**3",
        "singular_corners": "sharp re-entrant corners, where the stress is unbounded",
        "hand_torsion_constant": "J by the hand method, length**4",
        "hand_error": "relative error of the hand method's J",
        "hand_section_modulus": "W_t by the hand method, length**3",
        "hand_stress_error": "relative error of the hand method's peak stress",
        "area": "length**2",
        "seconds": "time of solving",
    }
)
#: Columns that hold words.
WORDS: Mapping[str, str] = MappingProxyType(
    {
        "hand_method": "thin plates, thin cells, or empty",
        "status": f"{OK}, {SHORT}, {FAILED} or {LOST}",
        "error": "what went wrong",
    }
)

Row = dict[str, Any]

_ANY = Outline([(0.0, 0.0), (1.0, 0.0), (0.0, 1.0)])


@dataclass(frozen=True, slots=True)
class Settings:
    """How each section is solved: see `torsionfe.solve_torsion`."""

    rel_tol: float
    order: int
    peak_tol: float
    max_unknowns: int

    def __post_init__(self) -> None:
        tolerance, peak = checked_settings(_ANY, self.rel_tol, self.order, self.peak_tol, self.max_unknowns)
        for name, value in (("rel_tol", tolerance), ("order", int(self.order)), ("peak_tol", peak)):
            object.__setattr__(self, name, value)


@dataclass(frozen=True, slots=True)
class Parcel:
    """An outline as it travels to a worker: its numbers, which aren't checked again when it arrives.

    Attributes
    ----------
    vertices, bulges : ndarray
        Of the outer loop.
    voids : tuple of Parcel
    kind : str
        Of a trade shape; empty for a plain outline.
    dimensions : dict
    """

    vertices: Floats
    bulges: Floats
    voids: tuple[Parcel, ...] = ()
    kind: str = ""
    dimensions: tuple[tuple[str, float], ...] = ()

    @classmethod
    def of(cls, outline: Outline) -> Parcel:
        """Return the parcel of an outline."""
        voids = tuple(cls.of(void) for void in outline.voids)
        if isinstance(outline, TradeShape):
            return cls(outline.vertices, outline.bulges, voids, outline.kind, tuple(outline.dimensions.items()))
        return cls(outline.vertices, outline.bulges, voids)

    def opened(self) -> Outline:
        """Return the outline."""
        outline = Outline.__new__(Outline)
        for name, value in (
            ("vertices", self.vertices),
            ("bulges", self.bulges),
            ("voids", tuple(void.opened() for void in self.voids)),
        ):
            object.__setattr__(outline, name, value)
        for array in (self.vertices, self.bulges):
            array.flags.writeable = False
        return TradeShape(outline, self.kind, dict(self.dimensions)) if self.kind else outline

    def digest(self) -> bytes:
        """Return 16 bytes that stand for the section: the same for the same numbers, on every machine."""
        found = hashlib.sha256()
        self._feed(found)
        return found.digest()[:16]

    def _feed(self, found: Any) -> None:
        head = (len(self.vertices), len(self.voids), self.kind, self.dimensions)
        found.update(repr(head).encode())
        found.update(self.vertices.astype("<f8").tobytes())
        found.update(self.bulges.astype("<f8").tobytes())
        for void in self.voids:
            void._feed(found)


def solve_parcel(parcel: Parcel, settings: Settings) -> Row:
    """Return the row of a section; where it can't be solved, the row says why.

    Raises
    ------
    MemoryError
        Another worker may have more.
    """
    started = perf_counter()
    try:
        with one_thread():
            row = _solved(parcel.opened(), settings)
    except MemoryError:
        raise
    except Exception as error:  # one bad section is a row, never the end of the run
        row = failure(error)
    return row | {"seconds": perf_counter() - started}


def failure(error: BaseException, status: str = FAILED) -> Row:
    """Return the row of a section that has no answer."""
    return {"status": status, "error": f"{type(error).__name__}: {error}"}


def _solved(outline: Outline, settings: Settings) -> Row:
    solution = solve_torsion(
        outline,
        settings.rel_tol,
        settings.order,
        peak_tol=settings.peak_tol,
        max_unknowns=settings.max_unknowns,
    )
    constant, spot = solution.torsion_constant, solution.hot_spot
    row: Row = {
        "torsion_constant": constant.value,
        "torsion_constant_lower": constant.lower,
        "torsion_constant_upper": constant.upper,
        "section_modulus": solution.section_modulus,
        "singular_corners": len(solution.singular_corners),
        "area": outline.area,
        "status": OK if solution.converged else SHORT,
        "error": solution.shortfall,
    }
    if spot is not None:
        row["hot_spot_x"], row["hot_spot_y"] = spot.x, spot.y
        row["stress_per_torque"], row["stress_rel_error"] = spot.stress_per_torque, spot.rel_error
    return row | _by_hand(outline, constant.value, solution.section_modulus)


def _by_hand(outline: Outline, torsion_constant: float, section_modulus: float) -> Row:
    """Return what the hand method says of a trade shape, and how far off it is; nothing where it has no say."""
    if not isinstance(outline, TradeShape):
        return {}
    try:
        plates = plate_sum(outline.plates())
        method, constant, modulus = "thin plates", plates.torsion_constant_twist, plates.section_modulus
    except InputError:  # no set of plates
        try:
            cells = cell_sum(outline.thin_cells())
        except InputError:  # nor thin cells
            return {}
        method, constant, modulus = "thin cells", cells.torsion_constant, cells.section_modulus
    return {
        "hand_method": method,
        "hand_torsion_constant": constant,
        "hand_error": constant / torsion_constant - 1.0,
        "hand_section_modulus": modulus,
        "hand_stress_error": section_modulus / modulus - 1.0 if modulus else math.nan,
    }
