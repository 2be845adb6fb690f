"""Meshes of the shapes, made by Haunch's own chain or structured, and kept as ``.npz`` files."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from solver_timing.shapes import Shape

if TYPE_CHECKING:
    from geometry.part import Part
    from mesher.named_mesh import NamedMesh

MESHING_MEMORY, MESHING_SECONDS = 16_000, 600.0
"""Bounds of the mesh kernel's child, MiB and s: so wide that only the benchmark's own bounds count."""


def part_of(shape: Shape) -> Part:
    """The shape's part."""
    from geometry.spec import part_from_text

    return part_from_text(shape.spec, f"{shape.name}.toml")


def structured(part: Part, cells: tuple[int, int, int]) -> NamedMesh:
    """Structured second-order tetrahedra of a part of one straight rectangular member along global x.

    Six tetrahedra fill a cell. Knows nothing of `fem`, so that the rivals run whatever Haunch does.
    """
    from skfem import MeshTet, MeshTet2

    from mesher.named_mesh import NamedMesh
    from mesher.quality import scaled_jacobian

    dims = part.members[0].section.dims
    size = np.array([part.members[0].end[0], dims["width"], dims["depth"]])
    low = np.array([0.0, -size[1] / 2, -size[2] / 2])
    lines = (np.linspace(a, a + b, n + 1) for a, b, n in zip(low, size, cells, strict=True))
    mesh = MeshTet2.from_mesh(MeshTet.init_tensor(*lines))
    nodes, tets = mesh.doflocs.astype(float), mesh.dofs.element_dofs.astype(np.int64)
    edges = np.diff(nodes[:, tets[:4]], axis=1)  # (3, 3, m)
    swapped = np.linalg.det(edges.transpose(2, 0, 1)) < 0
    # corners 0 and 1 exchanged: so are the middles 12 and 02, 03 and 13
    tets[:, swapped] = tets[:, swapped][[1, 0, 2, 3, 4, 6, 5, 8, 7, 9]]
    facets = np.concatenate([tets[list(local)] for local in _FACETS], axis=1)
    a, b, c = np.sort(facets[:3], axis=0)
    corners = nodes.shape[1]
    _, first, count = np.unique((a * corners + b) * corners + c, return_index=True, return_counts=True)
    boundary = facets[:, np.sort(first[count == 1])]
    middle = nodes[:, boundary[:3]].mean(axis=1)
    named, areas, face = {}, {}, np.zeros(boundary.shape[1], dtype=np.int64)
    for k, (name, axis, far) in enumerate(_SIDES):
        on = np.isclose(middle[axis], low[axis] + far * size[axis], atol=1e-9 * size.max())
        face[on] = k
        named[f"{part.members[0].name}.{name}"] = boundary[:, on]
        areas[f"{part.members[0].name}.{name}"] = float(size.prod() / size[axis])
    return NamedMesh(
        nodes, tets, named, boundary, face, scaled_jacobian(nodes, tets), float(size.prod()), areas, areas
    )


_FACETS = ((1, 2, 3, 5, 9, 8), (0, 3, 2, 7, 9, 6), (0, 1, 3, 4, 8, 7), (0, 2, 1, 6, 5, 4))
"""Local nodes of a tetrahedron's outward triangles: corners, then the middles of corners 01, 12, 02."""
_SIDES = (("start", 0, 0), ("end", 0, 1), ("right", 1, 1), ("left", 1, 0), ("top", 2, 1), ("bottom", 2, 0))
"""Region, its axis, and whether it lies at the far end of it."""


def free(part: Part, factor: float) -> NamedMesh:
    """The part's solid, meshed with the sizes for its accuracy times `factor`."""
    from geometry.budget import Budget
    from geometry.solid import build_solid
    from mesher import mesh_solid
    from mesher.attempts import CHAIN

    chain = [replace(attempt, factor=attempt.factor * factor) for attempt in CHAIN]
    return mesh_solid(build_solid(part), part.accuracy, Budget(1, MESHING_MEMORY, MESHING_SECONDS), chain=chain)


def make(shape: Shape, size: str) -> NamedMesh:
    """The shape's mesh of one size."""
    part = part_of(shape)
    return structured(part, shape.cells[size]) if size in shape.cells else free(part, shape.factors[size])


_ARRAYS = ("nodes", "tets", "boundary", "face_index", "quality")


def save(mesh: NamedMesh, path: Path) -> None:
    """Write what a solution needs; a file under its name is complete."""
    arrays = {name: getattr(mesh, name) for name in _ARRAYS}
    for name, facets in mesh.facets.items():
        arrays[f"facets {name}"] = facets
        arrays[f"area {name}"] = np.array([mesh.region_area[name], mesh.region_area_cad[name]])
    part = path.with_suffix(".part.npz")
    np.savez(part, volume=np.array(mesh.volume), **arrays)
    part.rename(path)


def load(path: Path) -> NamedMesh:
    """Read what `save` wrote."""
    from mesher.named_mesh import NamedMesh

    with np.load(path, allow_pickle=False) as stored:
        data = {name: stored[name] for name in stored.files}
    regions = [name.removeprefix("facets ") for name in data if name.startswith("facets ")]
    return NamedMesh(
        **{name: data[name] for name in _ARRAYS},
        facets={name: data[f"facets {name}"] for name in regions},
        volume=float(data["volume"]),
        region_area={name: float(data[f"area {name}"][0]) for name in regions},
        region_area_cad={name: float(data[f"area {name}"][1]) for name in regions},
    )
