"""Named meshes from scikit-fem's structured meshes, and small parts to go with them."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
from numpy.typing import NDArray
from skfem import MeshTet, MeshTet2

from fem.solid.shape import facet_points
from geometry.part import Case, Material, Member, Part, Section
from mesher.named_mesh import NamedMesh

STEEL = Material("steel", 210000.0, 0.3, 7.85e-9, 12e-6, 235.0, 360.0, "declared", "EN 1993-1-1")
Map = Callable[[NDArray[np.float64]], NDArray[np.float64]]

_FACET_CORNERS = np.array([[1, 2, 3], [0, 3, 2], [0, 1, 3], [0, 2, 1]])
_MIDDLE = {(0, 1): 4, (1, 2): 5, (0, 2): 6, (0, 3): 7, (1, 3): 8, (2, 3): 9}


def _facet_nodes(tets: NDArray[np.int64]) -> NDArray[np.int64]:
    """(6, 4 m) outward facets of every tetrahedron."""
    facets = []
    for a, b, c in _FACET_CORNERS:
        local = [a, b, c] + [_MIDDLE[(min(p), max(p))] for p in ((a, b), (b, c), (a, c))]
        facets.append(tets[local])
    return np.concatenate(facets, axis=1)


def named_mesh(
    mesh: MeshTet2, regions: Mapping[str, Callable[[NDArray[np.float64]], Any]], quality: float = 0.5
) -> NamedMesh:
    """Regions are told by a condition on the (3, k) corner-mean points of the boundary facets."""
    nodes, tets = mesh.doflocs.astype(float), mesh.dofs.element_dofs.astype(np.int64)
    x = nodes[:, tets[:4]]
    swap = np.linalg.det(np.stack([x[:, i] - x[:, 0] for i in (1, 2, 3)]).transpose(2, 0, 1)) < 0
    tets = tets.copy()
    # swapping corners 0 and 1 swaps mid nodes 12 <-> 02 and 03 <-> 13
    tets[:, swap] = tets[:, swap][[1, 0, 2, 3, 4, 6, 5, 8, 7, 9]]
    facets = _facet_nodes(tets)
    keys = np.sort(facets[:3], axis=0)
    _, first, count = np.unique(keys, axis=1, return_index=True, return_counts=True)
    boundary = facets[:, np.sort(first[count == 1])]
    middle = nodes[:, boundary[:3]].mean(axis=1)
    named = {name: boundary[:, np.asarray(rule(middle), dtype=bool)] for name, rule in regions.items()}
    face_index = np.zeros(boundary.shape[1], dtype=np.int64)
    for k, rule in enumerate(regions.values(), start=1):
        face_index[np.asarray(rule(middle), dtype=bool)] = k
    area = {name: float(np.linalg.norm(facet_points(nodes, f)[2], axis=0).sum()) for name, f in named.items()}
    _, points, normals = facet_points(nodes, boundary)
    volume = float((points * normals).sum() / 3)
    return NamedMesh(nodes, tets, named, boundary, face_index, np.full(tets.shape[1], quality), volume, area, area)


def box_regions(length: float, width: float, depth: float, member: str = "arm") -> dict[str, Callable[..., Any]]:
    """Regions of a box x in (0, length), y in (-width/2, width/2), z in (-depth/2, depth/2)."""
    tol = 1e-6 * length
    return {
        f"{member}.start": lambda x: x[0] < tol,
        f"{member}.end": lambda x: x[0] > length - tol,
        f"{member}.top": lambda x: x[2] > depth / 2 - tol,
        f"{member}.bottom": lambda x: x[2] < -depth / 2 + tol,
        f"{member}.left": lambda x: x[1] < -width / 2 + tol,
        f"{member}.right": lambda x: x[1] > width / 2 - tol,
    }


def structured_box(length: float, width: float, depth: float, cells: tuple[int, int, int]) -> MeshTet2:
    """Structured second-order tetrahedra in the box of `box_regions`."""
    nx, ny, nz = cells
    return MeshTet2.from_mesh(
        MeshTet.init_tensor(
            np.linspace(0, length, nx + 1),
            np.linspace(-width / 2, width / 2, ny + 1),
            np.linspace(-depth / 2, depth / 2, nz + 1),
        )
    )


def box_mesh(
    length: float,
    width: float,
    depth: float,
    cells: tuple[int, int, int],
    extra: Mapping[str, Callable[..., Any]] | None = None,
) -> NamedMesh:
    """The structured box as a named mesh."""
    return named_mesh(
        structured_box(length, width, depth, cells), {**box_regions(length, width, depth), **(extra or {})}
    )


def box_part(
    length: float,
    width: float,
    depth: float,
    supports: Any = (),
    loads: Any = (),
    cases: Any = None,
    material: Material = STEEL,
    **more: Any,
) -> Part:
    """A rectangular bar along x; by default one case `all` with every load at factor 1."""
    member = Member(
        "arm",
        (0.0, 0.0, 0.0),
        (length, 0.0, 0.0),
        (0.0, 0.0, 1.0),
        0.0,
        Section("rectangle", {"depth": depth, "width": width}),
        **more,
    )
    if cases is None:
        cases = (Case("all", {load.name: 1.0 for load in loads}),)
    return Part("bar", material, (member,), tuple(supports), tuple(loads), tuple(cases))
