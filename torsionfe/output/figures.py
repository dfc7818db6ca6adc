"""Figures as files: PNG, SVG or PDF by the ending, whole or not at all, the same bytes for the same figure."""

from __future__ import annotations

import io
import os
from collections.abc import Mapping
from difflib import get_close_matches
from pathlib import Path
from types import MappingProxyType
from typing import Any

from torsionfe.checks import positive
from torsionfe.errors import InputError
from torsionfe.output.style import look
from torsionfe.storing import store

__all__ = ["FIGURE_ENDINGS", "check_figure_path", "figure_data", "save_figure"]

#: Endings of figure files, with what is left out of each so that it holds no date.
FIGURE_ENDINGS: Mapping[str, Mapping[str, None]] = MappingProxyType(
    {
        ".png": {"Software": None},
        ".svg": {"Date": None},
        ".pdf": {"CreationDate": None},
    }
)


def check_figure_path(path: str | os.PathLike[str]) -> Path:
    """Return where a figure will be written, before any work is done for it.

    Raises
    ------
    InputError
        An ending other than .png, .svg and .pdf; no such folder; a folder, or a file that can't be written.
    """
    target = Path(path)
    ending = target.suffix.lower()
    if ending not in FIGURE_ENDINGS:
        near = get_close_matches(ending, FIGURE_ENDINGS, n=1)
        hint = f"; did you mean {target.with_suffix(near[0]).name!r}?" if near else ""
        known = ", ".join(FIGURE_ENDINGS)
        raise InputError(f"a figure is written as {known}, by its ending, got {target.name!r}{hint}")
    folder = target.parent
    if not folder.is_dir():
        raise InputError(f"the folder {str(folder)!r} of the figure {target.name!r} does not exist: make it first")
    if target.is_dir():
        raise InputError(f"{str(target)!r} is a folder: give the figure a name inside it")
    if not os.access(folder, os.W_OK) or (target.exists() and not os.access(target, os.W_OK)):
        raise InputError(f"{str(target)!r} can't be written: no permission")
    return target


def figure_data(figure: Any, ending: str, dpi: float = 300.0) -> bytes:
    """Return a figure as the content of a file.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
        Or axes, or what a plot function returned.
    ending : {'.png', '.svg', '.pdf'}
    dpi : float
        Dots per inch of PNG, and of images inside the others.
    """
    import matplotlib

    drawn = _figure_of(figure)
    settings: Any = {"svg.hashsalt": "torsionfe", "pdf.fonttype": 42, "savefig.dpi": dpi}
    stream = io.BytesIO()
    with look(), matplotlib.rc_context(settings):
        drawn.savefig(stream, format=ending[1:], dpi=dpi, metadata=dict(FIGURE_ENDINGS[ending]))
    return stream.getvalue()


def save_figure(figure: Any, path: str | os.PathLike[str], *, dpi: float = 300.0) -> Path:
    """Write a figure as PNG, SVG or PDF, by the ending of its path.

    It is written beside its place and then renamed: no reader sees half of it, and a failure leaves an older file
    of that name as it was.

    Parameters
    ----------
    figure : matplotlib.figure.Figure
        Or axes, or what a plot function returned.
    path : path-like
    dpi : float
        Dots per inch of PNG, and of images inside the others.

    Returns
    -------
    pathlib.Path

    Raises
    ------
    InputError
        See `check_figure_path`.
    """
    target = check_figure_path(path)
    resolution = positive("dpi", dpi)
    if resolution > 2400.0:
        raise InputError(f"dpi must be 2400 or less, got {resolution:g}")
    return store(target, figure_data(figure, target.suffix.lower(), resolution))


def _figure_of(figure: Any) -> Any:
    """Return the whole figure that a figure, axes or a drawing belongs to."""
    from matplotlib.artist import Artist
    from matplotlib.figure import FigureBase

    found = figure
    axes = getattr(found, "axes", None)
    if not isinstance(found, Artist) and axes is not None:
        found = axes[0] if isinstance(axes, tuple) else axes
    if isinstance(found, Artist) and not isinstance(found, FigureBase):
        found = found.figure
    if not isinstance(found, FigureBase):
        raise InputError(f"a matplotlib figure, axes or the result of a plot function is needed, got {figure!r:.60}")
    return found.get_figure(root=True) if hasattr(found, "get_figure") else found
