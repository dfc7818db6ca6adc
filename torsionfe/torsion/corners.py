"""Sharp re-entrant corners: how fast the stress grows towards each, and how strongly.

Near a corner of interior angle ``alpha`` the stress function is ``phi_0 + K r^lambda sin(lambda theta)`` and smaller
terms, ``lambda = pi / alpha`` below one (Williams 1952, J. Appl. Mech. 19, 526-528, here for Poisson's equation), so
the stress ``k r^(lambda - 1)``, ``k = lambda K``, has no bound. On a circle of radius ``R`` about a corner between
straight flanks the first Fourier coefficient of ``phi - phi_0`` is exactly

    (2 / alpha) int (phi - phi_0) sin(lambda theta) dtheta = K R^lambda - 8 R^2 / (alpha lambda (4 - lambda^2)),

and that of the warping function, less the rotation of the section about the corner,

    (2 / alpha) int w cos(lambda theta) dtheta = K R^lambda - 4 R^2 / (alpha (4 - lambda^2)),

from the ordinary differential equation that each fulfils. So ``K`` comes from circles that pass well clear of the
corner, where the mesh is good, and twice: the two values differ by what the mesh still costs.
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
#: Circles about the corner, as shares of the largest that meets nothing but the two flanks.
_CIRCLES = np.array([0.35, 0.45, 0.55, 0.65, 0.75, 0.85])
_GAUSS_X, _GAUSS_W = np.polynomial.legendre.leggauss(32)
#: The true error was at most 2.5 times the disagreement: on sectors (exact) and trade shapes with sharp corners.
_CAUTION = 3.0
#: A curved flank is straight enough on circles of this share of its radius.
_CURVED = 0.15


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
    reach, curved = _reach(edges, rows)
    radius = reach[:, None] * _CIRCLES
    exponent = exponents(edges, rows)
    phi_k, omega_k = _on_circles(fields, rows, radius)
    # between curved flanks both are off by about R / radius: their line through R = 0
    ends = [np.where(curved, _at_zero(radius, k), k.mean(axis=1)) for k in (phi_k, omega_k)]
    value = 0.5 * (ends[0] + ends[1])
    spread = np.maximum(phi_k.std(axis=1), omega_k.std(axis=1))
    doubt = 0.5 * np.abs(ends[0] - ends[1]) + np.where(curved, 0.2, 1.0) * spread
    return rows, exponent * np.abs(value), _CAUTION * doubt / np.abs(value)


def _at_zero(radius: Floats, values: Floats) -> Floats:
    """Return the value at zero radius of the line through the values of each row."""
    x = radius - radius.mean(axis=1, keepdims=True)
    slope = np.sum(x * values, axis=1) / np.sum(x * x, axis=1)
    return np.asarray(values.mean(axis=1) - slope * radius.mean(axis=1), dtype=float)


def _reach(edges: Edges, rows: Ints) -> tuple[Floats, np.ndarray]:
    """Return how far from each corner only its two flanks lie, and whether one of them is curved."""
    reach = np.empty(len(rows))
    curved = np.zeros(len(rows), dtype=bool)
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
        curved[k] = np.isfinite(bend)
        reach[k] = min(*flanks, distance[other].min(initial=np.inf), _CURVED * bend)
    return reach, curved


def _on_circles(fields: Fields, rows: Ints, radius: Floats) -> tuple[Floats, Floats]:
    """Return ``K`` from the stress function and from the warping function on each circle, shape (c, circles)."""
    edges = fields.space.mesh.edges
    exponent = exponents(edges, rows)[:, None]
    alpha = np.pi / exponent
    lower, upper = _flank_angles(edges, rows, radius)
    opening = upper - lower
    share = 0.5 * (_GAUSS_X + 1.0)
    theta = lower[..., None] + opening[..., None] * share
    offset = radius[..., None, None] * np.stack([np.cos(theta), np.sin(theta)], axis=-1)
    points = edges.start[rows][:, None, None] + offset
    phi, omega = _values(fields, points.reshape(-1, 2), theta.shape)
    corner = edges.start[rows][:, None, None]
    turned = omega - (corner[..., 1] * offset[..., 0] - corner[..., 0] * offset[..., 1])
    weight = _GAUSS_W  # of mean 1: the integral over theta / alpha is half of the sum
    a = np.sum(weight * (phi - _loop_values(fields, rows)[:, None, None]) * np.sin(np.pi * share), axis=2)
    b = np.sum(weight * turned * np.cos(np.pi * share), axis=2)
    tail = radius**2 / (alpha * (4.0 - exponent**2))
    power = radius**exponent
    return (a + 8.0 * tail / exponent) / power, (b + 4.0 * tail) / power


def _flank_angles(edges: Edges, rows: Ints, radius: Floats) -> tuple[Floats, Floats]:
    """Return the directions from the corner to its flanks at the distance ``radius``, material from first to last."""
    before = edges.previous[rows]
    zero, one = np.zeros(len(rows)), np.ones(len(rows))
    leaving, arriving = edges.tangents(rows, zero), -edges.tangents(before, one)
    first = np.arctan2(leaving[:, 1], leaving[:, 0])[:, None]
    last = np.arctan2(arriving[:, 1], arriving[:, 0])[:, None]
    last = first + (last - first) % (2.0 * np.pi)
    # a chord of length R leaves an arc's tangent by asin(R / (2 radius)), to the left where the bulge is positive
    onto = np.arcsin(0.5 * radius / edges.radius[rows][:, None]) * np.sign(edges.bulge[rows])[:, None]
    back = np.arcsin(0.5 * radius / edges.radius[before][:, None]) * np.sign(edges.bulge[before])[:, None]
    return first + onto, last - back


def _loop_values(fields: Fields, rows: Ints) -> Floats:
    """Return the stress function's constant on the loop of each corner."""
    mesh = fields.space.mesh
    loop = mesh.edges.loop[rows]
    side = np.array([np.argmax(mesh.side_loop == k) for k in loop])
    return np.asarray(fields.phi[fields.space.side_dofs[side, 0]], dtype=float)


def _values(fields: Fields, points: Floats, shape: tuple[int, ...]) -> tuple[Floats, Floats]:
    """Return both functions at points of the section."""
    triangle, reference = locate(fields.space.mesh, points)
    basis = fields.space.element.values(reference)
    dofs = fields.space.dofs[triangle]
    phi, omega = (np.einsum("kb,kb->k", basis, field[dofs]).reshape(shape) for field in (fields.phi, fields.omega))
    return phi, omega
