"""Points on the faces of the solid in the mesh kernel: seeds of the size field. Runs in the child only."""

from __future__ import annotations

from dataclasses import dataclass
from math import pi

import gmsh
import numpy as np
from numpy.typing import NDArray

from mesher.sizes import Sizes

Floats = NDArray[np.float64]

_MOST_ALONG_ONE_WAY = 400


@dataclass(frozen=True, slots=True)
class FaceSamples:
    """Points (n, 3) on one face, mm; the size that the face asks for (mm); its area (mm^2)."""

    points: Floats
    size: float
    area: float


def sample_faces(faces: list[int], areas: list[float], sizes: Sizes) -> list[FaceSamples]:
    """Samples of every face (`faces`: kernel tags in the order of the solid's marks)."""
    return [
        _sample(tag, area, min(sizes.faces.get(index, sizes.bulk), _curvature_size(tag, sizes)))
        for index, (tag, area) in enumerate(zip(faces, areas, strict=True))
    ]


def _curvature_size(tag: int, sizes: Sizes) -> float:
    """Size that a curved face needs for its shape alone, mm.

    `sizes.turn` elements to the full turn, two thirds of that on a rounding (less than 135 degrees). Small
    roundings are let off with a third of the bulk size, as long as a quarter turn still has an element of its own.
    """
    kind = gmsh.model.getType(2, tag)
    if kind == "Plane":
        return sizes.bulk
    low, high = (np.array(b) for b in gmsh.model.getParametrizationBounds(2, tag))
    middle = low + (high - low) * np.array([[0.3, 0.4], [0.5, 0.5], [0.7, 0.6]])
    bend = float(np.max(np.abs(gmsh.model.getCurvature(2, tag, middle.ravel().tolist()))))
    if not np.isfinite(bend) or bend <= 0:
        return sizes.bulk
    radius = 1.0 / bend
    rounding = kind in ("Cylinder", "Cone") and high[0] - low[0] < 0.75 * pi
    turn = sizes.turn * (2 / 3 if rounding else 1)
    return min(sizes.bulk, max(2 * pi * radius / turn, min(sizes.bulk / 3, pi * radius / 2)))


def _sample(tag: int, area: float, size: float) -> FaceSamples:
    """A grid in the face's parameters with points about `size` apart; those outside its edges are dropped."""
    low, high = (np.array(b) for b in gmsh.model.getParametrizationBounds(2, tag))
    counts = [_steps(tag, low, high, axis, size) for axis in (0, 1)]
    u, v = (low[a] + (high[a] - low[a]) * (np.arange(n) + 0.5) / n for a, n in enumerate(counts))
    grid = np.stack(np.meshgrid(u, v, indexing="ij"), axis=-1).reshape(-1, 2)
    inside = [gmsh.model.isInside(2, tag, uv.tolist(), parametric=True) > 0 for uv in grid]
    kept = grid[np.array(inside, dtype=bool)]
    if len(kept) == 0:
        kept = grid  # a sliver of a face between all grid points: its surroundings serve as well
    points = np.array(gmsh.model.getValue(2, tag, kept.ravel().tolist())).reshape(-1, 3)
    return FaceSamples(points, size, area)


def _steps(tag: int, low: Floats, high: Floats, axis: int, size: float) -> int:
    """How many steps of about `size` fit along one parameter, measured in the middle of the other."""
    uv = np.tile((low + high) / 2, (17, 1))
    uv[:, axis] = np.linspace(low[axis], high[axis], 17)
    points = np.array(gmsh.model.getValue(2, tag, uv.ravel().tolist())).reshape(-1, 3)
    length = float(np.linalg.norm(np.diff(points, axis=0), axis=1).sum())
    return int(np.clip(np.ceil(length / size), 2, _MOST_ALONG_ONE_WAY))
