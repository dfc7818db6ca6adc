"""Solids and tubes whose torsion is known exactly: for tests, and beside the finite elements.

Sources are cited from memory; the tests hold every formula against independent values.

Every function returns an `ExactTorsion`. All are centred on the origin unless their docstring says otherwise.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from torsionfe.checks import finite, non_negative, positive
from torsionfe.closed_form.rectangle import rectangle_series
from torsionfe.errors import InputError
from torsionfe.text import number, table

__all__ = [
    "ExactTorsion",
    "circle",
    "concentric_tube",
    "confocal_tube",
    "eccentric_tube",
    "ellipse",
    "equilateral_triangle",
    "rectangle",
    "similar_elliptic_tube",
]

_ELASTICITY = "Timoshenko and Goodier, Theory of Elasticity, 3rd ed."


@dataclass(frozen=True)
class ExactTorsion:
    """The exact answer for one solid. ``print`` shows a table.

    Attributes
    ----------
    name : str
    torsion_constant : float
        ``J``, length**4.
    stress_per_torque : float
        Peak shear stress for a torque of 1, 1/length**3.
    hot_spots : tuple of (float, float)
        Where the peak sits: every place that symmetry gives, or, on a circle, one of all.
    where : str
        The same in words.
    source : str
        Where the formula was published.
    """

    name: str
    torsion_constant: float
    stress_per_torque: float
    hot_spots: tuple[tuple[float, float], ...]
    where: str
    source: str

    @property
    def section_modulus(self) -> float:
        """``W_t = T / tau_max``, length**3."""
        return 1.0 / self.stress_per_torque

    def peak_stress(self, torque: float) -> float:
        """Return the size of the peak shear stress, force/length**2."""
        return abs(finite("torque", torque)) * self.stress_per_torque

    def twist_rate(self, torque: float, shear_modulus: float) -> float:
        """Return ``T / (G J)``, rad/length."""
        return finite("torque", torque) / (positive("shear_modulus", shear_modulus) * self.torsion_constant)

    def __str__(self) -> str:
        rows = [
            ["torsion constant J", number(self.torsion_constant, 6)],
            ["section modulus W_t", number(self.section_modulus, 6)],
            ["peak stress per torque", number(self.stress_per_torque, 6)],
            ["hot spot", self.where],
            ["source", self.source],
        ]
        return table(rows, self.name)


def _both_ends(x: float, y: float) -> tuple[tuple[float, float], ...]:
    return ((x, y), (-x, -y))


def circle(diameter: float) -> ExactTorsion:
    """Return the round bar: ``J = pi d**4 / 32`` (Coulomb 1784)."""
    d = positive("diameter", diameter)
    J = math.pi * d**4 / 32.0
    return ExactTorsion(
        "Round bar", J, d / 2.0 / J, ((d / 2.0, 0.0),), "all round", f"Coulomb 1784; {_ELASTICITY}, art. 101"
    )


def concentric_tube(outer_diameter: float, wall: float) -> ExactTorsion:
    """Return the round tube.

    Raises
    ------
    InputError
        The wall is half the diameter or more.
    """
    d, t = positive("outer_diameter", outer_diameter), positive("wall", wall)
    if 2.0 * t >= d:
        raise InputError(f"wall must be less than half of outer_diameter, got {t:g} and {d:g}: use circle")
    inner = d - 2.0 * t
    # d**4 - inner**4, without the cancellation of thin walls
    J = math.pi / 32.0 * (2.0 * t) * (d + inner) * (d**2 + inner**2)
    return ExactTorsion(
        "Round tube", J, d / 2.0 / J, ((d / 2.0, 0.0),), "outside, all round", f"{_ELASTICITY}, art. 101"
    )


def _elliptic(a: float, b: float) -> tuple[float, float, tuple[tuple[float, float], ...]]:
    """Return ``J``, the peak for ``G theta' = 1`` and where it is, of an ellipse with semi-axes a, b."""
    J = math.pi * a**3 * b**3 / (a**2 + b**2)
    peak = 2.0 * a * b * max(a, b) / (a**2 + b**2)
    if a == b:
        return J, peak, ((a, 0.0),)
    return J, peak, _both_ends(0.0, b) if a > b else _both_ends(a, 0.0)


