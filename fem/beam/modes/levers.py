"""Where along and across the member forces act: what they do when sections turn by more than a little.

A section that turns by theta moves a point p (from the line) by theta x p + theta x (theta x p) / 2. On the second part
the dead forces t of a load do the work theta^T (sym S - tr S 1) theta / 2 with S = sum t p^T, its lever. A force above
the shear centre pushes a twisted section further over; this is where the height of a load comes in.

A moment on a region is taken as the traction that makes it (linear over the region's area), whatever the coupling. A
force at a remote point turns with its lever.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from fem.beam.actions import Actions
from fem.beam.equations import Row
from fem.beam.modes.mass import remote_arm
from fem.beam.regions import CutFaces, EndFace, Face, Region, Strip, linear_traction
from geometry.part import (
    BearingLoad,
    BodyLoad,
    LineLoad,
    Load,
    Pressure,
    RegionLoad,
    RemotePoint,
    StripLoad,
)

Array = NDArray[np.float64]


@dataclass
class Levers:
    """Levers S of one load or support.

    Attributes
    ----------
    along
        (m, 2, 3, 3) per length of the member, at the Gauss points of each length, N.
    turns
        Pairs of rows (3, n_freedoms) that give a rotation, and the lever (3, 3) that turns with it, N mm.
    """

    along: Array
    turns: list[tuple[Array, Array]] = field(default_factory=list)


def load_levers(actions: Actions, load: Load) -> Levers:
    """Levers of one load with factor 1, member axes."""
    mesh = actions.mesh
    R = mesh.axes
    out = Levers(np.zeros((len(mesh.x) - 1, 2, 3, 3)))
    match load:
        case RegionLoad():
            _on_region(out, actions, load.on, R @ load.force, R @ load.moment, load.coupling == "rigid")
        case BearingLoad():
            _on_region(out, actions, load.on, R @ load.force, np.zeros(3), False)
        case RemotePoint():
            _remote(out, actions, load, R @ load.force, R @ load.moment)
        case Pressure():
            _pressure(out, actions, load)
        case LineLoad() | StripLoad():
            # across the width the traction is even: all of it acts at the middle, as in the resultant
            lengths = actions.forces(load).lengths
            out.along += _about_middle(actions, load, lengths)
        case BodyLoad():
            p = mesh.sections.net(mesh.gauss)
            centre = np.column_stack([np.zeros_like(p.yc), p.yc, p.zc])
            q = mesh.part.material.density * p.area[:, None] * (R @ load.force_per_mass)
            out.along += (q[:, :, None] * centre[:, None, :]).reshape(-1, 2, 3, 3)
            for point in mesh.part.loads:
                if isinstance(point, RemotePoint) and point.mass:
                    _remote(out, actions, point, point.mass * (R @ load.force_per_mass), np.zeros(3))
    return out


def _about_middle(actions: Actions, load: LineLoad | StripLoad, lengths: Array) -> Array:
    """(m, 2, 3, 3) of a load that acts at the middle of a face's width at each station."""
    mesh = actions.mesh
    gauss, h = mesh.gauss.reshape(-1, 2), np.diff(mesh.x)
    face = load.on.partition(".")[2]
    out = np.zeros((len(h), 2, 3, 3))
    for e in np.flatnonzero(np.abs(lengths).any(axis=1)):
        for k, x in enumerate(gauss[e]):
            q = lengths[e, :3] + lengths[e, 6:9] * (x - mesh.x[e])
            out[e, k] = np.outer(q, np.nan_to_num(mesh.face_middle(face, float(x), int(e))))
    return out


def moment_lever(second: Array, moment: Array) -> Array:
    """(3, 3) lever about its own centroid of a traction linear over a region: `second` (3, 3) int r r^T dA."""
    theta = np.trace(second) * np.eye(3) - second
    turn = np.linalg.lstsq(theta, moment, rcond=1e-10)[0]
    return np.asarray(_cross_matrix(turn) @ second)


def _cross_matrix(a: Array) -> Array:
    return np.array([[0.0, -a[2], a[1]], [a[2], 0.0, -a[0]], [-a[1], a[0], 0.0]])


def _second(actions: Actions, region: Region) -> Array:
    """(3, 3) int r r^T dA of a region about its centroid."""
    if isinstance(region, EndFace):
        x = float(actions.mesh.x[region.node])
        p = actions.mesh.sections.gross(np.array([x]), "after" if x == 0.0 else "before")
        yy, yz, zz = float(p.Izz[0]), float(p.Iyz[0]), float(p.Iyy[0])
        return np.array([[0.0, 0.0, 0.0], [0.0, yy, yz], [0.0, yz, zz]])
    if isinstance(region, Face):
        h = np.repeat(region.h, 2) / 2.0
        points = np.vstack([s.points for s in region.strips])
        weight = np.concatenate([s.weight * dx for s, dx in zip(region.strips, h, strict=True)])
    else:
        points, weight = region.points, region.weight
    r = points - region.centroid
    return np.asarray((weight[:, None] * r).T @ r)


def turn_rows(actions: Actions, first: int) -> Array:
    """(3, n_freedoms) rows of the rotation whose freedoms follow the displacement at number `first`."""
    rows = np.zeros((3, actions.freedoms))
    rows[:, first + 3:first + 6] = np.eye(3)
    return rows


def _from_node(actions: Actions, node: int, point: Array) -> Array:
    return np.asarray(point - np.array([actions.mesh.x[node], 0.0, 0.0]))


