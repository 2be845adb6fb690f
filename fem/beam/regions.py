"""Regions as the beam sees them: where they lie along the member, their area, centroid and normals.

Worked out from the outlines of the beam model only. Points are (x, y, z) in member axes from the declared line, mm.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from fem.beam.element import GAUSS

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class Strip:
    """What a face shows of itself at one station: points (k, 3), area per length (k,), area vector per length (k, 3).

    The area vector points out of the material and holds the inclination of a tapered face. There are no points where
    a cut takes the whole width.
    """

    points: Array
    weight: Array
    normal: Array


@dataclass(frozen=True, slots=True)
class EndFace:
    """An end face at node `node`, its centroid (3,), and `corners` (k, 3), the points of a point-wise hold."""

    name: str
    node: int
    area: float
    centroid: Array
    corners: Array
    outward: Array


@dataclass(frozen=True, slots=True)
class Face:
    """A face or patch along lengths `lengths` of the line (indices), sampled at two Gauss points of each.

    `strips` has two entries a length; `ends` gives the strip at the nodes ``lengths[0] .. lengths[-1] + 1``; `depth`
    is the larger overall size of the section.
    """

    name: str
    lengths: NDArray[np.int64]
    h: Array
    strips: tuple[Strip, ...]
    ends: tuple[Strip, ...]
    depth: float

    def _stacked(self) -> tuple[Array, Array]:
        h = np.repeat(self.h, 2) / 2.0
        points = np.vstack([s.points for s in self.strips])
        weight = np.concatenate([s.weight * dx for s, dx in zip(self.strips, h, strict=True)])
        return points, weight

    @property
    def area(self) -> float:
        return float(self._stacked()[1].sum())

    @property
    def centroid(self) -> Array:
        points, weight = self._stacked()
        return np.asarray(weight @ points / weight.sum())

    def spread(self, force: Array, moment: Array) -> Array:
        """(m, 12) load per length (c and its growth) of an even traction plus one linear over the area.

        `force` (3,) and `moment` (3,) about the area centroid, member axes.
        """
        points, weight = self._stacked()
        t = linear_traction(points, weight, force, moment)
        return self._lengthwise(lambda s: t(s.points) * s.weight[:, None])

    def pushed(self, pressure: float) -> Array:
        """(m, 12) load per length of a pressure (MPa) that pushes into the part."""
        return self._lengthwise(lambda s: -pressure * s.normal)

    def _lengthwise(self, force: Callable[[Strip], Array]) -> Array:
        c = np.zeros((len(self.strips), 6))
        for k, s in enumerate(self.strips):
            f = force(s)
            r = s.points.copy()
            r[:, 0] = 0.0  # moments act on the line at this station
            c[k] = np.concatenate([f.sum(axis=0), np.cross(r, f).sum(axis=0)])
        return linear_load(c.reshape(-1, 2, 6), self.h)


@dataclass(frozen=True, slots=True)
class CutFaces:
    """Inner faces of one cut or a group: samples (k, 3) with area (k,), each tied to its cut's middle node."""

    name: str
    nodes: NDArray[np.int64]
    points: Array
    weight: Array

    @property
    def area(self) -> float:
        return float(self.weight.sum())

    @property
    def centroid(self) -> Array:
        return np.asarray(self.weight @ self.points / self.weight.sum())


Region = EndFace | Face | CutFaces


def linear_traction(points: Array, weight: Array, force: Array, moment: Array) -> Callable[[Array], Array]:
    """Traction with the given resultants: even for the force, linear in the distance to the centroid for the moment."""
    area = weight.sum()
    centre = weight @ points / area
    r = points - centre
    inertia = (r**2).sum(axis=1)[:, None, None] * np.eye(3) - r[:, :, None] * r[:, None, :]
    theta = np.einsum("k,kij->ij", weight, inertia)
    turn = np.linalg.lstsq(theta, moment, rcond=1e-10)[0]
    return lambda p: force / area + np.cross(turn, p - centre)


def linear_load(at_gauss: Array, h: Array) -> Array:
    """(m, 12) start value and growth per mm of the straight line through values at two Gauss points (m, 2, 6)."""
    growth = (at_gauss[:, 1] - at_gauss[:, 0]) / (h * (GAUSS[1] - GAUSS[0]))[:, None]
    return np.hstack([at_gauss[:, 0] - growth * (h * GAUSS[0])[:, None], growth])


def rigid_rows(points: Array, x: float) -> Array:
    """(k, 3, 6) displacement of points (k, 3) that move with the section at `x`, by its freedoms (u, r)."""
    r = points - np.array([x, 0.0, 0.0])
    rows = np.zeros((len(points), 3, 6))
    rows[:, :, :3] = np.eye(3)
    # u + rot x r
    rows[:, 0, 4], rows[:, 0, 5] = r[:, 2], -r[:, 1]
    rows[:, 1, 3], rows[:, 1, 5] = -r[:, 2], r[:, 0]
    rows[:, 2, 3], rows[:, 2, 4] = r[:, 1], -r[:, 0]
    return rows


def wrench(force: Array, moment: Array, point: Array, x: float) -> Array:
    """(6,) force and moment about the line's point at `x` of a force and moment at `point`."""
    return np.concatenate([force, moment + np.cross(point - np.array([x, 0.0, 0.0]), force)])
