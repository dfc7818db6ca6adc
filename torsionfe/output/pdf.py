"""A calculation sheet as a PDF: pages of text, tables and vector figures, set by matplotlib alone.

The content is cut into slabs, pieces that stay whole, each with its height; pages are filled with them from the top.
Lengths are points (1/72 inch) from the upper left corner of the page.
"""

from __future__ import annotations

import io
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass, replace
from functools import cache, lru_cache
from itertools import pairwise
from typing import TYPE_CHECKING, Any

from torsionfe.output.sheet import GUTTER, PAPERS, WIDTH, Beside, Block, Cells, Facts, Lines, Picture, Sheet, sheet_look
from torsionfe.output.style import INK, QUIET
from torsionfe.text import printable

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["legible", "render_pdf"]

_HEAD, _FOOT = 30.0, 24.0  # kept for the page's head and foot
_GAP = 6.0  # below a block
_NARROW_GAP, _WIDE_GAP = 8.0, 22.0  # between columns of a table
_SHORT = 6  # rows: a shorter table stays on one page
_LEADING = 1.32
#: Tried in turn until the sheet takes no more than three pages.
_SIZES = (8.0, 7.5, 7.0, 6.6)
_WANTED_PAGES = 3
_RULE, _WARNING = "#d4d7dc", "#c8553d"
_FAMILY = "DejaVu Sans"  # comes with matplotlib, so that every machine sets the same page


# --- measuring text -----------------------------------------------------------------------------------------


@cache
def _font(bold: bool) -> Any:
    from matplotlib.font_manager import FontProperties, findfont, get_font

    return get_font(findfont(FontProperties(family=_FAMILY, weight="bold" if bold else "normal")))


@cache
def _signs() -> frozenset[int]:
    """Return the characters that the font can set, upright and bold."""
    return frozenset(_font(False).get_charmap()) & frozenset(_font(True).get_charmap())


def legible(text: str) -> str:
    r"""Return text that the font can set: each character that it lacks is written as its number.

    Examples
    --------
    >>> legible("\N{GREEK SMALL LETTER TAU}\N{BLACK FOUR POINTED STAR}\N{PILE OF POO}")
    'τ✦[U+1F4A9]'
    """
    known = "".join(s if s == "\n" or ord(s) in _signs() else f"[U+{ord(s):04X}]" for s in printable(text))
    return known.replace("]\u200d[", "][")  # a joiner of two signs that are not there


@lru_cache(maxsize=20_000)
def _width_per_point(text: str, bold: bool) -> float:
    font = _font(bold)
    font.set_size(200.0, 72.0)  # so large that hinting to whole pixels does not matter
    font.set_text(text, 0.0)
    return float(font.get_width_height()[0]) / (64.0 * 200.0)


def _width(text: str, size: float, bold: bool = False) -> float:
    return _width_per_point(text, bold) * size


def _wrapped(text: str, width: float, size: float, bold: bool = False) -> list[str]:
    """Return text in lines no wider than ``width``, broken between words, inside one only where it must be."""
    lines = []
    for paragraph in legible(text).split("\n"):
        line = ""
        for word in paragraph.split(" "):
            longer = f"{line} {word}" if line else word
            if _width(longer, size, bold) <= width:
                line = longer
                continue
            if line:
                lines.append(line)
            *full, line = _pieces(word, width, size, bold)
            lines += full
        lines.append(line)
    return lines


def _pieces(word: str, width: float, size: float, bold: bool) -> list[str]:
    """Return a word in pieces that fit, each as long as can be."""
    pieces = []
    while _width(word, size, bold) > width and len(word) > 1:
        fits, fails = 1, len(word)
        while fails - fits > 1:
            middle = (fits + fails) // 2
            fits, fails = (middle, fails) if _width(word[:middle], size, bold) <= width else (fits, middle)
        pieces.append(word[:fits])
        word = word[fits:]
    return [*pieces, word]


def _shortened(text: str, width: float, size: float) -> str:
    """Return the first line of a text, cut with an ellipsis where it is too wide."""
    first, *more = _wrapped(" ".join(text.split()), width, size)
    return first if not more else _wrapped(first, width - _width("…", size), size)[0] + "…"


# --- pages and slabs ----------------------------------------------------------------------------------------


