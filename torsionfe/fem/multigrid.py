"""Large systems: conjugate gradients, preconditioned by multigrid on the nested meshes that bisection left.

Every node that bisection made is the middle of a link between two older nodes, so the history of the mesh is a ready
hierarchy: a younger node's value on a coarser level is the mean of its link's ends. Above it sits the step from the
elements' own order to linear ones on the same mesh. Coarse matrices are Galerkin products, the smoother a Chebyshev
polynomial in the scaled matrix (Adams, Brezina, Hu and Tuminaro 2003, J. Comput. Phys. 188, 593-610), and one V-cycle
preconditions the iteration (Bramble, Pasciak and Xu 1990, Math. Comput. 55, 1-22, for nested adaptive meshes).
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.fem.direct import factorised, solve_positive
from torsionfe.fem.elements import element
from torsionfe.fem.space import Space

if TYPE_CHECKING:
    from collections.abc import Callable

    from scipy.sparse import csr_array

__all__ = ["solve_multigrid"]

_COARSEST = 4000  # unknowns that a direct solve takes in a few milliseconds
_COARSENING = 3.0  # each level has about this many times fewer unknowns
_SMOOTHING = 3  # degree of the Chebyshev polynomial
_SPREAD = 12.0  # the smoother acts on the upper 1 / _SPREAD of the spectrum
_TOLERANCE = 1e-10
# what needs about ten steps on well-shaped meshes, and what triangles forced to be needles may take
_MOST_STEPS = 400
_FEW_STEPS, _FACTORISED = 60, 100_000  # up to this size a slow iteration is given up early
_ENOUGH = 1e-7  # the bounds hold for any function, and move by the square of this


@dataclass(frozen=True)
class _Level:
    """One level: its matrix, inverse diagonal, largest eigenvalue of the scaled matrix, and the way down."""

    matrix: csr_array
    scale: Floats
    top: float
    down: csr_array  # prolongation from the next coarser level


def solve_multigrid(space: Space, matrix: csr_array, right: Floats, unknown: Ints) -> Floats:
    """Return the solution of a large positive definite system on a space, factorised where the iteration is slow.

    Parameters
    ----------
    space : Space
        Its mesh carries the history of its nodes.
    matrix : sparse array of shape (count, count)
    right : ndarray of shape (count,)
    unknown : ndarray of shape (n,)
        The unknown that each degree of freedom equals; -1 where it is zero.

    Raises
    ------
    SolveError
        The matrix is singular.
    """
    levels, coarsest = _hierarchy(space, matrix, unknown)
    steps = _FEW_STEPS if len(right) <= _FACTORISED else _MOST_STEPS
    answer, left = _conjugate_gradients(matrix, right, lambda residual: _cycle(levels, coarsest, 0, residual), steps)
    return answer if left <= _ENOUGH else solve_positive(matrix, right)


# --- levels -------------------------------------------------------------------------------------------


def _hierarchy(space: Space, matrix: csr_array, unknown: Ints) -> tuple[list[_Level], Callable[[Floats], Floats]]:
    levels = []
    for down in _prolongations(space, unknown):
        levels.append(_level(matrix, down))
        matrix = (down.T @ matrix @ down).tocsr()
    return levels, factorised(matrix)


def _level(matrix: csr_array, down: csr_array) -> _Level:
    scale = 1.0 / matrix.diagonal()
    vector = np.random.default_rng(0).standard_normal(len(scale))
    top = 1.0
    for _ in range(12):  # power iteration on the scaled matrix
        vector = scale * (matrix @ vector)
        top = float(np.sqrt(_dot(vector, vector)))
        vector /= top
    return _Level(matrix, scale, 1.1 * top, down)


def _prolongations(space: Space, unknown: Ints) -> list[csr_array]:
    """Return the prolongations between the unknowns of each level, finest first."""
    steps = []
    if space.order > 1:
        coarse = unknown[: len(space.mesh.nodes)]
        steps.append(_constrained(_to_linear(space), unknown, coarse))
        unknown = _renumbered(coarse)
    born = space.mesh.born
    ends = _rounds(born)
    while len(unknown) > _COARSEST and len(ends) > 1:
        smaller = [k for k, end in enumerate(ends[:-1]) if end <= len(unknown) / _COARSENING]
        keep = smaller[-1] if smaller else 0
        coarse = unknown[: ends[keep]]
        steps.append(_constrained(_to_older(born, ends[keep:]), unknown, coarse))
        unknown, ends = _renumbered(coarse), ends[: keep + 1]
    return steps


def _rounds(born: Ints) -> list[int]:
    """Return how many nodes the mesh had after each round of bisection."""
    youngest = born.max(axis=1)
    ends = [int(np.count_nonzero(youngest < 0))]
    while ends[-1] < len(born):
        later = np.flatnonzero(youngest[ends[-1] :] >= ends[-1])
        ends.append(ends[-1] + int(later[0]) if len(later) else len(born))
    return ends


def _to_linear(space: Space) -> csr_array:
    """Return the step from linear functions on the mesh to the space's own, shape (size, nodes)."""
    from scipy.sparse import csr_array as csr

    first = np.full(space.size, -1)
    first[space.dofs.ravel()[::-1]] = np.arange(space.dofs.size)[::-1]
    triangle, local = np.divmod(first, space.dofs.shape[1])
    weights = element(1).values(space.element.nodes)[local]
    columns = space.mesh.triangles[triangle]
    rows = np.repeat(np.arange(space.size), 3)
    kept = weights.ravel() > 1e-12
    entries = (weights.ravel()[kept], (rows[kept], columns.ravel()[kept]))
    return csr(entries, shape=(space.size, len(space.mesh.nodes)))


