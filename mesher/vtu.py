"""The mesh and results on it as a VTU file, with its curved elements."""

from __future__ import annotations

import base64
from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, BinaryIO
from xml.sax.saxutils import quoteattr

import numpy as np
from numpy.typing import NDArray

from geometry.problem import MeshError
from mesher.named_mesh import NamedMesh

if TYPE_CHECKING:
    import meshio

QUADRATIC_TETRAHEDRON = 24
"""VTK's number of the cell."""
_PIECE = 3 << 20
_HEAD = b"""<?xml version="1.0"?>
<VTKFile type="UnstructuredGrid" version="1.0" byte_order="LittleEndian" header_type="UInt64">
<UnstructuredGrid><Piece NumberOfPoints="%d" NumberOfCells="%d">
"""

Data = Mapping[str, NDArray[np.float64]]


def write_vtu(path: Path | str, mesh: NamedMesh, point_data: Data | None = None, cell_data: Data | None = None) -> None:
    """Write a mesh with data.

    Parameters
    ----------
    path
        File name; its folder must exist.
    point_data
        Name -> (n,) or (n, components), a value for each node of `mesh.nodes`.
    cell_data
        Name -> (m,) or (m, components), a value for each element.

    Raises
    ------
    MeshError
        An array of the wrong length, or the file cannot be written.
    """
    points, cells = (
        _checked(point_data, mesh.nodes.shape[1], "node"),
        _checked(cell_data, mesh.tets.shape[1], "element"),
    )
    count, elements = mesh.nodes.shape[1], mesh.tets.shape[1]
    try:
        with open(path, "wb") as file:
            file.write(_HEAD % (count, elements))
            _section(file, "Points", {"Points": mesh.nodes.T})
            # VTK's quadratic tetrahedron orders its edges 01, 12, 02, 03, 13, 23, as we do; gmsh's files do not.
            _section(file, "Cells", {
                "connectivity": mesh.tets.T.ravel().astype(np.int32 if count < 2**31 else np.int64),
                "offsets": np.arange(10, 10 * elements + 1, 10, dtype=np.int64),
                "types": np.full(elements, QUADRATIC_TETRAHEDRON, dtype=np.uint8),
            })
            _section(file, "PointData", points)
            _section(file, "CellData", cells)
            file.write(b"</Piece></UnstructuredGrid></VTKFile>\n")
    except OSError as error:
        raise MeshError(f"mesh file {path}: cannot be written ({error})") from error


def _section(file: BinaryIO, name: str, arrays: Mapping[str, NDArray[Any]]) -> None:
    """Arrays as base64 of their bytes: not compressed, which would take longer than all the rest of the writing."""
    file.write(f"<{name}>\n".encode())
    for label, values in arrays.items():
        data = np.ascontiguousarray(values)
        kind = {"f": "Float", "i": "Int", "u": "UInt"}[data.dtype.kind] + str(8 * data.itemsize)
        columns = f' NumberOfComponents="{data.shape[1]}"' if data.ndim == 2 else ""
        file.write(f'<DataArray type="{kind}" Name={quoteattr(label)}{columns} format="binary">\n'.encode())
        content = data.astype(data.dtype.newbyteorder("<"), copy=False).reshape(-1).view(np.uint8).data
        # VTK wants the length and the data in one run of base64, which must not end in between.
        head = len(content).to_bytes(8, "little")
        spare = -len(head) % 3
        file.write(base64.b64encode(head + bytes(content[:spare])))
        for start in range(spare, len(content), _PIECE):
            file.write(base64.b64encode(content[start : start + _PIECE]))
        file.write(b"\n</DataArray>\n")
    file.write(f"</{name}>\n".encode())


def read_vtu(path: Path | str) -> meshio.Mesh:
    """Read a VTU file.

    Raises
    ------
    MeshError
        The file is missing or not readable. (On some files the library ends the program; not here.)
    """
    import meshio

    try:
        return meshio.read(path, file_format="vtu")
    except (Exception, SystemExit) as error:
        raise MeshError(f"mesh file {path}: cannot be read ({type(error).__name__}: {error})") from error


def _checked(data: Data | None, count: int, what: str) -> dict[str, NDArray[np.float64]]:
    result = {name: np.ascontiguousarray(values) for name, values in (data or {}).items()}
    for name, values in result.items():
        if values.ndim not in (1, 2) or len(values) != count:
            raise MeshError(f"data {name!r}: shape {values.shape}; one row for each of the {count} {what}s is needed")
    return result