class _Page:
    """A page to draw on."""

    def __init__(self, paper: str) -> None:
        from matplotlib.figure import Figure

        inches = PAPERS[paper]
        self.width, self.height = (72.0 * side for side in inches)
        self.margin = 0.5 * (self.width - 72.0 * WIDTH)
        self.figure: Figure = Figure(figsize=inches)
        self.late: list[Any] = []  # text and rules

    def text(self, x: float, y: float, words: str, size: float, *, bold: bool = False, ink: str = INK,
             to: str = "left") -> None:
        """Set one line, its baseline at ``y``."""
        from matplotlib.text import Text

        place = x / self.width, 1.0 - y / self.height
        weight = "bold" if bold else "normal"
        line = Text(*place, words, fontsize=size, fontweight=weight, color=ink, ha=to, va="baseline", parse_math=False)
        line.set(family=_FAMILY, transform=self.figure.transFigure)
        self.late.append(line)

    def line(self, start: tuple[float, float], end: tuple[float, float], width: float, ink: str = INK) -> None:
        """Draw a straight line."""
        from matplotlib.lines import Line2D

        xs, ys = [p[0] / self.width for p in (start, end)], [1.0 - p[1] / self.height for p in (start, end)]
        rule = Line2D(xs, ys, linewidth=width, color=ink, transform=self.figure.transFigure, solid_capstyle="butt")
        self.late.append(rule)

    def picture(self, x: float, y: float, width: float, height: float, picture: Picture) -> None:
        """Draw a picture into a rectangle, its upper left corner at ``(x, y)``.

        It is laid out alone, and its axes then set on the page where they were there: one solver for all pictures
        of a page sometimes finds no layout, and then takes the process down.
        """
        from matplotlib.figure import Figure

        alone = Figure(figsize=(width / 72.0, height / 72.0), layout="constrained")
        picture.draw(alone)
        engine = alone.get_layout_engine()
        if engine is not None and alone.axes:
            engine.execute(alone)
        part = self.figure.add_subfigure(self.figure.add_gridspec(1, 1)[0, 0])
        part.bbox_relative.p0 = x / self.width, 1.0 - (y + height) / self.height
        part.bbox_relative.p1 = (x + width) / self.width, 1.0 - y / self.height
        picture.draw(part)
        for here, there in zip(part.axes, alone.axes, strict=True):
            here.set_position(there.get_position(original=True))

    def finished(self) -> Figure:
        """Add the text, above the pictures."""
        for artist in self.late:
            self.figure.add_artist(artist)
        return self.figure


Draw = Callable[[_Page, float, float], None]


@dataclass(frozen=True, slots=True)
class _Slab:
    """A piece that stays whole.

    Attributes
    ----------
    height : float
    draw : callable
    joined : bool
        Whether the next one must stay with it.
    head : _Slab or None
        What a page repeats above it where it is the first one there.
    """

    height: float
    draw: Draw
    joined: bool = False
    head: _Slab | None = None


def _nothing(page: _Page, x: float, y: float) -> None:
    """Draw an empty slab."""


def _slabs(block: Block, width: float, size: float) -> list[_Slab]:
    """Return a block as slabs for a column of some width."""
    if isinstance(block, Facts):
        found = _fact_slabs(block, width, size)
    elif isinstance(block, Cells):
        found = _cell_slabs(block, width, size)
    elif isinstance(block, Lines):
        found = _line_slabs(block, width, size)
    elif isinstance(block, Picture):
        found = [_picture_slab(block, width, size)]
    else:
        found = _beside_slabs(block, width, size)
    if isinstance(block, Facts | Cells) and len(found) <= _SHORT:
        found = [*(replace(slab, joined=True) for slab in found[:-1]), *found[-1:]]
    return [*found, _Slab(_GAP, _nothing)] if found else []


def _fact_slabs(block: Facts, width: float, size: float) -> list[_Slab]:
    names = [line for name, _ in block.rows for line in legible(name).split("\n")]
    at = min(0.45 * width, max((_width(line, size) for line in names), default=0.0) + 10.0)
    slabs = []
    for name, value in block.rows:
        columns = [(0.0, _wrapped(name, at - 8.0, size), QUIET), (at, _wrapped(value, width - at, size), INK)]
        slabs.append(_row_slab(columns, width, size, ["left", "left"]))
    return slabs


def _row_slab(columns: Sequence[tuple[float, list[str], str]], width: float, size: float, sides: Sequence[str],
              *, bold: bool = False, rule: float = 0.4) -> _Slab:
    """Return a row of a table: each column with its place, its lines and its colour; a rule below."""
    leading = _LEADING * size
    height = leading * max(len(lines) for _, lines, _ in columns) + 0.45 * size

    def draw(page: _Page, x: float, y: float) -> None:
        for (at, lines, ink), side in zip(columns, sides, strict=True):
            for k, line in enumerate(lines):
                page.text(x + at, y + size + k * leading, line, size, ink=ink, to=side, bold=bold)
        low = y + height - 1.0
        page.line((x, low), (x + width, low), rule, _RULE if rule < 0.6 else QUIET)

    return _Slab(height, draw)