def _on_region(out: Levers, actions: Actions, name: str, force: Array, moment: Array, rigid: bool) -> None:
    """Even traction and one linear over the region's area, from each section's own point of the line."""
    region = actions.region(name)
    if rigid and name in actions.rigid_at:
        out.turns.append((turn_rows(actions, actions.rigid_at[name]), moment_lever(_second(actions, region), moment)))
    elif isinstance(region, EndFace):
        lever = np.outer(force, _from_node(actions, region.node, region.centroid))
        out.turns.append((turn_rows(actions, 7 * region.node), lever + moment_lever(_second(actions, region), moment)))
    elif isinstance(region, Face):
        points = np.vstack([s.points for s in region.strips])
        h = np.repeat(region.h, 2) / 2.0
        weight = np.concatenate([s.weight * dx for s, dx in zip(region.strips, h, strict=True)])
        traction = linear_traction(points, weight, force, moment)
        _along_face(out, region, [traction(s.points) * s.weight[:, None] for s in region.strips])
    else:
        given = linear_traction(region.points, region.weight, force, moment)(region.points)
        for node in sorted(set(region.nodes.tolist())):
            own = region.nodes == node
            arms = _from_node(actions, node, region.points[own])
            lever = (given[own] * region.weight[own, None]).T @ arms
            out.turns.append((turn_rows(actions, 7 * node), lever))


def _along_face(out: Levers, region: Face, forces: list[Array]) -> None:
    """Forces per length (k, 3) at the points of each strip."""
    for k, (s, f) in enumerate(zip(region.strips, forces, strict=True)):
        arms = s.points.copy()
        arms[:, 0] = 0.0
        out.along[region.lengths[k // 2], k % 2] += f.T @ arms


def _pressure(out: Levers, actions: Actions, load: Pressure) -> None:
    region = actions.region(load.on)
    if isinstance(region, EndFace):
        _on_region(out, actions, load.on, -load.value * region.area * region.outward, np.zeros(3), False)
    elif isinstance(region, Face):
        _along_face(out, region, [-load.value * s.normal for s in region.strips])
    # what pushes on the inner faces of a cut has no resultant; its lever is left out


def _remote(out: Levers, actions: Actions, load: RemotePoint, force: Array, moment: Array) -> None:
    """A force at the end of a lever that turns with the region; a dead moment at the point has no lever of its own."""
    region, arm = actions.region(load.on), remote_arm(actions.mesh, actions, load)
    rigid = load.coupling == "rigid"
    if rigid and load.on in actions.rigid_at:
        out.turns.append((turn_rows(actions, actions.rigid_at[load.on]), np.outer(force, arm)))
    elif isinstance(region, EndFace) or (isinstance(region, CutFaces) and len(set(region.nodes.tolist())) == 1):
        node = region.node if isinstance(region, EndFace) else int(region.nodes[0])
        whole = arm + _from_node(actions, node, region.centroid)
        out.turns.append((turn_rows(actions, 7 * node), np.outer(force, whole)))
    else:
        # the coupling hands force and moment on as a traction; against it stands the same traction on a rigid body
        about = moment + np.cross(arm, force)
        _on_region(out, actions, load.on, force, about, False)
        body = np.outer(force, arm) - moment_lever(_second(actions, region), about)
        out.turns.append((actions.motion_rows(load.on, False)[3:], body))


def reaction_levers(actions: Actions, rows: list[Row], reactions: Array) -> Levers:
    """Levers of what supports and the ties of rigid regions exert in one case; `reactions` (rows,)."""
    mesh = actions.mesh
    out = Levers(np.zeros((len(mesh.x) - 1, 2, 3, 3)))
    supports = {s.name: s for s in mesh.part.supports}
    totals: dict[str, Array] = {}
    for row, value in zip(rows, reactions, strict=True):
        if row.owner in supports:
            totals[row.owner] = totals.get(row.owner, 0.0) + value * row.vector
        else:
            _tie(out, actions, value * row.vector)
    for name, total in totals.items():
        region = actions.region(supports[name].on)
        for node in np.unique(np.flatnonzero(total[:7 * len(mesh.x)]) // 7).tolist():
            force, moment = total[7 * node:7 * node + 3], total[7 * node + 3:7 * node + 6]
            point = _from_node(actions, node, _place(mesh.x, region, node))
            lever = np.outer(force, point)
            if isinstance(region, EndFace):
                lever += moment_lever(_second(actions, region), moment - np.cross(point, force))
            out.turns.append((turn_rows(actions, 7 * node), lever))
    return out


def _place(x: Array, region: Region, node: int) -> Array:
    """(3,) middle of what a region shows at a node."""
    if isinstance(region, EndFace):
        return region.centroid
    if isinstance(region, CutFaces):
        own = region.nodes == node
        return np.asarray(region.weight[own] @ region.points[own] / region.weight[own].sum())
    at = node - int(region.lengths[0])
    strip: Strip | None = region.ends[at] if 0 <= at < len(region.ends) else None
    middle = region.centroid if strip is None or not len(strip.points) else \
        strip.weight @ strip.points / strip.weight.sum()
    return np.array([x[node], middle[1], middle[2]])


def _tie(out: Levers, actions: Actions, force: Array) -> None:
    """A tie between a section and a rigid body acts on both at one point: what is left is the body's centroid."""
    n = 7 * len(actions.mesh.x)
    bodies = np.flatnonzero(force[n:])
    nodes = np.flatnonzero(force[:n])
    if len(bodies) and len(nodes):
        node = int(nodes[0]) // 7
        arm = _from_node(actions, node, actions.rigid_points[int(bodies[0]) // 6])
        out.turns.append((turn_rows(actions, 7 * node), np.outer(force[7 * node:7 * node + 3], arm)))
