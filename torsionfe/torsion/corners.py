"""Sharp re-entrant corners: how fast the stress grows towards each, and how strongly.

Near a corner of interior angle ``alpha`` the stress function is ``phi_0 + K r^lambda sin(lambda theta)`` and smaller
terms, ``lambda = pi / alpha`` below one (Williams 1952, J. Appl. Mech. 19, 526-528, here for Poisson's equation), so
the stress ``k r^(lambda - 1)``, ``k = lambda K``, has no bound. ``K`` is taken out by Green's second identity with the
dual singular functions (Blum and Dobrowolski 1982, Computing 28, 53-63; here to vanish on the circle), on the sector
between the two flanks ``theta_1(r)``, ``theta_2(r)``, straight or arcs, inside a circle of radius ``R``. With
``g, h = r^-lambda -+ r^lambda R^(-2 lambda)``, the stress function ``u = phi - phi_0`` gives

    lambda alpha K = 2 lambda R^-lambda int u sin(lambda theta) dtheta + int 2 g sin(lambda theta) dA
                     + int w d[g sin(lambda theta)] - int g sin(lambda theta) r^2 dtheta,

and the warping function ``w``, less its value at the corner and the rotation of the section about it,

    lambda alpha K = 2 lambda R^-lambda int w cos(lambda theta) dtheta + int w d[h sin(lambda theta)]
                     + int g cos(lambda theta) r dr,

the integrals over ``dtheta`` along the circle, over ``d[]``, ``r^2 dtheta`` and ``r dr`` along the flanks with the
material on the left. So ``K`` comes from values alone, mostly well clear of the corner, where the mesh is good, and
twice: the two differ by what the mesh still costs.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from torsionfe.checks import Floats, Ints, finite, positive
from torsionfe.outline.crossings import fraction_on
from torsionfe.outline.edges import Edges
from torsionfe.outline.fillets import sharp_corners
from torsionfe.text import number, percent, table
from torsionfe.torsion.fields import Fields
from torsionfe.torsion.recover import locate

__all__ = ["CornerStress", "corner_strengths", "exponents"]

#: Peak at a fillet over the singular term at a distance of its radius, by interior angle (degrees).
_ROUNDED = np.array(
    [
        *[(180, 1.0), (183, 1.0791), (186, 1.1370), (190, 1.2013), (195, 1.2706), (200, 1.3295), (205, 1.3820)],
        *[(210, 1.4291), (217, 1.4861), (225, 1.5432), (240, 1.6308), (255, 1.6952), (270, 1.7465), (285, 1.7852)],
        *[(300, 1.8188), (315, 1.8461), (330, 1.8694), (345, 1.8890), (360, 1.905)],
    ]
)
#: Radii, as shares of the largest circle that meets nothing but the two flanks.
_CIRCLES = np.array([0.35, 0.45, 0.55, 0.65, 0.75, 0.85])
_GAUSS_X, _GAUSS_W = np.polynomial.legendre.leggauss(32)
#: The stated error over the disagreement of the two values: ``benchmarks/corner_honesty.py`` says how often it holds.
_CAUTION = 3.0
#: The largest circle over the radius of a curved flank.
_CURVED = 0.7


@dataclass(frozen=True, slots=True)
class CornerStress:
    """The singular stress at a sharp re-entrant corner, ``tau = T * intensity * r**(exponent - 1)``.

    Attributes
    ----------
    x, y : float
        The corner (length).
    angle : float
        Interior angle, radians.
    exponent : float
        ``pi / angle``, from 1/2 to 1.
    intensity : float
        For unit torque, length**(-2 - exponent): corners of the same angle rank by it.
    rel_error : float
        Estimated relative error of the intensity.
    """

    x: float
    y: float
    angle: float
    exponent: float
    intensity: float
    rel_error: float

    def stress(self, distance: float, torque: float = 1.0) -> float:
        """Return the singular term of the shear stress at a small distance (length) from the corner."""
        fall = positive("distance", distance) ** (self.exponent - 1.0)
        return float(abs(finite("torque", torque)) * self.intensity * fall)

    def peak_with_fillet(self, radius: float, torque: float = 1.0) -> float:
        """Return about the peak shear stress that a fillet here would have.

        ``c k radius**(exponent - 1)``: the stress about a rounded corner whose radius is small against everything
        around it follows from the singular term alone. ``c`` depends on the angle; its values are this project's own,
        from sectors with a fillet of a thousandth of their radius. The fillet's effect on ``J`` is left out, so the
        estimate is for choosing a radius: solve the filleted outline for the answer.

        Parameters
        ----------
        radius : float
            Length.
        torque : float
            force * length.
        """
        ratio = float(np.interp(np.degrees(self.angle), _ROUNDED[:, 0], _ROUNDED[:, 1]))
        return ratio * self.stress(radius, torque)

    def __str__(self) -> str:
        return table(
            [
                ("corner", f"({number(self.x)}, {number(self.y)})"),
                ("interior angle", f"{number(np.degrees(self.angle))} degrees"),
                ("stress per torque", f"{number(self.intensity)} r^{self.exponent - 1.0:.4f}"),
                ("uncertainty", f"+/- {percent(self.rel_error)}"),
            ],
            title="Sharp re-entrant corner",
        )


def exponents(edges: Edges, rows: Ints) -> Floats:
    """Return ``pi / alpha`` of the corners where the edges ``rows`` start, shape (k,)."""
    return np.asarray(np.pi / edges.interior_angle[rows], dtype=float)


def corner_strengths(fields: Fields) -> tuple[Ints, Floats, Floats]:
    """Return the edges that start at sharp re-entrant corners, their ``k`` for ``G theta' = 1``, and its rel. error.

    Returns
    -------
    rows : ndarray of shape (c,)
    strength : ndarray of shape (c,)
        length**(2 - exponent).
    rel_error : ndarray of shape (c,)
    """
    edges = fields.space.mesh.edges
    rows = sharp_corners(edges)
    if not len(rows):
        return rows, np.empty(0), np.empty(0)
    radius = _reach(edges, rows)[:, None] * _CIRCLES
    phi_k, omega_k = _by_duals(fields, rows, radius)
    ends = phi_k.mean(axis=1), omega_k.mean(axis=1)
    value = 0.5 * (ends[0] + ends[1])
    doubt = 0.5 * np.abs(ends[0] - ends[1]) + np.maximum(phi_k.std(axis=1), omega_k.std(axis=1))
    return rows, exponents(edges, rows) * np.abs(value), _CAUTION * doubt / np.abs(value)


def _reach(edges: Edges, rows: Ints) -> Floats:
    """Return how far from each corner only its two flanks lie."""
    reach = np.empty(len(rows))
    every = np.arange(len(edges))
    for k, row in enumerate(rows):
        before = edges.previous[row]
        corner = edges.start[row]
        nearest = edges.points(every, fraction_on(edges, every, np.tile(corner, (len(edges), 1)), np.inf))
        distance = np.hypot(*(nearest - corner).T)
        other = np.ones(len(edges), dtype=bool)
        other[[row, before]] = False
        flanks = [np.hypot(*(edges.end[row] - corner)), np.hypot(*(edges.start[before] - corner))]
        bend = min(edges.radius[row], edges.radius[before])
        reach[k] = min(*flanks, distance[other].min(initial=np.inf), _CURVED * bend)
    return reach


def _by_duals(fields: Fields, rows: Ints, radius: Floats) -> tuple[Floats, Floats]:
    """Return ``K`` from the stress function and from the warping function within each circle, shape (c, circles)."""
    edges = fields.space.mesh.edges
    power, big = exponents(edges, rows)[:, None, None], radius[..., None]
    share = 0.5 * (_GAUSS_X + 1.0)
    first, last = _flanks(edges, rows, big)
    theta = first.angle + (last.angle - first.angle) * share
    phi, omega = _values(fields, rows, big, theta)
    along = big**-power * (last.angle - first.angle) * _GAUSS_W  # of 2 R^-lambda dtheta
    a, b = power * phi * np.sin(power * theta) * along, power * omega * np.cos(power * theta) * along
    # r = R q^2 evens out the powers of r near the corner
    r, dr = big * share**2, big * share * _GAUSS_W
    rising = r**power * big ** (-2.0 * power)
    g, h = r**-power - rising, r**-power + rising
    # the material is on the left: out along the first flank, back along the last
    for flank, way in zip(_flanks(edges, rows, r), (1.0, -1.0), strict=True):
        omega = _values(fields, rows, r, flank.angle)[1]
        sin, cos = np.sin(power * flank.angle), np.cos(power * flank.angle)
        turning = power * cos * flank.slope
        a += way * (2.0 * g * r * cos / power - g * sin * r**2 * flank.slope) * dr
        a += way * omega * (g * turning - power * h / r * sin) * dr
        b += way * (omega * (h * turning - power * g / r * sin) + g * cos * r) * dr
    return a.sum(axis=2) / np.pi, b.sum(axis=2) / np.pi


@dataclass(frozen=True)
class _Flank:
    """Where a flank lies about its corner: its angle from the first flank's tangent, and how that turns with ``r``."""

    angle: Floats
    slope: Floats


