"""Sparse solves: constraints as a map to unknowns, and a direct factorisation."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.errors import SolveError

if TYPE_CHECKING:
    from scipy.sparse import csr_array

__all__ = ["reduced", "solve_constrained", "solve_positive"]


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


def solve_constrained(stiffness: csr_array, load: Floats, unknown: Ints) -> Floats:
    """Return the field ``u`` with ``K u = load`` under zero and tied values.

    Parameters
    ----------
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
    solution = solve_positive(reduced(stiffness, unknown, count), right)
    return np.asarray(np.where(free, solution[unknown], 0.0), dtype=float)


def solve_positive(matrix: csr_array, right: Floats) -> Floats:
    """Return the solution of a symmetric positive definite system.

    Raises
    ------
    SolveError
        The matrix is singular to working precision.
    """
    from scipy.sparse import csc_array
    from scipy.sparse.linalg import splu

    # the matrix is symmetric, so its rows serve as columns
    columns = csc_array((matrix.data, matrix.indices, matrix.indptr), shape=matrix.shape)
    try:
        factor = splu(
            columns, permc_spec="MMD_AT_PLUS_A", diag_pivot_thresh=0.0, options={"SymmetricMode": True}
        )
    except RuntimeError as error:
        raise SolveError(f"the stiffness matrix of {matrix.shape[0]} unknowns is singular: {error}") from None
    solution = np.asarray(factor.solve(right), dtype=float)
    if not np.isfinite(solution).all():
        raise SolveError(f"the solution of {matrix.shape[0]} unknowns is not finite: the mesh is degenerate")
    return solution
