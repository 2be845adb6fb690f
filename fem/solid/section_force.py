"""Section forces from the elements' nodal forces: exact equilibrium at any station, on any mesh.

The elements are told apart by their centroids, which leaves a ragged interface near the station. The nodal forces
int B^T sigma dV of the elements on one side, summed over the interface's nodes and less that side's own loads there,
are exactly what the other side exerts. What the loads between the interface and the plane put in is then
moved to the side of the plane on which it acts.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.solid.clip import clip_beyond
from fem.solid.frame import Frame
from fem.solid.model import SolidModel
from fem.solid.piece import FORCE_ORDER, FacetPoints, SurfacePiece, clipped_facets, facet_quadrature, piece_forces
from fem.solid.shape import (
    Array,
    inverse,
    tet_gradients,
    tet_quadrature,
    tet_values,
)
from fem.solid.stiffness import element_forces, stresses
from mesher.named_mesh import NamedMesh

Bool = NDArray[np.bool_]
BODY_ORDER = 2


@dataclass(frozen=True, slots=True)
class ElementLoads:
    """Nodal forces of every element of each case: `internal` (c, m, 10, 3) that hold it; `applied` (c, m, 10, 3) its
    share of the loads; pieces with the owner element of each facet."""

    internal: Array
    applied: Array
    owners: tuple[tuple[int, int, NDArray[np.int64]], ...]
    """(load index, piece index, owner element of each facet)"""
    body: Array
    """(c, 3) force for a volume, N / mm^3."""
    volumes: Array
    """(4, m) volume and first moment of each element, mm^3 and mm^4; empty without a force for a volume."""


def facet_owners(tets: NDArray[np.int64], facets: NDArray[np.int64], node_count: int) -> NDArray[np.int64]:
    """(k,) element of each boundary facet (6, k)."""

    def keys(corners: NDArray[np.int64]) -> NDArray[np.int64]:
        a, b, c = np.sort(corners, axis=0).astype(object if node_count > 2_000_000 else np.int64)
        return np.asarray((a * node_count + b) * node_count + c)

    every = np.concatenate([keys(tets[list(f)]) for f in ((1, 2, 3), (0, 2, 3), (0, 1, 3), (0, 1, 2))])
    order = np.argsort(every)
    found = order[np.searchsorted(every[order], keys(facets[:3]))]
    return np.asarray(found % tets.shape[1])


def element_loads(model: SolidModel, u: Array) -> ElementLoads:
    """Forces of each element; u (c, 3, n)."""
    mesh, material = model.mesh, model.part.material
    count, m = u.shape[0], mesh.tets.shape[1]
    expansion = material.expansion * model.change
    internal, applied = np.zeros((count, m, 10, 3)), np.zeros((count, m, 10, 3))
    loads = list(model.loads.values())
    body = material.density * model.factors @ np.array([load.force_per_mass for load in loads]).reshape(-1, 3)
    for group in model.groups:
        ue = u[:, :, mesh.tets[:, group.elements]].transpose(0, 3, 2, 1)
        s = stresses(group.gradients, ue, material.E, material.nu, expansion)
        internal[:, group.elements] = element_forces(group.gradients, group.weights, s)
        shares = group.weights @ tet_values(group.points).T  # (m', 10)
        applied[:, group.elements] = body[:, None, None, :] * shares[None, :, :, None]
    owners = []
    for k, load in enumerate(loads):
        for p, piece in enumerate(load.pieces):
            owner = facet_owners(mesh.tets, piece.facets, mesh.nodes.shape[1])
            owners.append((k, p, owner))
            forces = piece_forces(mesh.nodes, piece).transpose(2, 0, 1)  # (k, 6, 3)
            local = (mesh.tets[:, owner][None] == piece.facets[:, None]).argmax(axis=1)  # (6, k)
            for a in range(6):
                share = model.factors[:, k, None, None] * forces[None, :, a]
                for c in range(share.shape[0]):
                    np.add.at(applied[c], (owner, local[a]), share[c])
    volumes = np.zeros((4, 0))
    if body.any():
        L, w = tet_quadrature(BODY_ORDER)
        every = np.arange(m)
        parts = [_volume_points(mesh, every, np.broadcast_to(L[:, [q]], (4, m)), w[q]) for q in range(w.size)]
        volumes = np.sum([np.vstack([dV, x * dV]) for x, dV in parts], axis=0)
    return ElementLoads(internal, applied, tuple(owners), body, volumes)


def _volume_points(
    mesh: NamedMesh, elements: NDArray[np.int64], bary: Array, weights: Array | float
) -> tuple[Array, Array]:
    """Positions (3, p) and volumes (p,) of quadrature points (4, p) of elements (p,)."""
    corners = mesh.nodes[:, mesh.tets[:, elements]]
    x = np.einsum("iap,ap->ip", corners, tet_values(bary))
    J = np.matmul(corners.transpose(2, 0, 1), tet_gradients(bary).transpose(2, 0, 1))
    return x, weights * inverse(J)[1]


def _clipped_loads(
    model: SolidModel,
    loads: ElementLoads,
    local: Array,
    at: float,
    side: Bool,
    sign: float,
    frame: Frame,
    on_plane: bool,
) -> tuple[Array, Array]:
    """(c, 3) force and moment about the station's point of the loads on elements of `side` (m,) that act where
    sign * (x - at) >= 0; facets in the plane count when `on_plane`."""
    mesh, c = model.mesh, model.factors.shape[0]
    force, moment, point = np.zeros((c, 3)), np.zeros((c, 3)), frame.point(at)
    d = sign * (local[0] - at)
    d[np.abs(d) < 1e-9 * frame.length] = 0.0
    if loads.volumes.size:
        corners = d[mesh.tets[:4]]
        whole = side & (corners >= 0).all(axis=0)
        volume, *first = loads.volumes[:, whole].sum(axis=1)
        here = np.flatnonzero(side & ~whole & (corners > 0).any(axis=0))
        owner, bary, weights = clip_beyond(corners[:, here].T, BODY_ORDER)
        x, dV = _volume_points(mesh, here[owner], bary, weights)
        volume += dV.sum()
        force += loads.body * volume
        moment += np.cross(first + (x * dV).sum(axis=1) - volume * point, loads.body)
    pieces = [load.pieces for load in model.loads.values()]
    for k, p, owners in loads.owners:
        if not model.factors[:, k].any():
            continue
        piece = pieces[k][p]
        df = d[piece.facets[:3]]
        chosen = side[owners] & ((df > 0).any(axis=0) | (on_plane & (df == 0).all(axis=0)))
        here = np.flatnonzero(chosen)
        if not here.size:
            continue
        at_points = _beyond(mesh.nodes, piece, here, d[piece.facets[:, here]])
        t = piece.traction(at_points.points, at_points.normals) * at_points.areas
        force += np.outer(model.factors[:, k], t.sum(axis=1))
        moment += np.outer(model.factors[:, k], np.cross(at_points.points - point[:, None], t, axis=0).sum(axis=1))
    return force, moment


def _beyond(nodes: Array, piece: SurfacePiece, here: NDArray[np.int64], d: Array) -> FacetPoints:
    """Quadrature on what of the piece's facets `here` lies where the distances d (6, k) of their nodes are >= 0."""
    facets = piece.facets[:, here]
    if piece.window is not None:
        return clipped_facets(nodes, facets, (*piece.window.distances(nodes[:, facets]), d))
    owner, bary, weights = clip_beyond(d[:3].T, FORCE_ORDER)
    return facet_quadrature(nodes, facets, owner, bary, weights)


