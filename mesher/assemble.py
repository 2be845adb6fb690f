"""Putting the kernel's arrays together as a `NamedMesh`, and checking it against the solid."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from geometry.named_solid import NamedSolid
from mesher.child import ChildResult
from mesher.measure import facet_areas
from mesher.named_mesh import NamedMesh
from mesher.numbering import TET_EDGES, TET_FACES, from_gmsh
from mesher.quality import quality_and_volume

Ints = NDArray[np.int64]
Floats = NDArray[np.float64]


LEAST_QUALITY = 0.02
"""Floor of the least scaled Jacobian. Usual meshes of these parts reach 0.1 or more; slivers lie far below."""

VOLUME_TOLERANCE = 1e-3


class MeshRefused(Exception):
    """A gate refused the mesh of one attempt."""


def assemble(result: ChildResult, solid: NamedSolid, recipe: dict[str, Any]) -> NamedMesh:
    """The named mesh from the arrays of one attempt; `recipe` becomes its recipe.

    Raises
    ------
    MeshRefused
        Elements missing, inverted or too bad; a face, region or the volume that is not that of the solid.
    """
    arrays = result.arrays
    try:
        nodes, tets, index = from_gmsh(arrays["tags"], arrays["points"], arrays["tets"])
        boundary = boundary_facets(tets)
        face_index = _owners(boundary, index[arrays["triangles"].T], arrays["owner"])
    except ValueError as error:
        raise MeshRefused(str(error)) from error
    quality, volumes = quality_and_volume(nodes, tets)
    check_quality(quality, nodes, tets)
    areas = facet_areas(nodes, boundary)
    face_area: Floats = np.bincount(face_index, weights=areas, minlength=len(solid.faces)).astype(np.float64)
    _check_faces(face_area, arrays["tolerance"], solid)
    volume = float(volumes.sum())
    if abs(volume - solid.volume) > VOLUME_TOLERANCE * solid.volume:
        raise MeshRefused(f"volume of the mesh {volume:.8g} mm^3, of the solid {solid.volume:.8g} mm^3")
    facets = {name: boundary[:, np.isin(face_index, faces)] for name, faces in solid.regions.items()}
    return NamedMesh(
        nodes=nodes,
        tets=tets,
        facets=facets,
        boundary=boundary,
        face_index=face_index,
        quality=quality,
        volume=volume,
        region_area={name: float(face_area[list(faces)].sum()) for name, faces in solid.regions.items()},
        region_area_cad={name: sum(solid.faces[i].area for i in faces) for name, faces in solid.regions.items()},
        recipe=recipe,
    )


def check_quality(quality: Floats, nodes: Floats, tets: Ints) -> None:
    """Refuse inverted elements and slivers: one alone can spoil a factorisation without an error."""
    bad = int((quality < LEAST_QUALITY).sum())
    if bad:
        worst = int(np.argmin(quality))
        place = nodes[:, tets[:4, worst]].mean(axis=1)
        inverted = int((quality <= 0).sum())
        raise MeshRefused(
            f"{bad} of {len(quality)} elements have a scaled Jacobian below {LEAST_QUALITY} ({inverted}"
            f" of them may be inverted); the worst has {quality[worst]:.3g}, near"
            f" ({place[0]:.4g}, {place[1]:.4g}, {place[2]:.4g}) mm"
        )


def _check_faces(face_area: Floats, tolerance: Floats, solid: NamedSolid) -> None:
    """Every face must be meshed, with its area to the relative `tolerance`; the message names the region."""
    cad = np.array([face.area for face in solid.faces])
    off = np.abs(face_area - cad) / cad
    wrong = np.flatnonzero(off > tolerance)
    if len(wrong):
        i = int(wrong[np.argmax(off[wrong])])
        names = [name for name, faces in solid.regions.items() if i in faces]
        region = f"region {', '.join(names)}" if names else "no named region"
        raise MeshRefused(
            f"face {i} ({region}): area on the mesh {face_area[i]:.8g} mm^2, on the solid {cad[i]:.8g} mm^2"
            f" (off by {off[i]:.2g} of it); {len(wrong)} of {len(cad)} faces are off"
        )


def boundary_facets(tets: Ints) -> Ints:
    """(6, b) boundary triangles of tetrahedra (10, m), outward, in the order of the elements they belong to."""
    local = [(*face, *(_edge_row(face[a], face[b]) for a, b in ((0, 1), (1, 2), (0, 2)))) for face in TET_FACES]
    every = np.concatenate([tets[list(rows)] for rows in local], axis=1)
    count = int(tets[:4].max()) + 1
    low, middle, high = np.sort(every[:3], axis=0)
    key = (low * count + middle) * count + high  # below 2^63 for up to two million corners
    _, first, times = np.unique(key, return_index=True, return_counts=True)
    alone = np.sort(first[times == 1])
    return np.ascontiguousarray(every[:, alone])


def _edge_row(a: int, b: int) -> int:
    return 4 + TET_EDGES.index((min(a, b), max(a, b)))


def _owners(boundary: Ints, triangles: Ints, owner: Ints) -> Ints:
    """Face index of each boundary triangle, from the kernel's triangles on the faces."""
    mine, theirs = np.sort(boundary, axis=0), np.sort(triangles, axis=0)
    order, order_theirs = np.lexsort(mine), np.lexsort(theirs)
    if mine.shape != theirs.shape or not np.array_equal(mine[:, order], theirs[:, order_theirs]):
        raise ValueError("the triangles on the faces are not the boundary of the tetrahedra")
    result = np.empty(boundary.shape[1], dtype=np.int64)
    result[order] = owner[order_theirs]
    return result
