"""Sparse solves: constraints as a map to unknowns; direct up to a size, multigrid beyond."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.fem.direct import solve_positive
from torsionfe.fem.multigrid import solve_multigrid
from torsionfe.fem.space import Space

if TYPE_CHECKING:
    from scipy.sparse import csr_array

__all__ = ["DIRECT_UP_TO", "reduced", "solve_constrained"]

#: Systems up to this size are factorised, larger ones iterated: where the two cost the same.
DIRECT_UP_TO = 25_000


def reduced(stiffness: csr_array, unknown: Ints, count: int) -> csr_array:
    """Return the matrix of the unknowns, summing rows and columns that share one.

    Parameters
    ----------
    stiffness : sparse array of shape (n, n)
    unknown : ndarray of shape (n,)
        The unknown that each degree of freedom equals; -1 where it is zero.
    count : int
        Number of unknowns.
    """
    from scipy.sparse import coo_array

    entries = stiffness.tocoo()
    row, column = unknown[entries.row], unknown[entries.col]
    kept = (row >= 0) & (column >= 0)
    where = (row[kept].astype(np.int32), column[kept].astype(np.int32))
    return coo_array((entries.data[kept], where), shape=(count, count)).tocsr()


def solve_constrained(space: Space, stiffness: csr_array, load: Floats, unknown: Ints) -> Floats:
    """Return the field ``u`` with ``K u = load`` under zero and tied values.

    Parameters
    ----------
    space : Space
    stiffness : sparse array of shape (n, n)
    load : ndarray of shape (n,)
    unknown : ndarray of shape (n,)
        The unknown that each degree of freedom equals; -1 where it is zero.

    Returns
    -------
    ndarray of shape (n,)
    """
    count = int(unknown.max()) + 1
    if count == 0:  # one triangle, every node on the boundary
        return np.zeros(len(load))
    free = unknown >= 0
    right = np.asarray(np.bincount(unknown[free], load[free], count), dtype=float)
    one_pinned = count == len(unknown) - 1 and unknown[0] < 0 and bool((unknown[1:] == np.arange(count)).all())
    matrix = stiffness[1:, 1:].tocsr() if one_pinned else reduced(stiffness, unknown, count)
    if count <= DIRECT_UP_TO:
        solution = solve_positive(matrix, right)
    else:
        solution = solve_multigrid(space, matrix, right, unknown)
    return np.asarray(np.where(free, solution[unknown], 0.0), dtype=float)
