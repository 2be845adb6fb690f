"""Reactions: the force that each support exerts on the part, from the nodal forces K u - f."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem.solid.model import SolidModel
from fem.solid.nodal_forces import turns
from fem.solid.region import surface_region
from fem.solid.shape import Array
from fem.solid.support import rigid_map


@dataclass(frozen=True, slots=True)
class Reactions:
    """nodal (c, n, 3) constraint forces on the part, N; force, moment (c, 3) of each support by name, the moment
    about the area centroid of the support's region (N mm)."""

    nodal: Array
    force: dict[str, Array]
    moment: dict[str, Array]
    centre: dict[str, Array]


def reactions(model: SolidModel, u: Array, mean_forces: Array) -> Reactions:
    """Share the constraint forces among the supports.

    u (c, 3, n); mean_forces (rows, c). Where several supports hold one node or one rigid region, its force is shared
    by the rows that hold it (least squares, so an exact copy of a row gets an equal share).
    """
    constraints, mesh = model.constraints, model.mesh
    c, n = u.shape[0], mesh.nodes.shape[1]
    nodal = np.empty((c, n, 3))
    for some in turns(c):
        motion = np.ascontiguousarray(u[some].transpose(2, 1, 0)).reshape(3 * n, -1)
        np.subtract((model.K @ motion).T, model.forces(some).T, out=nodal[some].reshape(-1, 3 * n))
    centre = {
        s.name: constraints.regions[s.on].centroid
        if s.on in constraints.regions
        else surface_region(mesh, s.on).centroid
        for s in model.part.supports
    }
    force = {name: np.zeros((c, 3)) for name in centre}
    moment = {name: np.zeros((c, 3)) for name in centre}
    own = nodal
    if constraints.rows.shape[0]:
        own = nodal - (constraints.rows.T @ mean_forces).T.reshape(c, n, 3)
    for k, name in enumerate(constraints.row_supports):
        row = constraints.rows[[k]].toarray().reshape(n, 3)
        arms = mesh.nodes.T - centre[name]
        force[name] += np.outer(mean_forces[k], row.sum(axis=0))
        moment[name] += np.outer(mean_forces[k], np.cross(arms, row).sum(axis=0))
    for block in constraints.blocks:
        if not block.rows.size:
            continue
        names = np.array(block.supports)
        if block.centre is None:
            size = np.ones(3)
            general = own[:, block.nodes]  # (c, k, 3)
        else:
            arm = np.linalg.norm(np.ptp(mesh.nodes[:, block.nodes], axis=1))
            size = np.r_[np.ones(3), np.full(3, 1 / arm)]
            motion = rigid_map(mesh.nodes[:, block.nodes], block.centre)
            general = np.einsum("cki,kij->cj", own[:, block.nodes], motion)[:, None]
        share = (general * size) @ np.linalg.pinv((block.rows * size).T).T  # (c, k, rows)
        for name in dict.fromkeys(block.supports):
            mine = names == name
            part = share[:, :, mine] @ block.rows[mine]  # (c, k, 3 or 6)
            total = part[..., :3].sum(axis=1)
            force[name] += total
            if block.centre is None:
                moment[name] += np.cross(mesh.nodes[:, block.nodes].T - centre[name], part).sum(axis=1)
            else:
                moment[name] += part[:, 0, 3:] + np.cross(block.centre - centre[name], total)
    return Reactions(nodal, force, moment, centre)
