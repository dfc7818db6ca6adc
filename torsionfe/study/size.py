"""Sizing: the smallest dimension of a section that meets what is asked of it."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from typing import Any

from torsionfe.cautions import cautions
from torsionfe.checks import finite, positive
from torsionfe.errors import InputError, TorsionError
from torsionfe.member.bar import Bar, TorqueCase
from torsionfe.member.margins import Allowables, MarginTable
from torsionfe.text import number, table

__all__ = ["SizeResult", "Trial", "bar_margin", "size"]

#: What a trial may be judged by: its smallest margin, or a table of margins.
Judgement = float | MarginTable


@dataclass(frozen=True, slots=True)
class Trial:
    """One dimension that was tried.

    Attributes
    ----------
    dimension : float
    margin : float
        Smallest margin, 0 or more where the trial meets; NaN where it is not defined.
    note : str
        What governs, why the margin is not defined, or the error that the trial ended in.
    failed : bool
        Whether it ended in an error.
    """

    dimension: float
    margin: float
    note: str = ""
    failed: bool = False

    @property
    def meets(self) -> bool:
        """Whether the margin is defined and 0 or more."""
        return self.margin >= 0.0


@dataclass(frozen=True)
class SizeResult:
    """The answer of a sizing. ``print`` shows a table with the trail and the cautions.

    Attributes
    ----------
    found : bool
        Whether a dimension in the range meets.
    dimension : float
        The smallest found that meets; NaN where none does.
    margin : float
        Its margin, 0 or a little more; NaN where none was found.
    reason : str
        How the answer came about, or why there is none.
    trail : tuple of Trial
        Every trial, in order.
    tolerance : float
        The dimension next below that was tried, and does not meet, is at most this far off.
    """

    found: bool
    dimension: float
    margin: float
    reason: str
    trail: tuple[Trial, ...]
    tolerance: float

    def __str__(self) -> str:
        rows = [["trial", "dimension", "margin", "note"]]
        for k, trial in enumerate(self.trail, start=1):
            margin = "failed" if trial.failed else number(trial.margin)
            rows.append([str(k), number(trial.dimension, 6), margin, trial.note])
        answer = f"smallest dimension that meets: {number(self.dimension, 6)}" if self.found else "no dimension meets"
        return "\n".join([table(rows, "Sizing", head=True), f"{answer} ({self.reason})", cautions()])


def size(
    build: Callable[[float], Any],
    low: float,
    high: float,
    meets: Callable[[Any], Judgement],
    *,
    rel_tol: float = 1e-3,
    scan: int = 6,
) -> SizeResult:
    """Return the smallest dimension from ``low`` to ``high`` whose section meets what is asked.

    Parameters
    ----------
    build : callable
        From a dimension (a fillet radius, a thickness, a diameter) to an outline, or to whatever ``meets`` takes.
    low, high : float
        The range, both ends tried.
    meets : callable
        From what ``build`` returns to its smallest margin (0 or more meets, NaN is not defined) or a table of
        margins. `bar_margin` makes one.
    rel_tol : float
        Wanted width, as a share of the range's larger end, between the answer and the next smaller trial, 1e-9 to 0.1.
    scan : int
        How many steps to look through for a first dimension that meets if ``high`` does not; 1 or more.

    Returns
    -------
    SizeResult
        ``found`` is False where nothing that was tried meets. A trial that ends in a `TorsionError` (a fillet
        that does not fit, say) is kept in the trail and counts as not meeting.

    Raises
    ------
    InputError
        An argument is out of its range, or ``meets`` returns no number.

    Notes
    -----
    The margin is assumed to pass 0 once between the ends: where it rises, falls and rises again, the dimension
    found meets, and the next trial below does not, but a smaller one may meet too. The root comes from
    `scipy.optimize.toms748` (Alefeld, Potra and Shi 1995) where both ends have a margin, else from halving.

    Examples
    --------
    >>> result = size(lambda d: d, 1.0, 10.0, lambda d: d**3 / 200.0 - 1.0)
    >>> result.found, round(result.dimension, 1)
    (True, 5.8)
    """
    first, last = finite("low", low), finite("high", high)
    if not first < last:
        raise InputError(f"low must be below high, got {first:g} and {last:g}")
    share = positive("rel_tol", rel_tol)
    if not 1e-9 <= share <= 0.1:
        raise InputError(f"rel_tol must be from 1e-9 to 0.1, got {share:g}")
    if isinstance(scan, bool) or not isinstance(scan, int) or scan < 1:
        raise InputError(f"scan must be a whole number, 1 or more, got {scan!r}")
    return _Search(build, meets, first, last, width=share * max(abs(first), abs(last)), scan=scan).run()


def bar_margin(
    torque: float | TorqueCase | Sequence[TorqueCase],
    length: float,
    shear_modulus: float,
    allowables: Allowables,
    **solver: Any,
) -> Callable[[Any], MarginTable]:
    """Return a function from an outline to its margins: it solves the section and loads the bar.

    Parameters
    ----------
    torque : float, TorqueCase or sequence of TorqueCase
        As for `torsionfe.member.margins.margins`.
    length : float
        Length of the bar.
    shear_modulus : float
        force / length**2.
    allowables : Allowables
    **solver
        Passed to `torsionfe.solve_torsion`.

    Notes
    -----
    Margins count the mesh's error against the section, so a finer ``rel_tol`` gives a slightly smaller dimension.
    """

    def judge(outline: Any) -> MarginTable:
        from torsionfe.torsion.solve import solve_torsion

        return Bar(solve_torsion(outline, **solver), length, shear_modulus).margins(torque, allowables)

    return judge


class _UndefinedError(Exception):
    """A trial inside the root finder has no margin."""


@dataclass
class _Search:
    """Trials kept in order, none made twice."""

    build: Callable[[float], Any]
    meets: Callable[[Any], Judgement]
    low: float
    high: float
    width: float
    scan: int
    trials: dict[float, Trial] = field(default_factory=dict)

    def trial(self, dimension: float) -> Trial:
        dimension = float(dimension)
        if dimension not in self.trials:
            try:
                margin, note = _judged(self.meets(self.build(dimension)))
                self.trials[dimension] = Trial(dimension, margin, note)
            except _NoNumberError as error:
                raise InputError(str(error)) from None
            except TorsionError as error:
                self.trials[dimension] = Trial(dimension, math.nan, f"{type(error).__name__}: {error}", True)
        return self.trials[dimension]

    def run(self) -> SizeResult:
        if self.trial(self.low).meets:
            return self._answer(self.low, "the low end of the range meets already")
        bracket = self._bracket()
        if bracket is None:
            return self._answer(None, self._why_none())
        fails, meets = bracket
        while meets - fails > self.width:
            fails, meets = self._narrowed(fails, meets)
        below = self.trials[fails]
        why = f"margin {number(below.margin)}" if not math.isnan(below.margin) else below.note or "not defined"
        return self._answer(meets, f"{number(fails, 6)} does not: {why}")

    def _bracket(self) -> tuple[float, float] | None:
        """Return a dimension that does not meet and the next above that does."""
        if self.trial(self.high).meets:
            return self.low, self.high
        before = self.low
        for k in range(1, self.scan):
            dimension = self.low + (self.high - self.low) * k / self.scan
            if self.trial(dimension).meets:
                return before, dimension
            before = dimension
        return None

    def _narrowed(self, fails: float, meets: float) -> tuple[float, float]:
        """Return a narrower bracket: by the root finder where both ends have a margin, and by halving."""
        start = meets - fails
        if not math.isnan(self.trials[fails].margin):
            self._try_root(fails, meets)
            fails, meets = self._tightest(fails, meets)
        if meets - fails > max(self.width, 0.5 * start):
            self.trial(0.5 * (fails + meets))
            fails, meets = self._tightest(fails, meets)
        return fails, meets

    def _try_root(self, fails: float, meets: float) -> None:
        from scipy.optimize import toms748

        try:
            root = float(toms748(self._height, fails, meets, xtol=0.25 * self.width, rtol=1e-12))
        except _UndefinedError:
            return
        # the root may lie a hair on the wrong side: close the bracket round it
        for step in (0.0, 0.45 * self.width, -0.45 * self.width):
            if fails < root + step < meets:
                self.trial(root + step)

    def _tightest(self, fails: float, meets: float) -> tuple[float, float]:
        """Return the first trial in the bracket that meets, and the one below it."""
        inside = sorted(d for d in self.trials if fails <= d <= meets)
        first = next(d for d in inside if self.trials[d].meets)
        return max(d for d in inside if d < first), first

    def _height(self, dimension: float) -> float:
        """Return the margin squeezed into -1 to 1, so that an unbounded one does no harm."""
        margin = self.trial(dimension).margin
        if math.isnan(margin):
            raise _UndefinedError
        return math.copysign(1.0, margin) if math.isinf(margin) else margin / (1.0 + abs(margin))

    def _why_none(self) -> str:
        known = [trial for trial in self.trials.values() if not math.isnan(trial.margin)]
        span = f"from {number(self.low, 6)} to {number(self.high, 6)}"
        if not known:
            return f"no trial {span} has a margin: {next(iter(self.trials.values())).note}"
        best = max(known, key=lambda trial: trial.margin)
        return f"the largest margin {span} is {number(best.margin)}, at {number(best.dimension, 6)}"

    def _answer(self, dimension: float | None, reason: str) -> SizeResult:
        trail = tuple(self.trials.values())
        if dimension is None:
            return SizeResult(False, math.nan, math.nan, reason, trail, self.width)
        return SizeResult(True, dimension, self.trials[dimension].margin, reason, trail, self.width)


class _NoNumberError(InputError):
    """The user's function returned something that is no margin."""


def _judged(judgement: Judgement) -> tuple[float, str]:
    """Return the smallest margin and what governs it."""
    if isinstance(judgement, MarginTable):
        worst = judgement.governing
        where = f"case {worst.case}, {worst.criterion}"
        return worst.margin, where if worst.defined else f"{where} {worst.note}"
    try:
        if isinstance(judgement, (bool, str)):
            raise TypeError
        return float(judgement), ""
    except (TypeError, ValueError):
        raise _NoNumberError(f"meets must return a margin or a table of margins, got {judgement!r}") from None
