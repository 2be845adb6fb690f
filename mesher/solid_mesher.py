"""From a named solid to a named mesh: attempts in child processes, gates after each, and the recipe."""

from __future__ import annotations

import hashlib
import json
import threading
from collections.abc import Mapping, Sequence
from typing import Any

import numpy as np

from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from geometry.problem import MeshError
from mesher.assemble import MeshRefused, assemble
from mesher.attempts import CHAIN, Attempt, gmsh_options
from mesher.child import ChildFailure, run_child
from mesher.estimate import estimated_nodes, node_integrals, nodes_within, solver_memory
from mesher.named_mesh import NamedMesh
from mesher.sizes import Sizes, sizes_for

RECIPE_FORMAT = 2


def mesh_solid(
    solid: NamedSolid,
    accuracy: float,
    budget: Budget,
    recipe: Mapping[str, Any] | None = None,
    *,
    chain: Sequence[Attempt] = CHAIN,
    stop: threading.Event | None = None,
) -> NamedMesh:
    """Mesh a solid with curved 10-node tetrahedra whose regions are named.

    Parameters
    ----------
    solid
        What the solid builder made.
    accuracy
        Wanted relative accuracy of the results, 0.001 to 0.2; see `mesher.sizes`.
    budget
        `seconds` limits each attempt; `memory` (MiB) limits the child process and, by way of an estimate
        made before meshing, the number of nodes that the solver will have to carry.
    recipe
        `NamedMesh.recipe` of an earlier mesh: makes exactly that mesh again (`accuracy` is not used).
    chain
        The attempts, in order.
    stop
        Set from another thread, it ends the attempt under way and with it the whole.

    Raises
    ------
    MeshError
        Every attempt failed; the mesh would not fit the budget; a region or the volume is not that of the
        solid; or a recipe is for another solid or kernel, or did not give its mesh again.
    """
    if recipe is not None:
        return _replay(solid, budget, recipe)
    failed: list[dict[str, str]] = []
    logs: list[str] = []
    for attempt in chain:
        sizes = sizes_for(solid, accuracy, attempt.factor)
        if (nodes := _least_nodes(solid, sizes)) > nodes_within(budget.memory):
            raise MeshError(_over_budget(nodes, budget, attempt, failed))
        try:
            return _attempt(solid, attempt, sizes, budget, failed, stop=stop)
        except ChildFailure as failure:
            if failure.ending == "stopped":
                raise MeshError("meshing was stopped on request") from None
            if failure.kind == "OverBudget":
                raise MeshError(_over_budget(failure.facts["nodes"], budget, attempt, failed)) from None
            if failure.kind == "FaceMismatch":
                raise MeshError(f"the faces named by the solid were not found again: {failure}") from failure
            failed.append({"attempt": attempt.name, "ending": failure.ending, "message": str(failure)})
            logs.append(failure.log)
        except MeshRefused as refusal:
            failed.append({"attempt": attempt.name, "ending": "refused", "message": str(refusal)})
    raise MeshError(_all_failed(failed, logs))


def _attempt(
    solid: NamedSolid,
    attempt: Attempt,
    sizes: Sizes,
    budget: Budget,
    failed: Sequence[Mapping[str, str]],
    version: str = "",
    stop: threading.Event | None = None,
) -> NamedMesh:
    """One attempt with its gates; its recipe is complete."""
    options = gmsh_options(attempt)
    job = {
        "task": attempt.fault or "solid",
        "extent": _extent(solid),
        "marks": [{"area": f.area, "centroid": list(f.centroid), "box": list(f.box)} for f in solid.faces],
        "options": options,
        "sizes": sizes.as_json(),
        "most_nodes": nodes_within(budget.memory),
        "version": version,
    }
    result = run_child(job, budget.seconds, budget.memory, {"solid.brep": solid.brep}, stop)
    recipe = {
        "format": RECIPE_FORMAT,
        "kernel": result.answer["version"],
        "attempt": attempt.as_json(),
        "sizes": sizes.as_json(),
        "options": options,
        "estimated_nodes": result.answer["estimated_nodes"],
        "failed": [dict(f) for f in failed],
        "warnings": _warnings(result.log),
        "solid": hashlib.sha256(solid.brep).hexdigest(),
    }
    mesh = assemble(result, solid, recipe)
    recipe["nodes"] = mesh.nodes.shape[1]
    recipe["mesh"] = mesh_digest(mesh)
    return mesh


