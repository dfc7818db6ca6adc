"""Units of length: named, converted, and asked for where they are missing; never guessed.

The factors are exact by definition: the metre and its decimal prefixes (the SI brochure), the inch of 25.4 mm
and its multiples (international yard and pound agreement, 1959), and the US survey foot of 1200/3937 m.
"""

from __future__ import annotations

from difflib import get_close_matches
from fractions import Fraction
from typing import Any

from torsionfe.errors import UnitError

__all__ = ["UNITS", "length_factor", "parse_unit"]

_INCH = Fraction(254, 10_000)
_SURVEY_FOOT = Fraction(1200, 3937)

#: Every unit by its symbol, in metres.
_METRES = {
    "nm": Fraction(1, 10**9),
    "um": Fraction(1, 10**6),
    "mm": Fraction(1, 1000),
    "cm": Fraction(1, 100),
    "dm": Fraction(1, 10),
    "m": Fraction(1),
    "km": Fraction(1000),
    "mil": _INCH / 1000,
    "in": _INCH,
    "ft": 12 * _INCH,
    "yd": 36 * _INCH,
    "ft_us": _SURVEY_FOOT,
    "in_us": _SURVEY_FOOT / 12,
}

#: The symbols of the units that are known.
UNITS = tuple(_METRES)

_WORDS = {
    "nm": ("nanometre", "nanometer"),
    "um": ("micrometre", "micrometer", "micron"),
    "mm": ("millimetre", "millimeter"),
    "cm": ("centimetre", "centimeter"),
    "dm": ("decimetre", "decimeter"),
    "m": ("metre", "meter"),
    "km": ("kilometre", "kilometer"),
    "mil": ("thou",),
    "in": ("inch",),
    "ft": ("foot",),
    "yd": ("yard",),
    "ft_us": ("us survey foot",),
    "in_us": ("us survey inch",),
}
_NAMES = {word: symbol for symbol, words in _WORDS.items() for word in words}
_NAMES |= {f"{word}s": symbol for word, symbol in _NAMES.items() if word[-4:] not in ("inch", "foot", "thou")}
_NAMES |= {"inches": "in", "feet": "ft", "us survey feet": "ft_us", "us survey inches": "in_us"}
_SIGNS = {'"': "in", "\u2033": "in", "'": "ft", "\u2032": "ft", "\u00b5m": "um", "\u03bcm": "um"}


def parse_unit(name: Any) -> str:
    """Return the symbol of a unit of length, one of `UNITS`.

    Parameters
    ----------
    name : str
        A symbol (as it is, or all in capitals: ``mm``, ``MM``, but not ``Mm``, which is a megametre), a word
        in any case, singular or plural, or one of the signs of the inch, the foot and the micrometre.

    Raises
    ------
    UnitError
        No such unit; the message names the nearest one and all that are known.

    Examples
    --------
    >>> parse_unit("mm"), parse_unit("Inches"), parse_unit("feet")
    ('mm', 'in', 'ft')
    """
    if isinstance(name, str):
        text = " ".join(name.split())
        if text in _SIGNS:
            return _SIGNS[text]
        symbol = text.lower() if text.isupper() else text
        if symbol in _METRES:
            return symbol
        if text.lower() in _NAMES:
            return _NAMES[text.lower()]
    near = get_close_matches(str(name)[:40].lower(), [*_METRES, *_NAMES], n=1)
    hint = f"; did you mean {near[0]!r}?" if near else ""
    shown = name[:40] if isinstance(name, str) else name
    raise UnitError(f"{shown!r:.60} is no unit of length that is known here ({', '.join(UNITS)}){hint}")


def length_factor(from_unit: str, to_unit: str) -> float:
    """Return what a length in ``from_unit`` is multiplied by to be in ``to_unit``, correctly rounded.

    Raises
    ------
    UnitError
        One of them is unknown.

    Examples
    --------
    >>> length_factor("in", "mm"), length_factor("m", "mm"), length_factor("mm", "mm")
    (25.4, 1000.0, 1.0)
    """
    return float(_METRES[parse_unit(from_unit)] / _METRES[parse_unit(to_unit)])