def section_force(
    model: SolidModel, loads: ElementLoads, reaction: Array, frame: Frame, at: float, inside: Bool
) -> Array:
    """(c, 6) N, Vy, Vz, T, My, Mz at a station: what the far part exerts on the near part, about the member's line.

    reaction (c, n, 3) nodal constraint forces; `inside` (m,) elements of this member.
    """
    mesh = model.mesh
    tets, n = mesh.tets, mesh.nodes.shape[1]
    local = frame.local(mesh.nodes)
    tolerance = 1e-9 * frame.length
    beyond = local[0] >= at - tolerance
    near = local[0][tets[:4]].mean(axis=0) < at - tolerance
    touched = np.zeros((2, n), dtype=bool)
    touched[0, tets[:, near & inside]] = True
    touched[1, tets[:, ~near & inside]] = True
    interface = touched.all(axis=0)
    start, end = not touched[0].any(), not touched[1].any()
    if start or end:  # an end of the part: the face itself is the interface
        face = local[0] <= at + tolerance if start else local[0] >= at - tolerance
        interface = face & touched.any(axis=0)
    # a reaction at an interface node belongs to the side of the plane on which the node lies
    by_near: Bool = interface & (beyond | end) & np.full(n, not start)
    by_far: Bool = interface & ~by_near
    force, moment = np.zeros((reaction.shape[0], 3)), np.zeros((reaction.shape[0], 3))
    point = frame.point(at)
    for side, chosen, sign in ((near, by_near, 1.0), (~near, by_far, -1.0)):
        mine = np.flatnonzero(side & chosen[tets].any(axis=0))
        pick = chosen[tets[:, mine]].T
        f = sign * (loads.internal[:, mine] - loads.applied[:, mine]) * pick[None, :, :, None]
        arms = mesh.nodes[:, tets[:, mine]].transpose(2, 1, 0) - point
        force += f.sum(axis=(1, 2))
        moment += np.cross(arms[None], f).sum(axis=(1, 2))
    extra = [
        (_clipped_loads(model, loads, local, at, near & inside, 1.0, frame, end), 1.0),
        (_clipped_loads(model, loads, local, at, ~near & inside, -1.0, frame, start), -1.0),
    ]
    for (f, m), sign in extra:
        force += sign * f
        moment += sign * m
    free = ~interface
    for chosen, sign in ((free & touched[0] & beyond, 1.0), (free & touched[1] & ~beyond, -1.0)):
        if chosen.any():
            r = reaction[:, chosen]
            force += sign * r.sum(axis=1)
            moment += sign * np.cross(mesh.nodes[:, chosen].T - point, r).sum(axis=1)
    return np.hstack([force @ frame.axes.T, moment @ frame.axes.T])


def raw_section_force(frame: Frame, weights: Array, points: Array, stress: Array) -> Array:
    """(c, 6) N, Vy, Vz, T, My, Mz from raw stress (c, 6, p) at the quadrature points (3, p) of a cut."""
    tensor = stress[:, np.array([[0, 3, 5], [3, 1, 4], [5, 4, 2]])]  # (c, 3, 3, p)
    traction = np.einsum("ki,cijp,j->ckp", frame.axes, tensor, frame.axes[0], optimize=True) * weights
    y, z = points[1], points[2]
    return np.stack(
        [
            traction[:, 0].sum(axis=1),
            traction[:, 1].sum(axis=1),
            traction[:, 2].sum(axis=1),
            (y * traction[:, 2] - z * traction[:, 1]).sum(axis=1),
            (z * traction[:, 0]).sum(axis=1),
            -(y * traction[:, 0]).sum(axis=1),
        ],
        axis=1,
    )
