"""Where along the boundary material counts: Hadamard's formula, from one solve.

Moving the boundary outward by ``dn`` changes the torsion constant by ``dJ = int tau^2 dn ds``, ``tau`` for
``G theta' = 1`` (Hadamard 1908, *Mém. prés. par divers savants* 33, no. 4; on every loop, that of a void too, outward
means out of the material). Scaling the section gives ``4 J = int tau^2 x.n ds``, exactly: how well the boundary's
stress fulfils that is the check that comes with the result.

At a sharp re-entrant corner ``tau^2`` grows as ``r^(2 lambda - 2)`` with ``lambda = pi / alpha > 1/2``: it has an
integral, but elements of any size miss part of it. On the sides next to the corner it is taken from the singular terms
``k r^(lambda - 1) + c r^(2 lambda - 1)`` instead, with the corner's intensity ``k`` (`torsionfe.torsion.corners`).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from torsionfe.checks import Floats, Ints, finite_array
from torsionfe.errors import InputError
from torsionfe.fem.geometry import side_curve
from torsionfe.outline.edges import Edges
from torsionfe.outline.fillets import SMOOTH
from torsionfe.text import number, percent, table
from torsionfe.torsion.boundary import along_sides
from torsionfe.torsion.corners import corner_strengths, exponents
from torsionfe.torsion.solution import TorsionSolution

__all__ = ["BoundarySensitivity", "EdgeSensitivity", "boundary_sensitivity"]

#: Sides beside a corner that are left to the singular terms, and how many after them these are fitted to.
_LEFT, _FITTED = 2, 2
_MOST_ROWS = 12
_SAME = 1e-6


@dataclass(frozen=True, slots=True)
class EdgeSensitivity:
    """What moving one edge of the outline does to the torsion constant.

    Attributes
    ----------
    loop : int
        0 for the outer loop, ``k`` for void ``k - 1``.
    start, end : int
        Vertices of that loop, in the direction that has the material on the left.
    kind : {'straight', 'arc', 'fillet', 'rounding'}
        A fillet is an arc that is tangent to both neighbours and hollow, a rounding one that is full.
    length : float
    radius : float
        Length; infinity for a straight edge.
    x, y : float
        The edge's middle.
    by_offset : float
        Gain of ``J`` for each unit that the whole edge moves out of the material, length**3.
    by_radius : float
        Gain of ``J`` for each unit of radius (length**3): of a fillet or rounding that stays tangent to its neighbours,
        of another arc about its centre. NaN for a straight edge, and where parallel neighbours fix the radius.
    rel_error : float
        Estimated relative error of both.
    """

    loop: int
    start: int
    end: int
    kind: str
    length: float
    radius: float
    x: float
    y: float
    by_offset: float
    by_radius: float
    rel_error: float


@dataclass(frozen=True, eq=False)
class BoundarySensitivity:
    """The gain of the torsion constant for material added along the boundary. ``print`` shows a table of the edges.

    Attributes
    ----------
    solution : TorsionSolution
    points, normals : ndarray of shape (n, 2)
        Along every loop in order; unit normals out of the material.
    density : ndarray of shape (n,)
        Gain of ``J`` for each area added there, ``tau^2``, length**2. At sharp re-entrant corners it has no bound.
    weights : ndarray of shape (n,)
        Length of boundary that each point stands for: ``sum(density * weights * dn)`` is the change of ``J``.
    edge : ndarray of shape (n,)
        The row of ``edges`` that each point is on.
    edges : tuple of EdgeSensitivity
        One for each edge of the outline, the outer loop first.
    closure : float
        ``sum(density * weights * (x . n)) / (4 J) - 1``: 0 for the true stress.
    """

    solution: TorsionSolution
    points: Floats
    normals: Floats
    density: Floats
    weights: Floats
    edge: Ints
    edges: tuple[EdgeSensitivity, ...]
    closure: float

    def change(self, movement: ArrayLike) -> float:
        """Return the change of ``J`` (length**4), to first order, when the boundary moves out of the material.

        Parameters
        ----------
        movement : array_like of shape (n,) or (n, 2)
            Along the normals, or vectors, at ``points`` (length).

        Raises
        ------
        InputError
            Another number of points, or not finite.
        """
        vectors = np.ndim(movement) == 2
        given = finite_array("movement", movement, columns=2 if vectors else None)
        if len(given) != len(self.points):
            raise InputError(f"movement must have a row for each of the {len(self.points)} points, got {len(given)}")
        outward = np.sum(given * self.normals, axis=1) if vectors else given
        return float(np.sum(self.density * self.weights * outward))

    def __iter__(self) -> Iterator[EdgeSensitivity]:
        return iter(self.edges)

    def largest(self) -> tuple[EdgeSensitivity, ...]:
        """Return the edges in falling order of what moving them does."""
        return tuple(sorted(self.edges, key=lambda edge: -edge.by_offset))

    def __str__(self) -> str:
        rows = [["edge", "kind", "middle", "length", "J for 1 outward", "J for 1 of radius", "+/-"]]
        for edge in self.largest()[:_MOST_ROWS]:
            loop = f"void {edge.loop - 1}, " if edge.loop else ""
            cells = [f"{loop}{edge.start} to {edge.end}", edge.kind, f"({number(edge.x)}, {number(edge.y)})"]
            by_radius = "" if np.isnan(edge.by_radius) else number(edge.by_radius)
            rows.append([*cells, number(edge.length), number(edge.by_offset), by_radius, percent(edge.rel_error)])
        more = len(self.edges) - _MOST_ROWS
        lines = [table(rows, "Where material counts", head=True)]
        lines += [f"and {more} more edges"] if more > 0 else []
        constant = number(self.solution.torsion_constant.value)
        lines.append(f"J = {constant}; int tau^2 x.n ds = 4 J is met to {percent(abs(self.closure))}")
        return "\n".join(lines)


def boundary_sensitivity(solution: TorsionSolution) -> BoundarySensitivity:
    """Return what moving the boundary does to the torsion constant, point by point and edge by edge.

    Parameters
    ----------
    solution : TorsionSolution

    Returns
    -------
    BoundarySensitivity

    Raises
    ------
    InputError
        Not a solution.

    Examples
    --------
    >>> from torsionfe.outline.shapes import round_bar
    >>> from torsionfe.torsion.solve import solve_torsion
    >>> found = boundary_sensitivity(solve_torsion(round_bar(20.0)))
    >>> round(sum(edge.by_offset for edge in found) / (2.0 * np.pi * 10.0**3), 6)  # J = pi r^4 / 2
    1.0
    """
    if not isinstance(solution, TorsionSolution):
        kind = type(solution).__name__
        raise InputError(f"a torsion solution is needed, got {kind}: call solve_torsion(outline) first")
    walk = _Walk.of(solution)
    gain, doubt = _beside_corners(solution, walk)
    doubt = np.where(doubt > 0.0, doubt, np.sqrt(walk.gain * walk.lengths).sum(axis=1) * _jumps(solution))
    bounds = solution.fields.lower + solution.fields.upper
    closure = float(np.sum(gain * np.sum(walk.points * walk.normals, axis=-1))) / (2.0 * bounds) - 1.0
    scale = solution.frame.scale
    lengths = walk.lengths.ravel() * scale
    return BoundarySensitivity(
        solution=solution,
        points=solution.frame.outward_points(walk.points.reshape(-1, 2)),
        normals=walk.normals.reshape(-1, 2),
        density=gain.ravel() * scale**3 / lengths,
        weights=lengths,
        edge=np.repeat(walk.edge, gain.shape[1]),
        edges=_edges(solution, walk, gain * scale**3, doubt * scale**3, abs(closure)),
        closure=closure,
    )


@dataclass(frozen=True)
class _Walk:
    """The boundary's sides in walking order, at Gauss points, in the solver's unit."""

    edge: Ints
    points: Floats
    normals: Floats
    lengths: Floats  # (s, g): what each point stands for
    gain: Floats  # (s, g): tau^2 over that length

    @classmethod
    def of(cls, solution: TorsionSolution) -> _Walk:
        space, sides = solution.fields.space, solution.boundary.sides
        nodes, weights = np.polynomial.legendre.leggauss(space.order)
        t = 0.5 * (1.0 + nodes)
        tau, points, speed = along_sides(space, solution.fields.omega, sides, t)
        tangents = side_curve(space.mesh, sides, t)[1] / speed[..., None]
        normals = np.stack([tangents[..., 1], -tangents[..., 0]], axis=-1)
        lengths = 0.5 * weights * speed
        lengths *= (solution.boundary.length / lengths.sum(axis=1))[:, None]  # those of the arcs to the last digit
        return cls(solution.boundary.edge, points, normals, lengths, tau**2 * lengths)


def _jumps(solution: TorsionSolution) -> Floats:
    """Return the largest jump of the stress at either end of each side, or where there is none its change along it.

    The true stress has no jump but at corners. On 29 trade shapes the true error was within the jump, times stress and
    length, on 533 of 535 edges.
    """
    stress, edges = solution.boundary, solution.boundary.mesh.edges
    ends = along_sides(solution.fields.space, solution.fields.omega, stress.sides, np.array([0.0, 1.0]))[0]
    loop = edges.loop[stress.edge]
    before = np.arange(len(loop)) - 1
    opening = np.searchsorted(loop, loop)
    before = np.where(before < opening, np.searchsorted(loop, loop, side="right") - 1, before)
    smooth = np.abs(edges.interior_angle - np.pi) <= SMOOTH
    joined = (stress.start > 0.0) | smooth[stress.edge]
    at_start = np.where(joined, np.abs(ends[:, 0] - ends[before, 1]), 0.0)
    jump = at_start.copy()
    np.maximum.at(jump, before, at_start)
    alone = ~joined
    alone[before] &= ~joined
    return np.where(alone, np.abs(ends[:, 1] - ends[:, 0]), jump)


# --- sharp corners ------------------------------------------------------------------------------------------


def _beside_corners(solution: TorsionSolution, walk: _Walk) -> tuple[Floats, Floats]:
    """Return the gain (s, g), that beside sharp corners by their singular terms, and there its doubt (s,), else 0."""
    edges, gain = solution.boundary.mesh.edges, walk.gain.copy()
    doubt = np.zeros(len(gain))
    for row, strength, power, rel_error in zip(*_corners(solution), strict=True):
        for edge, way in ((row, 1), (int(edges.previous[row]), -1)):
            sides, integral = _flank(solution, edge, way, strength, power)
            gain[sides] *= (integral / gain[sides].sum(axis=1))[:, None]
            doubt[sides] = 2.0 * rel_error * integral
    return gain, doubt


def _corners(solution: TorsionSolution) -> tuple[list[int], list[float], list[float], list[float]]:
    """Return the edges that start at sharp corners, the corners' strengths, exponents and relative errors."""
    rows, strength, rel_error = corner_strengths(solution.fields)
    powers = exponents(solution.boundary.mesh.edges, rows)
    return rows.tolist(), strength.tolist(), powers.tolist(), rel_error.tolist()


