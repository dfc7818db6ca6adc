"""Lagrange triangles of any order, as data: nodes, shape functions, quadrature.

The reference triangle has the corners (0, 0), (1, 0), (0, 1). Basis functions come in the order: the three
corners, the inner nodes of the side opposite to each corner, the inside.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import numpy as np

from torsionfe.checks import Floats, Ints

__all__ = ["Element", "Rule", "element", "line_gradient", "line_nodes", "line_values", "rule"]


@dataclass(frozen=True)
class Rule:
    """Quadrature on the reference triangle: ``points`` (q, 2) and ``weights`` (q,), of sum 1/2."""

    points: Floats
    weights: Floats


@dataclass(frozen=True)
class Element:
    """A Lagrange triangle.

    Attributes
    ----------
    order : int
        Polynomial degree.
    nodes : ndarray of shape (b, 2)
        Where each basis function is one, in reference coordinates.
    powers : ndarray of shape (b, 2)
        Exponents of the monomials that span the space.
    coefficients : ndarray of shape (b, b)
        Monomial coefficients of the basis functions, one column each.
    """

    order: int
    nodes: Floats
    powers: Ints
    coefficients: Floats

    def values(self, points: Floats) -> Floats:
        """Return the basis functions at reference points ``(q, 2)``, shape (q, b)."""
        return _monomials(points, self.powers) @ self.coefficients

    def gradients(self, points: Floats) -> Floats:
        """Return the reference gradients of the basis functions at ``(q, 2)``, shape (q, b, 2)."""
        parts = []
        for axis in range(2):
            lower = self.powers.copy()
            lower[:, axis] = np.maximum(lower[:, axis] - 1, 0)
            parts.append((_monomials(points, lower) * self.powers[:, axis]) @ self.coefficients)
        return np.stack(parts, axis=2)


def _monomials(points: Floats, powers: Ints) -> Floats:
    return np.asarray(points[:, None, 0] ** powers[:, 0] * points[:, None, 1] ** powers[:, 1], dtype=float)


@cache
def element(order: int) -> Element:
    """Return the Lagrange triangle of the given order (1 linear, 2 quadratic, ...)."""
    corners = np.array([[0.0, 0.0], [1.0, 0.0], [0.0, 1.0]])
    inner = np.arange(1, order) / order
    sides = [
        corners[(k + 1) % 3] + inner[:, None] * (corners[(k + 2) % 3] - corners[(k + 1) % 3]) for k in range(3)
    ]
    lattice = [(i / order, j / order) for j in range(1, order) for i in range(1, order - j)]
    nodes = np.concatenate([corners, *sides, np.array(lattice).reshape(-1, 2)])
    powers = np.array([(i, d - i) for d in range(order + 1) for i in range(d, -1, -1)])
    return Element(order, nodes, powers, np.asarray(np.linalg.inv(_monomials(nodes, powers)), dtype=float))


# Dunavant (1985), Int. J. Numer. Meth. Eng. 21, 1129-1148: (barycentric pair, weight) of each 3-point orbit
_ORBITS = {
    2: [(1.0 / 6.0, 1.0 / 6.0)],
    4: [
        (0.445948490915964886318329253883051, 0.223381589678011465852420604664),
        (0.0915762135097707434595714634022015, 0.109951743655321867481248978669),
    ],
}


@cache
def rule(degree: int) -> Rule:
    """Return a quadrature rule exact for polynomials of the given degree.

    Symmetric rules (Dunavant 1985) for degrees up to 4, beyond that the conical product of Gauss points
    (Stroud 1971, *Approximate Calculation of Multiple Integrals*, sec. 2.6).
    """
    if degree <= 4:
        orbits = _ORBITS[2 if degree <= 2 else 4]
        points = [p for a, _ in orbits for p in ((a, a), (1.0 - 2.0 * a, a), (a, 1.0 - 2.0 * a))]
        share = np.repeat([w for _, w in orbits], 3)
        return Rule(np.array(points), 0.5 * share / share.sum())
    x, wx = np.polynomial.legendre.leggauss(degree // 2 + 1)
    y, wy = np.polynomial.legendre.leggauss((degree + 1) // 2 + 1)  # one degree more for the cone's width
    u, v = np.meshgrid(0.5 * (1.0 + x), 0.5 * (1.0 + y), indexing="ij")
    weights = 0.25 * wx[:, None] * wy * (1.0 - v)
    return Rule(np.stack([(u * (1.0 - v)).ravel(), v.ravel()], axis=1), weights.ravel())


@cache
def line_nodes(order: int) -> Floats:
    """Return the nodes of the Lagrange basis on a side, in the order end, end, inside; shape (order + 1,)."""
    return np.concatenate([[0.0, 1.0], np.arange(1, order) / order])


def line_gradient(order: int, t: Floats) -> Floats:
    """Return d/dt of the Lagrange basis on a side at ``t`` in 0..1, shape (q, order + 1)."""
    inverse = np.linalg.inv(np.vander(line_nodes(order), increasing=True))
    powers = np.arange(order + 1)
    slope = powers * t[:, None] ** np.maximum(powers - 1, 0)
    return np.asarray(slope @ inverse, dtype=float)


def line_values(order: int, t: Floats) -> Floats:
    """Return the Lagrange basis on a side at ``t`` in 0..1, shape (q, order + 1)."""
    inverse = np.linalg.inv(np.vander(line_nodes(order), increasing=True))
    return np.asarray(np.vander(t, order + 1, increasing=True) @ inverse, dtype=float)
