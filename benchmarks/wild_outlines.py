"""Outlines wilder than those of the property tests, from a generator of random numbers: for the soak."""

import math

import numpy as np
from random_outlines import filleted, random_outline, star

from torsionfe.errors import OutlineError
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline

SQUARE = [(0, 0), (1, 0), (1, 1), (0, 1)]


def spread(random, low, high):
    """Return a number between two others, spread evenly over its logarithm."""
    return float(np.exp(random.uniform(math.log(low), math.log(high))))


def any_outline(random, most=100.0, **options):
    return random_outline(int(random.integers(2**32)), aspect=spread(random, 1.0, most), **options)


# --- thin, sharp, narrow ------------------------------------------------------------------------------------


def needle(random):
    angle = spread(random, 0.003, 0.4)
    return Outline([(0, 0), (1, 0), (math.cos(angle), math.sin(angle))])


def thin(random):
    ratio = spread(random, 20.0, 5000.0)
    return shapes.rectangle(1.0, 1.0 / ratio) if random.random() < 0.5 else shapes.tube(1.0, 1.0 / ratio)


def neck(random):
    half = [(-1, -1), (-0.5 * spread(random, 3e-7, 0.1), -spread(random, 1e-6, 1.0))]
    half += [(-half[1][0], half[1][1]), (1, -1)]
    return Outline(half + [(-x, -y) for x, y in half])


def spiky(random):
    n = int(random.integers(5, 40))
    turn = np.linspace(0.0, 2.0 * np.pi, 2 * n, endpoint=False)
    radius = np.where(np.arange(2 * n) % 2, random.uniform(0.2, 0.95), 1.0)
    return Outline(radius[:, None] * np.stack([np.cos(turn), np.sin(turn)], axis=1))


def slit(random):
    width = spread(random, 1e-4, 0.1)
    d = random.uniform(0.1, 0.9)
    return Outline([(-1, -1), (1, -1), (1, 1), (width, 1), (width, 1 - 2 * d), (0, 1 - 2 * d), (0, 1), (-1, 1)])


def comb(random):
    n, t, height = int(random.integers(2, 40)), random.uniform(0.1, 0.9), spread(random, 0.1, 30.0)
    teeth = [point for k in range(n) for point in [(k, 0), (k, height), (k + t, height), (k + t, 0)]]
    base = random.uniform(0.05, 3.0)
    outline = Outline([(0, -base), (n - 1 + t, -base), *teeth[::-1][1:-1]])
    return filleted(outline, spread(random, 1e-4, 0.3)) if random.random() < 0.5 else outline


def spiral(random):
    turns, wall = random.uniform(0.5, 6.0), random.uniform(0.05, 0.8)
    angle = np.linspace(0.0, 2.0 * np.pi * turns, int(turns * random.integers(12, 60)))
    along, radius = np.stack([np.cos(angle), np.sin(angle)], axis=1), (1.0 + angle / (2.0 * np.pi))[:, None]
    return Outline(np.concatenate([(radius + wall) * along, (radius * along)[::-1]]))


# --- arcs ---------------------------------------------------------------------------------------------------


def tiny_fillet(random):
    return shapes.angle(1.0, 0.8, 0.15, root_radius=spread(random, 1e-6, 1e-2))


def deep_arc(random):
    return Outline(SQUARE, [0.0, spread(random, 1.0, 45.0), 0.0, 0.0])


def crescent(random):
    bulge = spread(random, 0.05, 8.0)
    return Outline([(0, 0), (1, 0)], [-bulge * random.uniform(0.2, 0.999), bulge])


def keyhole(random):
    """A slot that opens into a round hole: an arc of nearly a full circle, cut out or put on."""
    width, bulge = spread(random, 1e-3, 0.1), spread(random, 1.0, 40.0)
    if random.random() < 0.5:
        x, s = 0.5 * width, 3.0 + 2.0 * width * bulge
        slot = [(x, 0), (x, -0.3), (-x, -0.3), (-x, 0)]
        return Outline([(-s, -2 * s), (s, -2 * s), (s, 0), *slot, (-s, 0)], [0, 0, 0, 0, -bulge, 0, 0, 0])
    a, b = 0.5 + 0.5 * width, 0.5 - 0.5 * width
    stalk = [(a, 0.2), (a, 0.5), (b, 0.5), (b, 0.2)]
    return Outline([(0, 0), (1, 0), (1, 0.2), *stalk, (0, 0.2)], [0, 0, 0, 0, bulge, 0, 0, 0])


