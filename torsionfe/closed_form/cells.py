"""Thin-walled cells, one or several, with open fins attached: Bredt (1896) and Batho (1915).

In every wall the shear flow ``q`` (stress times thickness) is the difference of the flows that circulate
in the cells on its two sides. Around cell ``i``: ``sum q ds/t = 2 A_i G theta'``; together
``T = 2 sum q_i A_i``.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from types import MappingProxyType

import numpy as np

from torsionfe.checks import Floats, finite, non_negative, positive
from torsionfe.closed_form.plates import Plate, PlateSum, plate_sum
from torsionfe.closed_form.rectangle import CoefficientTable
from torsionfe.errors import InputError
from torsionfe.text import number, percent, table

__all__ = ["CellSum", "CellWall", "ThinCells", "cell_sum", "thin_cells_of"]

#: A wall above this part of the cell's mean radius ``2 A / perimeter`` is noted as thick. On a round tube
#: ``J`` is then 1 % or more too low: the ratio to the exact one is ``1 / (1 + (t / 2 r)**2)``.
_THICK = 0.2


@dataclass(frozen=True, slots=True)
class CellWall:
    """One wall of thin cells.

    Parameters
    ----------
    length : float
        Along the middle line (length).
    thickness : float
        Where the wall varies, its least, which governs the stress (length).
    cells : tuple of int
        The cell that it bounds, or the two that it parts.
    name : str
        What tables call it.
    flexibility : float, optional
        ``int ds/t`` of a wall that varies, dimensionless; ``length / thickness`` by default.

    Raises
    ------
    InputError
        A size that is not above 0; no cell, more than two, or twice the same; a flexibility above
        ``length / thickness``, which no wall has whose least thickness is the one given.
    """

    length: float
    thickness: float
    cells: tuple[int, ...] = (0,)
    name: str = ""
    flexibility: float | None = None

    def __post_init__(self) -> None:
        label = f" of wall {self.name!r}" if self.name else ""
        object.__setattr__(self, "length", positive(f"length{label}", self.length))
        object.__setattr__(self, "thickness", positive(f"thickness{label}", self.thickness))
        most = self.length / self.thickness
        given = most if self.flexibility is None else positive(f"flexibility{label}", self.flexibility)
        if given > most * (1.0 + 1e-9):
            raise InputError(
                f"flexibility{label} must be at most length / thickness = {most:g}, got {given:g}: "
                "thickness is the least along the wall"
            )
        object.__setattr__(self, "flexibility", given)
        cells = (self.cells,) if isinstance(self.cells, int) else tuple(self.cells)
        whole = all(isinstance(c, (int, np.integer)) and not isinstance(c, bool) and c >= 0 for c in cells)
        if not whole or len(cells) not in (1, 2) or len(set(cells)) != len(cells):
            raise InputError(f"cells{label} must be one or two different numbers from 0, got {self.cells!r}")
        object.__setattr__(self, "cells", tuple(int(c) for c in cells))

    @property
    def compliance(self) -> float:
        """``int ds/t`` along the wall, dimensionless."""
        assert self.flexibility is not None
        return self.flexibility


@dataclass(frozen=True)
class ThinCells:
    """Thin-walled cells: their walls, the areas within the middle lines, and open fins.

    Parameters
    ----------
    walls : sequence of CellWall
        Every cell is closed by them.
    areas : sequence of float
        Enclosed by the middle line of each cell (length**2).
    fins : sequence of Plate
        Open plates attached outside or inside.
    source : str
        Where the walls come from, for the printed result.
    notes : tuple of str

    Raises
    ------
    InputError
        No cell, a cell without a wall, a wall of a cell that does not exist.
    """

    walls: tuple[CellWall, ...]
    areas: tuple[float, ...]
    fins: tuple[Plate, ...] = ()
    source: str = "given by hand"
    notes: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        for name, kind in (("walls", CellWall), ("fins", Plate)):
            items = tuple(getattr(self, name))
            for k, item in enumerate(items):
                if not isinstance(item, kind):
                    raise InputError(f"{name}[{k}] must be a {kind.__name__}, got {item!r:.80}")
            object.__setattr__(self, name, items)
        areas = (self.areas,) if isinstance(self.areas, (int, float)) else self.areas
        sizes = tuple(positive(f"areas[{k}]", area) for k, area in enumerate(areas))
        object.__setattr__(self, "areas", sizes)
        if not sizes:
            raise InputError("areas is empty: there must be one cell or more")
        named = {cell for wall in self.walls for cell in wall.cells}
        if named - set(range(len(sizes))):
            raise InputError(f"a wall bounds cell {max(named)}, but there are {len(sizes)} areas, from 0")
        if len(named) < len(sizes):
            bare = min(set(range(len(sizes))) - named)
            raise InputError(f"cell {bare} has no wall: every cell must be closed by its walls")

    @classmethod
    def single(
        cls, walls: Iterable[tuple[float, float]], area: float, fins: Iterable[Plate] = ()
    ) -> ThinCells:
        """Return one cell, from ``(length, thickness)`` of each wall and the enclosed area."""
        return cls(tuple(CellWall(length, thickness) for length, thickness in walls), (area,), tuple(fins))


@dataclass(frozen=True)
class CellSum:
    """Bredt and Batho's answer for thin cells and their fins. ``print`` shows a table.

    Attributes
    ----------
    cells : ThinCells
    torsion_constant : float
        Of cells and fins together, length**4.
    torsion_constant_cells : float
        Of the cells, with the walls' own strips if ``strips`` (length**4).
    circulations : ndarray of shape (n_cells,)
        ``q_i / (G theta')`` of each cell, length**2: the stress function on its void.
    fin_sum : PlateSum or None
        The fins by themselves.
    strips : bool
        Whether ``sum(l t**3 / 3)`` of the walls was added, and ``t G theta'`` to their stress.
    notes : tuple of str
    """

    cells: ThinCells
    torsion_constant: float
    torsion_constant_cells: float
    circulations: Floats
    fin_sum: PlateSum | None
    strips: bool
    notes: tuple[str, ...] = ()

    @cached_property
    def _thickness(self) -> Floats:
        return np.array([wall.thickness for wall in self.cells.walls])

    @cached_property
    def _flow(self) -> Floats:
        """``q / (G theta')`` of each wall: the flow of its first cell less that of its second."""
        held = [self.circulations[list(wall.cells)] for wall in self.cells.walls]
        return np.array([flow[0] - flow[1] if len(flow) == 2 else flow[0] for flow in held])

    def shear_flow(self, torque: float) -> Floats:
        """Return stress times thickness in each wall (force/length), shape (n_walls,).

        Positive counter-clockwise around the first cell of the wall, for a positive torque.
        """
        return self._flow * (finite("torque", torque) / self.torsion_constant)

    def wall_stress(self, torque: float) -> Floats:
        """Return the size of the shear stress in each wall, where it is thinnest, shape (n_walls,)."""
        own = self._thickness if self.strips else 0.0
        rate = abs(finite("torque", torque)) / self.torsion_constant
        return np.asarray(rate * (np.abs(self._flow) / self._thickness + own), dtype=float)

    def fin_stress(self, torque: float) -> Floats:
        """Return the size of the peak shear stress of each fin, shape (n_fins,)."""
        if self.fin_sum is None:
            return np.zeros(0)
        share = self.fin_sum.torsion_constant_twist / self.torsion_constant
        return self.fin_sum.peak_stress(finite("torque", torque) * share)

    def peak_stress(self, torque: float) -> float:
        """Return the largest stress of walls and fins."""
        return float(np.max(np.concatenate([self.wall_stress(torque), self.fin_stress(torque)])))

    @property
    def governing(self) -> str:
        """The wall or fin with the largest stress, in words."""
        stress = np.concatenate([self.wall_stress(1.0), self.fin_stress(1.0)])
        k, walls = int(np.argmax(stress)), self.cells.walls
        if k < len(walls):
            return walls[k].name or f"wall {k}"
        return self.cells.fins[k - len(walls)].name or f"fin {k - len(walls)}"

    @property
    def section_modulus(self) -> float:
        """``W_t = T / tau_max``, length**3."""
        return 1.0 / self.peak_stress(1.0)

    def twist_rate(self, torque: float, shear_modulus: float) -> float:
        """Return the rotation per length ``T / (G J)``, rad/length."""
        return finite("torque", torque) / (positive("shear_modulus", shear_modulus) * self.torsion_constant)

    def __str__(self) -> str:
        rows = [["wall", "length", "t", "cells", "flow per torque", "stress per torque"]]
        flow, stress = self.shear_flow(1.0), self.wall_stress(1.0)
        for k, wall in enumerate(self.cells.walls):
            sizes = [number(wall.length, 6), number(wall.thickness, 6), ", ".join(map(str, wall.cells))]
            rows.append([wall.name or str(k), *sizes, number(flow[k]), number(stress[k])])
        for k, (fin, tau) in enumerate(zip(self.cells.fins, self.fin_stress(1.0), strict=True)):
            sizes = [number(fin.width, 6), number(fin.thickness, 6), "open"]
            rows.append([fin.name or f"fin {k}", *sizes, "", number(tau)])
        areas = ", ".join(number(area, 6) for area in self.cells.areas)
        fins = self.torsion_constant - self.torsion_constant_cells
        lines = [
            table(rows, "Thin-walled cells (Bredt 1896, Batho 1915)", head=True),
            f"enclosed area      {areas}",
            f"torsion constant   {number(self.torsion_constant, 6)}"
            + (f", {percent(fins / self.torsion_constant)} of it from the fins" if self.fin_sum else ""),
            f"governing          {self.governing}",
            f"walls              {self.cells.source}"
            + (", each wall's own strip l t^3/3 added" if self.strips else ""),
        ]
        return "\n".join([*lines, *(f"note: {note}" for note in self.notes)])


def cell_sum(cells: ThinCells, rule: str | CoefficientTable = "series", strips: bool = False) -> CellSum:
    """Return torsion constant, shear flows and stresses of thin cells with fins.

    Parameters
    ----------
    cells : ThinCells
    rule : str or CoefficientTable
        Coefficients of the fins: see `torsionfe.closed_form.rectangle.rectangle_coefficients`.
    strips : bool
        Whether to add what each wall carries as a strip of its own: ``sum(l t**3 / 3)`` to the torsion
        constant and ``t G theta'`` to the stress, as EN 10210-2 does for hollow sections. Without (the
        default), it is Bredt's formula.

    Raises
    ------
    InputError
        ``cells`` is no `ThinCells`, or an unknown rule.

    Examples
    --------
    >>> square = ThinCells.single([(100.0, 5.0)] * 4, area=100.0**2)
    >>> round(cell_sum(square).torsion_constant)  # 4 A**2 / (sum of l/t)
    5000000
    """
    if not isinstance(cells, ThinCells):
        raise InputError(f"cells must be a ThinCells, got {cells!r:.80}")
    n = len(cells.areas)
    matrix, areas = np.zeros((n, n)), np.array(cells.areas)
    for wall in cells.walls:
        sign = np.zeros(n)
        sign[list(wall.cells)] = [1.0, -1.0][: len(wall.cells)]
        matrix += wall.compliance * np.outer(sign, sign)
    if np.linalg.cond(matrix) > 1e12:
        raise InputError("the cells have no outer wall: a wall that bounds a single cell is missing")
    circulations = np.linalg.solve(matrix, 2.0 * areas)
    closed = 2.0 * float(circulations @ areas)
    if strips:
        closed += sum(wall.length * _mean_cube(wall) / 3.0 for wall in cells.walls)
    fins = plate_sum(cells.fins, rule, "fins of cells") if cells.fins else None
    total = closed + (fins.torsion_constant_twist if fins else 0.0)
    notes = (*cells.notes, *(fins.notes if fins else ()), *_roughness(cells))
    return CellSum(cells, total, closed, np.asarray(circulations), fins, strips, notes)


def _mean_cube(wall: CellWall) -> float:
    """Return the cube of the wall's mean thickness, the one that its flexibility stands for."""
    return (wall.length / wall.compliance) ** 3


def _roughness(cells: ThinCells) -> list[str]:
    notes = []
    for cell, area in enumerate(cells.areas):
        walls = [wall for wall in cells.walls if cell in wall.cells]
        radius = 2.0 * area / sum(wall.length for wall in walls)
        thick = max(wall.length / wall.compliance for wall in walls)
        if thick > _THICK * radius:
            notes.append(
                f"cell {cell}: a wall of {number(thick)} around a mean radius of {number(radius)} is not "
                f"thin; the J of a round tube like that is {percent((0.5 * thick / radius) ** 2)} higher"
            )
    return notes


def thin_cells_of(kind: str, dimensions: Mapping[str, float]) -> ThinCells:
    """Return the cells of a trade shape: ``'tube'``, ``'box'``, ``'finned_box'`` or ``'multi_cell'``.

    Corners turn on the mean of the outer and inner radius, as in EN 10210-2; fillets count for nothing. Fins
    run from the middle of the box's side.

    Parameters
    ----------
    kind : str
        The name of the shape's function.
    dimensions : mapping of str to float
        The shape's parameters by name (length; counts are plain numbers).

    Raises
    ------
    InputError
        The shape has no closed cell (or not by its dimensions: see `thin_cells`), a dimension is missing, or
        the walls fill the section.
    """
    if kind not in _SHAPES:
        known = ", ".join(map(repr, _SHAPES))
        raise InputError(
            f"no cells are known for the kind {kind!r}, only for {known}: "
            "for any outline with voids use thin_cells(outline)"
        )
    sizes = {}
    for name in _SHAPES[kind]:
        if name not in dimensions:
            given = ", ".join(dimensions) or "none"
            raise InputError(f"a {kind} needs the dimension {name!r}; given: {given}")
        sizes[name] = positive(name, dimensions[name])
    if kind == "tube":
        mean = sizes["outer_diameter"] - sizes["wall"]
        _hollow(mean, sizes["wall"])
        wall = CellWall(math.pi * mean, sizes["wall"])
        return ThinCells((wall,), (math.pi / 4.0 * mean**2,), source="tube, middle of the wall")
    radii = [non_negative(name, dimensions.get(name, 0.0)) for name in ("outer_radius", "inner_radius")]
    fins: tuple[Plate, ...] = ()
    if kind == "finned_box":
        reach = sizes["fin_length"] + 0.5 * sizes["wall"]
        fins = tuple(Plate(reach, sizes["fin_thickness"], f"{side} fin") for side in ("left", "right"))
        radii[0] = 0.0
    grid = _grid(sizes, 0.5 * sum(radii))
    return ThinCells(*grid, fins, f"{kind.replace('_', ' ')}, middle of the walls")


_SHAPES: Mapping[str, tuple[str, ...]] = MappingProxyType(
    {
        "tube": ("outer_diameter", "wall"),
        "box": ("width", "height", "wall"),
        "finned_box": ("width", "height", "wall", "fin_length", "fin_thickness"),
        "multi_cell": ("width", "height", "wall", "web", "columns", "rows"),
    }
)


def _hollow(between: float, wall: float) -> None:
    """Raise where walls fill what they should enclose."""
    if between <= wall:
        raise InputError(f"walls of {wall:g} leave no void: only {between:g} between their middles")


def _grid(sizes: Mapping[str, float], radius: float) -> tuple[tuple[CellWall, ...], tuple[float, ...]]:
    """Return the walls and areas of cells in rows and columns, the four outer corners rounded."""
    t, web = sizes["wall"], sizes.get("web", sizes["wall"])
    n, m = round(sizes.get("columns", 1.0)), round(sizes.get("rows", 1.0))
    wide, high = _pitches(sizes["width"], n, t, web), _pitches(sizes["height"], m, t, web)
    _hollow(min(*wide, *high), t if n == m == 1 else max(t, web))
    least = min(*wide, *high, 0.5 * sum(wide), 0.5 * sum(high))
    if radius > least:
        raise InputError(f"the mean corner radius {radius:g} does not fit: at most {least:g}")
    areas = [wide[i] * high[k] for k in range(m) for i in range(n)]
    corner = (1.0 - math.pi / 4.0) * radius  # what one corner takes off each of its two walls
    walls = []
    for k in range(m + 1):
        for i in range(n):
            cells = tuple(row * n + i for row in (k - 1, k) if 0 <= row < m)
            ends = (i == 0) + (i == n - 1) if len(cells) == 1 else 0
            name = _side(cells, ("bottom", "top"), k > 0)
            walls.append(CellWall(wide[i] - ends * corner, t if len(cells) == 1 else web, cells, name))
    for i in range(n + 1):
        for k in range(m):
            cells = tuple(k * n + column for column in (i - 1, i) if 0 <= column < n)
            ends = (k == 0) + (k == m - 1) if len(cells) == 1 else 0
            name = _side(cells, ("left", "right"), i > 0)
            walls.append(CellWall(high[k] - ends * corner, t if len(cells) == 1 else web, cells, name))
    for cell in (0, n - 1, n * (m - 1), n * m - 1):
        areas[cell] -= (1.0 - math.pi / 4.0) * radius**2
    return tuple(walls), tuple(areas)


def _pitches(size: float, count: int, wall: float, web: float) -> list[float]:
    """Return the distances between the middles of the walls across a row of equal cells."""
    clear = (size - 2.0 * wall - (count - 1) * web) / count
    if clear <= 0.0:
        raise InputError(f"walls of {wall:g} and webs of {web:g} leave no void in {size:g}")
    if count == 1:
        return [size - wall]
    return [clear + 0.5 * (wall + web), *[clear + web] * (count - 2), clear + 0.5 * (wall + web)]


def _side(cells: tuple[int, ...], ends: tuple[str, str], last: bool) -> str:
    return ends[last] if len(cells) == 1 else "web"
