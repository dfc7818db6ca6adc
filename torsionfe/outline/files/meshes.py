"""The boundary of a flat mesh of triangles and quadrilaterals, in any format that ``meshio`` reads."""

from __future__ import annotations

import io
import subprocess
import sys
import zipfile
from pathlib import Path

import numpy as np
import shapely
from numpy.typing import NDArray

from torsionfe.checks import Floats, Ints
from torsionfe.errors import ReadError
from torsionfe.outline.files.chaining import chain, nodes_of
from torsionfe.outline.files.loops import LARGEST, SMALLEST, Found, RawLoop, ReadOptions, Segments, too_many
from torsionfe.outline.validate import CLEARANCE

__all__ = ["boundary_of", "mesh_endings", "read_mesh"]

Arrays = dict[str, NDArray[np.generic]]

_FLAT = 1e-6
_STRAIGHT = 3e-7
_CELLS_PER_EDGE = 20
_CORNERS = {"triangle": 3, "quad": 4, "polygon": 0}
_BESIDE = ("vertex", "line")


def mesh_endings() -> tuple[str, ...]:
    """Return the file endings that ``meshio`` reads."""
    import meshio

    return tuple(sorted(meshio.extension_to_filetypes))


def read_mesh(path: Path, options: ReadOptions, kind: str = "", seconds: float = 20.0) -> Found:
    """Return the boundary loops of a mesh file.

    Parameters
    ----------
    path : Path
    options : ReadOptions
    kind : str
        The name that ``meshio`` has for the format; "" for what the file's ending says.
    seconds : float
        How long the reading may take.

    Raises
    ------
    ReadError
        It cannot be read, in time and in memory; or the mesh is not flat, has no area, or edges that more than
        two cells share.
    """
    return boundary_of(_arrays(path, kind, seconds), options)


def _arrays(path: Path, kind: str, seconds: float) -> Arrays:
    worker = Path(__file__).with_name("mesh_worker.py")
    command = [sys.executable, "-P", str(worker), str(path.resolve()), kind, str(int(seconds) + 2)]
    try:
        done = subprocess.run(command, stdin=subprocess.DEVNULL, capture_output=True, timeout=seconds, check=False)
    except subprocess.TimeoutExpired:
        raise ReadError(f"the mesh could not be read within {seconds:g} s: it may be damaged") from None
    except OSError as error:
        raise ReadError(f"the reader of meshes cannot be started ({error})") from error
    if done.returncode:
        said = done.stderr.decode(errors="replace").strip().splitlines()
        why = said[-1][:200] if said else f"its reader ended with {done.returncode}"
        raise ReadError(f"it is no mesh that can be read, or a damaged one ({why})")
    try:
        with np.load(io.BytesIO(done.stdout), allow_pickle=False) as found:
            return dict(found)
    except (ValueError, OSError, EOFError, zipfile.BadZipFile) as error:
        raise ReadError(f"its reader gave no mesh ({error})") from error


def boundary_of(arrays: Arrays, options: ReadOptions) -> Found:
    """Return the boundary loops of a mesh given by its points and blocks of cells."""
    try:
        points = np.asarray(arrays["points"], dtype=float)
    except (TypeError, ValueError):
        raise ReadError("the mesh's points are no numbers") from None
    if points.ndim != 2 or points.shape[1] not in (2, 3) or not len(points):
        raise ReadError(f"the mesh's points must have 2 or 3 coordinates, got the shape {points.shape}")
    edges, middle, notes = _boundary_edges(arrays, points, options)
    quadratic = middle >= 0
    start, end = points[edges[:, 0], :2], points[edges[:, 1], :2]
    half = points[middle[quadratic], :2]
    pieces = Segments(
        np.concatenate([start, half]),
        np.concatenate([np.where(quadratic[:, None], points[middle, :2], end), end[quadratic]]),
        np.zeros(len(edges) + len(half)),
    )
    loops, more = chain(pieces, options.tolerance)
    return Found(tuple(_straightened(loop) for loop in loops), None, tuple(notes + more))


