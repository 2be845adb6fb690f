"""Axes of a member: where its line lies and which way its section is turned."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from geometry.part import Member
from geometry.problem import SolidError

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Frame:
    """Right-handed axes of a member.

    Attributes
    ----------
    origin
        (3,) start of the declared line, global, mm.
    axes
        (3, 3) rows x, y, z of the member, global components.
    length
        Length of the line, mm.
    """

    origin: Array
    axes: Array
    length: float

    def to_member(self, points: Array) -> Array:
        """(..., 3) global points in member axes, mm."""
        return np.asarray((np.asarray(points) - self.origin) @ self.axes.T)

    def to_global(self, points: Array) -> Array:
        """(..., 3) points given in member axes as global coordinates, mm."""
        return np.asarray(np.asarray(points) @ self.axes + self.origin)


def member_frame(member: Member) -> Frame:
    """Axes of `member`: x along the line, z towards `up` made square to x, then turned by `roll` about x.

    Raises
    ------
    SolidError
        The member has no length, or `up` is along it.
    """
    start, end = np.asarray(member.start, float), np.asarray(member.end, float)
    length = float(np.linalg.norm(end - start))
    if not length > 0.0:
        raise SolidError(f"members.{member.name}: start and end coincide; give it a length.")
    x = (end - start) / length
    up = np.asarray(member.up, float)
    square = up - (up @ x) * x
    size = float(np.linalg.norm(square))
    if size <= 1e-6 * max(float(np.linalg.norm(up)), 1e-300):
        raise SolidError(f"members.{member.name}.up: {member.up} is along the member; choose a direction across it.")
    z = square / size
    z = np.cos(member.roll) * z + np.sin(member.roll) * np.cross(x, z)
    return Frame(start, np.array([x, np.cross(z, x), z]), length)