def _to_older(born: Ints, ends: list[int]) -> csr_array:
    """Return the step from the oldest ``ends[0]`` nodes to the first ``ends[-1]``."""
    from scipy.sparse import csr_array as csr
    from scipy.sparse import eye_array, vstack

    total = eye_array(ends[0], format="csr")
    for start, end in itertools.pairwise(ends):
        pairs = born[start:end]
        rows = np.repeat(np.arange(end - start), 2)
        middle = csr((np.full(pairs.size, 0.5), (rows, pairs.ravel())), shape=(end - start, start))
        total = vstack([total, middle @ total], format="csr")
    return total


def _renumbered(unknown: Ints) -> Ints:
    """Return the unknowns of the coarser degrees of freedom, numbered without gaps, -1 kept."""
    return np.asarray(np.unique(np.append(unknown, -1), return_inverse=True)[1][:-1] - 1, dtype=np.int64)


def _constrained(step: csr_array, fine: Ints, coarse: Ints) -> csr_array:
    """Return a step between degrees of freedom as one between unknowns: zeros dropped, tied ones summed."""
    from scipy.sparse import csr_array as csr

    columns = _renumbered(coarse)
    free = np.flatnonzero(columns >= 0)
    inject = csr((np.ones(len(free)), (free, columns[free])), shape=(len(columns), int(columns.max()) + 1))
    # tied degrees of freedom have equal rows: one stands for all
    first = np.zeros(int(fine.max()) + 1, dtype=np.int64)
    owners = np.flatnonzero(fine >= 0)[::-1]
    first[fine[owners]] = owners
    return (step.tocsr()[first] @ inject).tocsr()


# --- iteration ----------------------------------------------------------------------------------------


def _smoothed(level: _Level, right: Floats, start: Floats | None) -> Floats:
    """Return the Chebyshev smoother's answer from ``start`` (zero if None)."""
    upper, lower = level.top, level.top / _SPREAD
    theta, delta = 0.5 * (upper + lower), 0.5 * (upper - lower)
    sigma = theta / delta
    rho = 1.0 / sigma
    answer = np.zeros_like(right) if start is None else start
    residual = right if start is None else right - level.matrix @ start
    step = level.scale * residual / theta
    for _ in range(_SMOOTHING - 1):
        answer = answer + step
        residual = residual - level.matrix @ step
        following = 1.0 / (2.0 * sigma - rho)
        step = following * rho * step + 2.0 * following / delta * (level.scale * residual)
        rho = following
    return answer + step


def _cycle(levels: list[_Level], coarsest: Callable[[Floats], Floats], depth: int, right: Floats) -> Floats:
    """Return one V-cycle's answer, symmetric and positive definite in ``right``."""
    if depth == len(levels):
        return coarsest(right)
    level = levels[depth]
    answer = _smoothed(level, right, None)
    residual = right - level.matrix @ answer
    answer = answer + level.down @ _cycle(levels, coarsest, depth + 1, level.down.T @ residual)
    return _smoothed(level, right, answer)


def _dot(a: Floats, b: Floats) -> float:
    """Return the inner product without the threads of a BLAS: on a busy machine they wait longer than they work."""
    return float(np.einsum("i,i", a, b))


def _conjugate_gradients(
    matrix: csr_array, right: Floats, precondition: Callable[[Floats], Floats], steps: int
) -> tuple[Floats, float]:
    """Return the answer after some steps at most, and what is left of the residual, as a part of its start.

    Infinity where the preconditioner is not positive: on needles a smoother may miss the top of the spectrum.
    """
    answer = np.zeros_like(right)
    residual = right.copy()
    better = precondition(residual)
    direction = better
    product = first = _dot(residual, better)
    for _ in range(steps):
        if product <= _TOLERANCE**2 * first:  # or negative
            break
        image = matrix @ direction
        length = product / _dot(direction, image)
        answer += length * direction
        residual -= length * image
        better = precondition(residual)
        product, before = _dot(residual, better), product
        direction = better + product / before * direction
    if first == 0.0:  # no load
        return answer, 0.0
    return answer, float(np.sqrt(product / first)) if 0.0 <= product <= first else np.inf
