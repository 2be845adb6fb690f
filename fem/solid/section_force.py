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
from fem.solid.cut import Cut, Cutter, View
from fem.solid.frame import Frame
from fem.solid.kernels.interface import between, facet_owners, interface_forces, node_reach, rules
from fem.solid.model import SolidModel
from fem.solid.piece import FORCE_ORDER, FacetPoints, SurfacePiece, clipped_facets, facet_quadrature, piece_forces
from fem.solid.shape import Array
from fem.solid.stiffness import CURVED_ORDER, STRAIGHT_ORDER, lame

Bool = NDArray[np.bool_]
Int = NDArray[np.int64]
BODY_ORDER = 2


@dataclass(frozen=True, slots=True)
class LoadedFacets:
    """The facets of every surface load that acts in some case, one after the other.

    facets (6, k); owner (k,) element; load, piece (k,) index into the loads and into `pieces`; column (k,) of the
    piece's facets; forces (6, 3, k) on their nodes with factor 1, N.
    """

    pieces: tuple[SurfacePiece, ...]
    facets: Int
    owner: Int
    load: Int
    piece: Int
    column: Int
    forces: Array


def owners_of(cutter: Cutter, facets: Int) -> Int:
    """(k,) element of each boundary facet (6, k)."""
    n = cutter.points.shape[0]
    a, b, c = np.sort(facets[:3], axis=0)
    keys = a * n + b
    order = np.argsort(keys)
    marked = np.zeros(n, dtype=np.bool_)
    marked[facets[:3]] = True
    found = np.full(order.size, -1)
    facet_owners(cutter.tets, marked, keys[order], c[order], found, n)
    out = np.empty(order.size, dtype=np.int64)
    out[order] = found
    return out


def loaded_facets(model: SolidModel, cutter: Cutter) -> LoadedFacets:
    """Collect the facets of the surface loads and their nodal forces."""
    pieces: list[SurfacePiece] = []
    loads: list[int] = []
    for k, load in enumerate(model.loads.values()):
        if model.factors[:, k].any():
            pieces += load.pieces
            loads += [k] * len(load.pieces)
    sizes = [piece.facets.shape[1] for piece in pieces]
    facets = np.concatenate([np.zeros((6, 0), np.int64), *(piece.facets for piece in pieces)], axis=1)
    forces = [np.zeros((6, 3, 0)), *(piece_forces(model.mesh.nodes, piece) for piece in pieces)]
    return LoadedFacets(
        tuple(pieces),
        facets,
        owners_of(cutter, facets),
        np.repeat(np.array(loads, dtype=np.int64), sizes),
        np.repeat(np.arange(len(sizes)), sizes),
        np.concatenate([np.zeros(0, np.int64), *map(np.arange, sizes)]),
        np.concatenate(forces, axis=2),
    )


