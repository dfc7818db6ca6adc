"""What the numbers do not cover: said wherever a margin is printed."""

from __future__ import annotations

__all__ = ["BUCKLING", "MARGINS", "PLASTIC", "RESTRAINT", "cautions"]

#: For every margin of safety.
MARGINS = (
    "Linear elastic, homogeneous, isotropic material; prismatic bar; ends free to warp unless said otherwise.",
    "Not covered: fatigue, residual stress, welds, contact, local buckling, and every action besides torque.",
    "The governing code and a licensed engineer decide; this is a calculation aid, not an approval.",
)

#: For the fully plastic torque.
PLASTIC = (
    "Fully plastic torque: rigid, perfectly plastic material without hardening, free warping, no local buckling; "
    "an upper limit that is reached only at large twist.",
)

#: For restrained warping.
RESTRAINT = (
    "Restrained warping by Vlasov's theory: the section keeps its shape, shear strain from warping is left out; "
    "best for thin open sections, rough for solid and closed ones. Real ends hold warping only in part.",
)

#: For torsional buckling.
BUCKLING = (
    "Elastic torsional buckling of a perfect, straight, centrally compressed bar: an upper limit. Yielding, "
    "imperfections and residual stress lower it; codes give the design strength.",
)


def cautions(*more: tuple[str, ...]) -> str:
    """Return the cautions of every margin, and of each further group, one a line.

    Examples
    --------
    >>> print(cautions().splitlines()[2])
    caution: The governing code and a licensed engineer decide; this is a calculation aid, not an approval.
    """
    return "\n".join(f"caution: {line}" for group in (MARGINS, *more) for line in group)
