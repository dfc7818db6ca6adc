"""Solve a section: mesh, solve, bound, look at the peak, refine, until both are as tight as asked."""

from __future__ import annotations

import math

import numpy as np

from torsionfe.checks import Ints, positive
from torsionfe.errors import InputError
from torsionfe.outline.outline import Outline
from torsionfe.torsion.adaptive import around_peaks, from_afar, refined
from torsionfe.torsion.bounds import Bounds
from torsionfe.torsion.frame import Frame
from torsionfe.torsion.look import OF_GAP, Look, Seen, look_at
from torsionfe.torsion.solution import Pass, TorsionSolution

__all__ = ["solve_torsion"]

_MOST_PASSES = 40


def solve_torsion(
    outline: Outline,
    rel_tol: float = 1e-3,
    order: int = 2,
    *,
    peak_tol: float = 2e-3,
    max_unknowns: int = 300_000,
) -> TorsionSolution:
    """Solve Saint-Venant's torsion of a section.

    Parameters
    ----------
    outline : Outline
    rel_tol : float
        Wanted width of the bracket of the torsion constant over its value, 1e-9 to 1.
    order : int
        Degree of the elements: 1 linear, 2 quadratic (the default), up to 6.
    peak_tol : float
        Wanted relative error of the peak shear stress; ``math.inf`` leaves the peak as it comes.
    max_unknowns : int
        Refinement stops when a mesh has this many degrees of freedom; the result then carries the bracket that
        it has and says so (`TorsionSolution.converged`).

    Returns
    -------
    TorsionSolution

    Raises
    ------
    InputError
        An argument is out of its range.
    MeshError
        The outline can't be triangulated; ``at`` names the place.

    Examples
    --------
    >>> from torsionfe.outline.shapes import tube
    >>> solution = solve_torsion(tube(50.0, 5.0), rel_tol=1e-4)
    >>> exact = 3.141592653589793 / 32.0 * (50.0**4 - 40.0**4)
    >>> solution.torsion_constant.lower < exact < solution.torsion_constant.upper
    True
    >>> round(solution.section_modulus / (exact / 25.0), 3)
    1.0
    """
    from torsionfe.mesh.triangulate import triangulate

    tolerance, peak_wanted = checked_settings(outline, rel_tol, order, peak_tol, max_unknowns)
    # a peak can be no surer than its mesh is fine: see OF_GAP
    aim = min(tolerance, math.sqrt(peak_wanted / OF_GAP))
    frame = Frame.of(outline)
    mesh = frame.inward(triangulate(outline))
    trail: list[Pass] = []
    look = look_at(mesh, order, None)
    while True:
        trail.append(_pass(look, frame))
        shortfall = _shortfall(look, tolerance, peak_wanted)
        if not shortfall or len(trail) == _MOST_PASSES:
            break
        mesh = refined(look.fields, aim * look.fields.lower, _forced(look, peak_wanted))
        if mesh.unknowns(order) > max_unknowns:
            shortfall += f" within {max_unknowns} unknowns"
            break
        before = Seen(look.peak, look.rel_error)
        del look  # the coarser fields are let go before the finer ones are made
        look = look_at(mesh, order, before)
    return TorsionSolution.of(outline, frame, look, tuple(trail), shortfall)


def _shortfall(look: Look, tolerance: float, peak_wanted: float) -> str:
    """Return what is still wider than asked, in words; empty where nothing is."""
    gap = Bounds(look.fields.lower, look.fields.upper).rel_gap
    parts = []
    if gap > tolerance:
        parts.append(f"the bracket of J is {gap:.2g} wide, not {tolerance:.2g}")
    if np.any(look.rel_error > peak_wanted):
        parts.append(f"the peak is sure to {look.rel_error.max():.2g}, not {peak_wanted:.2g}")
    return ", ".join(parts)


def checked_settings(
    outline: Outline, rel_tol: float, order: int, peak_tol: float, max_unknowns: int
) -> tuple[float, float]:
    """Return both tolerances, every setting checked."""
    if not isinstance(outline, Outline):
        raise InputError(f"an Outline is needed, got {type(outline).__name__}: see torsionfe.Outline")
    tolerance = positive("rel_tol", rel_tol)
    if not 1e-9 <= tolerance <= 1.0:
        raise InputError(f"rel_tol must be from 1e-9 to 1, got {tolerance:g}")
    if isinstance(order, bool) or order not in range(1, 7):
        raise InputError(f"order must be a whole number from 1 to 6, got {order!r}")
    peak = math.inf if peak_tol == math.inf else positive("peak_tol", peak_tol)
    if peak < 1e-5:
        raise InputError(f"peak_tol must be 1e-5 or more, got {peak:g}")
    if isinstance(max_unknowns, bool) or not isinstance(max_unknowns, int) or max_unknowns < 1:
        raise InputError(f"max_unknowns must be a whole number above 0, got {max_unknowns!r}")
    return tolerance, peak


def _forced(look: Look, wanted: float) -> Ints:
    """Return the bisections that the peaks ask for, triangle by triangle."""
    open_ = look.rel_error > wanted
    if not open_.any():
        return np.zeros(len(look.fields.space.mesh.triangles), dtype=np.int64)
    # the error of the samples falls about as h**(p + 1), and two rounds halve every side
    ratio = np.minimum(look.rel_error[open_], 1.0) / wanted
    rounds = 2 * np.clip(np.ceil(np.log2(ratio) / (look.fields.space.order + 1)), 1, 2).astype(np.int64)
    near = around_peaks(look.boundary, look.peak.side[open_], rounds)
    return np.maximum(near, from_afar(look.influence[open_[: len(look.influence)]], wanted))


def _pass(look: Look, frame: Frame) -> Pass:
    f = look.fields
    s4 = frame.scale**4
    tau = float(look.peak.tau[0]) if len(look.peak.tau) else math.nan
    j = 0.5 * (f.lower + f.upper)
    error = float(look.rel_error[0]) if len(look.rel_error) else math.nan
    return Pass(f.space.size, len(f.space.mesh.triangles), f.lower * s4, f.upper * s4, tau / j / frame.scale**3, error)
