"""The triangulation: conforming, well shaped, coarse, deterministic."""

import json
import math
from pathlib import Path

import numpy as np
import pytest

from torsionfe.mesh.triangulate import SMALLEST_ANGLE, triangulate
from torsionfe.outline import arcs
from torsionfe.outline.outline import Outline

CASES = Path(__file__).parent / "reference" / "torsion_cases.json"


def reference_outlines():
    found = {}
    for case in json.loads(CASES.read_text()):
        loops = case["geometry"]["loops"]
        if any(edge and edge["type"] == "ellipse" for loop in loops for edge in loop["edges"]):
            continue
        made = {"outer": [], "hole": []}
        for loop in loops:
            bulges = [edge["bulge"] if edge else 0.0 for edge in loop["edges"]]
            made[loop["role"]].append((loop["vertices"], bulges))
        found[case["id"]] = Outline(*made["outer"][0], [Outline(*hole) for hole in made["hole"]])
    return found


REFERENCE = reference_outlines()


def check_mesh(mesh, outline):
    """Assert everything that later stages rely on."""
    sides, triangles, n = mesh.sides, mesh.triangles, len(mesh.nodes)
    segments = arcs.segment_area(mesh.nodes[sides[:, 0]], mesh.nodes[sides[:, 1]], mesh.side_bulge)
    assert mesh.areas.min() > 0.0
    assert mesh.areas.sum() + segments.sum() == pytest.approx(outline.area, rel=1e-9)
    assert np.array_equal(np.unique(triangles), np.arange(n))
    first, second = np.roll(triangles, -1, axis=1), np.roll(triangles, -2, axis=1)
    ahead, back = (first * n + second).ravel(), (second * n + first).ravel()
    assert len(np.unique(ahead)) == ahead.size
    rim = np.sort(ahead[~np.isin(ahead, back)])
    assert np.array_equal(rim, np.sort(sides[:, 0] * n + sides[:, 1]))
    points = mesh.edges.points(mesh.side_edge, mesh.side_span[:, 0])
    assert np.array_equal(points, mesh.nodes[sides[:, 0]])
    assert np.array_equal(np.sort(sides[:, 0]), np.sort(sides[:, 1]))
    for loop in (outline, *outline.voids):
        assert (mesh.nodes[None] == loop.vertices[:, None]).all(axis=2).any(axis=1).all()
    assert np.abs(arcs.sweep(mesh.side_bulge)).max() <= math.radians(30.0) * (1.0 + 1e-9)
    assert (mesh.angles[:, 0] >= mesh.angles.max(axis=1) - 1e-9).all()


@pytest.mark.parametrize("name", REFERENCE)
def test_every_reference_case_is_meshed_with_good_angles(name):
    outline = REFERENCE[name]
    mesh = triangulate(outline)
    check_mesh(mesh, outline)
    if outline.edges.interior_angle.min() > math.radians(60.5):
        assert mesh.angles.min() >= SMALLEST_ANGLE * (1.0 - 1e-9)
