"""A stubby lever by hand and by the true answer: how far off are thin plates, and does the fillet matter?

Sizes in mm, invented. The lever is the packaged section "sluice-lever".
"""

import torsionfe as tf
from torsionfe.text import number, percent, table


def main() -> None:
    """Print the hand method beside the answer, over the fillet's radius."""
    rows = [["root radius", "J between bounds", "by hand", "J by hand is off", "peak stress by hand is off"]]
    for radius in (2.0, 4.0, 7.0, 10.0):
        lever = tf.shapes.angle(62.0, 46.0, 13.0, root_radius=radius, toe_radius=4.0)
        solution = tf.solve_torsion(lever)
        hand = tf.plate_sum(lever.plates())  # plates have no fillet: the same for every radius
        j, w = solution.torsion_constant, solution.section_modulus
        errors = hand.torsion_constant_twist / j.value - 1.0, w / hand.section_modulus - 1.0
        rows.append([number(radius), str(j), number(hand.torsion_constant_twist, 6), *map(percent, errors)])
    print(table(rows, "Lever 62 x 46 x 13, in mm", head=True))


if __name__ == "__main__":
    main()
