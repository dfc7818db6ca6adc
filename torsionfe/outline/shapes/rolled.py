"""Rolled, welded and extruded open shapes: angle, tee, channel, zee, wide flange, plate girder, cross.

Radii are named as the trade names them (common practice): the root radius is the fillet where two plates
meet, the toe radius rounds the inner edge of a plate's free end, the heel radius the outside of a bend.
"""

from __future__ import annotations

from torsionfe.outline.outline import Outline
from torsionfe.outline.shapes.trade import TradeShape, above_zero, at_most, build, less, zero_or_more

__all__ = ["angle", "channel", "cross", "plate_girder", "tee", "wide_flange", "zee"]


def angle(
    leg_x: float,
    leg_y: float,
    thickness: float,
    root_radius: float = 0.0,
    toe_radius: float = 0.0,
    *,
    heel_radius: float = 0.0,
) -> TradeShape:
    """Return an angle, its heel at the origin and its legs along the positive axes.

    Parameters
    ----------
    leg_x, leg_y : float
        Outside lengths of the legs.
    thickness : float
        Of both legs.
    root_radius, toe_radius, heel_radius : float
        Fillet between the legs; rounding of the inner edge of each leg's end; rounding of the heel (0 on
        rolled angles; root radius plus thickness on bent ones).

    Examples
    --------
    >>> angle(80, 80, 8, root_radius=8).area.__round__(3)
    1229.735
    """
    sizes = above_zero(leg_x=leg_x, leg_y=leg_y, thickness=thickness)
    sizes |= zero_or_more(root_radius=root_radius, toe_radius=toe_radius, heel_radius=heel_radius)
    a, b, t = sizes["leg_x"], sizes["leg_y"], sizes["thickness"]
    less("thickness", t, "leg_x", a)
    less("thickness", t, "leg_y", b)
    at_most("toe_radius", sizes["toe_radius"], "thickness", t)
    sharp = Outline([(0, 0), (a, 0), (a, t), (t, t), (t, b), (0, b)])
    return build("angle", sizes, sharp, {"root_radius": [3], "toe_radius": [2, 4], "heel_radius": [0]})


class _Flange:
    """Thickness of a flange along its width, tapered from a stated place or constant."""

    def __init__(self, sizes: dict[str, float], overhang: float) -> None:
        self.mean, self.slope, self.place = (
            sizes["flange_thickness"],
            sizes["flange_slope"],
            sizes["thickness_at"],
        )
        self.toe = self.mean - self.slope * self.place
        self.root = self.toe + self.slope * overhang
        less("flange_slope * thickness_at", self.slope * self.place, "flange_thickness", self.mean)
        at_most("toe_radius", sizes["toe_radius"], "the flange's thickness at its toe", self.toe)


def _flanged(
    depth: float, flange_width: float, flange_thickness: float, web_thickness: float, radii: dict[str, float]
) -> dict[str, float]:
    """Return the dimensions of a shape with a web and flanges, checked against each other."""
    sizes = above_zero(
        depth=depth,
        flange_width=flange_width,
        flange_thickness=flange_thickness,
        web_thickness=web_thickness,
    )
    sizes |= zero_or_more(**radii)
    less("web_thickness", sizes["web_thickness"], "flange_width", sizes["flange_width"])
    return sizes


def _taper(sizes: dict[str, float], thickness_at: float | None, usual: float, overhang: float) -> _Flange:
    """Return the flange, its place of measurement written into ``sizes`` and checked."""
    place = usual if thickness_at is None else thickness_at
    sizes |= zero_or_more(thickness_at=place)
    at_most("thickness_at", sizes["thickness_at"], "flange_width", sizes["flange_width"])
    return _Flange(sizes, overhang)


