"""A small bar, half of it straight and half curved, with every kind of load that has kernels of its own."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from skfem import MeshTet, MeshTet2

from fem.solid.shape import Array
from geometry.part import (
    BodyLoad,
    Buckling,
    Case,
    Material,
    Member,
    Part,
    RegionLoad,
    Section,
    StripLoad,
    Support,
    TemperatureLoad,
    Vibration,
)
from mesher.named_mesh import NamedMesh

LENGTH, WIDTH, DEPTH = 80.0, 10.0, 20.0
_SWAPPED = [1, 0, 2, 3, 4, 6, 5, 8, 7, 9]
_FACETS = [[1, 2, 3, 5, 9, 8], [0, 3, 2, 7, 9, 6], [0, 1, 3, 4, 8, 7], [0, 2, 1, 6, 5, 4]]


def tiny_mesh() -> NamedMesh:
    """8 x 1 x 2 cells of six tetrahedra."""
    grid = MeshTet2.from_mesh(
        MeshTet.init_tensor(
            np.linspace(0, LENGTH, 9), np.linspace(-WIDTH / 2, WIDTH / 2, 2), np.linspace(-DEPTH / 2, DEPTH / 2, 3)
        )
    )
    nodes, tets = grid.doflocs.astype(float), grid.dofs.element_dofs.astype(np.int64)
    corners = nodes[:, tets[:4]]
    turned = np.linalg.det((corners[:, 1:] - corners[:, :1]).transpose(2, 1, 0)) < 0
    tets[:, turned] = tets[:, turned][_SWAPPED]
    far = nodes[0] > LENGTH / 2
    nodes[1, far] += 2e-4 * (nodes[0, far] - LENGTH / 2) * nodes[2, far] ** 2 / DEPTH
    facets = np.concatenate([tets[local] for local in _FACETS], axis=1)
    _, first, count = np.unique(np.sort(facets[:3], axis=0), axis=1, return_index=True, return_counts=True)
    boundary = facets[:, np.sort(first[count == 1])]
    middle = nodes[:, boundary[:3]].mean(axis=1)
    regions = {
        "bar.start": middle[0] < 1e-6,
        "bar.end": middle[0] > LENGTH - 1e-6,
        "bar.top": middle[2] > DEPTH / 2 - 1e-6,
    }
    faces = np.zeros(boundary.shape[1], dtype=np.int64)
    named: dict[str, NDArray[np.int64]] = {}
    area: dict[str, float] = {}
    for number, (name, which) in enumerate(regions.items(), start=1):
        faces[which], named[name] = number, boundary[:, which]
        area[name] = _area(nodes, named[name])
    quality = np.full(tets.shape[1], 0.5)
    return NamedMesh(nodes, tets, named, boundary, faces, quality, LENGTH * WIDTH * DEPTH, area, area)


def _area(nodes: Array, facets: NDArray[np.int64]) -> float:
    a, b, c = (nodes[:, facets[k]] for k in range(3))
    return float(np.linalg.norm(np.cross(b - a, c - a, axis=0), axis=0).sum() / 2)


def tiny_part() -> Part:
    """The bar, held at its start."""
    member = Member(
        "bar", (0.0, 0.0, 0.0), (LENGTH, 0.0, 0.0), (0.0, 0.0, 1.0), 0.0,
        Section("rectangle", {"depth": DEPTH, "width": WIDTH}),
    )  # fmt: skip
    loads = (
        RegionLoad("push", "bar.end", (-1000.0, 0.0, -50.0)),
        BodyLoad("weight", (0.0, 0.0, -9810.0)),
        StripLoad("wheel", "bar.top", (33.0,), 7.0, (0.0, 0.0, -100.0)),
        TemperatureLoad("warmth", 30.0),
    )
    cases = (
        Case("all", {load.name: 1.0 for load in loads}),
        *(Case(load.name, {load.name: 1.0}) for load in loads),
    )
    return Part(
        "bar",
        Material("steel", 210000.0, 0.3, 7.85e-9, 12e-6, 235.0, 360.0, "declared", ""),
        (member,),
        (Support("wall", "bar.start", {"x": 0.0, "y": 0.0, "z": 0.0}),),
        loads,
        cases,
        vibration=Vibration(modes=1),
        buckling=(Buckling("push", modes=1),),
    )
