"""The look that every figure shares: colours, lines, markers, and how it joins the user's own settings.

Nothing here changes matplotlib for anyone else: figures are made without pyplot, so they need no display and leave
nothing behind, and the project's settings hold inside `look` only, where the user has not set something else.

The colour maps are curves in CIELAB (CIE 15:2004, white point D65), run through at a constant distance per step and
with falling lightness: even to the eye, and in the same order when printed in grey.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats
from torsionfe.outline.outline import Outline
from torsionfe.text import number

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.colors import ListedColormap

__all__ = [
    "ACCENTS",
    "HATCH",
    "HOT_SPOT",
    "INK",
    "MATERIAL",
    "PAPER",
    "QUIET",
    "SINGULAR",
    "TWIST_CENTRE",
    "Accent",
    "Mark",
    "axis_label",
    "cielab",
    "frame_section",
    "frame_window",
    "label_axes",
    "look",
    "new_axes",
    "plain",
    "stress_colours",
    "warping_colours",
    "with_unit",
    "written_number",
    "written_unit",
]

#: Text, outlines and leader lines; quieter lines (dimensions, grids); the section's fill; behind labels.
INK, QUIET, MATERIAL, PAPER = "#1d2330", "#6b7280", "#dfe1e5", "#ffffff"
#: What no plate stands for, or what a thing is not.
HATCH = "////"


@dataclass(frozen=True, slots=True)
class Accent:
    """A line that stays apart from the others in colour, lightness and dashes.

    Attributes
    ----------
    colour : str
    dashes : str or tuple
        A matplotlib line style.
    marker : str
    """

    colour: str
    dashes: str | tuple[float, tuple[float, ...]]
    marker: str


#: Series of a chart in order; lightness (CIELAB) about 31, 51, 62 and 78, so that they also differ in grey.
ACCENTS = (
    Accent("#1f4690", "-", "o"),
    Accent("#c8553d", "--", "s"),
    Accent("#4ba3a4", "-.", "^"),
    Accent("#e3bd6a", (0, (1.0, 1.2)), "D"),
)


@dataclass(frozen=True, slots=True)
class Mark:
    """A marker with a meaning: told from the others by its shape alone.

    Attributes
    ----------
    shape : str
        A matplotlib marker.
    face : str
        Its colour, ``none`` for a ring; the edge is ink, on a rim of paper.
    size : float
        In points.
    """

    shape: str
    face: str
    size: float

    def options(self) -> dict[str, Any]:
        """Return the keywords of ``Axes.plot`` that draw the marker without a line."""
        from matplotlib.patheffects import Normal, Stroke

        edge = 1.4 if self.face == "none" else 1.1
        return {
            "linestyle": "none",
            "marker": self.shape,
            "markersize": self.size,
            "markerfacecolor": self.face,
            "markeredgecolor": INK,
            "markeredgewidth": edge,
            "path_effects": [Stroke(linewidth=edge + 1.6, foreground=PAPER), Normal()],
            "clip_on": False,
        }


HOT_SPOT = Mark("o", "none", 7.0)
SINGULAR = Mark("X", "#ffffff", 9.0)
TWIST_CENTRE = Mark("P", "#ffffff", 8.0)

#: Settings of our own, each used only where the user has left matplotlib's.
_OURS: Mapping[str, Any] = MappingProxyType(
    {
        "axes.spines.top": False,
        "axes.spines.right": False,
        "axes.linewidth": 0.8,
        "axes.edgecolor": INK,
        "axes.labelcolor": INK,
        "axes.titlesize": "medium",
        "axes.titlelocation": "left",
        "axes.formatter.use_mathtext": True,
        "text.color": INK,
        "xtick.color": INK,
        "ytick.color": INK,
        "xtick.labelsize": "small",
        "ytick.labelsize": "small",
        "legend.frameon": False,
        "legend.fontsize": "small",
        "hatch.linewidth": 0.5,
        "hatch.color": QUIET,
        "font.size": 9.0,
    }
)


@contextmanager
def look() -> Iterator[None]:
    """Draw with the project's settings where the user has set none; theirs are back afterwards.

    Only one setting is overruled: text is never passed to TeX, since labels are plain words.
    """
    import matplotlib

    given: Any = matplotlib.rcParams
    default: Any = matplotlib.rcParamsDefault
    ours: Any = {name: value for name, value in _OURS.items() if given[name] == default[name]}
    with matplotlib.rc_context({**ours, "text.usetex": False}):
        yield


def new_axes(size: tuple[float, float] = (6.4, 5.2)) -> Axes:
    """Return the axes of a new figure that no window and no pyplot knows of.

    To draw into a window, pass axes of ``matplotlib.pyplot.subplots`` to the plot instead.

    Parameters
    ----------
    size : tuple of float
        Width and height in inches.
    """
    from matplotlib.figure import Figure

    return Figure(figsize=size, layout="constrained").add_subplot()


# --- words on figures -------------------------------------------------------------------------------------

_RAISED = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")


def plain(text: str) -> str:
    """Return text that matplotlib draws as it is: dollar signs don't start mathematics."""
    return text.replace("\\$", "$").replace("$", r"\$")


