"""The assembled solid model: element groups, stiffness, load vectors of every load and case."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.mesh_graph import pieces
from fem.solid.load import SolidLoad, solid_loads, surface_vector
from fem.solid.mass import node_integrals, node_volumes
from fem.solid.shape import Array
from fem.solid.stiffness import ElementGroup, KernelMesh, element_groups, lame, stiffness_matrix
from fem.solid.support import Constraints, build_constraints
from geometry.part import Part
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

LEAST_QUALITY = 1e-3
"""An element below this is refused: with one sliver a factor once gave a deflection 11 % off without an error."""


@dataclass(frozen=True, slots=True)
class SolidModel:
    """Everything that belongs to the part and its mesh before the solution.

    mechanical, thermal
        (c, n, 3) nodal forces of the cases, N: loads, and int B^T D alpha dT dV.
    factors
        (c, loads) factor of each load in each case, in the order of `loads`.
    change
        (c,) temperature change of each case, K.
    threads
        For the work on whole meshes; no result depends on it.
    """

    part: Part
    mesh: NamedMesh
    groups: list[ElementGroup]
    K: BlockMatrix
    constraints: Constraints
    loads: dict[str, SolidLoad]
    load_vectors: Array
    factors: Array
    mechanical: Array
    thermal: Array
    change: Array
    mass: float
    centre_of_mass: Array
    threads: int = 1


def check_mesh(mesh: NamedMesh) -> None:
    """Refuse slivers and detached pieces before anything is solved."""
    least = float(mesh.quality.min())
    if least < LEAST_QUALITY:
        bad = int(mesh.quality.argmin())
        where = mesh.nodes[:, mesh.tets[:4, bad]].mean(axis=1)
        raise SolveError(
            f"The mesh has an element of quality {least:.2g} (least allowed {LEAST_QUALITY:g}) near "
            f"{np.round(where, 3).tolist()} mm. Mesh the part again with another recipe."
        )
    n = mesh.nodes.shape[1]
    used = np.zeros(n, dtype=bool)
    used[mesh.tets] = True
    if not used.all():
        idle = np.flatnonzero(~used)
        raise SolveError(
            f"The mesh has {idle.size} unused nodes, the first one at "
            f"{np.round(mesh.nodes[:, idle[0]], 3).tolist()} mm. Mesh the part again."
        )
    piece = pieces(mesh.tets[:4], n)
    if (piece[mesh.tets[0]] != piece[mesh.tets[0, 0]]).any():
        of_node = np.empty(n, dtype=np.int64)
        of_node[mesh.tets] = piece[mesh.tets[0]]
        sizes = np.sort(np.unique(of_node, return_counts=True)[1])[::-1]
        raise SolveError(
            f"The mesh is in {sizes.size} pieces that do not touch (nodes in each: "
            f"{', '.join(map(str, sizes[:5]))}). The members do not meet."
        )


def mass_vector(mesh: NamedMesh, groups: list[ElementGroup]) -> tuple[Array, float, Array]:
    """(n,) integral of each shape function (mm^3), the volume and the first moment (3,)."""
    shares = node_integrals(groups)[:, 0]
    return (shares, *node_volumes(shares, mesh.nodes))


def thermal_vector(mesh: NamedMesh, groups: list[ElementGroup], E: float, nu: float) -> Array:
    """(n, 3) nodal forces of a unit free expansion."""
    lam, mu = lame(E, nu)
    return (3 * lam + 2 * mu) * node_integrals(groups)[:, 1:]


def build_model(part: Part, mesh: NamedMesh, threads: int = 1) -> SolidModel:
    """Assemble stiffness, constraints and load vectors."""
    check_mesh(mesh)
    material = part.material
    shared = KernelMesh(mesh.nodes, mesh.tets, threads)
    groups = element_groups(mesh.nodes, mesh.tets, threads, shared)
    K = stiffness_matrix(mesh.nodes, mesh.tets, groups, material.E, material.nu, threads, shared)
    constraints = build_constraints(part, mesh)
    loads = solid_loads(part, mesh)
    integrals = node_integrals(groups, threads, shared)
    volume, first = node_volumes(integrals[:, 0], mesh.nodes)
    vectors = np.zeros((len(loads), mesh.nodes.shape[1], 3))
    for k, load in enumerate(loads.values()):
        if load.force_per_mass.any():
            np.multiply(material.density * integrals[:, :1], load.force_per_mass, out=vectors[k])
        for piece in load.pieces:
            surface_vector(mesh, piece, vectors[k])
    factors = np.array([[case.factors.get(name, 0.0) for name in loads] for case in part.cases]).reshape(
        len(part.cases), len(loads)
    )
    change = factors @ np.array([load.change for load in loads.values()]) if loads else np.zeros(len(part.cases))
    thermal = np.zeros((len(part.cases), *vectors.shape[1:]))
    if change.any():
        lam, mu = lame(material.E, material.nu)
        unit = (3 * lam + 2 * mu) * material.expansion * integrals[:, 1:]
        thermal = change[:, None, None] * unit
    return SolidModel(
        part,
        mesh,
        groups,
        K,
        constraints,
        loads,
        vectors,
        factors,
        np.tensordot(factors, vectors, axes=1),
        thermal,
        change,
        material.density * volume,
        first / volume,
        threads,
    )
