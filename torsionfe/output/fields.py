"""The solved fields as files for general viewers, through meshio: VTU, XDMF and whatever else can hold them."""

from __future__ import annotations

import contextlib
import io
import os
import shutil
import tempfile
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from torsionfe.checks import Floats, Ints, finite
from torsionfe.errors import InputError
from torsionfe.fem.assembly import gradients, turned
from torsionfe.output.sampled import nodal_stress, split_triangle
from torsionfe.output.xdmf import xdmf_text
from torsionfe.storing import store
from torsionfe.torsion.fields import Fields
from torsionfe.torsion.solution import TorsionSolution
from torsionfe.torsion.warping import dof_points, normalised_warping

if TYPE_CHECKING:
    from meshio import Mesh

__all__ = ["ElementMeans", "element_means", "field_mesh", "write_fields"]

#: From our order of a quadratic triangle's nodes (corners, then the middles opposite to each) to that of viewers
#: (corners, then the middles of the sides 0-1, 1-2, 2-0).
_MIDDLES = [0, 1, 2, 5, 3, 4]
_XDMF = (".xdmf", ".xmf")


@dataclass(frozen=True)
class ElementMeans:
    """Means over each element, in the outline's unit of length.

    Attributes
    ----------
    stress : ndarray of shape (m, 2)
        ``(tau_zx, tau_zy)`` for unit torque, 1/length**3.
    magnitude : ndarray of shape (m,)
        Mean of its size.
    stress_function, warping : ndarray of shape (m,)
        length**2.
    bracket_share : ndarray of shape (m,)
        What each element adds to the relative width of the bracket of ``J``; their sum is that width.
    """

    stress: Floats
    magnitude: Floats
    stress_function: Floats
    warping: Floats
    bracket_share: Floats


def element_means(solution: TorsionSolution) -> ElementMeans:
    """Return the mean of each field over each element, by the quadrature of the solver."""
    fields, scale = solution.fields, solution.frame.scale
    m = len(fields.space.mesh.triangles)
    warping = normalised_warping(fields).omega
    sums = np.zeros((m, 5))
    area = np.zeros(m)
    for patch in fields.system.patches:
        tau = _mean_stress(fields, patch)
        shape = fields.space.element.values(patch.rule.points)
        dofs = fields.space.dofs[patch.triangles]
        phi, omega = fields.phi[dofs] @ shape.T, warping[dofs] @ shape.T
        stacked = np.stack([tau[..., 0], tau[..., 1], np.hypot(tau[..., 0], tau[..., 1]), phi, omega], axis=2)
        sums[patch.triangles] = np.einsum("kqf,kq->kf", stacked, patch.weights)
        area[patch.triangles] = patch.weights.sum(axis=1)
    means = sums / area[:, None]
    per_torque = scale / solution.torsion_constant.value
    share = fields.energies.gap / (0.5 * (fields.lower + fields.upper))
    return ElementMeans(
        means[:, :2] * per_torque, means[:, 2] * per_torque, means[:, 3] * scale**2, means[:, 4] * scale**2, share
    )


def _mean_stress(fields: Fields, patch: Any) -> Floats:
    """Return the mean of both stress fields at a patch's quadrature points, shape (k, q, 2)."""
    slope = gradients(fields.space, patch, fields.phi)
    tau_phi = np.stack([slope[..., 1], -slope[..., 0]], axis=-1)
    tau_omega = gradients(fields.space, patch, fields.omega) - turned(patch.points)
    return np.asarray(0.5 * (tau_phi + tau_omega), dtype=float)


def field_mesh(solution: TorsionSolution, torque: float | None = None, *, curved: bool = True) -> Mesh:
    """Return the elements and fields of a solution as a meshio mesh, in the outline's coordinates and ``z = 0``.

    Quadratic elements become curved six-node triangles, their middles on the true arcs. Linear elements become
    triangles; elements of a higher degree are split into triangles between their nodes.

    Parameters
    ----------
    solution : TorsionSolution
    torque : float, optional
        force * length; without it, stress is per torque (1/length**3).
    curved : bool
        Whether six-node triangles may be used; else quadratic elements are split into four triangles.

    Returns
    -------
    meshio.Mesh
        At nodes: ``shear_stress`` (a vector in the plane of the section) and ``shear_stress_size``, both ending in
        ``_per_torque`` without a torque; ``stress_function`` for ``G theta' = 1`` and ``warping_function`` about
        the centre of twist (length**2). At elements the means of the same, named ``mean_shear_stress`` and so on,
        and ``bracket_share``, their part of the relative width of the bracket of ``J``.
    """
    import meshio

    factor = 1.0 if torque is None else finite("torque", torque)
    ending = "_per_torque" if torque is None else ""
    fields, frame, space = solution.fields, solution.frame, solution.fields.space
    stress = nodal_stress(fields) * (frame.scale / solution.torsion_constant.value * factor)
    phi, omega = fields.phi * frame.scale**2, normalised_warping(fields).omega * frame.scale**2
    means = element_means(solution)
    cells, parent = _cells(solution, curved)
    nodal = (stress, np.hypot(*stress.T), phi, omega)
    mean = (means.stress * factor, means.magnitude * abs(factor), means.stress_function, means.warping)
    names = (f"shear_stress{ending}", f"shear_stress_size{ending}", "stress_function", "warping_function")
    return meshio.Mesh(
        _spatial(frame.outward_points(dof_points(fields))),
        [cells],
        point_data={name: _spatial(values) for name, values in zip(names, nodal, strict=True)},
        cell_data={
            **{f"mean_{name}": [_spatial(values[parent])] for name, values in zip(names, mean, strict=True)},
            "bracket_share": [means.bracket_share[parent] / (len(parent) / len(space.mesh.triangles))],
        },
    )