def written_unit(unit: str) -> str:
    """Return a unit as it is set in print.

    Examples
    --------
    >>> written_unit("N*mm"), written_unit("lbf/in^2"), written_unit("1/mm^3")
    ('N·mm', 'lbf/in²', '1/mm³')
    """
    head, *powers = plain(unit).replace("**", "^").replace("*", "·").split("^")
    for power in powers:
        size = len(power) - len(power.lstrip("0123456789-"))
        head += power[:size].translate(_RAISED) + power[size:] if size else "^" + power
    return head


def written_number(value: float, digits: int = 4) -> str:
    """Return a number as it is set in print, with a power of ten where it would be long.

    Examples
    --------
    >>> written_number(34.1572), written_number(0.00043937), written_number(-2.5e9)
    ('34.16', '4.394 × 10⁻⁴', '−2.5 × 10⁹')
    """
    if value == 0.0 or not np.isfinite(value):
        return number(value, digits)
    if not 1e-3 <= abs(value) < 1e6:
        mantissa, power = f"{value:.{digits - 1}e}".split("e")
        mantissa = mantissa.rstrip("0").rstrip(".") if "." in mantissa else mantissa
        return f"{mantissa} × 10{str(int(power)).translate(_RAISED)}".replace("-", "−")
    return number(value, digits).replace("-", "−")


def with_unit(text: str, unit: str) -> str:
    """Return a number or a label with its unit after a space; without a unit, as it is."""
    return f"{plain(text)} {written_unit(unit)}" if unit else plain(text)


def axis_label(name: str, unit: str) -> str:
    """Return the label of an axis or a colour bar, the unit in brackets.

    Examples
    --------
    >>> axis_label("x", "mm"), axis_label("x", "")
    ('x [mm]', 'x')
    """
    return f"{plain(name)} [{written_unit(unit)}]" if unit else plain(name)


# --- axes of a section ------------------------------------------------------------------------------------

_LEAST = (0.5, 0.3)  # width and height of a section's frame, of the section's size


def label_axes(ax: Axes, unit: str) -> None:
    """Label both axes of a section with its unit of length."""
    ax.set_xlabel(axis_label("x", unit))
    ax.set_ylabel(axis_label("y", unit))


def frame_section(ax: Axes, outline: Outline, unit: str = "", room: float = 0.06) -> None:
    """Show a section whole and to scale, with labelled axes.

    Parameters
    ----------
    ax : matplotlib.axes.Axes
    outline : Outline
    unit : str
        Of the outline's lengths.
    room : float
        Margin on each side, as a share of the outline's size; a slender section gets more beside it.
    """
    x0, y0, x1, y1 = outline.bounds
    size = max(x1 - x0, y1 - y0)
    margin = room * size
    wide = max(margin, 0.5 * (_LEAST[0] * size - (x1 - x0)))
    high = max(margin, 0.5 * (_LEAST[1] * size - (y1 - y0)))
    frame_window(ax, (x0 - wide, y0 - high, x1 + wide, y1 + high), unit)


def frame_window(ax: Axes, window: tuple[float, float, float, float], unit: str = "") -> None:
    """Show a part of the plane to scale, with labelled axes; a power of ten goes into their labels.

    Parameters
    ----------
    ax : matplotlib.axes.Axes
    window : tuple of float
        ``(x_min, y_min, x_max, y_max)``.
    unit : str
        Of lengths.
    """
    from matplotlib.ticker import MaxNLocator

    x0, y0, x1, y1 = window
    size = max(x1 - x0, y1 - y0)
    ax.set_xlim(x0, x1)
    ax.set_ylim(y0, y1)
    ax.set_aspect("equal")
    for axis, name, low, high in ((ax.xaxis, "x", x0, x1), (ax.yaxis, "y", y0, y1)):
        largest = max(abs(low), abs(high))
        power = 0 if 1e-2 < largest < 1e5 else 3 * math.floor(math.log10(largest) / 3.0)
        write, digits = _ticks(power, size)
        count = max(2, round((7.5 - 0.5 * digits) * (high - low) / size))
        axis.set_major_locator(MaxNLocator(count, steps=[1, 2, 5, 10]))
        axis.set_major_formatter(write)
        axis.set_label_text(axis_label(name, f"10^{power} {unit}".strip() if power else unit))


