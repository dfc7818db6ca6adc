"""Results that show themselves in a notebook: a table of text, and a figure inside the page."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterable, Sequence
from html import escape
from typing import Any

from torsionfe.output.figures import figure_data
from torsionfe.text import printable

__all__ = ["html_table", "inline_svg", "rich_html"]

_DPI = 150.0  # of images inside the figure, enough for a screen


def rich_html(
    title: str,
    rows: Iterable[Sequence[str]],
    draw: Callable[[], Any] | None = None,
    *,
    head: bool = False,
) -> str:
    """Return what a result's ``_repr_html_`` shows: its table, then its figure.

    Parameters
    ----------
    title : str
    rows : iterable of sequences of str
        Cells; they are text, whatever stands in them.
    draw : callable, optional
        Returns a figure, axes or what a plot function returned.
    head : bool
        Whether the first row holds column heads.

    Returns
    -------
    str
        HTML that needs no other file and no script.
    """
    figure = f"<figure style='margin:0.5em 0'>{inline_svg(draw(), title)}</figure>" if draw is not None else ""
    return f"<div>{html_table(title, rows, head=head)}{figure}</div>"


def html_table(title: str, rows: Iterable[Sequence[str]], *, head: bool = False) -> str:
    """Return rows of text as an HTML table, every sign of them escaped."""
    body = [list(row) for row in rows]
    width = max((len(row) for row in body), default=1)
    lines = []
    for k, row in enumerate(body):
        tag = "th" if head and k == 0 else "td"
        style = " style='text-align:left'"
        cells = "".join(f"<{tag}{style}>{_text(cell)}</{tag}>" for cell in row)
        lines.append(f"<tr>{cells}{f'<{tag}></{tag}>' * (width - len(row))}</tr>")
    caption = f"<caption style='text-align:left;font-weight:bold'>{_text(title)}</caption>"
    return f"<table>{caption}<tbody>{''.join(lines)}</tbody></table>"


def _text(cell: str) -> str:
    return escape(printable(str(cell)), quote=True).replace("\n", "<br>")


def inline_svg(figure: Any, label: str = "") -> str:
    """Return a figure as an SVG element for a page of HTML.

    Its ids begin with a digest of its content, so that several figures on one page don't borrow from each other.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
        Or axes, or what a plot function returned.
    label : str
        What a screen reader says.
    """
    from hashlib import sha256

    svg = figure_data(figure, ".svg", dpi=_DPI).decode("utf-8")
    svg = re.sub(r"<!--.*?-->|<metadata>.*?</metadata>", "", svg[svg.index("<svg ") :], flags=re.DOTALL)
    own = "f" + sha256(svg.encode("utf-8")).hexdigest()[:10]
    svg = re.sub(r'(\bid="|href="#|url\(#)', rf"\g<1>{own}-", svg)
    name = f'<svg role="img" aria-label="{escape(printable(label), quote=True)}" style="max-width:100%;height:auto" '
    return svg.replace("<svg ", name, 1)