class SectionForces:
    """Section forces of all cases at any station of a solved model."""

    def __init__(self, model: SolidModel, cutter: Cutter, u: Array, reaction: Array) -> None:
        """u (c, 3, n); reaction (c, n, 3) constraint forces on the nodes."""
        self.model, self.cutter, self.u, self.reaction = model, cutter, u, reaction
        self.surface = loaded_facets(model, cutter)
        material, loads = model.part.material, list(model.loads.values())
        per_mass = np.array([load.force_per_mass for load in loads]).reshape(-1, 3)
        self.body = material.density * model.factors @ per_mass  # (c, 3), N / mm^3
        self.lam, self.mu = lame(material.E, material.nu)
        self.free = (3 * self.lam + 2 * self.mu) * material.expansion * model.change

    def reach(self, view: View, inside: Bool) -> tuple[Array, Array]:
        """(n,) least and greatest centroid along the member of the elements `inside` (m,) at each node."""
        n = self.cutter.points.shape[0]
        lowest, highest = np.full(n, np.inf), np.full(n, -np.inf)
        node_reach(self.cutter.tets, view.middle, inside, lowest, highest)
        return lowest, highest

    def at(self, frame: Frame, at: float, inside: Bool, reach: tuple[Array, Array] | None = None) -> Array:
        """(c, 6) N, Vy, Vz, T, My, Mz at a station: what the far part exerts on the near part, about the member's line.

        inside (m,): elements of this member; reach: theirs, where it is known already.
        """
        cutter, view = self.cutter, self.cutter.view(frame)
        x, tolerance, point = view.local[:, 0], 1e-9 * frame.length, frame.point(at)
        level = at - tolerance
        lowest, highest = reach or self.reach(view, inside)
        beyond, before_too, after_too = x >= level, lowest < level, highest >= level
        interface = before_too & after_too
        start, end = not before_too.any(), not after_too.any()
        if start or end:  # an end of the part: the face itself is the interface
            face = x <= at + tolerance if start else beyond
            interface = face & (before_too | after_too)
        # a reaction at an interface node belongs to the side of the plane on which the node lies
        code = np.zeros(x.size, dtype=np.int8)
        code[interface] = 2
        if not start:
            code[interface & (beyond | end)] = 1
        total = np.zeros((self.u.shape[0], 6))
        touched = x[interface]
        if touched.size:
            along = np.array([touched.min(), touched.max()])
            interface_forces(
                cutter.tets, cutter.curved, cutter.points, view.low, view.high, view.middle, level, code, along, self.u,
                self.lam, self.mu, self.free, self.body, *rules(STRAIGHT_ORDER, CURVED_ORDER), point, total,
            )  # fmt: skip
        near = view.middle < level
        total -= self._applied(code, near, point)
        total += self._moved(frame, view, at, near, inside, start, end, point)
        for chosen, sign in ((before_too & beyond, 1.0), (after_too & ~beyond, -1.0)):
            nodes = np.flatnonzero(chosen & ~interface)
            if nodes.size:
                r = self.reaction[:, nodes]
                total[:, :3] += sign * r.sum(axis=1)
                total[:, 3:] += sign * np.cross(cutter.points[nodes] - point, r).sum(axis=1)
        return np.hstack([total[:, :3] @ frame.axes.T, total[:, 3:] @ frame.axes.T])

    def _applied(self, code: NDArray[np.int8], near: Bool, point: Array) -> Array:
        """(c, 6) force and moment about `point` of the surface loads' shares at the interface, signed as its nodes."""
        s = self.surface
        side = near[s.owner]
        picked = code[s.facets] == np.where(side, 1, 2)
        here = np.flatnonzero(picked.any(axis=0))
        f = s.forces[:, :, here] * (picked[:, here] * np.where(side[here], 1.0, -1.0))[:, None, :]
        arms = self.model.mesh.nodes[:, s.facets[:, here]].transpose(1, 0, 2) - point[:, None]
        both = np.concatenate([f.sum(axis=0), np.cross(arms, f, axis=1).sum(axis=0)])  # (6, k)
        return self._cases(s.load[here], both)

    def _cases(self, load: Int, values: Array) -> Array:
        """(c, 6) sum of values (6, k) of the loads (k,), with the factors of the cases."""
        count = self.model.factors.shape[1]
        sums = np.array([np.bincount(load, weights=row, minlength=count) for row in values])
        return np.asarray(self.model.factors @ sums.T)

    def _moved(
        self, frame: Frame, view: View, at: float, near: Bool, inside: Bool, start: bool, end: bool, point: Array
    ) -> Array:
        """(c, 6) force and moment about `point` of the loads that act beyond the plane on the near side's elements,
        less those that act before it on the far side's; facets in the plane count at an end of the part."""
        out, tolerance = np.zeros((self.u.shape[0], 6)), 1e-9 * frame.length
        if self.body.any():
            cutter, volumes = self.cutter, np.zeros((2, 4))
            L, w, _, _ = rules(BODY_ORDER, BODY_ORDER)
            x = np.ascontiguousarray(view.local[:, 0])
            between(
                cutter.tets, cutter.curved, inside, cutter.points, view.low, view.high, view.middle, at - tolerance,
                x, at, tolerance, L, w, volumes,
            )  # fmt: skip
            volume, *first = volumes[0] - volumes[1]
            out[:, :3] += self.body * volume
            out[:, 3:] += np.cross(np.array(first) - volume * point, self.body)
        s = self.surface
        d = view.local[s.facets, 0] - at
        d[np.abs(d) < tolerance] = 0.0
        flat = (d[:3] == 0).all(axis=0)
        own, side = inside[s.owner], near[s.owner]
        chosen = (
            (own & side & ((d[:3] > 0).any(axis=0) | (flat & end)), d, 1.0),
            (own & ~side & ((d[:3] < 0).any(axis=0) | (flat & start)), -d, -1.0),
        )
        for mask, distance, sign in chosen:
            here = np.flatnonzero(mask)
            for p in np.unique(s.piece[here]):
                mine = here[s.piece[here] == p]
                piece = s.pieces[p]
                q = _beyond(self.model.mesh.nodes, piece, s.column[mine], distance[:, mine])
                t = piece.traction(q.points, q.normals) * q.areas * sign
                both = np.concatenate([t.sum(axis=1), np.cross(q.points - point[:, None], t, axis=0).sum(axis=1)])
                out += np.outer(self.model.factors[:, s.load[mine[0]]], both)
        return out


def _beyond(nodes: Array, piece: SurfacePiece, here: Int, d: Array) -> FacetPoints:
    """Quadrature on what of the piece's facets `here` lies where the distances d (6, k) of their nodes are >= 0."""
    facets = piece.facets[:, here]
    if piece.window is not None:
        return clipped_facets(nodes, facets, (*piece.window.distances(nodes[:, facets]), d))
    owner, bary, weights = clip_beyond(d[None], FORCE_ORDER)
    return facet_quadrature(nodes, facets, owner, bary, weights)


def raw_section_force(model: SolidModel, cut: Cut, u: Array, frame: Frame) -> Array:
    """(c, 6) N, Vy, Vz, T, My, Mz of the elements' own stress, integrated over a cut; u (c, 3, n)."""
    material = model.part.material
    lam, mu = lame(material.E, material.nu)
    local = np.matmul(frame.axes, u[:, :, cut.nodes])  # (c, 3, k)
    H = (local @ cut.slopes.reshape(-1, 9)).reshape(-1, 3, 3, 3)  # int {1, r_y, r_z} du_i/dx_j dA: (c, i, moment, j)
    free = (3 * lam + 2 * mu) * material.expansion * model.change
    normal = lam * (H[:, 0, :, 0] + H[:, 1, :, 1] + H[:, 2, :, 2]) + 2 * mu * H[:, 0, :, 0]
    normal[:, 0] -= free * cut.area  # the moments about the centroid of an even stress are zero
    across_y, across_z = (mu * (H[:, 0, :, i] + H[:, i, :, 0]) for i in (1, 2))
    N, Vy, Vz = normal[:, 0], across_y[:, 0], across_z[:, 0]
    y, z = cut.centroid[1:]
    T = across_z[:, 1] + y * Vz - across_y[:, 2] - z * Vy
    return np.stack([N, Vy, Vz, T, normal[:, 2] + z * N, -normal[:, 1] - y * N], axis=1)
