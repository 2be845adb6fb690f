"""``solid.vtu``: the mesh with every nodal field of every case."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fem.solid.result import SolidResult
from geometry.problem import MeshError, RunError
from mesher.named_mesh import NamedMesh


def nodal_fields(solid: SolidResult) -> dict[str, NDArray[np.float64]]:
    """Fields by name, nodes first: ``CASE displacement (mm)`` (n, 3); ``CASE stress (MPa)`` (n, 6), global xx, yy,
    zz, xy, yz, xz as general viewers order a symmetric tensor; ``CASE von Mises (MPa)`` and ``CASE stress spread
    (MPa)`` (n,)."""
    fields = {}
    for i, case in enumerate(solid.cases):
        fields[f"{case} displacement (mm)"] = solid.u[i].T
        fields[f"{case} stress (MPa)"] = solid.stress[i].T
        fields[f"{case} von Mises (MPa)"] = solid.von_mises[i]
        fields[f"{case} stress spread (MPa)"] = solid.stress_error[i]
    return {name: np.ascontiguousarray(values) for name, values in fields.items()}


def write_fields(path: Path, mesh: NamedMesh, solid: SolidResult) -> None:
    """Write the file; second-order cells, for any viewer of VTK files."""
    from mesher import write_vtu

    try:
        write_vtu(path, mesh, nodal_fields(solid))
    except MeshError as error:  # a full disk, say: writing failed, not meshing
        raise RunError("write", str(error)) from error
