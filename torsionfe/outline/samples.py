"""Packaged example sections, all of one invented scenario: the gear of a canal lock's sluice (sizes in mm)."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

from torsionfe.checks import one_of
from torsionfe.outline import shapes
from torsionfe.outline.outline import Outline

__all__ = ["SAMPLES", "SAMPLE_UNIT", "Sample", "sample"]

#: Unit of every packaged section.
SAMPLE_UNIT = "mm"


@dataclass(frozen=True, slots=True)
class Sample:
    """One packaged section.

    Attributes
    ----------
    title : str
        What it is, in a line.
    build : callable
        Returns its outline, in mm.
    """

    title: str
    build: Callable[[], Outline]


def _deck() -> Outline:
    """Return a two-cell plank 120 wide with a fin to each side of its top face."""
    left, right, top, under = 18.0, 138.0, 50.0, 44.0
    outer = [(left, 0), (right, 0), (right, under), (156, under), (156, top), (0, top), (0, under), (left, under)]
    cells = [(24.0, 6.0, 78.0, 42.0), (84.0, 6.0, 132.0, 42.0)]
    voids = [
        shapes.rectangle(x1 - x0, y1 - y0, 5.0).translated((x0 + x1) / 2.0, (y0 + y1) / 2.0)
        for x0, y0, x1, y1 in cells
    ]
    return Outline(outer, voids=voids).filleted(6.0, at=[2, 7])


#: Every packaged section by name.
SAMPLES: Mapping[str, Sample] = MappingProxyType(
    {
        "sluice-lever": Sample(
            "stubby angle, legs 62 x 46, 13 thick, root radius 7, toe radius 4",
            lambda: shapes.angle(62.0, 46.0, 13.0, root_radius=7.0, toe_radius=4.0),
        ),
        "winch-shaft": Sample(
            "keyed shaft, diameter 44, keyway 12 x 5, root radius 0.8",
            lambda: shapes.keyed_shaft(44.0, 12.0, 5.0, root_radius=0.8),
        ),
        "gate-beam": Sample(
            "wide flange, depth 180, flange 91 x 8, web 5.3, root radius 9",
            lambda: shapes.wide_flange(180.0, 91.0, 8.0, 5.3, root_radius=9.0),
        ),
        "paddle-tube": Sample(
            "rectangular tube 70 x 40 x 5, corner radii 8 and 3",
            lambda: shapes.box(70.0, 40.0, 5.0, outer_radius=8.0, inner_radius=3.0),
        ),
        "deck-plank": Sample("two-cell extrusion 120 x 50 x 6 with two 18 mm fins", _deck),
    }
)


def sample(name: str) -> Outline:
    """Return a packaged example section by name, in mm.

    Raises
    ------
    InputError
        No such section; the message names the nearest.
    """
    return SAMPLES[one_of("the example section", name, tuple(SAMPLES))].build()
