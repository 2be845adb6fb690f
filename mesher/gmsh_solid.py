"""Meshing a solid with gmsh. Runs in the child only."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import gmsh
import numpy as np

from mesher.estimate import estimated_nodes, node_integrals
from mesher.face_samples import sample_faces
from mesher.gmsh_session import kernel_version, session
from mesher.matching import match_faces
from mesher.size_field import build_field
from mesher.sizes import Sizes

SLIVER, SPOILT = 0.03, 0.05
"""Least scaled Jacobian of straight and of curved elements that is let pass without the slow improvement. The gate
after meshing asks for 0.02."""


class WrongKernel(ValueError):
    """The recipe was made with another version of the mesh kernel."""


class OverBudget(ValueError):
    """The mesh would have too many nodes; `facts` holds ``nodes``, the estimate."""

    def __init__(self, nodes: int) -> None:
        self.facts = {"nodes": nodes}
        super().__init__(f"about {nodes} nodes expected")


def mesh_brep(job: dict[str, Any], path: Path) -> tuple[dict[str, Any], dict[str, Any]]:
    """One attempt at the solid in `path`.

    The job holds ``options`` (gmsh options by name), ``marks`` (the face fingerprints: area, centroid, box),
    ``extent`` (mm), ``sizes``, ``most_nodes``, and ``version`` (the kernel that a recipe asks for, or empty).
    """
    with session():
        version = kernel_version()
        if job["version"] and job["version"] != version:
            raise WrongKernel(f"the recipe is for gmsh {job['version']}, this is gmsh {version}")
        volumes = gmsh.model.occ.importShapes(str(path), highestDimOnly=True, format="brep")
        gmsh.model.occ.synchronize()
        if [dim for dim, _ in volumes] != [3]:
            raise ValueError(f"the file holds {len(volumes)} shapes; one solid is needed")
        faces = match_faces(job["marks"], _face_marks(), job["extent"])
        volume = gmsh.model.occ.getMass(3, volumes[0][1])
        integrals, tolerance = _set_size_field(job, faces, volume, path.parent)
        nodes = estimated_nodes(*integrals)
        if nodes > job["most_nodes"]:
            raise OverBudget(nodes)
        for name, value in job["options"].items():
            gmsh.option.setNumber(name, value)
        _generate(job["extent"])
        answer = {"version": version, "volume": volume, "estimated_nodes": nodes, "integrals": integrals}
        return answer, {**_arrays(faces), "tolerance": np.array(tolerance)}


def _generate(extent: float) -> None:
    """Straight elements, then curved ones; improved where that is needed.

    The kernel's slow improvement takes longer than all the rest and adds a tenth of nodes. It is called only when the
    quick one has left slivers, or elements that curving spoils: those with two faces on one curved face, which it
    splits.
    """
    gmsh.model.mesh.generate(3)
    if len(gmsh.model.mesh.getElementsByType(4)[0]) == 0:
        raise ValueError("the kernel made no tetrahedra")
    improved = _least(4, "minSICN") < SLIVER
    if improved:
        gmsh.model.mesh.optimize("Netgen")
    gmsh.model.mesh.setOrder(2)
    if not improved and _least(11, "minSJ") < SPOILT:
        gmsh.model.mesh.setOrder(1)
        gmsh.model.mesh.optimize("Netgen")
        gmsh.model.mesh.setOrder(2)
    _improve_curved(extent)


def _least(kind: int, measure: str) -> float:
    """The least quality of the elements of a type (4: straight, 11: curved tetrahedra)."""
    tags, _ = gmsh.model.mesh.getElementsByType(kind)
    return float(gmsh.model.mesh.getElementQualities(tags, measure).min())


def _improve_curved(extent: float) -> None:
    """Move nodes where curving has spoiled elements.

    The kernel adds up in an order that follows memory addresses, so that the same job does not give the last digits
    twice. Nodes that it has moved are therefore put on a grid that is far finer than any tolerance and far coarser than
    those digits.
    """
    wanted = gmsh.option.getNumber("Mesh.HighOrderOptimize")
    if not wanted:
        return
    _, before, _ = gmsh.model.mesh.getNodes()
    gmsh.model.mesh.optimize("HighOrderElastic" if wanted == 2 else "HighOrder")
    tags, after, _ = gmsh.model.mesh.getNodes()
    points = after.reshape(-1, 3)
    grain = 2.0 ** round(math.log2(1e-9 * extent))
    for k in np.flatnonzero((points != before.reshape(-1, 3)).any(axis=1)):
        gmsh.model.mesh.setNode(int(tags[k]), (np.round(points[k] / grain) * grain).tolist(), [])


def _face_marks() -> list[dict[str, Any]]:
    return [
        {
            "tag": tag,
            "area": gmsh.model.occ.getMass(2, tag),
            "centroid": list(gmsh.model.occ.getCenterOfMass(2, tag)),
            "box": list(gmsh.model.occ.getBoundingBox(2, tag)),
        }
        for _, tag in gmsh.model.getEntities(2)
    ]


def _set_size_field(
    job: dict[str, Any], faces: list[int], volume: float, folder: Path
) -> tuple[tuple[float, float], list[float]]:
    """Make the background field.

    Returns the integrals for the estimate of the number of nodes, and the tolerance of each face's area.
    """
    sizes = Sizes.from_json(job["sizes"])
    areas = [mark["area"] for mark in job["marks"]]
    samples = sample_faces(faces, areas, sizes)
    fine = [s for s in samples if s.size < sizes.bulk]
    points = np.concatenate([s.points for s in fine]) if fine else np.empty((0, 3))
    wanted = np.concatenate([np.full(len(s.points), s.size) for s in fine]) if fine else np.empty(0)
    box = np.array(gmsh.model.getBoundingBox(-1, -1)).reshape(2, 3)
    grid = build_field(box[0], box[1], sizes.bulk, sizes.slope, points, wanted)
    grid.write(folder / "sizes.bin")
    field = gmsh.model.mesh.field.add("Structured")
    gmsh.model.mesh.field.setString(field, "FileName", str(folder / "sizes.bin"))
    gmsh.model.mesh.field.setNumber(field, "TextFormat", 0)
    gmsh.model.mesh.field.setAsBackgroundMesh(field)
    grows = [s.size < sizes.bulk for s in samples]
    found = [grid.at(s.points) for s in samples]
    return node_integrals(areas, found, volume, grows, sizes.bulk, sizes.slope), [s.tolerance for s in samples]


def _arrays(faces: list[int]) -> dict[str, Any]:
    """Nodes, tetrahedra, and triangles with the index of their face; all in gmsh's numbering."""
    tags, coords, _ = gmsh.model.mesh.getNodes()
    _, tets = gmsh.model.mesh.getElementsByType(11)
    triangles, owner = [], []
    for index, tag in enumerate(faces):
        _, cells = gmsh.model.mesh.getElementsByType(9, tag)
        triangles.append(cells.astype(np.int64).reshape(-1, 6))
        owner.append(np.full(len(triangles[-1]), index, dtype=np.int64))
    if len(tets) == 0:
        raise ValueError("the kernel made no tetrahedra")
    return {
        "tags": tags.astype(np.int64),
        "points": coords.reshape(-1, 3),
        "tets": tets.astype(np.int64).reshape(-1, 10),
        "triangles": np.concatenate(triangles),
        "owner": np.concatenate(owner),
    }