def _spatial(values: Floats) -> Floats:
    """Return vectors of the plane with a third component of zero; numbers as they are."""
    return np.column_stack([values, np.zeros(len(values))]) if values.ndim == 2 else values


def _cells(solution: TorsionSolution, curved: bool) -> tuple[tuple[str, Ints], Ints]:
    """Return kind and nodes of the cells, and the element that each belongs to."""
    space = solution.fields.space
    every = np.arange(len(space.mesh.triangles))
    if space.order == 2 and curved:
        return ("triangle6", space.dofs[:, _MIDDLES]), every
    split = split_triangle(space.order)
    return ("triangle", space.dofs[:, split].reshape(-1, 3)), np.repeat(every, len(split))


def write_fields(
    solution: TorsionSolution, path: str | os.PathLike[str], torque: float | None = None
) -> Path:
    """Write the fields of a solution for a viewer, in the format of the path's ending.

    VTU (``.vtu``) and XDMF (``.xdmf``, in one file) are the ones to prefer. Of the other endings that meshio knows,
    those work whose format holds what `field_mesh` lists: what was written is read back before the file takes its
    place, and a format that lost some of it is refused. Formats without curved elements get split ones.

    Parameters
    ----------
    solution : TorsionSolution
    path : path-like
    torque : float, optional
        force * length; without it, stress is per torque (1/length**3).

    Returns
    -------
    pathlib.Path

    Raises
    ------
    InputError
        An unknown ending; a format that doesn't hold the fields, or needs a library that is not there; a folder
        that doesn't exist or can't be written to.
    """
    target = Path(path)
    ending = _ending(target)
    if not target.parent.is_dir():
        raise InputError(f"the folder {str(target.parent)!r} of {target.name!r} does not exist: make it first")
    if ending in _XDMF:
        return store(target, xdmf_text(field_mesh(solution, torque)))
    why = ""
    for curved in (True, False) if solution.order == 2 else (True,):
        mesh = field_mesh(solution, torque, curved=curved)
        for name in _formats()[ending]:
            data, why = _written(mesh, name, ending)
            if data is not None:
                return store(target, data)
    raise InputError(f"{target.name!r}: the format {ending!r} {why}; write .vtu or .xdmf")


def _formats() -> dict[str, list[str]]:
    """Return meshio's formats by their endings."""
    import meshio

    return dict(meshio.extension_to_filetypes)


def _ending(target: Path) -> str:
    ending = ("".join(target.suffixes[-2:]) if target.suffix == ".gz" else target.suffix).lower()
    if ending not in _formats():
        raise InputError(f"{target.name!r}: {ending!r} is the ending of no format of fields; write .vtu or .xdmf")
    return ending


def _written(mesh: Mesh, name: str, ending: str) -> tuple[bytes | None, str]:
    """Return a file's content and nothing, or nothing and why the format can't hold the mesh with its fields."""
    import meshio

    with _folder() as folder, contextlib.redirect_stdout(io.StringIO()), contextlib.redirect_stderr(io.StringIO()):
        file = folder / f"fields{ending}"
        try:
            mesh.write(file, file_format=name)
            if len(list(folder.iterdir())) != 1:
                return None, "needs more than one file"
            data = file.read_bytes()
            if b"stress_function" not in data:  # a format of meshes alone; reading it back may take for ever
                return None, "does not hold fields"
            lost = _lost(mesh, meshio.read(file, file_format=name))
            return (None, f"does not hold {lost}") if lost else (data, "")
        except ImportError as error:
            return None, f"needs the library {error.name}, which is not installed"
        except Exception:  # each writer and reader fails in its own way
            return None, "does not hold these elements or fields"


@contextlib.contextmanager
def _folder() -> Iterator[Path]:
    folder = Path(tempfile.mkdtemp(prefix="torsionfe-"))
    try:
        yield folder
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def _lost(mesh: Mesh, found: Mesh) -> str:
    """Return what of a mesh a format has lost; some formats keep a vector as its components."""
    given, kept = ([(block.type, len(block.data)) for block in one.cells] for one in (mesh, found))
    if given != kept:
        return "these elements"
    for where, wanted, there in (
        ("nodes", mesh.point_data, found.point_data),
        ("elements", mesh.cell_data, found.cell_data),
    ):
        for name in wanted:
            if name not in there and f"{name}_0" not in there:
                return f"{name} at {where}"
    return ""