def tee(
    flange_width: float,
    depth: float,
    flange_thickness: float,
    web_thickness: float,
    root_radius: float = 0.0,
    *,
    toe_radius: float = 0.0,
    web_toe_radius: float = 0.0,
    flange_slope: float = 0.0,
    thickness_at: float | None = None,
) -> TradeShape:
    """Return a tee, its flange on top, the middle of its extent at the origin.

    Parameters
    ----------
    flange_width, depth : float
        Outside width and overall height.
    flange_thickness, web_thickness : float
    root_radius, toe_radius, web_toe_radius : float
        Fillets between web and flange; rounding of the flange toes' inner edges; of both edges of the web's
        end.
    flange_slope : float
        Rise of the flange's inner face over its run.
    thickness_at : float, optional
        Distance from the flange's toe at which ``flange_thickness`` is measured; a quarter of the width by
        default (common practice).
    """
    radii = {"root_radius": root_radius, "toe_radius": toe_radius, "web_toe_radius": web_toe_radius}
    radii["flange_slope"] = flange_slope
    sizes = _flanged(depth, flange_width, flange_thickness, web_thickness, radii)
    b, d, tw = sizes["flange_width"], sizes["depth"], sizes["web_thickness"]
    flange = _taper(sizes, thickness_at, b / 4.0, (b - tw) / 2.0)
    less("the flange's thickness at the web", flange.root, "depth", d)
    x, w, y = b / 2.0, tw / 2.0, d / 2.0
    right = [(w, -y), (w, y - flange.root), (x, y - flange.toe), (x, y)]
    sharp = Outline([(-w, -y), *right, *((-px, py) for px, py in right[:0:-1])])
    corners = {"root_radius": [2, 7], "toe_radius": [3, 6], "web_toe_radius": [0, 1]}
    return build("tee", sizes, sharp, corners)


def channel(
    depth: float,
    flange_width: float,
    flange_thickness: float,
    web_thickness: float,
    root_radius: float = 0.0,
    *,
    toe_radius: float = 0.0,
    heel_radius: float = 0.0,
    flange_slope: float = 0.0,
    thickness_at: float | None = None,
) -> TradeShape:
    """Return a channel, open to the right, the middle of its extent at the origin.

    Parameters
    ----------
    depth, flange_width : float
        Overall height and width; the flange's width includes the web.
    flange_thickness, web_thickness : float
    root_radius, toe_radius, heel_radius : float
        Fillets between web and flanges; rounding of the flange toes' inner edges; of the outer corners at the
        web (0 on rolled channels; root radius plus thickness on bent ones).
    flange_slope : float
        Rise of the flanges' inner faces over their run: 0.08 on European tapered channels up to 300 mm, 0.05
        above, 1/6 on American ones (common practice, from memory).
    thickness_at : float, optional
        Distance from the flange's toe at which ``flange_thickness`` is measured; half of the width by default
        (European channels up to 300 mm; the middle of the overhang above and on American ones: common
        practice, from memory).
    """
    radii = {"root_radius": root_radius, "toe_radius": toe_radius, "heel_radius": heel_radius}
    radii["flange_slope"] = flange_slope
    sizes = _flanged(depth, flange_width, flange_thickness, web_thickness, radii)
    b, d, tw = sizes["flange_width"], sizes["depth"], sizes["web_thickness"]
    flange = _taper(sizes, thickness_at, b / 2.0, b - tw)
    less("twice the flange's thickness at the web", 2.0 * flange.root, "depth", d)
    x, y, w = b / 2.0, d / 2.0, tw - b / 2.0
    lower = [(-x, -y), (x, -y), (x, flange.toe - y), (w, flange.root - y)]
    sharp = Outline(lower + [(px, -py) for px, py in reversed(lower)])
    corners = {"root_radius": [3, 4], "toe_radius": [2, 5], "heel_radius": [0, 7]}
    return build("channel", sizes, sharp, corners)


def zee(
    depth: float,
    flange_width: float,
    flange_thickness: float,
    web_thickness: float,
    root_radius: float = 0.0,
    *,
    toe_radius: float = 0.0,
    heel_radius: float = 0.0,
) -> TradeShape:
    """Return a zee, its top flange to the left and its bottom flange to the right, its middle at the origin.

    Parameters
    ----------
    depth, flange_width : float
        Overall height; width of each flange from its toe to the far face of the web.
    flange_thickness, web_thickness : float
    root_radius, toe_radius, heel_radius : float
        Fillets between web and flanges; rounding of the flange toes' inner edges; of the outer corners at the
        web (root radius plus thickness on bent zees).
    """
    radii = {"root_radius": root_radius, "toe_radius": toe_radius, "heel_radius": heel_radius}
    sizes = _flanged(depth, flange_width, flange_thickness, web_thickness, radii)
    b, d = sizes["flange_width"], sizes["depth"]
    t, tw = sizes["flange_thickness"], sizes["web_thickness"]
    less("twice the flange_thickness", 2.0 * t, "depth", d)
    at_most("toe_radius", sizes["toe_radius"], "flange_thickness", t)
    w, y, x = tw / 2.0, d / 2.0, b - tw / 2.0
    half = [(-w, -y), (x, -y), (x, t - y), (w, t - y)]
    sharp = Outline(half + [(-px, -py) for px, py in half])
    corners = {"root_radius": [3, 7], "toe_radius": [2, 6], "heel_radius": [0, 4]}
    return build("zee", sizes, sharp, corners)


