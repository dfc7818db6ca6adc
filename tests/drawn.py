"""Outlines for the tests of reading and writing: random ones, and arcs drawn as chords."""

import numpy as np
from hypothesis import strategies as st

from torsionfe.outline import arcs
from torsionfe.outline.outline import Outline


def circle(x, y, radius):
    return Outline([(x - radius, y), (x + radius, y)], [1.0, 1.0])


def rectangle(width, height, x=0.0, y=0.0):
    return Outline([(x, y), (x + width, y), (x + width, y + height), (x, y + height)])


def angle(leg=80.0, thickness=8.0):
    t = thickness
    return Outline([(0, 0), (leg, 0), (leg, t), (t, t), (t, leg), (0, leg)])


def fractions(count, spacing, rng=None):
    """Where the chords of an arc end, from 0 on, the end left out."""
    if spacing == "even":
        return np.arange(count) / count
    if spacing == "random":
        ends = np.concatenate([[0.0], np.cumsum(rng.uniform(0.7, 1.4, count))])
    elif spacing == "partial":  # the first and the last chord cut short
        ends = np.concatenate([[0.0], np.arange(count - 1) + 0.4, [count - 1.3]])
    else:
        ends = np.concatenate([[0.0], np.cumsum(1.1 ** np.arange(count))])
    return ends[:-1] / ends[-1]


def faceted(outline, count, spacing="even", decimals=None, rng=None):
    """The outline with each arc as ``count`` chords whose ends lie on it."""
    loops = []
    for loop in (outline, *outline.voids):
        parts = []
        for p, q, bulge in zip(loop.vertices, np.roll(loop.vertices, -1, axis=0), loop.bulges, strict=True):
            t = fractions(count, spacing, rng) if bulge else np.zeros(1)
            rows = np.ones(len(t))
            parts.append(arcs.point_at(rows[:, None] * p, rows[:, None] * q, rows * bulge, t))
        points = np.concatenate(parts)
        loops.append(Outline(points if decimals is None else np.round(points, decimals)))
    return Outline(loops[0].vertices, voids=loops[1:])


@st.composite
def outlines(draw):
    """Star-shaped outlines of straight edges and arcs, with up to two round or square voids, anywhere."""
    n = draw(st.integers(3, 9))
    radius = np.array(draw(st.lists(st.floats(6.0, 10.0), min_size=n, max_size=n)))
    bulges = np.array(draw(st.lists(st.sampled_from([0.0, 0.0, 0.1, 0.3]), min_size=n, max_size=n)))
    turn = 2.0 * np.pi * (np.arange(n) + draw(st.floats(0.0, 1.0))) / n
    points = radius[:, None] * np.stack([np.cos(turn), np.sin(turn)], axis=1)
    two = (circle(-0.9, 0, 0.7), rectangle(0.8, 0.9, 0.2))
    voids = draw(st.sampled_from([(), (circle(0.3, 0.2, 1.5),), two]))
    outline = Outline(points, bulges, voids)
    x, y = draw(st.floats(-50.0, 50.0)), draw(st.floats(-50.0, 50.0))
    return outline.scaled(draw(st.sampled_from([1.0, 0.013, 250.0]))).translated(x, y)


def assert_same(a, b, rel=1e-12):
    """The same loops from the same first vertices, within ``rel`` of the size."""
    assert len(a.voids) == len(b.voids)
    far = max(np.abs(a.vertices).max(), a.size)
    for one, other in zip((a, *a.voids), (b, *b.voids), strict=True):
        assert one.vertices.shape == other.vertices.shape
        np.testing.assert_allclose(other.vertices, one.vertices, rtol=0, atol=rel * far)
        np.testing.assert_allclose(other.bulges, one.bulges, rtol=0, atol=1e3 * rel * far / a.size)


def assert_same_shape(a, b, rel=1e-12):
    """The same loops wherever they start, voids in any order."""
    assert len(a.voids) == len(b.voids)
    far = max(np.abs(a.vertices).max(), a.size)

    def rolled(loop):
        key = np.round(loop.vertices / (1e-6 * far))
        first = np.lexsort(key.T)[0]
        return np.roll(loop.vertices, -first, axis=0), np.roll(loop.bulges, -first)

    def ordered(outline):
        voids = sorted(map(rolled, outline.voids), key=lambda v: tuple(np.round(v[0][0], 6)))
        return [rolled(outline), *voids]

    for (p, b1), (q, b2) in zip(ordered(a), ordered(b), strict=True):
        assert p.shape == q.shape
        np.testing.assert_allclose(q, p, rtol=0, atol=rel * far)
        np.testing.assert_allclose(b2, b1, rtol=0, atol=1e3 * rel * far / a.size)
