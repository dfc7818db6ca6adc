"""Which root radius does a keyway need? The smallest one that keeps a margin of safety of 0.2.

Sizes in mm, forces in N, invented.
"""

from torsionfe.member.bar import TorqueCase
from torsionfe.member.margins import Allowables
from torsionfe.outline import shapes
from torsionfe.study.size import bar_margin, size


def shaft(root_radius: float) -> shapes.TradeShape:
    """Return the winch shaft with a keyway of some root radius."""
    return shapes.keyed_shaft(44.0, 12.0, 5.0, root_radius=root_radius)


def main() -> None:
    """Search the radius, and print every trial."""
    crank = TorqueCase("two keepers on the crank", torque=1.1e6)
    steel = Allowables(shear_yield=180.0)
    judge = bar_margin(crank, length=350.0, shear_modulus=79e3, allowables=steel)
    print(size(shaft, 0.3, 3.0, lambda outline: judge(outline).governing.margin - 0.2))


if __name__ == "__main__":
    main()