def ellipse(width: float, height: float) -> ExactTorsion:
    """Return the ellipse with the full axes ``width`` (x) and ``height`` (y): Saint-Venant 1855."""
    J, peak, spots = _elliptic(positive("width", width) / 2.0, positive("height", height) / 2.0)
    source = f"Saint-Venant 1855; {_ELASTICITY}, art. 106"
    return ExactTorsion("Ellipse", J, peak / J, spots, "ends of the minor axis", source)


def similar_elliptic_tube(width: float, height: float, inner_scale: float) -> ExactTorsion:
    """Return the tube between an ellipse and its copy ``inner_scale`` (0 to 1) times as large.

    The inner ellipse is a stress line of the solid one, so that the material inside takes its share along
    and the rest is as it was.
    """
    k = positive("inner_scale", inner_scale)
    if k >= 1.0:
        raise InputError(f"inner_scale must be less than 1, got {k:g}")
    solid, peak, spots = _elliptic(positive("width", width) / 2.0, positive("height", height) / 2.0)
    J = solid * (1.0 - k) * (1.0 + k) * (1.0 + k**2)
    where = "outside, ends of the minor axis"
    return ExactTorsion("Elliptic tube, similar", J, peak / J, spots, where, f"{_ELASTICITY}, ch. 10")


def confocal_tube(width: float, height: float, inner_height: float) -> ExactTorsion:
    """Return the tube between two ellipses of the same foci.

    Parameters
    ----------
    width, height : float
        Full axes of the outer ellipse along x and y, ``width > height`` (length).
    inner_height : float
        Full axis of the inner ellipse along y; the foci give the other.

    Raises
    ------
    InputError
        Unless ``inner_height < height <= width``.

    Notes
    -----
    In elliptic coordinates ``x + i y = c cosh(xi + i eta)`` (Love, *Mathematical Theory of Elasticity*, 4th
    ed., ch. 14), ``phi + (x**2 + y**2)/2`` is harmonic, has no term in ``xi`` (the warping is single-valued)
    and the part ``c**2/4 cos(2 eta)`` on both ellipses, hence
    ``c**2/4 cosh(2 xi - xi_o - xi_i) / cosh(xi_o - xi_i) cos(2 eta)``; ``J`` and the stresses follow.
    """
    a, b = positive("width", width) / 2.0, positive("height", height) / 2.0
    b0 = positive("inner_height", inner_height) / 2.0
    if not b0 < b <= a:
        raise InputError(
            f"inner_height < height <= width is needed, got {2 * b0:g}, {2 * b:g}, {2 * a:g}: "
            "confocal ellipses are flat along the same axis"
        )
    c2 = (a - b) * (a + b)
    a0 = math.sqrt(c2 + b0**2)
    # c**2 tanh(xi_o - xi_i), written so that it holds for a circle too
    kappa = c2 * (b - b0) * (b + b0) * (a * a0 + b * b0) / ((b * a0 + b0 * a) * (c2 + b**2 + b0**2))
    J = math.pi / 4.0 * (a * b * (a**2 + b**2) - a0 * b0 * (a0**2 + b0**2) - c2 * kappa)
    # along each ellipse the stress is largest at an end of an axis; the inner minor axis never governs
    ends = [
        ((a * b - kappa / 2.0) / b, a, 0.0, "outside, ends of the major axis"),
        ((a * b + kappa / 2.0) / a, 0.0, b, "outside, ends of the minor axis"),
        ((a0 * b0 + kappa / 2.0) / b0, a0, 0.0, "inside, ends of the major axis"),
    ]
    peak, x, y, where = max(ends)
    source = "elliptic coordinates, Love, Mathematical Theory of Elasticity, 4th ed., ch. 14"
    return ExactTorsion("Elliptic tube, confocal", J, peak / J, _both_ends(x, y), where, source)