def _flank(solution: TorsionSolution, edge: int, way: int, strength: float, power: float) -> tuple[Ints, Floats]:
    """Return the sides of an edge next to its sharp end, and the integral of ``tau^2`` over each by singular terms."""
    stress = solution.boundary
    sides = np.flatnonzero(stress.edge == edge)[::way]
    count = min(_LEFT, len(sides) // 3)  # the other end may be sharp, too
    near, next_ = sides[:count], sides[count : count + _FITTED]
    whole = stress.mesh.edges.length[edge]
    distance = stress.position[next_] if way == 1 else whole - stress.position[next_]
    basis = distance ** (2.0 * power - 1.0)
    rest = np.abs(stress.tau[next_]) - strength * distance ** (power - 1.0)
    second = np.sum(basis * rest) / np.sum(basis * basis)
    reach = np.append(0.0, np.cumsum(stress.length[near]))
    terms = ((strength**2, 2.0), (2.0 * strength * second, 3.0), (second**2, 4.0))
    total = sum(factor * reach ** (times * power - 1.0) / (times * power - 1.0) for factor, times in terms)
    return near, np.diff(total)


# --- edges --------------------------------------------------------------------------------------------------


def _edges(
    solution: TorsionSolution, walk: _Walk, gain: Floats, doubt: Floats, floor: float
) -> tuple[EdgeSensitivity, ...]:
    edges = solution.outline.edges
    count = len(edges)
    by_offset = np.bincount(walk.edge, gain.sum(axis=1), count)
    rel_error = np.bincount(walk.edge, doubt, count) / by_offset + floor
    tangent, centre_way = _tangent_arcs(edges)
    sign = np.sign(edges.bulge)
    # a point of an arc about a centre that moves by w: (w + e) . n, with e = sign n
    outward = np.sum(walk.normals * centre_way[walk.edge][:, None], axis=-1) + sign[walk.edge][:, None]
    by_radius = np.where(sign == 0.0, np.nan, np.bincount(walk.edge, np.sum(gain * outward, axis=1), count))
    kinds = np.where(sign == 0.0, "straight", np.where(~tangent, "arc", np.where(sign < 0.0, "fillet", "rounding")))
    middle = edges.points(np.arange(count), np.full(count, 0.5))
    last = edges.vertex[edges.following]
    columns = (edges.loop, edges.vertex, last, kinds, edges.length, edges.radius, *middle.T, by_offset, by_radius)
    return tuple(EdgeSensitivity(*row) for row in zip(*(c.tolist() for c in (*columns, rel_error)), strict=True))


def _tangent_arcs(edges: Edges) -> tuple[NDArray[np.bool_], Floats]:
    """Return which edges are arcs between tangent neighbours of other curvature, and how far their centres move.

    While such an arc's radius grows by 1, its ends stay on the neighbours: there ``(w + e) . n = 0``, two equations for
    the way ``w`` of the centre. It is NaN where they are parallel, and 0 for an arc that only grows about its centre.
    """
    rows = np.arange(len(edges))
    ends = [edges.tangents(rows, np.full(len(rows), t)) for t in (0.0, 1.0)]
    normals = np.stack([np.stack([end[:, 1], -end[:, 0]], axis=1) for end in ends], axis=1)
    smooth = np.abs(edges.interior_angle - np.pi) <= SMOOTH
    sign = np.sign(edges.bulge)
    curvature = sign / edges.radius
    own = np.abs(curvature)
    apart = [np.abs(curvature[beside] - curvature) > _SAME * own for beside in (edges.previous, edges.following)]
    tangent = (sign != 0.0) & smooth & smooth[edges.following] & apart[0] & apart[1]
    across = np.abs(np.linalg.det(normals)) > _SAME
    way = np.zeros((len(rows), 2))
    solved = tangent & across
    right = np.repeat(-sign[solved][:, None, None], 2, axis=1)
    way[solved] = np.linalg.solve(normals[solved], right)[..., 0]
    way[tangent & ~across] = np.nan
    return tangent, way
