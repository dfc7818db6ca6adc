"""A two-cell plank with fins: Bredt's thin cells beside the answer, and what the middle web carries.

Sizes in mm, invented. The plank is the packaged section "deck-plank".
"""

import torsionfe as tf
from torsionfe.text import number, percent, table


def main() -> None:
    """Print torsion constants and stresses, by hand and by the solution."""
    plank = tf.sample("deck-plank")
    solution = tf.solve_torsion(plank)
    hand = tf.cell_sum(tf.derive_plates(plank).cells)
    print(f"J = {solution.torsion_constant} mm^4")
    j, middle_of_web = solution.torsion_constant, [(81.0, 24.0)]
    in_web = abs(float(solution.stress_at(middle_of_web)[0, 1]))
    by_hand = min(hand.wall_stress(1.0))
    known = [j.value, solution.section_modulus, in_web]
    guessed = [hand.torsion_constant, hand.section_modulus, by_hand]
    names = ["torsion constant J", "section modulus W_t", "stress per torque in the web"]
    rows = [["", "solution", "thin cells", "off by"]]
    for name, one, other in zip(names, known, guessed, strict=True):
        rows.append([name, number(one, 5), number(other, 5), percent(other / one - 1.0)])
    print(table(rows, "Two-cell plank, in mm", head=True))
    share = percent(in_web * solution.section_modulus)
    print(f"The flows on both sides of the web nearly cancel: its stress is {share} of the peak, which sits in the")
    print("fillet under a fin, where thin cells know of no stress at all.")


if __name__ == "__main__":
    main()