def _flanks(edges: Edges, rows: Ints, r: Floats) -> tuple[_Flank, _Flank]:
    """Return both flanks of each corner at the distances ``r`` of shape (c, ...), the material from first to last."""
    shape = (-1,) + (1,) * (r.ndim - 1)
    # a chord of length r leaves an arc's tangent by asin(r / (2 radius)), to the left where the bulge is positive
    bends = (0.5 * np.sign(edges.bulge[k]) / edges.radius[k] for k in (rows, edges.previous[rows]))
    onto, back = (bend.reshape(shape) for bend in bends)
    opening = edges.interior_angle[rows].reshape(shape)
    return (
        _Flank(np.arcsin(onto * r), onto / np.sqrt(1.0 - (onto * r) ** 2)),
        _Flank(opening - np.arcsin(back * r), -back / np.sqrt(1.0 - (back * r) ** 2)),
    )


def _values(fields: Fields, rows: Ints, r: Floats, theta: Floats) -> tuple[Floats, Floats]:
    """Return both functions about their values at each corner, the rotation about it taken from the second.

    ``r`` and ``theta``, the angle from the first flank's tangent, are of shape (c, ...).
    """
    mesh, space = fields.space.mesh, fields.space
    edges = mesh.edges
    shape = (-1,) + (1,) * (theta.ndim - 1)
    corner = edges.start[rows]
    leaving = edges.tangents(rows, np.zeros(len(rows)))
    direction = theta + np.arctan2(leaving[:, 1], leaving[:, 0]).reshape(shape)
    offset = np.stack(np.broadcast_arrays(r * np.cos(direction), r * np.sin(direction)), axis=-1)
    x, y = (corner[:, axis].reshape(shape) for axis in range(2))
    triangle, reference = locate(mesh, (offset + np.stack([x, y], axis=-1)).reshape(-1, 2))
    basis = space.element.values(reference)
    phi, omega = (
        np.einsum("kb,kb->k", basis, field[space.dofs[triangle]]).reshape(theta.shape) - at.reshape(shape)
        for field, at in ((field, field[mesh.vertex_nodes[rows]]) for field in (fields.phi, fields.omega))
    )
    return phi, omega - (y * offset[..., 0] - x * offset[..., 1])