def _least_nodes(solid: NamedSolid, sizes: Sizes) -> int:
    """Estimate without curvature and with each face's size growing at once, so never more than the kernel's own, which
    for a sheet of millions of elements takes minutes to make."""
    areas = [face.area for face in solid.faces]
    wanted = [np.array([min(sizes.faces.get(i, sizes.bulk), sizes.bulk)]) for i in range(len(areas))]
    grows = [float(h[0]) < sizes.bulk for h in wanted]
    return estimated_nodes(*node_integrals(areas, wanted, solid.volume, grows, sizes.bulk, sizes.slope))


def _replay(solid: NamedSolid, budget: Budget, recipe: Mapping[str, Any]) -> NamedMesh:
    try:
        if recipe["format"] != RECIPE_FORMAT:
            raise MeshError(f"mesh recipe: format {recipe['format']!r}; this version reads format {RECIPE_FORMAT}")
        attempt, sizes = Attempt.from_json(recipe["attempt"]), Sizes.from_json(recipe["sizes"])
        version, digest, solid_digest = str(recipe["kernel"]), str(recipe["mesh"]), str(recipe["solid"])
        failed = [dict(f) for f in recipe["failed"]]
    except (KeyError, TypeError, ValueError, AttributeError) as error:
        raise MeshError(
            f"mesh recipe: not readable ({type(error).__name__}: {error}); mesh without a recipe"
        ) from error
    if hashlib.sha256(solid.brep).hexdigest() != solid_digest:
        raise MeshError("mesh recipe: it belongs to another solid; mesh without a recipe")
    try:
        mesh = _attempt(solid, attempt, sizes, budget, failed, version)
    except (ChildFailure, MeshRefused) as failure:
        raise MeshError(f"mesh recipe: replaying {attempt.name!r} failed: {failure}") from failure
    if mesh.recipe["mesh"] != digest:
        raise MeshError(
            f"mesh recipe: replaying {attempt.name!r} gave another mesh ({mesh.nodes.shape[1]} nodes, the recipe's"
            f" had {recipe.get('nodes')}); mesh without a recipe"
        )
    return mesh


def mesh_digest(mesh: NamedMesh) -> str:
    """SHA-256 over nodes, tetrahedra and the face of each boundary triangle."""
    digest = hashlib.sha256()
    for array in (mesh.nodes, mesh.tets, mesh.boundary, mesh.face_index):
        digest.update(json.dumps([str(array.dtype), list(array.shape)]).encode())
        digest.update(np.ascontiguousarray(array).tobytes())
    return digest.hexdigest()


def _extent(solid: NamedSolid) -> float:
    box = np.array([face.box for face in solid.faces])
    return float((box[:, 3:].max(axis=0) - box[:, :3].min(axis=0)).max())


def _warnings(log: str) -> list[str]:
    """The kernel's warnings and errors; its other lines hold times, which differ from run to run."""
    lines = (line.strip() for line in log.splitlines())
    return [line for line in lines if line.startswith(("Warning", "Error"))][:20]


def _over_budget(nodes: int, budget: Budget, attempt: Attempt, failed: Sequence[Mapping[str, str]]) -> str:
    after = f" (after {len(failed)} failed attempts, with {attempt.name!r})" if failed else ""
    return (
        f"the mesh would have about {nodes} nodes ({3 * nodes} unknowns){after}, and solving it would take about"
        f" {solver_memory(nodes):.0f} MiB; the budget is {budget.memory} MiB, enough for about"
        f" {nodes_within(budget.memory)} nodes. Ask for a coarser accuracy or give more memory."
    )


def _all_failed(failed: Sequence[Mapping[str, str]], logs: Sequence[str]) -> str:
    lines = [f"  {i}. {f['attempt']}: {f['ending']}: {f['message']}" for i, f in enumerate(failed, 1)]
    tail = "\n".join(logs[-1].strip().splitlines()[-8:]) if logs else ""
    return (
        f"none of the {len(failed)} meshing attempts succeeded. Look for very short edges or slivers of faces in the"
        " solid, or allow more seconds for each attempt.\n"
        + "\n".join(lines)
        + (f"\nLast log:\n{tail}" if tail else "")
    )
