"""Where thin plates may still be used, over a range of dimensions."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from torsionfe.checks import Floats, one_of, positive
from torsionfe.closed_form.derive import derive_plates
from torsionfe.closed_form.idealise import IDEALISATIONS
from torsionfe.closed_form.plates import PlateSet
from torsionfe.errors import InputError, TorsionError
from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes import TradeShape
from torsionfe.study.grid import combinations
from torsionfe.study.hand import HandMethod, hand_methods
from torsionfe.study.sweep import sweep
from torsionfe.study.sweep_table import SweepTable
from torsionfe.text import signed_percent, table

if TYPE_CHECKING:
    from matplotlib.axes import Axes

__all__ = ["JUDGED", "OUTSIDE", "UNDECIDED", "UNKNOWN", "WITHIN", "HandRange", "hand_method_range"]

#: What the hand method is judged by.
JUDGED = ("torsion_constant", "peak_stress")
WITHIN, OUTSIDE, UNDECIDED, UNKNOWN = "within", "outside", "undecided", "no answer"
_SHOWN = 12
_FAILED = 5


@dataclass(frozen=True, eq=False, repr=False)
class HandRange:
    """How far off the hand method is over a range of dimensions. ``print`` shows a summary.

    Attributes
    ----------
    table : SweepTable
        The answers, one row a section, with their bounds.
    constant_low, constant_high : ndarray of shape (n,)
        The error of ``J`` by hand lies between these (ratios, from the bounds of ``J``); NaN without an answer.
    stress_low, stress_high : ndarray of shape (n,)
        The same for the peak stress, from the hot spot's error; NaN where no finite peak exists.
    names : tuple of str
        The hand method's name in each section, empty where it has no answer.
    errors : tuple of str
        Why a section has no answer, solved or by hand; empty where it has both.
    """

    table: SweepTable
    constant_low: Floats
    constant_high: Floats
    stress_low: Floats
    stress_high: Floats
    names: tuple[str, ...]
    errors: tuple[str, ...]

    def error(self, judged: str = "torsion_constant") -> tuple[Floats, Floats]:
        """Return the ends of the error of ``J`` or of the peak stress, each of shape (n,)."""
        if one_of("judged", judged, JUDGED) == "torsion_constant":
            return self.constant_low, self.constant_high
        return self.stress_low, self.stress_high

    def verdicts(self, limit: float, judged: str = "torsion_constant") -> NDArray[np.str_]:
        """Return whether the hand method is within a limit (a ratio, 0.05 for 5 %) in each section, shape (n,).

        ``'within'`` and ``'outside'`` hold whatever the exact value between the bounds is; else it is
        ``'undecided'``, or ``'no answer'``.
        """
        most = positive("limit", limit)
        low, high = self.error(judged)
        worst = np.maximum(np.abs(low), np.abs(high))
        least = np.where((low < 0.0) & (high > 0.0), 0.0, np.minimum(np.abs(low), np.abs(high)))
        known = np.isfinite(low) & np.isfinite(high)
        found = np.where(worst <= most, WITHIN, np.where(least > most, OUTSIDE, UNDECIDED))
        return np.where(known, found, UNKNOWN)

    def __len__(self) -> int:
        return len(self.table)

    def __repr__(self) -> str:
        return f"<HandRange of {len(self)} sections over {', '.join(self.table.parameters)}>"

    def __str__(self) -> str:
        summary = [["sections", "J within 5 %", "J within 10 %", "peak within 5 %", "peak within 10 %"]]
        counts = [self.verdicts(limit, judged) for judged in JUDGED for limit in (0.05, 0.10)]
        summary.append([str(len(self)), *(_counted(found) for found in counts)])
        rows = [[*self.table.parameters, "hand method", "error of J", "error of the peak", "status"]]
        for k in range(min(len(self), _SHOWN)):
            values = [str(self.table[name][k]) for name in self.table.parameters]
            errors = [_interval(low[k], high[k]) for low, high in map(self.error, JUDGED)]
            rows.append([*values, self.names[k], *errors, str(self.table["status"][k])])
        more = [f"... and {len(self) - _SHOWN} more sections"] if len(self) > _SHOWN else []
        failed = [k for k, words in enumerate(self.errors) if words]
        more += [f"row {k}: {self.errors[k]}" for k in failed[:_FAILED]]
        if len(failed) > _FAILED:
            more.append(f"... and {len(failed) - _FAILED} more without an answer: see .errors")
        if (self.table["singular_corners"].astype(float) > 0.0).any():
            more.append("no error of the peak beside sharp re-entrant corners: the stress is unbounded there")
        head = table(summary, "The hand method over a range of dimensions", head=True)
        return "\n".join([head, "", table(rows, head=True), *more])

    def as_table(self) -> tuple[tuple[str, ...], list[tuple[Any, ...]]]:
        """Return names of columns and a row a section: for files."""
        own = ("constant_low", "constant_high", "stress_low", "stress_high")
        columns = [*(self.table[name].tolist() for name in self.table.columns), self.names, self.errors]
        columns += [getattr(self, name).tolist() for name in own]
        names = (*self.table.columns, "hand_name", "no_answer", *(f"hand_{name}" for name in own))
        return names, list(zip(*columns, strict=True))

    def plot(self, ax: Axes | None = None, **options: Any) -> Any:
        """Draw the error over one or two dimensions; see `torsionfe.output.range_plot.plot_range`."""
        from torsionfe.output.range_plot import plot_range

        return plot_range(self, ax, **options)


def _counted(found: NDArray[np.str_]) -> str:
    words = [f"{int((found == WITHIN).sum())}"]
    words += [f"{int((found == name).sum())} {name}" for name in (UNDECIDED, UNKNOWN) if (found == name).any()]
    return ", ".join(words)


def _interval(low: float, high: float) -> str:
    if math.isnan(low):
        return "none"
    ends = [signed_percent(float(end), 3) for end in (low, high)]
    return ends[0] if ends[0] == ends[1] else f"{ends[0].removesuffix(' %')} to {ends[1]}"


def hand_method_range(
    build: Callable[..., Outline],
    grid: Mapping[str, Any],
    *,
    hand: str | Callable[..., Any] | None = None,
    **options: Any,
) -> HandRange:
    """Solve a section over a range of its dimensions, and set the hand method beside each.

    Parameters
    ----------
    build : callable
        ``build(**dimensions)`` returns an `Outline`: ``torsionfe.shapes.angle``, say. It must return the same outline
        for the same dimensions, since it is called once to solve and once for the plates.
    grid : mapping of str to iterable
        The values of each dimension, or one that is held; every combination is solved.
    hand : str or callable, optional
        The idealisation, such as ``'full_depth'``; or ``hand(**dimensions)`` that returns whatever
        `torsionfe.compare` takes for plates. By default the shape's first idealisation, or what is found in any
        other outline.
    **options
        As for `torsionfe.sweep`: tolerances, ``workers``, ``executor``, ``journal``, ``progress``.

    Returns
    -------
    HandRange
        Sections that cannot be built, solved or taken for plates have no answer; ``errors`` says why.

    Raises
    ------
    InputError
        An argument is out of its range; see `torsionfe.sweep` for the others.
    """
    if not isinstance(grid, Mapping) or not grid:
        raise InputError(f"grid must be a mapping of dimension to values, got {grid!r:.80}")
    if isinstance(hand, str):
        one_of("hand", hand, tuple(IDEALISATIONS))
    elif hand is not None and not callable(hand):
        raise InputError(f"hand must be the name of an idealisation or a function of the dimensions, got {hand!r:.80}")
    # an iterator is read twice
    held = {name: list(values) if isinstance(values, Iterator) else values for name, values in grid.items()}
    found = sweep(held, build, **options)
    methods: list[HandMethod | None] = []
    errors = []
    for solved, words, point in zip(found.solved, found["error"], combinations(held), strict=True):
        method, why = _method(build, hand, point) if solved else (None, words)
        methods.append(method)
        errors.append(why)
    constant = np.array([math.nan if by is None else by.torsion_constant for by in methods])
    stress = np.array([math.nan if by is None else by.stress_per_torque for by in methods])
    lower, upper, peak = (
        found[name].astype(float) for name in ("torsion_constant_lower", "torsion_constant_upper", "stress_per_torque")
    )
    # beside a sharp corner the largest finite stress is not the peak
    peak = np.where(found["singular_corners"].astype(float) > 0.0, math.nan, peak)
    doubt = found["stress_rel_error"].astype(float)
    return HandRange(
        found,
        constant / upper - 1.0,
        constant / lower - 1.0,
        stress / (peak * (1.0 + doubt)) - 1.0,
        stress / (peak * np.maximum(1.0 - doubt, 1e-12)) - 1.0,
        tuple("" if by is None else by.name for by in methods),
        tuple(errors),
    )


def _method(build: Callable[..., Outline], hand: Any, point: Mapping[str, Any]) -> tuple[HandMethod | None, str]:
    """Return the hand method of one section, or why it has no answer."""
    try:
        outline = build(**point)
        if isinstance(hand, str):
            return hand_methods(outline, _stated(outline, hand))[0], ""
        return hand_methods(outline, None if hand is None else hand(**point))[0], ""
    except Exception as error:  # whatever the user's function does, what was solved is kept
        return None, f"hand method: {error}" if isinstance(error, TorsionError) else f"{type(error).__name__}: {error}"


def _stated(outline: Outline, idealisation: str) -> PlateSet:
    return outline.plates(idealisation) if isinstance(outline, TradeShape) else derive_plates(outline, idealisation)
