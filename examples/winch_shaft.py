"""Which root radius does a keyway need? The smallest one that keeps a margin of safety of 0.2.

Sizes in mm, forces in N, invented.
"""

import torsionfe as tf


def shaft(root_radius: float) -> tf.TradeShape:
    """Return the winch shaft with a keyway of some root radius."""
    return tf.shapes.keyed_shaft(44.0, 12.0, 5.0, root_radius=root_radius)


def main() -> None:
    """Search the radius, and print every trial."""
    crank = tf.TorqueCase("two keepers on the crank", torque=1.1e6)
    steel = tf.Allowables(shear_yield=180.0)
    judge = tf.bar_margin(crank, length=350.0, shear_modulus=79e3, allowables=steel)
    print(tf.size(shaft, 0.3, 3.0, lambda outline: judge(outline).governing.margin - 0.2))


if __name__ == "__main__":
    main()
