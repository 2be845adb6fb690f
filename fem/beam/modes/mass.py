"""Mass of the beam model: of its sections, of shoulder fillets, of remote points."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.beam.actions import Actions
from fem.beam.figures import fillet_volumes, section_arm
from fem.beam.mesh import BeamMesh
from geometry.part import RemotePoint
from geometry.problem import RunError

Array = NDArray[np.float64]


def section_inertia(mesh: BeamMesh, x: Array) -> Array:
    """(k, 7, 7) mass per length of the net sections at `x` (k,) over (ux, uy, uz, rx, ry, rz, chi) of the line's point.

    t/mm for displacements. A section moves as a rigid body and warps: rotary inertia about y and z is taken where shear
    flexibility is (a beam without either is Euler and Bernoulli's).
    """
    p = mesh.sections.net(x)
    m = np.zeros((len(x), 7, 7))
    centre = np.zeros((len(x), 3, 7))  # displacement of the centroid
    centre[:, :, :3] = np.eye(3)
    centre[:, 0, 4], centre[:, 0, 5], centre[:, 1, 3], centre[:, 2, 3] = p.zc, -p.yc, -p.zc, p.yc
    m += p.area[:, None, None] * np.swapaxes(centre, 1, 2) @ centre
    m[:, 3, 3] += p.Iyy + p.Izz
    if mesh.shear:
        m[:, 4, 4] += p.Iyy
        m[:, 5, 5] += p.Izz
        m[:, 4, 5] -= p.Iyz
        m[:, 5, 4] -= p.Iyz
    m[:, 6, 6] = p.Iw
    return mesh.part.material.density * m


def fillet_nodes(mesh: BeamMesh) -> list[tuple[int, float, Array]]:
    """Node, mass (t) and point of the material in each shoulder fillet, which moves with the nearest section."""
    density = mesh.part.material.density
    return [(int(np.argmin(np.abs(mesh.x - point[0]))), density * volume, point)
            for volume, point in fillet_volumes(mesh)]


def lumped_rows(mesh: BeamMesh, actions: Actions) -> Array:
    """(r, n_freedoms) rows B on the freedoms of the mesh whose B^T B is the mass of fillets and remote points.

    Raises
    ------
    RunError
        Stage ``beam``: a remote point's inertia that no body has.
    """
    rows = [np.zeros((0, actions.freedoms))]
    for node, mass, point in fillet_nodes(mesh):
        row = np.zeros((3, actions.freedoms))
        arm = point - np.array([mesh.x[node], 0.0, 0.0])
        row[:, 7 * node:7 * node + 3], row[:, 7 * node + 3:7 * node + 6] = np.eye(3), arm_matrix(arm)
        rows.append(np.sqrt(mass) * row)
    for load in mesh.part.loads:
        if isinstance(load, RemotePoint) and (load.mass or any(load.inertia)):
            rows.append(_remote_rows(mesh, actions, load))
    return np.vstack(rows)


def arm_matrix(arm: Array) -> Array:
    """(3, 3) A with A @ rotation = rotation x arm."""
    out = section_arm(float(arm[1]), float(arm[2]))
    out[1, 2], out[2, 1] = arm[0], -arm[0]
    return out


def remote_arm(mesh: BeamMesh, actions: Actions, load: RemotePoint) -> Array:
    """(3,) from the centroid of its region to a remote point, member axes."""
    return np.asarray(mesh.axes @ np.subtract(load.point, mesh.member.start) - actions.region(load.on).centroid)


def _remote_rows(mesh: BeamMesh, actions: Actions, load: RemotePoint) -> Array:
    motion = actions.motion_rows(load.on, load.coupling == "rigid")
    moved = motion[:3] + arm_matrix(remote_arm(mesh, actions, load)) @ motion[3:]
    xx, yy, zz, xy, yz, zx = load.inertia
    inertia = mesh.axes @ np.array([[xx, xy, zx], [xy, yy, yz], [zx, yz, zz]]) @ mesh.axes.T
    size, axes = np.linalg.eigh(inertia)
    if size[0] < -1e-9 * max(size[-1], 0.0):
        raise RunError("beam", f"the inertia of the remote point {load.name} has the principal moment {size[0]:.4g} "
                       "t mm^2, which no body has; look at its products of inertia")
    turned = np.sqrt(np.maximum(size, 0.0))[:, None] * (axes.T @ motion[3:])
    return np.vstack([np.sqrt(load.mass) * moved, turned])