def _cell_slabs(block: Cells, width: float, size: float) -> list[_Slab]:
    size *= 0.95
    widths, gap = _columns([block.head, *block.rows], width, size)
    starts = [sum(widths[:k]) + k * gap for k in range(len(widths))]
    sides = ["left" if k < block.words else "right" for k in range(len(widths))]
    places = [s if k < block.words else s + w for k, (s, w) in enumerate(zip(starts, widths, strict=True))]
    whole = starts[-1] + widths[-1]

    def row(cells: Sequence[str], ink: str, rule: float) -> _Slab:
        lines = [_wrapped(cell, widths[k], size) for k, cell in enumerate(cells)]
        return _row_slab([(places[k], lines[k], ink) for k in range(len(cells))], whole, size, sides, rule=rule)

    head = replace(row(block.head, QUIET, 0.7), joined=True)
    return [head, *(replace(row(cells, INK, 0.4), head=head) for cells in block.rows)]


def _columns(rows: Sequence[Sequence[str]], width: float, size: float) -> tuple[list[float], float]:
    """Return the widths of a table's columns, as its cells need, the widest narrowed until all fit; and their gap."""
    count = len(rows[0])
    columns = [[legible(row[k]) for row in rows] for k in range(count)]
    need = [max(_width(line, size) for cell in column for line in cell.split("\n")) + 0.5 for column in columns]
    gap = min(_WIDE_GAP, max(_NARROW_GAP, (width - sum(need)) / max(count - 1, 1)))
    room = width - gap * (count - 1)
    if sum(need) <= room + 1e-6:
        return need, gap
    # a column keeps its longest word whole where all of them can
    least = [max((_width(word, size) for cell in column for word in cell.split()), default=0.0) for column in columns]
    least = [word + 0.5 for word in least] if sum(least) + 0.5 * count < room else [0.0] * count
    # a common limit on all columns, by halving
    low, high = 0.0, max(need)
    for _ in range(40):
        middle = 0.5 * (low + high)
        fits = sum(max(word, min(n, middle)) for n, word in zip(need, least, strict=True)) <= room
        low, high = (middle, high) if fits else (low, middle)
    return [max(word, min(n, low)) for n, word in zip(need, least, strict=True)], gap


def _line_slabs(block: Lines, width: float, size: float) -> list[_Slab]:
    verdict = block.tone == "verdict"
    inset = {"plain": 0.0, "list": 9.0}.get(block.tone, 8.0)
    big = size * (1.15 if verdict else 1.0)
    lines = [
        (words, k == 0)
        for line in block.lines
        for k, words in enumerate(_wrapped(line, width - inset - (8.0 if verdict else 0.0), big))
    ]
    if verdict:
        return [_verdict_slab([words for words, _ in lines], width, big)]
    return [_text_slab(words, first, block.tone, inset, size) for words, first in lines]


def _verdict_slab(lines: list[str], width: float, size: float) -> _Slab:
    height = _LEADING * size * len(lines) + 9.0

    def draw(page: _Page, x: float, y: float) -> None:
        for k, words in enumerate(lines):
            page.text(x + 8.0, y + 4.0 + size + k * _LEADING * size, words, size, bold=k == 0)
        corners = [(x, y), (x + width, y), (x + width, y + height), (x, y + height), (x, y)]
        for start, end in pairwise(corners):
            page.line(start, end, 1.0)

    return _Slab(height, draw)


def _text_slab(words: str, first: bool, tone: str, inset: float, size: float) -> _Slab:
    height = _LEADING * size + 0.8

    def draw(page: _Page, x: float, y: float) -> None:
        if tone == "list" and first:
            page.text(x, y + size, "–", size, ink=QUIET)
        if tone in ("warning", "caution"):
            page.line((x + 1.5, y), (x + 1.5, y + height), 2.5, _WARNING if tone == "warning" else QUIET)
        page.text(x + inset, y + size, words, size)

    return _Slab(height, draw)


def _picture_slab(block: Picture, width: float, size: float) -> _Slab:
    small = 0.92 * size
    caption = _wrapped(block.caption, width, small)
    high = width * block.ratio
    height = high + _LEADING * small * len(caption) + 3.0

    def draw(page: _Page, x: float, y: float) -> None:
        page.picture(x, y, width, high, block)
        for k, words in enumerate(caption):
            page.text(x, y + high + 2.0 + small + k * _LEADING * small, words, small, ink=QUIET)

    return _Slab(height, draw)


def _beside_slabs(block: Beside, width: float, size: float) -> list[_Slab]:
    room = width - 72.0 * GUTTER
    left_width = room * block.share
    left = [slab for item in block.left for slab in _slabs(item, left_width, size)]
    right = [slab for item in block.right for slab in _slabs(item, room - left_width, size)]
    height = max(sum(slab.height for slab in column) for column in (left, right)) - _GAP

    def draw(page: _Page, x: float, y: float) -> None:
        for column, at in ((left, x), (right, x + left_width + 72.0 * GUTTER)):
            down = y
            for slab in column:
                slab.draw(page, at, down)
                down += slab.height

    return [_Slab(height, draw)]


