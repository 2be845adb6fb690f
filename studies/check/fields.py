"""``solid.vtu``: the mesh with every nodal field of every case (of a travelling load, of the position that governs),
and the shapes of the modes."""

from __future__ import annotations

from collections import Counter
from collections.abc import Collection
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from fem.solid.result import SolidResult
from geometry.problem import MeshError, RunError
from mesher.named_mesh import NamedMesh


def nodal_fields(solid: SolidResult, cases: Collection[str] | None = None) -> dict[str, NDArray[np.float64]]:
    """Fields by name, nodes first: ``CASE displacement (mm)`` (n, 3); ``CASE stress (MPa)`` (n, 6), global xx, yy,
    zz, xy, yz, xz as general viewers order a symmetric tensor; ``CASE von Mises (MPa)`` and ``CASE stress spread
    (MPa)`` (n,); ``vibration 1, 41.5 Hz`` and ``CASE buckling 1, factor 3.5`` (n, 3), largest size 1.

    `cases`: which to give; all when left out.
    """
    fields = {}
    for number, (mode, shape) in enumerate(zip(solid.vibration, solid.vibration_shapes, strict=True), 1):
        fields[f"vibration {number}, {mode.value:.4g} Hz"] = shape.T
    counted: Counter[str] = Counter()
    for mode, shape in zip(solid.buckling, solid.buckling_shapes, strict=True):
        counted[mode.case] += 1
        fields[f"{mode.case} buckling {counted[mode.case]}, factor {mode.value:.4g}"] = shape.T
    for i, case in enumerate(solid.cases):
        if cases is not None and case not in cases:
            continue
        fields[f"{case} displacement (mm)"] = solid.u[i].T
        fields[f"{case} stress (MPa)"] = solid.stress[i].T
        fields[f"{case} von Mises (MPa)"] = solid.von_mises[i]
        fields[f"{case} stress spread (MPa)"] = solid.stress_error[i]
    return {name: np.ascontiguousarray(values) for name, values in fields.items()}


def write_fields(path: Path, mesh: NamedMesh, solid: SolidResult, cases: Collection[str] | None = None) -> None:
    """Write the file; second-order cells, for any viewer of VTK files. `cases`: see `nodal_fields`."""
    from mesher import write_vtu

    try:
        write_vtu(path, mesh, nodal_fields(solid, cases))
    except MeshError as error:  # a full disk, say: writing failed, not meshing
        raise RunError("write", str(error)) from error
