"""The boundary of a cross-section: an outer loop and its voids, of straight edges and circular arcs."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, fields
from functools import cached_property
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import ArrayLike

from torsionfe.checks import Floats, finite, finite_array, positive
from torsionfe.errors import OutlineError
from torsionfe.outline import arcs
from torsionfe.outline.edges import Edges, edges_of
from torsionfe.outline.validate import CLEARANCE, validate_loop, validate_voids

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from shapely import Polygon

    from torsionfe.output.outline_plot import OutlinePlot

__all__ = ["Outline"]


@dataclass(frozen=True, eq=False, repr=False)
class Outline:
    """The boundary of a cross-section, checked when it is made and never changed after.

    Parameters
    ----------
    vertices : array_like of shape (n, 2)
        Corners of the outer loop (length), counter-clockwise. A clockwise loop is turned round, vertex 0
        staying first. The first vertex is not repeated at the end.
    bulges : array_like of shape (n,), optional
        ``tan(sweep / 4)`` of the edge from vertex ``k`` to ``k + 1``, positive counter-clockwise; 0 (the
        default) is straight.
    voids : sequence of Outline
        Holes, inside the outer loop and apart from each other; either orientation is accepted.

    Raises
    ------
    OutlineError
        Self-crossing, repeated points, zero area, a void outside or touching, NaN or infinity; the
        message and the error's ``at`` name the place.

    Examples
    --------
    >>> bar = Outline([(0, 0), (30, 0), (30, 10), (0, 10)])
    >>> bar.area
    300.0
    """

    vertices: Floats
    bulges: Floats
    voids: tuple[Outline, ...]

    def __init__(
        self, vertices: ArrayLike, bulges: ArrayLike | None = None, voids: Iterable[Outline] = ()
    ) -> None:
        try:
            points = finite_array("vertices", vertices, columns=2)
            turns = np.zeros(len(points)) if bulges is None else finite_array("bulges", bulges)
        except ValueError as error:
            raise OutlineError(str(error)) from None
        points, turns = validate_loop(points, turns)
        holes = _listed(voids)
        for array in (points, turns):
            array.flags.writeable = False
        object.__setattr__(self, "vertices", points)
        object.__setattr__(self, "bulges", turns)
        object.__setattr__(self, "voids", ())
        if holes:
            validate_voids(self, holes)
            object.__setattr__(self, "voids", holes)
            self.__dict__.pop("edges", None)  # those without the voids

    @classmethod
    def from_polygon(cls, polygon: Polygon) -> Outline:
        """Return the outline of a shapely polygon, its exterior and interiors, edges straight.

        Points that repeat the one before are left out. Chains of chords stay as they are, and
        each chord end that turns into the material is a sharp re-entrant corner to the solver:
        `torsionfe.restore_arcs` makes them arcs again.

        Parameters
        ----------
        polygon : shapely.Polygon
            Or a MultiPolygon of one part. Heights (z) are left out.

        Raises
        ------
        OutlineError
            Not a polygon, empty, of several parts, or not the boundary of a cross-section.
        """
        from shapely import MultiPolygon, remove_repeated_points
        from shapely import Polygon as ShapelyPolygon

        part = polygon
        if isinstance(part, MultiPolygon) and not part.is_empty:
            if len(part.geoms) > 1:
                centres = [piece.centroid for piece in list(part.geoms)[:5]]
                places = ", ".join(f"({centre.x:g}, {centre.y:g})" for centre in centres)
                raise OutlineError(
                    f"the polygon has {len(part.geoms)} parts, around {places}: a cross-section is one piece, "
                    "so choose one of polygon.geoms"
                )
            part = part.geoms[0]
        if not isinstance(part, ShapelyPolygon) or part.is_empty:
            raise OutlineError(f"a non-empty shapely Polygon is needed, got {polygon!r:.80}")
        x0, y0, x1, y1 = part.bounds
        part = remove_repeated_points(part, CLEARANCE * max(x1 - x0, y1 - y0))
        rings = [np.asarray(ring.coords)[:-1, :2] for ring in (part.exterior, *part.interiors)]
        return cls(rings[0], voids=[cls(ring) for ring in rings[1:]])

    # --- what it is -----------------------------------------------------------------------------------

    @cached_property
    def edges(self) -> Edges:
        """Every edge of every loop, the material on the left; its arrays are read-only."""
        edges = edges_of(self)
        for field in fields(edges):
            getattr(edges, field.name).flags.writeable = False
        return edges

    @property
    def area(self) -> float:
        """Area of the material, length**2."""
        return self._own_area() - sum(void.area for void in self.voids)

    @property
    def centroid(self) -> tuple[float, float]:
        """Centroid of the material."""
        x, y = self.edges.moments()[1]
        return float(x), float(y)

    @cached_property
    def bounds(self) -> tuple[float, float, float, float]:
        """Extent ``(x_min, y_min, x_max, y_max)``, the arcs' bellies included."""
        edges = self.edges
        points = [self.vertices]
        curved = (edges.bulge != 0.0) & (edges.loop == 0)
        if curved.any():
            p, q, b = edges.start[curved], edges.end[curved], edges.bulge[curved]
            centre, radius, turn = arcs.arc_centre(p, q, b), arcs.arc_radius(p, q, b), arcs.sweep(b)
            first = np.arctan2(*(p - centre).T[::-1])
            for quarter in range(4):
                angle = quarter * math.pi / 2.0
                ahead = (angle - first) * np.sign(turn) % (2.0 * math.pi)
                reached = ahead < np.abs(turn)
                direction = np.array([math.cos(angle), math.sin(angle)])
                points.append((centre + radius[:, None] * direction)[reached])
        every = np.concatenate(points)
        (x0, y0), (x1, y1) = every.min(axis=0), every.max(axis=0)
        return float(x0), float(y0), float(x1), float(y1)

    @property
    def size(self) -> float:
        """The longer side of `bounds`, length."""
        x0, y0, x1, y1 = self.bounds
        return max(x1 - x0, y1 - y0)

    @property
    def perimeter(self) -> float:
        """Length of all loops, voids included."""
        return float(self.edges.length.sum())

    def polygon(self, tolerance: float | None = None) -> Polygon:
        """Return the outline as a shapely polygon, arcs as chords at most ``tolerance`` off the arc.

        Parameters
        ----------
        tolerance : float, optional
            Largest distance between chord and arc (length); one millionth of the size by default. Less is
            taken where chords so coarse would cross each other.
        """
        from shapely import Polygon as ShapelyPolygon

        finest = 1e-6 * self.size  # that of the checks when the outline was made
        off = finest if tolerance is None else positive("tolerance", tolerance)
        while True:
            rings = [loop._facets(off) for loop in (self, *self.voids)]
            polygon = ShapelyPolygon(rings[0], rings[1:])
            if off <= finest or polygon.is_valid:
                return polygon
            off = max(0.1 * off, finest)  # chords of both faces of a thin wall cross

    def _own_area(self) -> float:
        p = self.vertices - self.vertices[0]
        q = np.roll(p, -1, axis=0)
        shoelace = 0.5 * float(np.sum(p[:, 0] * q[:, 1] - p[:, 1] * q[:, 0]))
        return shoelace + float(arcs.segment_area(p, q, self.bulges).sum())

    def _facets(self, tolerance: float) -> Floats:
        from torsionfe.outline.validate import facets

        return facets(self.vertices, self.bulges, tolerance)

    # --- changed copies -------------------------------------------------------------------------------

    def _mapped(self, vertices: Floats, flip: bool, voids: Sequence[Outline]) -> Outline:
        if flip:  # a mirror turns every loop round: vertex 0 stays first
            order = -np.arange(len(vertices)) % len(vertices)
            return Outline(vertices[order], -(-self.bulges)[(order - 1) % len(order)], voids)
        return Outline(vertices, self.bulges, voids)

    def translated(self, dx: float, dy: float) -> Outline:
        """Return a copy moved by ``(dx, dy)`` (length)."""
        step = np.array([finite("dx", dx), finite("dy", dy)])
        return self._mapped(self.vertices + step, False, [void.translated(dx, dy) for void in self.voids])

    def rotated(self, angle: float, about: tuple[float, float] = (0.0, 0.0)) -> Outline:
        """Return a copy turned by ``angle`` (radians, counter-clockwise) about a point."""
        c, s = math.cos(finite("angle", angle)), math.sin(angle)
        centre = np.array([finite("about[0]", about[0]), finite("about[1]", about[1])])
        turned = (self.vertices - centre) @ np.array([[c, s], [-s, c]]) + centre
        return self._mapped(turned, False, [void.rotated(angle, about) for void in self.voids])

    def scaled(self, factor: float, about: tuple[float, float] = (0.0, 0.0)) -> Outline:
        """Return a copy ``factor`` (above 0) times as large, about a point that stays."""
        times = positive("factor", factor)
        centre = np.array([finite("about[0]", about[0]), finite("about[1]", about[1])])
        scaled = (self.vertices - centre) * times + centre
        return self._mapped(scaled, False, [void.scaled(factor, about) for void in self.voids])

    def mirrored(self, angle: float = math.pi / 2.0, about: tuple[float, float] = (0.0, 0.0)) -> Outline:
        """Return a copy mirrored in the line through ``about`` at ``angle`` to the x axis (radians).

        The default is the vertical line through the origin: left becomes right.
        """
        c, s = math.cos(2.0 * finite("angle", angle)), math.sin(2.0 * angle)
        centre = np.array([finite("about[0]", about[0]), finite("about[1]", about[1])])
        turned = (self.vertices - centre) @ np.array([[c, s], [s, -c]]) + centre
        return self._mapped(turned, True, [void.mirrored(angle, about) for void in self.voids])

    def filleted(self, radius: float, at: Iterable[int] | None = None) -> Outline:
        """Return a copy with corners rounded by tangent arcs.

        Parameters
        ----------
        radius : float
            Radius of every fillet, length.
        at : iterable of int, optional
            Vertices of the outer loop; by default every sharp re-entrant corner of every loop.

        Raises
        ------
        OutlineError
            A fillet does not fit: the message names the vertex and the largest radius that would.
        """
        from torsionfe.outline.fillets import fillet

        return fillet(self, radius, at)

    def union(self, other: Outline) -> Outline:
        """Return the outline of what lies in this outline or in another; arcs stay arcs.

        Raises
        ------
        OutlineError
            The result is in several pieces or touches itself; the message names the places.
        """
        from torsionfe.outline.boolean import union

        return union(self, other)

    def difference(self, other: Outline) -> Outline:
        """Return the outline of what lies in this outline and not in another; arcs stay arcs.

        Raises
        ------
        OutlineError
            Nothing is left, the result is in several pieces or touches itself; the message names the places.
        """
        from torsionfe.outline.boolean import difference

        return difference(self, other)

    # --- comparing and showing ------------------------------------------------------------------------

    def plot(
        self, ax: Axes | None = None, *, unit: str = "", vertex_numbers: bool = True, dimensions: bool = True
    ) -> OutlinePlot:
        """Draw the outline with overall dimensions and vertex numbers; see `plot_outline`."""
        from torsionfe.output.outline_plot import plot_outline

        return plot_outline(self, ax, unit=unit, vertex_numbers=vertex_numbers, dimensions=dimensions)

    def matches(self, other: Outline, tolerance: float | None = None) -> bool:
        """Return whether another outline has the same loops, wherever they start and in any order.

        ``==`` is stricter: the same vertices in the same order, to the last digit.

        Parameters
        ----------
        other : Outline
        tolerance : float, optional
            Largest distance between vertices, and between the middles of edges (length); one billionth of the
            size by default.
        """
        from torsionfe.outline.matching import matches

        return matches(self, other, 1e-9 * self.size if tolerance is None else positive("tolerance", tolerance))

    def __eq__(self, other: object) -> bool:
        if not isinstance(other, Outline):
            return NotImplemented
        return (
            np.array_equal(self.vertices, other.vertices)
            and np.array_equal(self.bulges, other.bulges)
            and self.voids == other.voids
        )

    def __hash__(self) -> int:
        return hash((self.vertices.tobytes(), self.bulges.tobytes(), self.voids))

    def __reduce__(self) -> tuple[Any, ...]:
        return Outline, (self.vertices, self.bulges, self.voids)

    def __repr__(self) -> str:
        x0, y0, x1, y1 = self.bounds
        n_arcs = int(np.count_nonzero(self.edges.bulge))
        n_voids = len(self.voids)
        return (
            f"<Outline {x1 - x0:.6g} x {y1 - y0:.6g}, {len(self.edges)} edges, "
            f"{n_arcs} arc{'s'[: n_arcs != 1]}, {n_voids} void{'s'[: n_voids != 1]}, area {self.area:.6g}>"
        )


def _listed(voids: Iterable[Outline]) -> tuple[Outline, ...]:
    if isinstance(voids, Outline) or not isinstance(voids, Iterable):
        kind = type(voids).__name__
        raise OutlineError(f"voids must be a list of Outlines, got {kind}: write voids=[void], or leave it out")
    return tuple(voids)
