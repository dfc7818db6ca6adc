"""Sharp re-entrant corners, where the elastic stress is unbounded.

Near a corner of interior angle ``alpha`` the stress grows as ``r**(pi/alpha - 1)`` (Williams 1952, J. Appl. Mech.
19, 526-528, here for Laplace's equation), so no finite peak exists there.
"""

from __future__ import annotations

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.outline.edges import Edges

__all__ = ["SHARP", "exponents", "sharp_corners"]

#: An interior angle this far over 180 degrees (radians) is a sharp re-entrant corner.
SHARP = np.radians(0.1)


def sharp_corners(edges: Edges) -> Ints:
    """Return the rows of the edges that start at a sharp re-entrant corner, shape (k,)."""
    return np.flatnonzero(edges.interior_angle > np.pi + SHARP)


def exponents(edges: Edges, rows: Ints) -> Floats:
    """Return ``pi / alpha`` of the corners where the edges ``rows`` start, shape (k,)."""
    return np.asarray(np.pi / edges.interior_angle[rows], dtype=float)
