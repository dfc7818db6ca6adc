"""A mesh with its fields as one XDMF file, numbers in its text (version 3 of the open format's description).

meshio's own writer of this format wants the HDF5 library even where the numbers go into the text.
"""

from __future__ import annotations

from typing import TYPE_CHECKING
from xml.etree import ElementTree

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from meshio import Mesh

__all__ = ["xdmf_text"]

_TOPOLOGY = {"triangle": "Triangle", "triangle6": "Triangle_6"}


def xdmf_text(mesh: Mesh) -> bytes:
    """Return a mesh of one block of triangles, with its data at nodes and cells, as an XDMF document."""
    root = ElementTree.Element("Xdmf", Version="3.0")
    grid = ElementTree.SubElement(ElementTree.SubElement(root, "Domain"), "Grid", Name="section", GridType="Uniform")
    (block,) = mesh.cells
    _numbers(ElementTree.SubElement(grid, "Geometry", GeometryType="XYZ"), np.asarray(mesh.points))
    kind = {"TopologyType": _TOPOLOGY[block.type], "NumberOfElements": str(len(block.data))}
    _numbers(ElementTree.SubElement(grid, "Topology", kind), block.data)
    for centre, data in (("Node", mesh.point_data), ("Cell", {name: rows[0] for name, rows in mesh.cell_data.items()})):
        for name, values in data.items():
            shape = "Vector" if values.ndim == 2 else "Scalar"
            where = ElementTree.SubElement(grid, "Attribute", Name=name, AttributeType=shape, Center=centre)
            _numbers(where, values)
    ElementTree.indent(root)
    return bytes(ElementTree.tostring(root, encoding="utf-8", xml_declaration=True))


def _numbers(parent: ElementTree.Element, values: NDArray[np.float64] | NDArray[np.int64]) -> None:
    """Add numbers, one row a line, with every digit."""
    kind = "Float" if np.issubdtype(values.dtype, np.floating) else "Int"
    size = " ".join(map(str, values.shape))
    item = ElementTree.SubElement(parent, "DataItem", DataType=kind, Precision="8", Format="XML", Dimensions=size)
    rows = values.reshape(len(values), -1).tolist()
    item.text = "\n" + "\n".join(" ".join(map(repr, row)) for row in rows) + "\n"