def small_arc(random):
    end = 0.5 + spread(random, 1.2e-7, 1e-2)
    bulges = [0.0, random.uniform(-3.0, 5.0), 0.0, 0.0, 0.0, random.uniform(-0.8, 2.0)]
    return Outline([(0, 0), (0.5, 0), (end, 0), (1, 0), (1, 1), (0, 1)], bulges)


def flat_arcs(random):
    bulges = [spread(random, 1e-10, 1e-3) * random.choice([-1, 1]) for _ in range(4)]
    return Outline([(0, 0), (1, 0), (1, 0.3), (0, 0.3)], bulges)


def rounded(random):
    """Some corners, convex ones too, rounded by the largest radius of a row that fits."""
    outline = any_outline(random, round_=False)
    n = len(outline.vertices)
    at = random.choice(n, int(random.integers(1, n + 1)), replace=False).tolist()
    radius = spread(random, 1e-5, 1.0) * outline.size
    for _ in range(40):
        try:
            return outline.filleted(radius, at)
        except OutlineError:
            radius *= 0.75
    return outline.filleted(radius, at)


# --- voids --------------------------------------------------------------------------------------------------


def near_voids(random):
    gap, r = spread(random, 1e-5, 0.1), 0.3
    holes = [shapes.round_bar(2.0 * r).translated(side * (r + 0.5 * gap), 0.0) for side in (-1.0, 1.0)]
    return Outline([(-1, -0.5), (1, -0.5), (1, 0.5), (-1, 0.5)], voids=holes)


def near_edge(random):
    gap = spread(random, 1e-5, 0.1)
    return Outline([(-1, -0.5), (1, -0.5), (1, 0.5), (-1, 0.5)], voids=[shapes.round_bar(1.0 - 2.0 * gap)])


def near_arc(random):
    gap = spread(random, 2e-7, 0.05)
    r = random.uniform(0.05, 0.95) * (1.0 - gap)
    void = shapes.round_bar(2.0 * r).translated(1.0 - gap - r, 0.0).rotated(random.uniform(0.0, 6.0))
    return Outline([(-1, 0), (1, 0)], [1, 1], [void])


def many_voids(random):
    columns, rows = (int(n) for n in random.integers(2, 20, 2))
    r = random.uniform(0.2, 0.49)
    holes = [shapes.round_bar(2.0 * r).translated(i, k) for i in range(columns) for k in range(rows)]
    x, y = columns - 0.4, rows - 0.4
    return Outline([(-0.6, -0.6), (x, -0.6), (x, y), (-0.6, y)], voids=holes)


def cells(random):
    columns, rows = (int(n) for n in random.integers(1, 9, 2))
    wall = spread(random, 1e-3, 0.4)
    hole = shapes.rectangle(1.0 - wall, 1.0 - wall, 0.05 if random.random() < 0.5 else 0.0)
    x, y, a = columns - 0.5 + wall, rows - 0.5 + wall, -0.5 - wall
    holes = [hole.translated(i, k) for i in range(columns) for k in range(rows)]
    return Outline([(a, a), (x, a), (x, y), (a, y)], voids=holes)


def scattered_voids(random):
    """Round and star-shaped voids of all sizes wherever they fit, down to a thin wall."""
    import shapely

    base = any_outline(random, 5.0)
    size, placed, voids = base.size, [], []
    ring = Outline(base.vertices, base.bulges).polygon(1e-4 * size)
    (x0, y0, x1, y1), wall = base.bounds, spread(random, 1e-6, 1e-2) + 2e-4
    for centre in random.uniform((x0, y0), (x1, y1), (int(random.integers(1, 150)), 2)):
        point = shapely.Point(centre)
        if not ring.contains(point) or any(void.contains(point) for void in placed):
            continue
        others = [ring.exterior.distance(point), *(void.distance(point) for void in placed)]
        r = min(min(others) - wall * size, spread(random, 1e-4, 0.3) * size)
        if r > 1e-4 * size:
            void = shapes.round_bar(2.0 * r) if random.random() < 0.7 else star(random).scaled(0.9 * r)
            voids.append(void.translated(*centre))
            placed.append(point.buffer(r, quad_segs=64))
    return Outline(base.vertices, base.bulges, voids)


