"""From a named solid to a named mesh: attempts in child processes, gates, then names."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from geometry.problem import MeshError
from mesher.assemble import assemble
from mesher.child import ChildFailure, run_child
from mesher.named_mesh import NamedMesh


def mesh_solid(
    solid: NamedSolid, accuracy: float, budget: Budget, recipe: Mapping[str, Any] | None = None
) -> NamedMesh:
    """Mesh a solid with curved 10-node tetrahedra."""
    box = [f.box for f in solid.faces]
    extent = max(max(b[i + 3] for b in box) - min(b[i] for b in box) for i in range(3))
    size = 0.5 * (solid.least_wall or extent / 10)
    job = {
        "task": "solid",
        "extent": extent,
        "marks": [{"area": f.area, "centroid": list(f.centroid), "box": list(f.box)} for f in solid.faces],
        "options": {
            "Mesh.ElementOrder": 2, "Mesh.SecondOrderLinear": 0, "Mesh.Algorithm": 6, "Mesh.Algorithm3D": 1,
            "Mesh.MeshSizeMax": size, "Mesh.MeshSizeFromCurvature": 12,
        },
    }
    try:
        result = run_child(job, budget.seconds, budget.memory, {"solid.brep": solid.brep})
    except ChildFailure as failure:
        raise MeshError(f"{failure}\n{failure.log[-1000:]}") from failure
    return assemble(result, solid, {"options": job["options"], "version": result.answer["version"]})
