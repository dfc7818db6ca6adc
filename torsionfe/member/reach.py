"""How far each inward ray of an outline's boundary runs before another part of the boundary is nearer.

Every length here is in units of the outline's size, measured from the middle of its bounds, so that the
tolerances are plain numbers. A ray leaves a boundary point ``p`` along the inward normal ``n``; the heap is
``offset + t`` high along it, until the place where some other edge or vertex ``F`` gives less:

    distance(p + t n, F) + offset_F = offset + t.

For a straight edge, an arc or a point that equation is linear in ``t``, so the end of each ray is exact.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np

from torsionfe.checks import Floats, Ints
from torsionfe.outline import arcs
from torsionfe.outline.edges import Edges

__all__ = ["Boundary", "Rays"]

# Below this bulge an edge counts as straight: its sagitta is under 1e-7 of its length.
_FLAT = 1e-7
# A denominator below this means that ray and edge never meet (they are parallel).
_PARALLEL = 1e-12
_SLACK = 1e-10
_CONVEX = 1e-5
_CHUNK = 30_000  # pairs of ray and edge at a time: what fits the second-level cache


@dataclass(frozen=True)
class Rays:
    """Rays into the material: where they start, their direction, and what they cannot meet.

    Attributes
    ----------
    start, direction : ndarray of shape (n, 2)
    offset : ndarray of shape (n,)
        Height of the heap where each ray starts.
    furthest : ndarray of shape (n,)
        Where neighbouring rays cross each other: the radius of a convex arc, else infinity.
    skip_edges, skip_points : ndarray of shape (n, 2)
        Rows of the edge table that the ray starts on; it cannot meet them again.
    """

    start: Floats
    direction: Floats
    offset: Floats
    furthest: Floats
    skip_edges: Ints
    skip_points: Ints

    def __len__(self) -> int:
        return len(self.offset)

    def part(self, rows: slice) -> Rays:
        """Return the rays of a slice."""
        return Rays(
            self.start[rows],
            self.direction[rows],
            self.offset[rows],
            self.furthest[rows],
            self.skip_edges[rows],
            self.skip_points[rows],
        )


@dataclass(frozen=True)
class Boundary:
    """The edges of an outline, scaled, ready to be met by rays.

    Attributes
    ----------
    start, end : ndarray of shape (e, 2)
    bulge : ndarray of shape (e,)
        Zero where the edge counts as straight.
    height : ndarray of shape (e,)
        Height of the heap along each edge: 0 on the outer loop, the plateau's on a void.
    edges : Edges
        The table that the scaled edges come from.
    """

    edges: Edges
    start: Floats
    end: Floats
    bulge: Floats
    height: Floats
    straight: Ints = field(init=False)
    curved: Ints = field(init=False)
    points: Ints = field(init=False)
    centre: Floats = field(init=False)
    radius: Floats = field(init=False)
    middle: Floats = field(init=False)
    cos_half: Floats = field(init=False)
    _along: Floats = field(init=False)
    _span: Floats = field(init=False)

    def __post_init__(self) -> None:
        curved = np.flatnonzero(self.bulge)
        p, q, b = self.start[curved], self.end[curved], self.bulge[curved]
        centre = arcs.arc_centre(p, q, b)
        middle = arcs.point_at(p, q, b, np.full(len(b), 0.5)) - centre
        straight = np.flatnonzero(self.bulge == 0.0)
        along = self.end[straight] - self.start[straight]
        span = np.hypot(*along.T)
        parts = {
            "straight": straight,
            # a convex corner is never nearest: one of its edges is
            "points": np.flatnonzero(self.edges.interior_angle > np.pi - _CONVEX),
            "_along": along / span[:, None],
            "_span": span,
            "curved": curved,
            "centre": centre,
            "radius": arcs.arc_radius(p, q, b),
            "middle": middle / np.hypot(*middle.T)[:, None],
            "cos_half": np.cos(0.5 * arcs.sweep(b)),
        }
        for name, value in parts.items():
            object.__setattr__(self, name, value)

    @classmethod
    def of(cls, edges: Edges, origin: Floats, size: float) -> Boundary:
        """Return the scaled boundary with every height zero."""
        bulge = np.where(np.abs(edges.bulge) < _FLAT, 0.0, edges.bulge)
        start, end = (edges.start - origin) / size, (edges.end - origin) / size
        return cls(edges, start, end, bulge, np.zeros(len(edges)))

    def raised(self, height: Floats) -> Boundary:
        """Return a copy with the given heights along its edges."""
        return Boundary(self.edges, self.start, self.end, self.bulge, height)

    def within(self, points: Floats, arcs_: slice | Ints) -> tuple[Floats, Floats]:
        """Return each point's distance from each arc's centre, and by how much it is in the arc's sector."""
        away = points - self.centre[arcs_]
        r = np.hypot(away[..., 0], away[..., 1])
        toward = np.sum(away * self.middle[arcs_], axis=-1)
        return r, toward - r * self.cos_half[arcs_]

    # --- rays -----------------------------------------------------------------------------------------

    def lengths(self, rays: Rays) -> Floats:
        """Return how far each ray runs, shape (n,)."""
        step = max(1, _CHUNK // len(self.bulge))
        parts = [self._lengths(rays.part(slice(k, k + step))) for k in range(0, len(rays), step)]
        return np.concatenate(parts) if parts else np.zeros(0)

    def _lengths(self, rays: Rays) -> Floats:
        rows = np.arange(len(rays))[:, None]
        met = np.full((len(rays), len(self.bulge)), np.inf)
        met[:, self.straight] = self._meet_straight(rays)
        met[:, self.curved] = self._meet_curved(rays)
        met[rows, rays.skip_edges] = np.inf
        nearest = np.minimum(met.min(axis=1), self._meet_points(rays).min(axis=1, initial=np.inf))
        return np.asarray(np.clip(nearest, 0.0, rays.furthest), dtype=float)

    def _meet_straight(self, rays: Rays) -> Floats:
        """Meet the straight edges: height over the edge's line ``h + t n.m = t + w``."""
        ux, uy = self._along.T
        x, y = _away(rays.start, self.start[self.straight])
        nx, ny = rays.direction.T[..., None]
        w = rays.offset[:, None] - self.height[self.straight]
        t = _ratio(y * ux - x * uy - w, 1.0 - (ny * ux - nx * uy))
        foot = x * ux + y * uy + t * (nx * ux + ny * uy)
        good = (foot > -_SLACK) & (foot < self._span + _SLACK) & (t > -_SLACK) & (t + w > -_SLACK)
        return np.where(good, t, np.inf)

    def _meet_curved(self, rays: Rays) -> Floats:
        """Meet the arcs: ``|q + t n| = R + s (t + w)``, ``q`` from the centre, ``s`` -1 for a convex arc."""
        sign = -np.sign(self.bulge[self.curved])
        x, y = _away(rays.start, self.centre)
        nx, ny = rays.direction.T[..., None]
        w = rays.offset[:, None] - self.height[self.curved]
        reach = self.radius + sign * w
        t = _ratio(sign * (x * x + y * y - reach**2), 2.0 * (reach - sign * (x * nx + y * ny)))
        x, y = x + t * nx, y + t * ny
        r = np.hypot(x, y)
        inside = x * self.middle[:, 0] + y * self.middle[:, 1] - r * self.cos_half > -_SLACK * r
        good = inside & (t > -_SLACK) & (t + w > -_SLACK) & (reach + sign * t > -_SLACK)
        return np.where(good, t, np.inf)

    def _meet_points(self, rays: Rays) -> Floats:
        """Meet the vertices: ``|q + t n| = t + w``."""
        x, y = _away(rays.start, self.start[self.points])
        nx, ny = rays.direction.T[..., None]
        w = rays.offset[:, None] - self.height[self.points]
        t = _ratio(x * x + y * y - w**2, 2.0 * (w - x * nx - y * ny))
        good = (t > -_SLACK) & (t + w > -_SLACK)
        own = (self.points == rays.skip_points[:, :1]) | (self.points == rays.skip_points[:, 1:])
        return np.where(good & ~own, t, np.inf)

    # --- distances between loops ----------------------------------------------------------------------

    def point_distances(self, points: Floats, edges: Ints) -> Floats:
        """Return the distance of each point to each of the given edges, shape (n, k)."""
        p, q = self.start[edges], self.end[edges]
        along = q - p
        away, far = points[:, None] - p, points[:, None] - q
        share = np.clip(np.sum(away * along, axis=2) / np.sum(along**2, axis=1), 0.0, 1.0)
        near = away - share[..., None] * along
        out = np.asarray(np.hypot(near[..., 0], near[..., 1]), dtype=float)
        bent = np.flatnonzero(self.bulge[edges])
        rows = np.searchsorted(self.curved, edges[bent])
        r, inside = self.within(points[:, None], rows)
        ends = [np.hypot(step[:, bent, 0], step[:, bent, 1]) for step in (away, far)]
        out[:, bent] = np.where(inside >= 0.0, np.abs(r - self.radius[rows]), np.minimum(*ends))
        return out

    def loop_distances(self) -> Floats:
        """Return the shortest distance between each two loops, shape (loops, loops)."""
        loops = [np.flatnonzero(self.edges.loop == k) for k in range(self.edges.loop.max() + 1)]
        out = np.zeros((len(loops), len(loops)))
        for a in range(len(loops)):
            for b in range(a):
                out[a, b] = out[b, a] = self._pair_distance(loops[a], loops[b])
        return out

    def _pair_distance(self, first: Ints, second: Ints) -> float:
        """Two edges are nearest at an end of one, or where they share a normal."""
        return min(
            min(float(self.point_distances(self.start[one], other).min()), self._normal_distance(one, other))
            for one, other in ((first, second), (second, first))
        )

    def _normal_distance(self, own: Ints, other: Ints) -> float:
        """Return the least distance along a shared normal from some edges to the arcs among others.

        It starts on a straight edge below the centre of the arc, on an arc in line with both centres.
        """
        target = np.flatnonzero(np.isin(self.curved, other))
        theirs = self.centre[target][:, None]
        flat = own[self.bulge[own] == 0.0]
        along = self.end[flat] - self.start[flat]
        share = np.sum((theirs - self.start[flat]) * along, axis=2) / np.sum(along**2, axis=1)
        rows = np.flatnonzero(np.isin(self.curved, own))
        line = theirs - self.centre[rows]
        gap = np.hypot(line[..., 0], line[..., 1])[..., None]
        step = self.radius[rows][:, None] * line / np.where(gap > 0.0, gap, 1.0)
        places = [self.start[flat] + np.clip(share, 0.0, 1.0)[..., None] * along]
        for point in (self.centre[rows] + step, self.centre[rows] - step):
            on_arc = self.within(point, rows)[1] >= 0.0
            places.append(np.where(on_arc[..., None], point, np.inf))
        best = math.inf
        for point in places:
            known = np.where(np.isfinite(point), point, 0.0)
            r, inside = self.within(known, target[:, None])
            facing = np.isfinite(point[..., 0]) & (inside >= 0.0)
            best = min(best, float(np.abs(r - self.radius[target][:, None]).min(initial=np.inf, where=facing)))
        return best


def _away(points: Floats, places: Floats) -> tuple[Floats, Floats]:
    """Return both components of the step from each place to each point, shape (points, places)."""
    return points[:, :1] - places[:, 0], points[:, 1:] - places[:, 1]


def _ratio(above: Floats, below: Floats) -> Floats:
    """Return ``above / below``, or -1 (behind the ray) where the denominator is too near 0 to mean anything."""
    apart = np.abs(below) > _PARALLEL
    return np.asarray(np.where(apart, above / np.where(apart, below, 1.0), -1.0), dtype=float)