# --- rounding -----------------------------------------------------------------------------------------------


def close_vertices(random):
    gap = spread(random, 1e-10, 1e-3)
    return Outline([(0, 0), (0.5, 0), (0.5 + gap, gap), (1, 0), (1, 1), (0, 1)])


def noisy_line(random):
    x, rise = np.sort(random.uniform(0.0, 1.0, int(random.integers(1, 60)))), spread(random, 1e-12, 1e-4)
    line = np.stack([x, rise * random.normal(size=len(x))], axis=1)
    return Outline([(0, 0), *line, (1, 0), (1, spread(random, 1e-3, 1.0))])


def noisy_circle(random):
    n, rise = int(random.integers(20, 400)), spread(random, 1e-6, 0.05)
    turn, radius = 2.0 * np.pi * np.arange(n) / n, 1.0 + rise * random.normal(size=n)
    return Outline(np.stack([radius * np.cos(turn), random.uniform(0.1, 1.0) * radius * np.sin(turn)], axis=1))


def far(random):
    away = 10.0 ** random.uniform(2.0, 9.0)
    return any_outline(random).translated(away, -0.7 * away)


def any_unit(random):
    return any_outline(random).scaled(10.0 ** random.uniform(-30.0, 30.0))


# --- put together, and wrong --------------------------------------------------------------------------------


def joined(random):
    outline = any_outline(random, 4.0)
    for _ in range(int(random.integers(1, 4))):
        other = any_outline(random, 4.0).scaled(spread(random, 0.05, 1.0))
        other = other.translated(*(0.5 * random.uniform(-1.0, 1.0, 2) * outline.size))
        outline = outline.union(other) if random.random() < 0.5 else outline.difference(other)
    return outline


def shared_edge(random):
    """A union or difference of two whose edges lie upon each other, or nearly."""
    gap = random.choice([0.0, 1e-12, 1e-9, 1e-7, 1e-6, 1e-3]) * random.choice([-1.0, 1.0])
    other = shapes.rectangle(random.choice([0.5, 1.0]), 0.5, random.choice([0.0, 0.1]))
    other = other.translated(random.choice([0.0, 0.25, 0.5]), 0.75 + gap)
    square = shapes.rectangle(1.0, 1.0)
    return square.union(other) if random.random() < 0.5 else square.difference(other.translated(0.0, -0.5))


def crossed(random):
    return Outline(random.normal(size=(int(random.integers(4, 9)), 2)))


def no_outline(random):
    """What is no outline at all: words, none, not a number, complex, too large, voids outside."""
    wrong = [None, "abc", math.nan, math.inf, 1e300, 1e-300, 1j, True, [], {}, object(), 10**400]
    value, where = wrong[int(random.integers(len(wrong)))], int(random.integers(6))
    square = Outline(SQUARE)
    holes = [square.scaled(random.choice([0.5, 1.0, 2.0])).translated(random.uniform(-1, 1), 0.1) for _ in range(2)]
    makers = [
        lambda: Outline([(0, 0), (1, value), (1, 1)]),
        lambda: Outline(SQUARE, [0, value, 0, 0]),
        lambda: Outline(SQUARE, voids=[value]),
        lambda: Outline(SQUARE, voids=[value] if isinstance(value, dict | list | str) else value),
        lambda: Outline(SQUARE, voids=holes),
        lambda: square.filleted(value, at=[int(random.integers(-9, 9))]),
    ]
    return makers[where]()


WILD = (
    *(needle, thin, neck, spiky, slit, comb, spiral),
    *(tiny_fillet, deep_arc, crescent, keyhole, small_arc, flat_arcs, rounded),
    *(near_voids, near_edge, near_arc, many_voids, cells, scattered_voids),
    *(close_vertices, noisy_line, noisy_circle, far, any_unit),
    *(joined, shared_edge, crossed, no_outline),
)
