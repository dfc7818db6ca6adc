"""Which plates stand for a trade shape: the choices where one plate meets another, side by side."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from types import MappingProxyType

from torsionfe.checks import one_of, positive
from torsionfe.closed_form.plates import Plate, PlateSet
from torsionfe.errors import InputError

__all__ = ["IDEALISATIONS", "PLATE_KINDS", "idealisations", "plates_of"]

#: Where plates end at a joint, in a line each. 'centreline' is common practice.
IDEALISATIONS: Mapping[str, str] = MappingProxyType(
    {
        "centreline": "each plate from the middle of the plate that it meets to its own end",
        "full_depth": "each plate over its full outside length, joints counted twice",
        "straight_through": "flanges, or the longer leg, run straight through; the rest ends at their faces",
        "web_through": "the web, or the shorter leg, runs straight through; the rest ends at its faces",
        "developed": "one strip, as long as the centre line",
    }
)

#: The trade shapes that are sets of plates.
PLATE_KINDS = ("rectangle", "angle", "tee", "channel", "zee", "wide_flange", "plate_girder", "cross")

_WHOLE = "the section is one rectangle"
_HOLLOW = ("tube", "box", "finned_box", "multi_cell", "extrusion")


def plates_of(kind: str, dimensions: Mapping[str, float], idealisation: str = "centreline") -> PlateSet:
    """Return the plates that stand for a trade shape.

    Parameters
    ----------
    kind : str
        The name of the shape's function: one of `PLATE_KINDS`.
    dimensions : mapping of str to float
        The shape's parameters by name (length). Fillets and other radii are left out: plates have none.
    idealisation : str
        One of `IDEALISATIONS`.

    Raises
    ------
    InputError
        The shape is no set of plates, a dimension is missing, or the idealisation does not exist for it.

    Examples
    --------
    >>> legs = plates_of("angle", {"leg_x": 80.0, "leg_y": 60.0, "thickness": 8.0})
    >>> [(plate.name, plate.width) for plate in legs]
    [('x leg', 76.0), ('y leg', 56.0)]
    """
    one_of("idealisation", idealisation, tuple(IDEALISATIONS))
    every = idealisations(kind, dimensions)
    if idealisation not in every:
        allowed = ", ".join(map(repr, every))
        raise InputError(f"a {_words(kind)} of these sizes has no plates {idealisation!r}, only {allowed}")
    return every[idealisation]


def idealisations(kind: str, dimensions: Mapping[str, float]) -> dict[str, PlateSet]:
    """Return every idealisation of a trade shape, by name: the choice changes the answer.

    Parameters
    ----------
    kind, dimensions
        As in `plates_of`.

    Raises
    ------
    InputError
        The shape is no set of plates, or a dimension is missing.
    """
    if kind not in PLATE_KINDS:
        cells = " It is made of thin-walled cells: see thin_cells_of." if kind in _HOLLOW else ""
        raise InputError(
            f"a {_words(str(kind))} is no set of plates; those that are: {', '.join(PLATE_KINDS)}.{cells}"
        )
    found = _BY_KIND[kind](_Sizes(kind, dimensions))
    meanings = dict.fromkeys(IDEALISATIONS, _WHOLE) if kind == "rectangle" else IDEALISATIONS
    return {
        name: PlateSet(tuple(plates), name, meanings[name], _remarks(kind, dimensions, name))
        for name, plates in found.items()
    }


def _remarks(kind: str, dimensions: Mapping[str, float], idealisation: str) -> tuple[str, ...]:
    if dimensions.get("flange_slope"):
        return ("the flanges taper: the thickness that the shape states is used",)
    if kind == "cross" and not idealisation.endswith("through"):
        return ("the two plates cross: where they do, the section is counted twice",)
    return ()


def _words(kind: str) -> str:
    return kind.replace("_", " ")


class _Sizes:
    """The dimensions of one shape, checked when they are asked for."""

    def __init__(self, kind: str, dimensions: Mapping[str, float]) -> None:
        self.kind, self.dimensions = kind, dimensions

    def __getitem__(self, name: str) -> float:
        if name not in self.dimensions:
            given = ", ".join(self.dimensions) or "none"
            raise InputError(f"a {_words(self.kind)} needs the dimension {name!r}; given: {given}")
        return positive(name, self.dimensions[name])


def _rectangle(size: _Sizes) -> dict[str, list[Plate]]:
    width, height = size["width"], size["height"]
    plate = Plate(max(width, height), min(width, height), "rectangle")
    return {name: [plate] for name in IDEALISATIONS}


def _angle(size: _Sizes) -> dict[str, list[Plate]]:
    a, b, t = size["leg_x"], size["leg_y"], size["thickness"]

    def legs(short_x: float, short_y: float) -> list[Plate]:
        return [Plate(a - short_x, t, "x leg"), Plate(b - short_y, t, "y leg")]

    through = (0.0, t) if a >= b else (t, 0.0)
    return {
        "centreline": legs(t / 2.0, t / 2.0),
        "full_depth": legs(0.0, 0.0),
        "straight_through": legs(*through),
        "web_through": legs(*through[::-1]),
        "developed": [Plate(a + b - t, t, "strip")],
    }


def _tee(size: _Sizes) -> dict[str, list[Plate]]:
    b, d, tf, tw = size["flange_width"], size["depth"], size["flange_thickness"], size["web_thickness"]
    flange = Plate(b, tf, "flange")
    return {
        "centreline": [flange, Plate(d - tf / 2.0, tw, "web")],
        "full_depth": [flange, Plate(d, tw, "web")],
        "straight_through": [flange, Plate(d - tf, tw, "web")],
        "web_through": [Plate(d, tw, "web"), *_halves(flange, tw)],
    }


def _halves(plate: Plate, gap: float, ends: tuple[str, str] = ("left", "right")) -> list[Plate]:
    """Return what is left of a plate on both sides of one that runs through it."""
    return [Plate((plate.width - gap) / 2.0, plate.thickness, f"{end} {plate.name}") for end in ends]


def _wide_flange(size: _Sizes) -> dict[str, list[Plate]]:
    b, tf = size["flange_width"], size["flange_thickness"]
    flanges = [Plate(b, tf, f"{end} flange") for end in ("top", "bottom")]
    return _girder(flanges, size["depth"], size["web_thickness"])


def _plate_girder(size: _Sizes) -> dict[str, list[Plate]]:
    top = Plate(size["top_width"], size["top_thickness"], "top flange")
    bottom = Plate(size["bottom_width"], size["bottom_thickness"], "bottom flange")
    return _girder([top, bottom], size["depth"], size["web_thickness"])


def _girder(flanges: list[Plate], depth: float, tw: float) -> dict[str, list[Plate]]:
    both = sum(flange.thickness for flange in flanges)
    halves = [half for flange in flanges for half in _halves(flange, tw)]
    return {
        "centreline": [*flanges, Plate(depth - both / 2.0, tw, "web")],
        "full_depth": [*flanges, Plate(depth, tw, "web")],
        "straight_through": [*flanges, Plate(depth - both, tw, "web")],
        "web_through": [Plate(depth, tw, "web"), *halves],
    }


def _cross(size: _Sizes) -> dict[str, list[Plate]]:
    level = Plate(size["width"], size["thickness"], "level plate")
    upright = Plate(size["height"], size["upright_thickness"], "upright plate")
    pieces = [level, *_halves(upright, level.thickness, ("top", "bottom"))]
    others = [upright, *_halves(level, upright.thickness)]
    larger = level.area >= upright.area
    return {
        "centreline": [level, upright],
        "full_depth": [level, upright],
        "straight_through": pieces if larger else others,
        "web_through": others if larger else pieces,
    }


def _channel(size: _Sizes) -> dict[str, list[Plate]]:
    b, d, tf, tw = size["flange_width"], size["depth"], size["flange_thickness"], size["web_thickness"]

    def parts(flange: float, web: float) -> list[Plate]:
        return [Plate(flange, tf, "top flange"), Plate(flange, tf, "bottom flange"), Plate(web, tw, "web")]

    found = {
        "centreline": parts(b - tw / 2.0, d - tf),
        "full_depth": parts(b, d),
        "straight_through": parts(b, d - 2.0 * tf),
        "web_through": parts(b - tw, d),
    }
    if tf == tw:
        found["developed"] = [Plate(2.0 * b + d - 2.0 * tw, tw, "strip")]
    return found


_BY_KIND: Mapping[str, Callable[[_Sizes], dict[str, list[Plate]]]] = MappingProxyType(
    {
        "rectangle": _rectangle,
        "angle": _angle,
        "tee": _tee,
        "channel": _channel,
        "zee": _channel,
        "wide_flange": _wide_flange,
        "plate_girder": _plate_girder,
        "cross": _cross,
    }
)
