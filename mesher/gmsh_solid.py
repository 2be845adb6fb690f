"""Meshing a solid with gmsh. Runs in the child only."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import gmsh
import numpy as np

from mesher.gmsh_session import kernel_version, session
from mesher.matching import match_faces


def mesh_brep(job: dict[str, Any], path: Path) -> tuple[dict[str, Any], dict[str, Any]]:
    """One attempt at the solid in `path`.

    ``job["options"]`` are gmsh options by name; ``job["marks"]`` the face fingerprints (area, centroid, box).
    """
    with session():
        volumes = gmsh.model.occ.importShapes(str(path), highestDimOnly=True, format="brep")
        gmsh.model.occ.synchronize()
        if [dim for dim, _ in volumes] != [3]:
            raise ValueError(f"the file holds {len(volumes)} shapes; one solid is needed")
        faces = match_faces(job["marks"], _face_marks(), job["extent"])
        for name, value in job["options"].items():
            gmsh.option.setNumber(name, value)
        gmsh.model.mesh.generate(3)
        answer = {"version": kernel_version(), "volume": gmsh.model.occ.getMass(3, volumes[0][1])}
        return answer, _arrays(faces)


def _face_marks() -> list[dict[str, Any]]:
    marks = []
    for _, tag in gmsh.model.getEntities(2):
        marks.append({
            "tag": tag,
            "area": gmsh.model.occ.getMass(2, tag),
            "centroid": list(gmsh.model.occ.getCenterOfMass(2, tag)),
            "box": list(gmsh.model.occ.getBoundingBox(2, tag)),
        })
    return marks


def _arrays(faces: list[int]) -> dict[str, Any]:
    """Nodes, tetrahedra, and triangles with the index of their face; all in gmsh's numbering."""
    tags, coords, _ = gmsh.model.mesh.getNodes()
    _, tets = gmsh.model.mesh.getElementsByType(11)
    triangles, owner = [], []
    for index, tag in enumerate(faces):
        _, cells = gmsh.model.mesh.getElementsByType(9, tag)
        triangles.append(cells.astype(np.int64).reshape(-1, 6))
        owner.append(np.full(len(triangles[-1]), index, dtype=np.int64))
    return {
        "tags": tags.astype(np.int64),
        "points": coords.reshape(-1, 3),
        "tets": tets.astype(np.int64).reshape(-1, 10),
        "triangles": np.concatenate(triangles),
        "owner": np.concatenate(owner),
    }
