"""Whether the supports hold the part: which rigid motions they leave, in words."""

from __future__ import annotations

import numpy as np

from fem.solid.shape import Array
from fem.solid.support import Constraints, rigid_map
from mesher.named_mesh import NamedMesh

FREE = 1e-7
"""A rigid motion is free when the held freedoms see less than this part of it."""


def free_motions(mesh: NamedMesh, constraints: Constraints) -> list[str]:
    """Rigid motions that no support resists, one sentence each; empty when the part is held.

    The rows of all supports are applied to the six rigid motions (rotations scaled to the part's size); their
    null space is what is left free.
    """
    centre = mesh.nodes.mean(axis=1)
    size = float(np.linalg.norm(np.ptp(mesh.nodes, axis=1))) / 2
    scale = np.r_[np.ones(3), np.full(3, 1.0 / size)]
    seen = [np.zeros((1, 6))]
    for block in constraints.blocks:
        if not block.rows.size:
            continue
        if block.centre is None:
            motion = rigid_map(mesh.nodes[:, block.nodes], centre)
            seen.append(np.einsum("rd,kdm->rkm", block.rows, motion).reshape(-1, 6))
        else:
            at = rigid_map(block.centre[:, None], centre)[0]
            seen.append(block.rows @ np.vstack([at, np.hstack([np.zeros((3, 3)), np.eye(3)])]))
    if constraints.rows.shape[0]:
        motion = rigid_map(mesh.nodes, centre).reshape(-1, 6)
        seen.append(constraints.rows @ motion)
    scaled = []
    for rows in seen:
        rows = rows * scale
        length = np.linalg.norm(rows, axis=1, keepdims=True)
        scaled.append(rows / np.where(length > 0, np.maximum(length, 1e-30), 1.0))
    _, s, vt = np.linalg.svd(np.linalg.qr(np.vstack([*scaled, np.zeros((6, 6))]), mode="r"))
    free = vt[s <= FREE * max(1.0, s[0])]
    return [_describe(motion * scale, centre, size) for motion in _echelon(free)]


def _echelon(motions: Array) -> Array:
    """The same space with rotations and directions told apart: reduced rows, rotations as leading columns."""
    rows = motions[:, [3, 4, 5, 0, 1, 2]].copy()
    lead = 0
    for column in range(6):
        if lead == rows.shape[0]:
            break
        pivot = lead + int(np.abs(rows[lead:, column]).argmax())
        if abs(rows[pivot, column]) < 1e-6:
            continue
        rows[[lead, pivot]] = rows[[pivot, lead]]
        rows[lead] /= rows[lead, column]
        others = np.arange(rows.shape[0]) != lead
        rows[others] -= np.outer(rows[others, column], rows[lead])
        lead += 1
    rows[np.abs(rows) < 1e-6] = 0.0
    return rows[:, [3, 4, 5, 0, 1, 2]]


def _direction(vector: Array) -> str:
    unit = vector / np.linalg.norm(vector)
    axis = int(np.abs(unit).argmax())
    if abs(unit[axis]) > 1 - 1e-6:
        return "xyz"[axis]
    return "(" + ", ".join(f"{v:.4g}" for v in unit) + ")"


def _describe(motion: Array, centre: Array, size: float) -> str:
    shift, turn = motion[:3], motion[3:]
    if np.linalg.norm(turn) * size < 1e-6:
        return f"it can slide along {_direction(shift)}"
    point = centre + np.cross(turn, shift) / (turn @ turn)
    near = np.where(np.abs(point) < 1e-6 * size, 0.0, point)
    return f"it can turn about an axis along {_direction(turn)} through ({', '.join(f'{v:.4g}' for v in near)}) mm"
