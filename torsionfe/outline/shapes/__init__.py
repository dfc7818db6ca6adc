"""Trade shapes: outlines from the dimensions that drawings give.

Unless a shape's docstring says otherwise, the middle of its extent lies at the origin.
"""

from torsionfe.outline.shapes.bars import (
    ellipse,
    flatted_bar,
    keyed_shaft,
    rectangle,
    regular,
    round_bar,
    splined_shaft,
)
from torsionfe.outline.shapes.hollow import box, extrusion, finned_box, multi_cell, tube
from torsionfe.outline.shapes.rolled import angle, channel, cross, plate_girder, tee, wide_flange, zee
from torsionfe.outline.shapes.trade import TradeShape

__all__ = [
    "TradeShape",
    "angle",
    "box",
    "channel",
    "cross",
    "ellipse",
    "extrusion",
    "finned_box",
    "flatted_bar",
    "keyed_shaft",
    "multi_cell",
    "plate_girder",
    "rectangle",
    "regular",
    "round_bar",
    "splined_shaft",
    "tee",
    "tube",
    "wide_flange",
    "zee",
]
