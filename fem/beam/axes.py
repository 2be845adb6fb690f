"""Member axes: x from start to end, z = `up` made square to the line and turned by `roll`, y = z cross x."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from geometry.part import Member
from geometry.problem import RunError


def member_axes(member: Member) -> tuple[NDArray[np.float64], float]:
    """Rotation and length of a member.

    Returns
    -------
    R
        (3, 3); its rows are the member's x, y, z in global axes, so that ``R @ v`` gives the member
        components of a global vector and ``R.T @ w`` goes back.
    length
        Length of the declared line, mm.

    Raises
    ------
    RunError
        Stage ``beam``: the line has no length, or `up` is parallel to it.
    """
    line = np.subtract(member.end, member.start)
    length = float(np.linalg.norm(line))
    if length == 0.0:
        raise RunError("beam", f"member {member.name} has no length; give `from` and `to` different points")
    x = line / length
    up = np.asarray(member.up, dtype=float)
    square = up - (up @ x) * x
    size = float(np.linalg.norm(square))
    if size <= 1e-9 * float(np.linalg.norm(up)) or size == 0.0:
        raise RunError("beam", f"member {member.name}: `up` is parallel to the line; choose another direction")
    z0 = square / size
    y0 = np.cross(z0, x)
    # A right-handed turn about x carries y to z and z to -y.
    c, s = np.cos(member.roll), np.sin(member.roll)
    return np.vstack([x, c * y0 + s * z0, c * z0 - s * y0]), length
