"""The solid model's own member frames, stations and part lengths."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from fem.solid.shape import Array
from geometry.part import Member

STATION_COUNT = 21


@dataclass(frozen=True, slots=True)
class Frame:
    """Member axes: rows of `axes` (3, 3) are x, y, z in global components; `origin` is the member's start, mm."""

    origin: Array
    axes: Array
    length: float

    def local(self, points: Array) -> Array:
        """(3, ...) member coordinates of global points (3, ...)."""
        shifted = points - self.origin.reshape(3, *[1] * (points.ndim - 1))
        return np.tensordot(self.axes, shifted, axes=1)

    def point(self, at: float) -> Array:
        """(3,) global position on the member's line."""
        return self.origin + at * self.axes[0]


def member_frame(member: Member) -> Frame:
    """Frame of a member: z towards `up` made square to the line, turned by `roll` about x, y = z cross x."""
    start, end = np.array(member.start), np.array(member.end)
    length = float(np.linalg.norm(end - start))
    x = (end - start) / length
    up = np.array(member.up, dtype=float)
    z = up - (up @ x) * x
    z /= np.linalg.norm(z)
    z = np.cos(member.roll) * z + np.sin(member.roll) * np.cross(x, z)
    return Frame(start, np.array([x, np.cross(z, x), z]), length)


def stations(length: float) -> Array:
    """(21,) stations k L / 20, mm."""
    return length * np.arange(STATION_COUNT) / (STATION_COUNT - 1)