def _boundary_edges(arrays: Arrays, points: Floats, options: ReadOptions) -> tuple[Ints, Ints, list[str]]:
    """Return the edges that one cell has, ``(e, 2)``, the nodes halfway along them (-1 for none), and notes."""
    edges, middles = [], []
    for name, cells in arrays.items():
        if name == "points":
            continue
        kind = name.split(" ", 1)[-1]
        family = kind.rstrip("0123456789")
        if family in _BESIDE:
            continue
        if family not in _CORNERS:
            raise ReadError(f"the mesh holds cells of the type {kind!r}: flat triangles or quadrilaterals are needed")
        block = _cells(cells, len(points), kind)
        corners = _CORNERS[family] or block.shape[1]
        if len(block) * corners > _CELLS_PER_EDGE * options.max_edges:
            raise too_many(len(block) * corners, options.max_edges)
        corner = block[:, :corners]
        edges.append(np.stack([corner, np.roll(corner, -1, axis=1)], axis=2).reshape(-1, 2))
        has_middle = _CORNERS[family] and block.shape[1] >= 2 * corners
        middles.append((block[:, corners : 2 * corners] if has_middle else np.full_like(corner, -1)).ravel())
    if not edges:
        raise ReadError("the mesh holds no triangle or quadrilateral")
    every = np.concatenate(edges)
    halfway = np.concatenate(middles)
    named = np.unique(np.concatenate([every.ravel(), halfway[halfway >= 0]]))
    if not (np.abs(points[named]) < LARGEST).all():
        raise ReadError(f"the mesh has a node with coordinates that are not finite, or above {LARGEST:g}")
    notes = _flat(points[named]) if len(named) else []
    return *_once(every, halfway, points), notes


def _cells(cells: NDArray[np.generic], count: int, kind: str) -> Ints:
    """Return the cells of a block, checked, each but once."""
    if cells.ndim != 2 or cells.dtype.kind not in "iu" or cells.shape[1] < 3:
        raise ReadError(f"the mesh's cells of the type {kind!r} are no lists of node numbers")
    block = cells.astype(np.int64)
    if len(block) and not (block.min() >= 0 and block.max() < count):
        raise ReadError(f"the mesh names a node {block.max()} (or {block.min()}) and has {count}")
    return np.asarray(block[np.unique(np.sort(block, axis=1), axis=0, return_index=True)[1]], dtype=np.int64)


def _once(edges: Ints, middle: Ints, points: Floats) -> tuple[Ints, Ints]:
    """Return the edges that belong to one cell only, nodes in one place being one."""
    flat = points[:, :2]
    named = np.unique(edges)
    size = float(np.ptp(flat[named], axis=0).max()) if len(named) else 0.0
    if size < SMALLEST:
        raise ReadError("the mesh has no size in the x-y plane: turn it into that plane")
    label = np.full(len(points), -1)
    label[named], _ = nodes_of(flat[named], CLEARANCE * size)
    ends = np.sort(label[edges], axis=1)
    real = ends[:, 0] != ends[:, 1]
    _, first, count = np.unique(ends[real], axis=0, return_index=True, return_counts=True)
    rows = np.flatnonzero(real)[first]
    shared = np.flatnonzero(count > 2)
    if len(shared):
        x, y = flat[edges[rows[shared[0]], 0]]
        raise ReadError(
            f"{count[shared[0]]} cells share the edge at ({x:g}, {y:g}), and in a flat mesh at most two do: the mesh "
            "overlaps itself or leaves the x-y plane",
            (float(x), float(y)),
        )
    alone = np.sort(rows[count == 1])
    if not len(alone):
        raise ReadError("the mesh has no boundary in the x-y plane")
    return edges[alone], middle[alone]


def _flat(points: Floats) -> list[str]:
    if points.shape[1] < 3:
        return []
    low, high = points[np.argmin(points[:, 2])], points[np.argmax(points[:, 2])]
    size = float(np.ptp(points[:, :2], axis=0).max())
    if not high[2] - low[2] <= _FLAT * size:
        raise ReadError(
            f"the mesh is not flat: z is {low[2]:g} at ({low[0]:g}, {low[1]:g}) and {high[2]:g} at ({high[0]:g}, "
            f"{high[1]:g})",
            (float(high[0]), float(high[1])),
        )
    return [f"flattened from z = {low[2]:g}"] if abs(low[2]) > _FLAT * size else []


def _straightened(loop: RawLoop) -> RawLoop:
    """Return a loop without the nodes along its straight edges."""
    points = loop.vertices
    step = np.roll(points, -1, axis=0) - points
    before = np.roll(step, 1, axis=0)
    turn = np.arctan2(before[:, 0] * step[:, 1] - before[:, 1] * step[:, 0], np.sum(before * step, axis=1))
    ring = np.roll(points, -int(np.argmax(np.abs(turn))), axis=0)  # a corner first, which then stays
    size = float(np.ptp(points, axis=0).max())
    line = shapely.LineString(np.concatenate([ring, ring[:1]])).simplify(_STRAIGHT * size, preserve_topology=False)
    kept = shapely.get_coordinates(line)[:-1]
    return RawLoop(kept, np.zeros(len(kept))) if len(kept) >= 3 else loop
