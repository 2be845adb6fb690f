"""The mesh and results on it as a VTU file, with its curved elements."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from geometry.problem import MeshError
from mesher.named_mesh import NamedMesh

if TYPE_CHECKING:
    import meshio

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
    import meshio

    points, cells = (
        _checked(point_data, mesh.nodes.shape[1], "node"),
        _checked(cell_data, mesh.tets.shape[1], "element"),
    )
    # VTK's quadratic tetrahedron orders its edges 01, 12, 02, 03, 13, 23, as we do; gmsh's files do not.
    content = meshio.Mesh(
        np.ascontiguousarray(mesh.nodes.T),
        [("tetra10", np.ascontiguousarray(mesh.tets.T))],
        point_data=points,
        cell_data={name: [values] for name, values in cells.items()},
    )
    try:
        meshio.write(path, content, file_format="vtu")
    except OSError as error:
        raise MeshError(f"mesh file {path}: cannot be written ({error})") from error


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