def wide_flange(
    depth: float,
    flange_width: float,
    flange_thickness: float,
    web_thickness: float,
    root_radius: float = 0.0,
    *,
    toe_radius: float = 0.0,
    flange_slope: float = 0.0,
    thickness_at: float | None = None,
) -> TradeShape:
    """Return an I or H shape with equal flanges, its middle at the origin.

    Parameters
    ----------
    depth, flange_width : float
        Overall height and width.
    flange_thickness, web_thickness : float
    root_radius, toe_radius : float
        Fillets between web and flanges (tables that give ``k`` instead mean a root radius of ``k`` less the
        flange's thickness: common practice); rounding of the flange toes' inner edges.
    flange_slope : float
        Rise of the flanges' inner faces over their run: 0.14 on European tapered beams, 1/6 on American ones
        (common practice, from memory).
    thickness_at : float, optional
        Distance from the flange's toe at which ``flange_thickness`` is measured; a quarter of the width by
        default (common practice).
    """
    radii = {"root_radius": root_radius, "toe_radius": toe_radius, "flange_slope": flange_slope}
    sizes = _flanged(depth, flange_width, flange_thickness, web_thickness, radii)
    b, d, tw = sizes["flange_width"], sizes["depth"], sizes["web_thickness"]
    flange = _taper(sizes, thickness_at, b / 4.0, (b - tw) / 2.0)
    less("twice the flange's thickness at the web", 2.0 * flange.root, "depth", d)
    x, y, w = b / 2.0, d / 2.0, tw / 2.0
    right = [(x, -y), (x, flange.toe - y), (w, flange.root - y)]
    right += [(px, -py) for px, py in reversed(right)]
    sharp = Outline(right + [(-px, -py) for px, py in right])
    return build("wide_flange", sizes, sharp, {"root_radius": [2, 3, 8, 9], "toe_radius": [1, 4, 7, 10]})


def plate_girder(
    depth: float,
    web_thickness: float,
    root_radius: float = 0.0,
    *,
    top_width: float,
    top_thickness: float,
    bottom_width: float,
    bottom_thickness: float,
) -> TradeShape:
    """Return an I shape with unequal flanges, the middle of its extent at the origin.

    Parameters
    ----------
    depth : float
        Overall height.
    web_thickness : float
    root_radius : float
        Fillets between web and flanges.
    top_width, top_thickness, bottom_width, bottom_thickness : float
        Of the two flanges.
    """
    sizes = above_zero(
        depth=depth,
        web_thickness=web_thickness,
        top_width=top_width,
        top_thickness=top_thickness,
        bottom_width=bottom_width,
        bottom_thickness=bottom_thickness,
    )
    d, tw, bt, tt, bb, tb = sizes.values()
    sizes |= zero_or_more(root_radius=root_radius)
    less("web_thickness", tw, "top_width", bt)
    less("web_thickness", tw, "bottom_width", bb)
    less("top_thickness + bottom_thickness", tt + tb, "depth", d)
    y, w = d / 2.0, tw / 2.0
    right = [(bb / 2.0, -y), (bb / 2.0, tb - y), (w, tb - y), (w, y - tt), (bt / 2.0, y - tt), (bt / 2.0, y)]
    sharp = Outline(right + [(-px, py) for px, py in reversed(right)])
    return build("plate_girder", sizes, sharp, {"root_radius": [2, 3, 8, 9]})


def cross(
    width: float,
    height: float,
    thickness: float,
    root_radius: float = 0.0,
    *,
    upright_thickness: float | None = None,
) -> TradeShape:
    """Return a cross of two plates, centred on the origin.

    Parameters
    ----------
    width, height : float
        Overall, along x and y.
    thickness : float
        Of the level plate, and of the upright one unless ``upright_thickness`` says otherwise.
    root_radius : float
        Of the four fillets.
    upright_thickness : float, optional
        Of the upright plate.
    """
    upright = thickness if upright_thickness is None else upright_thickness
    sizes = above_zero(width=width, height=height, thickness=thickness, upright_thickness=upright)
    b, h, t, u = sizes.values()
    sizes |= zero_or_more(root_radius=root_radius)
    less("thickness", t, "height", h)
    less("upright_thickness", u, "width", b)
    x, y, w, v = b / 2.0, h / 2.0, u / 2.0, t / 2.0
    half = [(w, -y), (w, -v), (x, -v), (x, v), (w, v), (w, y)]
    sharp = Outline(half + [(-px, -py) for px, py in half])
    return build("cross", sizes, sharp, {"root_radius": [1, 4, 7, 10]})
