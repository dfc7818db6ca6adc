"""The outlines that every benchmark uses: twelve of practice, their dimensions invented (mm), and a comb.

Each is a function that builds a fresh outline, so that nothing kept from an earlier run is measured.
"""

import numpy as np

from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline

OUTLINES = {
    "square": lambda: shapes.rectangle(40, 40),
    "rectangle 5:1": lambda: shapes.rectangle(100, 20),
    "angle 80 x 80 x 8, root 8": lambda: shapes.angle(80, 80, 8, root_radius=8),
    "angle 80 x 80 x 8, root 1": lambda: shapes.angle(80, 80, 8, root_radius=1),
    "stubby tee": lambda: shapes.tee(60, 50, 20, 18, root_radius=6),
    "zee": lambda: shapes.zee(100, 50, 6, 5, root_radius=6),
    "wide flange": lambda: shapes.wide_flange(200, 100, 10, 7, root_radius=12),
    "box, rounded": lambda: shapes.box(100, 60, 6, outer_radius=9, inner_radius=6),
    "keyed shaft": lambda: shapes.keyed_shaft(50, 14, 5.5, root_radius=0.6),
    "flatted bar": lambda: shapes.flatted_bar(40, 30),
    "two-cell extrusion": lambda: shapes.extrusion(
        120, 60, [(6, 6, 61.5, 48), (72.5, 6, 41.5, 48)], outer_radius=9, inner_radius=5
    ),
    "splined shaft, 24 teeth": lambda: shapes.splined_shaft(24, 65, 58, 4, root_radius=0.6),
}


def comb(fillets: int) -> Outline:
    """Return a comb with an even number of root fillets of 1 mm, two to a gap between its 12 mm teeth."""
    gaps = fillets // 2
    pitch, tooth, base, reach = 10.0, 4.0, 8.0, 12.0
    left = pitch * np.arange(gaps, -1, -1)[:, None] + np.array([tooth, tooth, 0.0, 0.0])
    teeth = np.stack([left, np.broadcast_to([0.0, reach, reach, 0.0], left.shape)], axis=2).reshape(-1, 2)
    back = [(0.0, -base), (gaps * pitch + tooth, -base)]
    return Outline(np.concatenate([back, teeth[1:-1]])).filleted(1.0)
