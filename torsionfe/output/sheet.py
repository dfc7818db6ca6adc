"""A calculation sheet: its content, once, and the HTML made of it. `torsionfe.output.pdf` makes the PDF.

The content is data: sections of blocks, each a list of facts, a table, lines of text or a picture. Neither form
adds to it, so that they cannot say different things.
"""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from markupsafe import Markup
    from matplotlib.figure import FigureBase

__all__ = [
    "PAPERS",
    "Beside",
    "Block",
    "Cells",
    "Facts",
    "Lines",
    "Picture",
    "Sheet",
    "SheetSection",
    "clean",
    "render_html",
    "sheet_look",
    "svg_of",
]

#: Width and height in inches (ISO 216; ANSI/ASME Y14.1 size A).
PAPERS = {"a4": (210.0 / 25.4, 297.0 / 25.4), "letter": (8.5, 11.0)}


@dataclass(frozen=True, slots=True)
class Facts:
    """Names and values, one a row."""

    rows: tuple[tuple[str, str], ...]


@dataclass(frozen=True, slots=True)
class Cells:
    """A table with column heads.

    Attributes
    ----------
    head : tuple of str
    rows : tuple of tuples of str
        As long as the head.
    words : int
        How many columns, from the left, are words; the others are numbers, set to the right.
    """

    head: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    words: int = 1


@dataclass(frozen=True, slots=True)
class Lines:
    """Lines of text.

    Attributes
    ----------
    lines : tuple of str
    tone : {'plain', 'list', 'warning', 'caution', 'verdict'}
    """

    lines: tuple[str, ...]
    tone: str = "plain"


@dataclass(frozen=True, slots=True)
class Picture:
    """A figure.

    Attributes
    ----------
    name : str
        Of its file, without ending.
    caption : str
        Also what a screen reader says.
    draw : callable
        Draws into the figure, or part of one, that it is given.
    ratio : float
        Height over width.
    """

    name: str
    caption: str
    draw: Callable[[FigureBase], object]
    ratio: float = 0.75


@dataclass(frozen=True, slots=True)
class Beside:
    """Blocks in two columns.

    Attributes
    ----------
    left, right : tuple of Block
    share : float
        Of the width, that the left column takes.
    """

    left: tuple[Block, ...]
    right: tuple[Block, ...]
    share: float = 0.5


Block = Facts | Cells | Lines | Picture | Beside


@dataclass(frozen=True, slots=True)
class SheetSection:
    """A section: its title, and blocks under it."""

    title: str
    blocks: tuple[Block, ...]


@dataclass(frozen=True)
class Sheet:
    """A calculation sheet.

    Attributes
    ----------
    title : str
    marks : tuple of str
        Short facts for the head of every page, such as the revision.
    sections : tuple of SheetSection
    paper : str
        One of `PAPERS`.
    origin : str
        Program and version, for the foot of every page.
    """

    title: str
    marks: tuple[str, ...]
    sections: tuple[SheetSection, ...]
    paper: str = "a4"
    origin: str = ""

    def pictures(self) -> Iterator[Picture]:
        """Yield every picture in order."""

        def within(blocks: Sequence[Block]) -> Iterator[Picture]:
            for block in blocks:
                if isinstance(block, Picture):
                    yield block
                elif isinstance(block, Beside):
                    yield from within(block.left + block.right)

        for section in self.sections:
            yield from within(section.blocks)


# --- text from anywhere -------------------------------------------------------------------------------------

#: Marks that turn the direction of the text after them, and the byte order mark: shown, never obeyed.
_HIDDEN = {*range(0x202A, 0x202F), *range(0x2066, 0x206A), 0xFEFF, *range(0xE0000, 0xE0080)}


def clean(text: str) -> str:
    r"""Return text that only prints: line breaks stay, what would steer a printer or reader is written out.

    Examples
    --------
    >>> clean("a\tb\u202ec")
    'a b[U+202E]c'
    """
    lines = text.replace("\r\n", "\n").replace("\r", "\n").replace("\t", " ")
    return "".join(f"[U+{ord(sign):04X}]" if _steers(sign) else sign for sign in lines)


def _steers(sign: str) -> bool:
    code = ord(sign)
    if sign == "\n" or 0x20 <= code < 0x7F:
        return False
    return unicodedata.category(sign) in ("Cc", "Cs", "Zl", "Zp") or code in _HIDDEN or code & 0xFFFE == 0xFFFE


# --- HTML ---------------------------------------------------------------------------------------------------


@contextmanager
def sheet_look() -> Iterator[None]:
    """Draw with the same settings everywhere, so that the same inputs give the same bytes."""
    import matplotlib.style

    from torsionfe.output.style import look

    with matplotlib.style.context("default"), look():
        import matplotlib as mpl

        mpl.rcParams.update({"svg.hashsalt": "torsionfe", "svg.fonttype": "path", "pdf.fonttype": 42})
        yield


def svg_of(picture: Picture, width: float) -> str:
    """Return a picture as an SVG document, ``width`` in inches; the same bytes each time."""
    import io

    from matplotlib.figure import Figure

    with sheet_look():
        figure = Figure(figsize=(width, width * picture.ratio), layout="constrained")
        picture.draw(figure)
        buffer = io.StringIO()
        figure.savefig(buffer, format="svg", metadata={"Date": None, "Creator": None})
    return buffer.getvalue()


def _inline(picture: Picture, width: float) -> Markup:
    """Return a picture as an ``svg`` element whose ids are its own among those of other pictures."""
    from markupsafe import Markup, escape

    svg = svg_of(picture, width)
    svg = re.sub(r"<!--.*?-->|<metadata>.*?</metadata>", "", svg[svg.index("<svg ") :], flags=re.DOTALL)
    svg = re.sub(r'\b(id="|href="#|url\(#)', rf"\g<1>{picture.name}-", svg)
    head, rest = svg.split(">", 1)
    head = re.sub(r' (?:width|height)="[^"]*"', "", head)  # as wide as its column
    return Markup(f'{head} role="img" aria-label="{escape(clean(picture.caption))}">{rest}')


def _css_string(text: str) -> Markup:
    """Return text as a string of a style sheet, all but letters and digits escaped (CSS Syntax 3, 4.3.7)."""
    from markupsafe import Markup

    return Markup('"' + "".join(s if s.isascii() and s.isalnum() else f"\\{ord(s):06x}" for s in clean(text)) + '"')


def _kind(block: Block) -> str:
    return type(block).__name__.lower()


def render_html(sheet: Sheet) -> str:
    """Return a sheet as one HTML document: no script, no other file, nothing from the network.

    Parameters
    ----------
    sheet : Sheet

    Returns
    -------
    str
        The same for the same sheet, to the last byte.
    """
    from jinja2 import Environment, PackageLoader, StrictUndefined
    from markupsafe import Markup

    def shown(value: Any) -> Any:
        return clean(value) if isinstance(value, str) and not isinstance(value, Markup) else value

    environment = Environment(
        loader=PackageLoader("torsionfe.output"),
        autoescape=True,
        undefined=StrictUndefined,
        finalize=shown,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters.update(kind=_kind, css_string=_css_string)
    environment.globals["inline"] = _inline
    return environment.get_template("sheet.html").render(sheet=sheet).lstrip() + "\n"
