"""Which triangles to bisect: so that the bracket closes evenly, and so that the peak settles."""

from __future__ import annotations

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.mesh.bisect import bisect
from torsionfe.mesh.trimesh import TriMesh
from torsionfe.outline.fillets import sharp_corners
from torsionfe.torsion.boundary import BoundaryStress
from torsionfe.torsion.corners import exponents
from torsionfe.torsion.fields import Fields

__all__ = ["around_peaks", "from_afar", "refined"]

_ROUNDS = 6  # bisections of one triangle in one pass
_AIM = 0.85  # of the gap that is wanted
_REACH = 2  # sides to each side of a peak's own that are refined with it


def refined(fields: Fields, wanted: float, forced: Ints) -> TriMesh:
    """Return a finer mesh, predicted to close the bracket to ``wanted``.

    The share of the gap in each triangle is its indicator (Prager and Synge 1947). It falls as area**(p + 1)
    where the solution is smooth, and as area**(pi/alpha) beside a sharp corner, so the number of bisections
    that levels it out is predicted, and one pass does the work of several rounds of marking.

    Parameters
    ----------
    fields : Fields
    wanted : float
        Gap to reach, length**4.
    forced : ndarray of shape (m,)
        Bisections that a triangle needs for another reason.
    """
    mesh, order = fields.space.mesh, fields.space.order
    share = fields.energies.gap
    corners = _corner_nodes(mesh)
    decay = _decay(mesh, corners, order)
    limit = _even_share(share, decay, _AIM * wanted) if fields.gap > wanted else np.inf
    for _ in range(_ROUNDS):
        marked = (share > limit) | (forced > 0)
        if not marked.any():
            break
        finer, parent = bisect(mesh, marked)
        halvings = np.rint(np.log2(mesh.areas[parent] / finer.areas))
        share = share[parent] * 2.0 ** (-decay[parent] * halvings)
        forced = forced[parent] - halvings.astype(int)
        mesh = finer
        decay = _decay(mesh, corners, order)
    return mesh


def _corner_nodes(mesh: TriMesh) -> dict[int, float]:
    """Return the nodes at sharp re-entrant corners with their exponents ``pi / alpha``."""
    rows = sharp_corners(mesh.edges)
    if not len(rows):
        return {}
    return dict(zip(mesh.vertex_nodes[rows].tolist(), exponents(mesh.edges, rows).tolist(), strict=True))


def _decay(mesh: TriMesh, corners: dict[int, float], order: int) -> Floats:
    """Return the power of its area by which each triangle's share of the gap falls."""
    at_node = np.full(len(mesh.nodes), order + 1.0)
    at_node[list(corners)] = list(corners.values())
    a, b, c = at_node[mesh.triangles.T]
    return np.asarray(np.minimum(np.minimum(a, b), c), dtype=float)


def _even_share(share: Floats, decay: Floats, wanted: float) -> float:
    """Return the largest share a triangle may keep for the predicted sum to be ``wanted``."""
    low, high = 0.0, float(share.max())
    positive = np.maximum(share, 1e-300)
    for _ in range(50):
        middle = 0.5 * (low + high) if low > 0.0 else high / 16.0
        halvings = np.maximum(np.ceil(np.log2(positive / middle) / decay), 0.0)
        # 2^h children of share * 2^(-h decay) each; beside a corner only one child keeps the singularity
        if float(np.sum(share * 2.0 ** (halvings * (np.minimum(1.0, decay - 0.5) - decay)))) > wanted:
            high = middle
        else:
            low = middle
            if high / low < 1.05:
                break
    return max(low, 1e-300)


def around_peaks(stress: BoundaryStress, sides: Ints, rounds: Ints) -> Ints:
    """Return how often to bisect each triangle (m,) so that the boundary around some sides is finer.

    Parameters
    ----------
    stress : BoundaryStress
    sides : ndarray of shape (k,)
        Rows of the boundary stress's sides.
    rounds : ndarray of shape (k,)
        Bisections for the triangles that touch each side or its neighbours.
    """
    mesh = stress.mesh
    wanted = np.zeros(len(mesh.nodes), dtype=np.int64)
    for offset in range(-_REACH, _REACH + 1):
        rows = stress.sides[(sides + offset) % len(stress.sides)]
        for end in range(2):
            np.maximum.at(wanted, mesh.sides[rows, end], rounds)
    here = wanted[mesh.triangles].max(axis=1)
    # one layer more, one bisection less: what is left coarse nearby would set the value that the peak settles on
    np.maximum.at(wanted, mesh.triangles.ravel(), np.repeat(here - 1, 3))
    return np.asarray(wanted[mesh.triangles].max(axis=1))


def from_afar(influence: Floats, wanted: float) -> Ints:
    """Return how often to bisect each triangle (m,) so that little of its error reaches the peaks.

    Parameters
    ----------
    influence : ndarray of shape (k, m)
        How much of each peak's relative error may come from each triangle.
    wanted : float
        Relative error that is wanted of each peak.
    """
    rounds = np.zeros(influence.shape[1], dtype=np.int64)
    for reach in influence:
        if reach.sum() > wanted:
            rising = np.sort(reach)
            # what is left alone may bring half of it; two bisections take the others to a sixteenth (order 2) or so
            least = rising[np.searchsorted(np.cumsum(rising), 0.5 * wanted)]
            rounds[reach >= least] = 2
    return rounds
