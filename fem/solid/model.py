"""The assembled solid model: element groups, stiffness, load vectors of every load and case."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
import scipy.sparse as sp
from numpy.typing import NDArray

from fem.solid.block_matrix import BlockMatrix
from fem.solid.kernels.mesh_graph import pieces
from fem.solid.load import SolidLoad, solid_loads, surface_vector
from fem.solid.mass import node_integrals, node_volumes
from fem.solid.nodal_forces import NodalForces, rows_of
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

    load_vectors
        (loads, 3 n) nodal forces of each load with factor 1, N.
    mechanical, thermal
        Nodal forces of the cases: loads, and int B^T D alpha dT dV.
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
    load_vectors: sp.csr_matrix
    factors: Array
    mechanical: NodalForces
    thermal: NodalForces
    change: Array
    mass: float
    centre_of_mass: Array
    threads: int = 1

    def forces(self, cases: slice = slice(None)) -> Array:
        """(3 n, k) all nodal forces of some cases, N."""
        out = self.mechanical.columns(cases)
        if self.change[cases].any():
            out += self.thermal.columns(cases)
        return out


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


def _load_vectors(
    mesh: NamedMesh, loads: dict[str, SolidLoad], masses: Array
) -> Iterator[tuple[NDArray[np.int64], Array]]:
    """Nodes that each load touches and its forces there; masses (n, 1) of the nodes, t."""
    out = np.zeros((mesh.nodes.shape[1], 3))
    for load in loads.values():
        heavy = bool(load.force_per_mass.any())
        if heavy:
            np.multiply(masses, load.force_per_mass, out=out)
        for piece in load.pieces:
            surface_vector(mesh, piece, out)
        facets = [np.zeros(0, dtype=np.int64), *(piece.facets.ravel() for piece in load.pieces)]
        nodes = np.arange(out.shape[0]) if heavy else np.unique(np.concatenate(facets))
        yield nodes, out[nodes]
        out[nodes] = 0.0


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
    vectors = rows_of(_load_vectors(mesh, loads, material.density * integrals[:, :1]), mesh.nodes.shape[1])
    factors = np.array([[case.factors.get(name, 0.0) for name in loads] for case in part.cases]).reshape(
        len(part.cases), len(loads)
    )
    change = factors @ np.array([load.change for load in loads.values()]) if loads else np.zeros(len(part.cases))
    thermal = NodalForces(sp.csr_matrix((1, vectors.shape[1])), change[:, None])
    if change.any():
        lam, mu = lame(material.E, material.nu)
        unit = (3 * lam + 2 * mu) * material.expansion * integrals[:, 1:]
        thermal = NodalForces(sp.csr_matrix(unit.reshape(1, -1)), change[:, None])
    return SolidModel(
        part,
        mesh,
        groups,
        K,
        constraints,
        loads,
        vectors,
        factors,
        NodalForces(vectors, factors),
        thermal,
        change,
        material.density * volume,
        first / volume,
        threads,
    )
