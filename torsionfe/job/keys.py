"""Every key that a job file may hold, with what it means: the schema, and what the starter file explains."""

from __future__ import annotations

import inspect
from collections.abc import Mapping
from functools import cache
from types import MappingProxyType

__all__ = ["KEYS", "SHAPES", "SHEET_SECTIONS", "SWEEP_MAPS", "shape_keys"]

#: Sections of the sheet that a job may choose from, in their order on the paper.
SHEET_SECTIONS = ("section", "inputs", "method", "constant", "stress", "hand", "bar", "sensitivity", "references")

#: Columns of a sweep that can be drawn, the usual ones first.
SWEEP_MAPS = (
    "torsion_constant",
    "stress_per_torque",
    "hand_error",
    "hand_stress_error",
    "section_modulus",
    "area",
)

#: Trade shapes that a job may name, the functions of `torsionfe.outline.shapes`.
SHAPES = (
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
)

#: Dimensions that are no lengths.
_PLAIN = ("flange_slope", "tolerance")

_TABLES: dict[str, dict[str, str]] = {
    "": {
        "title": "what the sheet is about; on every page",
        "unit": "unit of length that bare numbers are in, and results are given in",
        "force": "unit of force; N, or lbf where the length is an inch or foot",
        "author": "who made the calculation",
        "checker": "who checked it",
        "revision": "revision of the job",
        "date": "date to print; the sheet has none of its own, so that it can be made again to the same bytes",
        "remarks": "text for the job's block on the sheet",
        "folders": "folders, besides the job file's own, that files may be read from",
        "outline": "the cross-section",
        "material": "stiffness and strengths, with their source",
        "cases": "torques",
        "bar": "length, supports, segments and allowed twist",
        "buckling": "the bar as a column: elastic torsional buckling",
        "compare": "the hand method to set beside the answer",
        "sensitivity": "what a little more on each dimension does",
        "tolerance": "how sure the answer has to be",
        "sheet": "paper and sections of the sheet",
        "outputs": "which files to write",
        "sweep": "the same job over a range of dimensions",
    },
    "outline": {
        "section": "a packaged example section (`torsionfe sections` lists them)",
        "file": "a drawing, mesh or table of points, relative to the job file",
        "file_unit": "unit of a file that states none",
        "layers": "layers of a DXF drawing to read",
        "restore_arcs": "whether chains of chords become arcs again (true)",
        "facet_tolerance": "how far chords' ends may lie off the arc, in the file's unit",
        "shape": "a trade shape, with its dimensions as further keys",
        "vertices": "corners [x, y] of the outer loop, counter-clockwise",
        "bulges": "tan(sweep / 4) of the edge after each corner, 0 for straight",
        "voids": "holes, each a table with vertices and bulges",
        "fillets": "corners to round",
    },
    "outline.voids": {
        "vertices": "corners [x, y] of the hole",
        "bulges": "tan(sweep / 4) of the edge after each corner, 0 for straight",
    },
    "outline.fillets": {
        "radius": "of the fillet",
        "at": "vertices of the outer loop, as numbered before rounding; by default every sharp re-entrant corner",
    },
    "material": {
        "name": "of the material",
        "source": "where its numbers come from; asked for as soon as there is one",
        "shear_modulus": "G",
        "elastic_modulus": "E; needed where warping is held, and for buckling",
        "shear_yield": "yield strength in shear",
        "shear_ultimate": "ultimate strength in shear",
        "tensile_yield": "yield strength in tension, turned into shear by the criterion",
        "tensile_ultimate": "ultimate strength in tension, turned into shear by the criterion",
        "criterion": "'von Mises' or 'Tresca'; needed with tensile strengths",
    },
    "cases": {
        "name": "of the case; its number without one",
        "torque": "at the far end",
        "at": "or torques at stations of a stepped bar",
        "limit_factor": "times the torque is set against yield and twist (1)",
        "ultimate_factor": "times the torque is set against the ultimate strength (1.5)",
    },
    "cases.at": {"station": "0 is where the first segment begins", "torque": "that acts there"},
    "bar": {
        "length": "of the bar",
        "held": "stations that cannot rotate (0)",
        "warping_held": "ends that cannot warp: 'near' (station 0) or 'both'; without it the bar warps freely",
        "segments": "bars in series, in place of one length",
        "allowed_twist": "largest rotation of any station",
        "allowed_twist_rate": "largest rotation per length",
    },
    "bar.segments": {
        "name": "of the segment",
        "length": "of the segment",
        "shear_modulus": "of the segment, if not the material's",
        "outline": "of the segment, if not the job's",
    },
    "buckling": {
        "force": "compression to set against the buckling load",
        "length": "of the column, if not the bar's",
        "length_factor": "K: 1 with ends free to warp and kept from rotating, 0.5 with both held (1)",
    },
    "compare": {
        "plates": "'shape' (as the trade shape states), 'derive' (from the outline), 'none', or a list of plates",
        "idealisations": "where plates end at a joint; the first one is drawn",
        "rule": "where the coefficients come from: 'series', 'table', 'thin' or 'third' (series)",
    },
    "compare.plates": {"width": "b", "thickness": "t", "name": "of the plate"},
    "sensitivity": {
        "step": "how much more (a power of ten near a thousandth of the section's size)",
        "of": "dimensions of the trade shape to vary (every length that the job states)",
    },
    "tolerance": {
        "torsion_constant": "width of the bracket of J over J (0.001)",
        "peak_stress": "relative error of the peak stress (0.002)",
        "order": "degree of the elements (2)",
        "most_unknowns": "where refinement stops (300000)",
    },
    "sheet": {
        "paper": "'a4' or 'letter'",
        "sections": f"of {', '.join(SHEET_SECTIONS)}; job block, warnings and cautions are always there",
    },
    "outputs": {
        "html": "sheet.html (true)",
        "pdf": "sheet.pdf (true)",
        "json": "result.json (true)",
        "csv": "tables for spreadsheets (false)",
        "fields": "stress and warping in the section, as fields.vtu (false)",
        "figures": "formats of the figures as files of their own: 'svg', 'pdf', 'png'",
    },
    "sweep": {
        "grid": "dimensions of the trade shape to vary, each with its values",
        "maps": f"what to draw over the grid: {', '.join(SWEEP_MAPS)}",
    },
    "sweep.grid.*": {
        "from": "first value",
        "to": "last value",
        "count": "how many",
        "spacing": "'even' or 'ratio' (even)",
    },
}

#: Every table of a job file: its keys and what they mean.
KEYS: Mapping[str, Mapping[str, str]] = MappingProxyType(
    {name: MappingProxyType(keys) for name, keys in _TABLES.items()}
)


@cache
def shape_keys(shape: str) -> Mapping[str, tuple[str, bool]]:
    """Return the dimensions of a trade shape: a ``length``, ``number``, ``whole`` or ``voids``, and whether needed."""
    from torsionfe.outline import shapes

    found = {}
    for name, parameter in inspect.signature(getattr(shapes, shape)).parameters.items():
        kind = "voids" if name == "voids" else "whole" if parameter.annotation == "int" else "length"
        found[name] = ("number" if name in _PLAIN else kind, parameter.default is inspect.Parameter.empty)
    return MappingProxyType(found)
