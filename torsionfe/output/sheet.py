"""A calculation sheet: its content, once, and the HTML made of it. `torsionfe.output.pdf` makes the PDF.

The content is data: sections of blocks, each a list of facts, a table, lines of text or a picture. Neither form
adds to it, so that they cannot say different things.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from torsionfe.output.figures import figure_data
from torsionfe.text import printable

if TYPE_CHECKING:
    from markupsafe import Markup
    from matplotlib.figure import FigureBase

__all__ = [
    "GUTTER",
    "PAPERS",
    "WIDTH",
    "Beside",
    "Block",
    "Cells",
    "Facts",
    "Lines",
    "Picture",
    "Sheet",
    "SheetSection",
    "figure_bytes",
    "render_html",
    "sheet_look",
    "svg_pictures",
]

#: Width and height in inches (ISO 216; ANSI/ASME Y14.1 size A).
PAPERS = {"a4": (210.0 / 25.4, 297.0 / 25.4), "letter": (8.5, 11.0)}
#: Of the column of text, and between two columns side by side (inches).
WIDTH, GUTTER = 7.15, 0.22
#: Of every picture: small type; text of PDF to be searched; plain numbers on axes, which take half the time.
_SETTINGS: Any = {
    "font.size": 7.5,
    "svg.hashsalt": "torsionfe",
    "svg.fonttype": "path",
    "pdf.fonttype": 42,
    "axes.formatter.use_mathtext": False,
}


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

    def pictures(self) -> Iterator[tuple[Picture, float]]:
        """Yield every picture in order, with its width in inches."""

        def within(blocks: Sequence[Block], width: float) -> Iterator[tuple[Picture, float]]:
            for block in blocks:
                if isinstance(block, Picture):
                    yield block, width
                elif isinstance(block, Beside):
                    room = width - GUTTER
                    yield from within(block.left, block.share * room)
                    yield from within(block.right, (1.0 - block.share) * room)

        for section in self.sections:
            yield from within(section.blocks, WIDTH)


# --- HTML ---------------------------------------------------------------------------------------------------


@contextmanager
def sheet_look() -> Iterator[None]:
    """Draw with the same settings everywhere, so that the same inputs give the same bytes."""
    import matplotlib.style

    from torsionfe.output.style import look

    with matplotlib.style.context("default"), look():
        matplotlib.rcParams.update(_SETTINGS)
        yield


def figure_bytes(picture: Picture, width: float, ending: str) -> bytes:
    """Return a picture as a file of its own, the same bytes each time.

    Parameters
    ----------
    picture : Picture
    width : float
        In inches.
    ending : {'svg', 'pdf', 'png'}
        PNG has 300 dots an inch.
    """
    from matplotlib.figure import Figure

    with sheet_look():
        figure = Figure(figsize=(width, width * picture.ratio), layout="constrained")
        picture.draw(figure)
        return figure_data(figure, f".{ending}")


def _inline(name: str, caption: str, svg: str) -> Markup:
    """Return an SVG document as an element whose ids are its own among those of other pictures."""
    from markupsafe import Markup, escape

    svg = re.sub(r"<!--.*?-->|<metadata>.*?</metadata>", "", svg[svg.index("<svg ") :], flags=re.DOTALL)
    svg = re.sub(r'\b(id="|href="#|url\(#)', rf"\g<1>{name}-", svg)
    head, rest = svg.split(">", 1)
    head = re.sub(r' (?:width|height)="[^"]*"', "", head)  # as wide as its column
    return Markup(f'{head} role="img" aria-label="{escape(printable(caption))}">{rest}')


def _css_string(text: str) -> Markup:
    """Return text as a string of a style sheet, all but letters and digits escaped (CSS Syntax 3, 4.3.7)."""
    from markupsafe import Markup

    return Markup('"' + "".join(s if s.isascii() and s.isalnum() else f"\\{ord(s):06x}" for s in printable(text)) + '"')


def _kind(block: Block) -> str:
    return type(block).__name__.lower()


def svg_pictures(sheet: Sheet) -> dict[str, str]:
    """Return every picture of a sheet as an SVG document, by its name."""
    return {picture.name: figure_bytes(picture, width, "svg").decode() for picture, width in sheet.pictures()}


def render_html(sheet: Sheet, svgs: Mapping[str, str] | None = None) -> str:
    """Return a sheet as one HTML document: no script, no other file, nothing from the network.

    Parameters
    ----------
    sheet : Sheet
    svgs : mapping of str to str, optional
        What `svg_pictures` returned, where it is there already.

    Returns
    -------
    str
        The same for the same sheet, to the last byte.
    """
    from jinja2 import Environment, PackageLoader, StrictUndefined
    from markupsafe import Markup

    def shown(value: Any) -> Any:
        return printable(value) if isinstance(value, str) and not isinstance(value, Markup) else value

    environment = Environment(
        loader=PackageLoader("torsionfe.output"),
        autoescape=True,
        undefined=StrictUndefined,
        finalize=shown,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters.update(kind=_kind, css_string=_css_string)
    drawn = svg_pictures(sheet) if svgs is None else svgs
    environment.globals["inline"] = lambda picture: _inline(picture.name, picture.caption, drawn[picture.name])
    return environment.get_template("sheet.html").render(sheet=sheet).lstrip() + "\n"
