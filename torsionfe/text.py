"""Words and numbers for people: the tables that results print as."""

from __future__ import annotations

import math
import unicodedata
from collections.abc import Iterable, Sequence

__all__ = ["number", "percent", "printable", "signed_percent", "table"]

#: Marks that turn the direction of the text after them, and the byte order mark: shown, never obeyed.
_HIDDEN = {*range(0x202A, 0x202F), *range(0x2066, 0x206A), 0xFEFF, *range(0xE0000, 0xE0080)}


def number(value: float, digits: int = 4) -> str:
    """Return ``value`` with ``digits`` significant digits, plain where that stays short.

    Examples
    --------
    >>> number(13512.345, 6), number(1.5e-9), number(-0.00123456)
    ('13512.3', '1.5e-09', '-0.001235')
    """
    if not math.isfinite(value):
        return "not defined" if math.isnan(value) else ("unbounded" if value > 0 else "-unbounded")
    short = f"{value:.{digits}g}"
    return f"{value:.0f}" if "e+" in short and abs(value) < 1e7 else short


def percent(ratio: float, digits: int = 2) -> str:
    """Return a ratio as percent with ``digits`` significant digits.

    Examples
    --------
    >>> percent(0.01234), percent(-0.5), percent(0.0), percent(1.234)
    ('1.2 %', '-50 %', '0 %', '123 %')
    """
    return f"{number(ratio * 100.0, digits)} %" if math.isfinite(ratio) else number(ratio)


def signed_percent(ratio: float, digits: int = 2) -> str:
    """Return a ratio as percent with its sign: ``'+3.1 %'``."""
    return f"+{percent(ratio, digits)}" if ratio > 0.0 else percent(ratio, digits)


def printable(text: str) -> str:
    r"""Return text that only prints: line breaks stay, what would steer a printer or reader is written out.

    Examples
    --------
    >>> printable("a\tb\u202ec")
    'a b[U+202E]c'
    """
    lines = text.replace("\r\n", "\n").replace("\r", "\n").replace("\t", " ")
    return "".join(f"[U+{ord(sign):04X}]" if _steers(sign) else sign for sign in lines)


def _steers(sign: str) -> bool:
    code = ord(sign)
    if sign == "\n" or 0x20 <= code < 0x7F:
        return False
    return unicodedata.category(sign) in ("Cc", "Cs", "Zl", "Zp") or code in _HIDDEN or code & 0xFFFE == 0xFFFE


def table(rows: Iterable[Sequence[str]], title: str = "", head: bool = False) -> str:
    """Return rows of text as an aligned table, the first column to the left, the rest as given.

    Parameters
    ----------
    rows : iterable of sequences of str
        Cells; rows may be of different lengths.
    title : str
        A line above, underlined.
    head : bool
        Whether the first row holds column heads, set off by a rule.
    """
    body = [list(row) for row in rows]
    width = max((len(row) for row in body), default=0)
    columns = [max((len(row[k]) for row in body if k < len(row)), default=0) for k in range(width)]
    lines = [
        "  ".join(cell.ljust(columns[k]) for k, cell in enumerate(row)).rstrip() for row in body
    ]
    if head and lines:
        lines.insert(1, "  ".join("-" * size for size in columns))
    return "\n".join(([title, "=" * len(title)] if title else []) + lines)
