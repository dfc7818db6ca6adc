"""Random outlines of every kind that a user might draw, from a seed: for property tests and for the soak."""

import math

import numpy as np

from torsionfe.errors import OutlineError
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline

KINDS = ("star", "stair", "shape", "arcs", "perforated")


def placed(points, aspect):
    """Return points stretched along x, so that length over height grows by the aspect."""
    return points * (math.sqrt(aspect), 1.0 / math.sqrt(aspect))


def star(random, aspect=1.0):
    """A star-shaped polygon about the origin, of 3 to 12 corners."""
    n = int(random.integers(3, 13))
    turn = 2.0 * np.pi * (np.arange(n) + random.uniform(-0.35, 0.35, n)) / n
    radius = random.uniform(0.35, 1.0, n)
    return Outline(placed(radius[:, None] * np.stack([np.cos(turn), np.sin(turn)], axis=1), aspect))


def stair(random, aspect=1.0):
    """A rectilinear polygon: columns of random heights upon a base, and some below it."""
    n = int(random.integers(1, 6))
    x = np.cumsum(np.append(0.0, random.uniform(0.2, 1.0, n)))
    above = _uneven(random.uniform(0.2, 2.0, n))
    below = -_uneven(random.uniform(0.1, 1.0, n))
    up = [(px, h) for k, h in enumerate(above) for px in (x[k], x[k + 1])]
    down = [(px, h) for k, h in enumerate(below) for px in (x[k], x[k + 1])]
    return Outline(placed(np.array(down + up[::-1]), aspect))


def _uneven(heights):
    """Return heights of which no two neighbours are equal enough to make a straight corner."""
    for k in range(1, len(heights)):
        if abs(heights[k] - heights[k - 1]) < 0.05:
            heights[k] += 0.1
    return heights


def shape(random, aspect=1.0):
    """A trade shape of random dimensions; the aspect makes its walls thin."""
    t = 0.35 / math.sqrt(aspect)
    w, h = random.uniform(1.0, 2.0, 2)
    r = random.uniform(0.1, 0.8) * t
    makers = (
        lambda: shapes.angle(w, h, t, root_radius=r),
        lambda: shapes.tee(w, h, t, 0.8 * t, root_radius=r),
        lambda: shapes.channel(w, 0.8 * h, t, 0.7 * t, root_radius=r),
        lambda: shapes.zee(w, 0.8 * h, t, t, root_radius=r),
        lambda: shapes.wide_flange(w, h, t, 0.6 * t, root_radius=r),
        lambda: shapes.box(w, h, t, outer_radius=1.2 * r, inner_radius=0.2 * r),
        lambda: shapes.keyed_shaft(w, 0.2 * w, 0.1 * w, root_radius=0.03 * w),
        lambda: shapes.tube(w, 0.4 * t),
        lambda: shapes.multi_cell(2.0 * w, h, 0.5 * t, columns=2, inner_radius=0.2 * t),
    )
    return makers[int(random.integers(len(makers)))]()


def arcs(random, aspect=1.0):
    """A star-shaped outline whose edges bulge in and out, some beyond a half circle where that fits."""
    base = star(random, aspect)
    for share in (1.0, 0.5, 0.25, 0.1):
        bulges = share * random.uniform(-0.5, 0.9, len(base.vertices))
        try:
            return Outline(base.vertices, bulges)
        except OutlineError:
            continue
    return base


def perforated(random, aspect=1.0):
    """A plate with round and square voids, some close to each other and to the edge."""
    w, h = math.sqrt(aspect), 1.0 / math.sqrt(aspect)
    n = int(random.integers(1, 5))
    pitch = 2.0 * w / n
    voids = []
    for k in range(n):
        r = random.uniform(0.15, 0.48) * min(pitch, 2.0 * h)
        void = shapes.round_bar(2.0 * r) if random.random() < 0.6 else shapes.rectangle(1.6 * r, 1.6 * r, 0.2 * r)
        voids.append(void.translated(-w + pitch * (k + 0.5), random.uniform(-0.5, 0.5) * max(0.0, h - 1.05 * r)))
    return Outline([(-w, -h), (w, -h), (w, h), (-w, h)], voids=voids)


MAKERS = {"star": star, "stair": stair, "shape": shape, "arcs": arcs, "perforated": perforated}


def filleted(outline, share):
    """Return the outline with its re-entrant corners rounded, by the largest of some radii that fits; or as it is."""
    for radius in (share, 0.3 * share, 0.1 * share, 0.02 * share):
        try:
            return outline.filleted(radius * outline.size)
        except OutlineError:
            continue
    return outline


def mixed_outline(seed, round_):
    """Return a random outline of each kind in turn, every other one of arcs: their corners are the hardest."""
    return random_outline(seed, "arcs" if seed % 2 else KINDS[seed // 2 % len(KINDS)], round_=round_)


def random_outline(seed, kind=None, aspect=None, round_=None):
    """Return a valid outline of a size about one, in a random position.

    Raises OutlineError now and then: a random drawing may cross itself.
    """
    random = np.random.default_rng(seed)
    kind = kind or KINDS[int(random.integers(len(KINDS)))]
    aspect = float(np.exp(random.uniform(0.0, math.log(100.0)))) if aspect is None else aspect
    outline = MAKERS[kind](random, aspect)
    if random.random() < 0.6 if round_ is None else round_:
        outline = filleted(outline, float(np.exp(random.uniform(math.log(1e-3), math.log(0.1)))))
    return outline.rotated(float(random.uniform(0.0, 2.0 * np.pi)))