def _ticks(power: int, size: float) -> tuple[Callable[[float, object], str], int]:
    """Return what writes a tick over ``10**power``, and with how many digits after the point at most."""
    digits = max(0, power - math.floor(math.log10(size / 8.0)))

    def write(value: float, _: object = None) -> str:
        text = f"{value / 10.0**power:.{digits}f}"
        text = text.rstrip("0").rstrip(".") if "." in text else text
        return "0" if text == "-0" else text.replace("-", "−")

    return write, digits


# --- colours ----------------------------------------------------------------------------------------------

#: Stops of the colour maps in CIELAB (L*, a*, b*), from little to much.
_STRESS = ((96.0, -3.0, 14.0), (84.0, 8.0, 46.0), (66.0, 38.0, 52.0), (47.0, 56.0, 30.0), (30.0, 44.0, -2.0))
_WARPING = ((96.0, -5.0, 10.0), (81.0, -22.0, 15.0), (64.0, -27.0, -5.0), (47.0, -10.0, -29.0), (30.0, 16.0, -44.0))
_OVER = (12.0, 12.0, -10.0)

#: Linear sRGB to XYZ (IEC 61966-2-1), and the white of it.
_TO_XYZ = np.array(
    [[0.4123908, 0.3575843, 0.1804808], [0.2126390, 0.7151687, 0.0721923], [0.0193308, 0.1191948, 0.9505322]]
)
_WHITE = _TO_XYZ.sum(axis=1)
_KNEE = 6.0 / 29.0


def cielab(colours: ArrayLike) -> Floats:
    """Return ``(L*, a*, b*)`` of sRGB colours (0 to 1), shape (n, 3); ``L*`` is what a grey print keeps.

    Parameters
    ----------
    colours : array_like of shape (n, 3) or (n, 4)
        An alpha is left out.
    """
    rgb = np.asarray(colours, dtype=float)[:, :3]
    linear = np.where(rgb <= 0.04045, rgb / 12.92, ((rgb + 0.055) / 1.055) ** 2.4)
    ratio = linear @ _TO_XYZ.T / _WHITE
    f = np.where(ratio > _KNEE**3, np.cbrt(ratio), ratio / (3.0 * _KNEE**2) + 4.0 / 29.0)
    parts = [116.0 * f[:, 1] - 16.0, 500.0 * (f[:, 0] - f[:, 1]), 200.0 * (f[:, 1] - f[:, 2])]
    return np.stack(parts, axis=1)


def _srgb(lab: Floats) -> Floats:
    """Return sRGB colours (n, 3) of CIELAB ones."""
    middle = (lab[:, 0] + 16.0) / 116.0
    f = np.stack([middle + lab[:, 1] / 500.0, middle, middle - lab[:, 2] / 200.0], axis=1)
    ratio = np.where(f > _KNEE, f**3, 3.0 * _KNEE**2 * (f - 4.0 / 29.0))
    linear = (ratio * _WHITE) @ np.linalg.inv(_TO_XYZ).T
    rgb = np.where(linear <= 0.0031308, 12.92 * linear, 1.055 * np.abs(linear) ** (1.0 / 2.4) - 0.055)
    return np.asarray(np.clip(rgb, 0.0, 1.0), dtype=float)


def _even_steps(stops: Sequence[tuple[float, float, float]], count: int) -> Floats:
    """Return points (count, 3) along a smooth curve through the stops, equally far from each other."""
    from scipy.interpolate import PchipInterpolator

    curve = PchipInterpolator(np.linspace(0.0, 1.0, len(stops)), np.array(stops))(np.linspace(0.0, 1.0, 4001))
    walked = np.append(0.0, np.cumsum(np.linalg.norm(np.diff(curve, axis=0), axis=1)))
    place = np.linspace(0.0, walked[-1], count)
    return np.stack([np.interp(place, walked, curve[:, k]) for k in range(3)], axis=1)


def _colours(name: str, stops: Sequence[tuple[float, float, float]]) -> ListedColormap:
    from matplotlib.colors import ListedColormap

    found = ListedColormap(_srgb(_even_steps(stops, 256)), name=name)
    coloured = found.with_extremes(over=tuple(_srgb(np.array([_OVER]))[0]))
    assert isinstance(coloured, ListedColormap)
    return coloured


@cache
def stress_colours() -> ListedColormap:
    """Return the map of a shear stress: pale where it is small, dark where large, darker still beyond the scale."""
    return _colours("torsionfe stress", _STRESS)


@cache
def warping_colours() -> ListedColormap:
    """Return the map of the warping function: pale is low, dark is high."""
    return _colours("torsionfe warping", _WARPING)