def _stacked(block: Beside) -> tuple[Block, ...]:
    return block.left + block.right


# --- the sheet ----------------------------------------------------------------------------------------------


def _sheet_slabs(sheet: Sheet, width: float, most: float, size: float) -> list[_Slab]:
    slabs = _title_slabs(sheet.title, width, size)
    for section in sheet.sections:
        if section.title:
            slabs.append(_heading_slab(section.title, width, size))
        for block in section.blocks:
            found = _slabs(block, width, size)
            if isinstance(block, Beside) and any(slab.height > most for slab in found):
                found = [slab for item in _stacked(block) for slab in _slabs(item, width, size)]
            slabs += found
    return slabs


def _title_slabs(title: str, width: float, size: float) -> list[_Slab]:
    big = 1.7 * size
    lines = _wrapped(title, width, big, bold=True)
    step = 1.22 * big

    def slab(words: str) -> _Slab:
        return _Slab(step, lambda page, x, y: page.text(x, y + big, words, big, bold=True))

    return [*(slab(words) for words in lines), _Slab(5.0, _nothing)]


def _heading_slab(title: str, width: float, size: float) -> _Slab:
    big = 1.15 * size
    lines = _wrapped(title, width, big, bold=True)
    height = _LEADING * big * len(lines) + 11.0

    def draw(page: _Page, x: float, y: float) -> None:
        page.line((x, y + 4.0), (x + width, y + 4.0), 1.0)
        for k, words in enumerate(lines):
            page.text(x, y + 7.0 + big + k * _LEADING * big, words, big, bold=True)

    return _Slab(height, draw, joined=True)


def _paged(slabs: Sequence[_Slab], most: float) -> Iterator[list[_Slab]]:
    """Yield the slabs of each page; a joined slab moves on with the one after it."""
    page: list[_Slab] = []
    used = 0.0
    for k, slab in enumerate(slabs):
        need, ahead = slab.height, k
        while slabs[ahead].joined and ahead + 1 < len(slabs):
            ahead += 1
            need += slabs[ahead].height
        if page and used + need > most and slab.draw is not _nothing:
            yield page
            page = [slab.head] if slab.head else []
            used = slab.head.height if slab.head else 0.0
        if page or slab.draw is not _nothing:
            page.append(slab)
            used += slab.height
    if page:
        yield page


def _furnish(page: _Page, sheet: Sheet, number: int, count: int) -> None:
    """Set the head and foot of a page."""
    size, left, right = 6.6, page.margin, page.width - page.margin
    marks = _shortened("   ".join(sheet.marks), 0.45 * page.width, size)
    room = right - left - _width(marks, size) - 12.0
    page.text(left, 24.0, _shortened(sheet.title, room, size), size, ink=QUIET)
    page.text(right, 24.0, marks, size, ink=QUIET, to="right")
    page.line((left, 29.0), (right, 29.0), 0.5, QUIET)
    low = page.height - 18.0
    page.text(left, low, _shortened(sheet.origin, 0.8 * (right - left), size), size, ink=QUIET)
    page.text(right, low, f"page {number} of {count}", size, ink=QUIET, to="right")


def _set(sheet: Sheet) -> list[list[_Slab]]:
    """Return the slabs of each page, in the largest type that takes no more pages than wanted."""
    most = 72.0 * PAPERS[sheet.paper][1] - _HEAD - _FOOT - 12.0
    pages: list[list[_Slab]] = []
    for size in _SIZES:
        pages = list(_paged(_sheet_slabs(sheet, 72.0 * WIDTH, most, size), most))
        if len(pages) <= _WANTED_PAGES:
            break
    return pages


def render_pdf(sheet: Sheet) -> bytes:
    """Return a sheet as a PDF document with embedded fonts and vector figures.

    Parameters
    ----------
    sheet : Sheet

    Returns
    -------
    bytes
        The same for the same sheet, to the last byte: it holds no date.
    """
    from matplotlib.backends.backend_pdf import PdfPages

    pages = _set(sheet)
    buffer = io.BytesIO()
    about = {"Title": printable(sheet.title), "Creator": sheet.origin, "Producer": None, "CreationDate": None}
    with sheet_look(), PdfPages(buffer, metadata=about) as book:
        for number, slabs in enumerate(pages, 1):
            page = _Page(sheet.paper)
            down = _HEAD + 6.0
            for slab in slabs:
                slab.draw(page, page.margin, down)
                down += slab.height
            _furnish(page, sheet, number, len(pages))
            book.savefig(page.finished())
    return buffer.getvalue()
