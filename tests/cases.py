"""The reference cases of ``tests/reference/torsion_cases.json`` as outlines (its README names the sources)."""

import json
from dataclasses import dataclass
from functools import cache, cached_property
from pathlib import Path

import numpy as np

from torsionfe.outline.biarcs import fit_curve
from torsionfe.outline.outline import Outline

FOLDER = Path(__file__).parent / "reference"
#: Ellipses become arcs this close to them, as a share of the longer axis.
ELLIPSE_TOLERANCE = 1e-6


@dataclass(frozen=True)
class Case:
    record: dict

    @property
    def name(self):
        return self.record["id"]

    @property
    def has_ellipse(self):
        edges = [edge for loop in self.record["geometry"]["loops"] for edge in loop["edges"]]
        return any(edge is not None and edge["type"] == "ellipse" for edge in edges)

    @cached_property
    def outline(self):
        loops = self.record["geometry"]["loops"]
        outer = [_loop(loop) for loop in loops if loop["role"] == "outer"]
        voids = [_loop(loop) for loop in loops if loop["role"] == "hole"]
        return Outline(outer[0].vertices, outer[0].bulges, voids)

    def has(self, name):
        return name in self.record["quantities"]

    def value(self, name):
        return self.record["quantities"][name]["value"]

    def digits(self, name):
        return self.record["quantities"][name]["digits"]


def _loop(loop):
    vertices, bulges = [], []
    for k, (start, edge) in enumerate(zip(loop["vertices"], loop["edges"], strict=True)):
        end = loop["vertices"][(k + 1) % len(loop["vertices"])]
        if edge is None or edge["type"] == "arc":
            vertices.append([start])
            bulges.append([0.0 if edge is None else edge["bulge"]])
        else:
            points, turns = _ellipse(edge, np.array(start), np.array(end))
            vertices.append(points[:-1])
            bulges.append(turns)
    return Outline(np.concatenate(vertices), np.concatenate(bulges))


def _ellipse(edge, start, end):
    centre, axes = np.array(edge["center"]), np.array([edge["rx"], edge["ry"]])
    t0, t1 = (np.arctan2(*((point - centre) / axes)[::-1]) for point in (start, end))
    sign = 1.0 if edge["ccw"] else -1.0
    turn = (sign * (t1 - t0)) % (2.0 * np.pi)

    def point(t):
        angle = t0 + sign * t
        return centre + axes * np.stack([np.cos(angle), np.sin(angle)], axis=1)

    def tangent(t):
        angle = t0 + sign * t
        return sign * axes * np.stack([-np.sin(angle), np.cos(angle)], axis=1)

    return fit_curve(point, tangent, 0.0, turn, ELLIPSE_TOLERANCE * axes.max())


@cache
def reference_cases():
    records = json.loads((FOLDER / "torsion_cases.json").read_text())
    return {record["id"]: Case(record) for record in records}


def case(name):
    return reference_cases()[name]