def eccentric_tube(outer_diameter: float, inner_diameter: float, eccentricity: float) -> ExactTorsion:
    """Return the round bar with a round hole off its centre.

    Parameters
    ----------
    outer_diameter, inner_diameter : float
        Of the bar, centred on the origin, and of the hole (length).
    eccentricity : float
        The hole's centre is at ``(eccentricity, 0)``, 0 or more (length).

    Raises
    ------
    InputError
        The hole reaches the outside, or leaves less than a ten-thousandth of the radius.

    Notes
    -----
    Macdonald, *Proc. Cambridge Phil. Soc.* 8 (1893), in bipolar coordinates
    ``x + i y = c coth((xi + i eta)/2)``: with the pole at the bar's centre the harmonic part
    ``sum H_n(xi) cos(n eta)`` vanishes outside (``xi = alpha``) and is ``-2 c e exp(-n beta)`` on the hole
    (``xi = beta``); ``J = I_p - pi sum H_n H_n'(beta)``.
    """
    R, r = positive("outer_diameter", outer_diameter) / 2.0, positive("inner_diameter", inner_diameter) / 2.0
    e = non_negative("eccentricity", eccentricity)
    if R - r - e < 1e-4 * R:
        raise InputError(
            "eccentricity + inner_diameter / 2 must stay below outer_diameter / 2, "
            f"got {e:g} + {r:g} and {R:g}"
        )
    # every quantity times e, so that e = 0 needs no case of its own: p = c e, the centres x_a e and x_b e
    p = 0.5 * math.sqrt((R - r - e) * (R - r + e) * ((R + r) ** 2 - e**2))
    xa, xb = 0.5 * (R**2 - r**2 + e**2), 0.5 * (R**2 - r**2 - e**2)
    hole = r * e / (xb + p)  # exp(-beta)
    w = r / R * (xa + p) / (xb + p)  # exp(alpha - beta)
    n = np.arange(1.0, 2.0 + 40.0 / max(-math.log(max(hole, 1e-16)), 1e-5))
    with np.errstate(under="ignore"):
        decay, ratio = hole**n, w**n
        rise, slope = 2.0 * ratio / (1.0 - ratio**2), (1.0 + ratio**2) / (1.0 - ratio**2)
        polar = math.pi / 2.0 * (R - r) * (R + r) * (R**2 + r**2) - math.pi * (r * e) ** 2
        J = polar - 4.0 * math.pi * p**2 * float(np.sum(n * decay**2 * slope))
        spots = []
        for side, sign in ((1.0, (-1.0) ** n), (-1.0, np.ones(len(n)))):  # the thin wall, the thick wall
            outside = R - 2.0 * (xa / R + side * e) * float(np.sum(n * decay * rise * sign))
            inside = r + side * e - 2.0 * (xb / r + side * e) * float(np.sum(n * decay * slope * sign))
            wall = "thinnest" if side > 0.0 else "thickest"
            spots.append((abs(outside), side * R, f"outside, where the wall is {wall}"))
            spots.append((abs(inside), e + side * r, f"inside, where the wall is {wall}"))
    peak, x, where = max(spots)
    source = "Macdonald 1893, bipolar coordinates"
    return ExactTorsion("Eccentric tube", J, peak / J, ((x, 0.0),), where, source)


def equilateral_triangle(side: float) -> ExactTorsion:
    """Return the equilateral triangle, one side at the bottom: ``J = sqrt(3) a**4 / 80``."""
    a = positive("side", side)
    J, middle = math.sqrt(3.0) / 80.0 * a**4, a / (2.0 * math.sqrt(3.0))
    angles = [math.radians(angle) for angle in (-90.0, 30.0, 150.0)]
    spots = tuple((middle * math.cos(angle), middle * math.sin(angle)) for angle in angles)
    source = f"Saint-Venant 1855; {_ELASTICITY}, art. 106"
    peak = math.sqrt(3.0) / 4.0 * a
    return ExactTorsion("Equilateral triangle", J, peak / J, spots, "middle of each side", source)


def rectangle(width: float, height: float) -> ExactTorsion:
    """Return the rectangle, from the series of `torsionfe.closed_form.rectangle`."""
    b, h = positive("width", width), positive("height", height)
    long, t = max(b, h), min(b, h)
    alpha, beta = (float(value) for value in rectangle_series(np.array(long / t)))
    spots = _both_ends(0.0, h / 2.0) if b >= h else _both_ends(b / 2.0, 0.0)
    if b == h:
        spots += _both_ends(b / 2.0, 0.0)
    source = f"Saint-Venant 1855; {_ELASTICITY}, art. 109"
    J, modulus = beta * long * t**3, alpha * long * t**2
    return ExactTorsion("Rectangle", J, 1.0 / modulus, spots, "middle of the long sides", source)
