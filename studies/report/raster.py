"""Orthographic pictures of triangles with a depth buffer, in NumPy.

Method: each triangle is scan-converted over its bounding rectangle by barycentric coordinates (the edge
function test of J. Pineda, "A parallel algorithm for polygon rasterization", Computer Graphics 22(4), 1988);
the nearest triangle of a pixel wins. All triangles of a batch are done at once.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

BATCH_PIXELS = 2_000_000
"""Candidate pixels that are worked on at once (about 250 MB)."""


@dataclass(frozen=True, slots=True)
class Camera:
    """Parallel projection: rows of `axes` are right, up and away from the eye (unit, right-handed as given)."""

    axes: Floats

    @classmethod
    def towards(cls, eye: Floats, up: Floats) -> Camera:
        """Look from the direction `eye` (3,) at the origin with `up` (3,) upwards in the picture."""
        away = -eye / np.linalg.norm(eye)
        right = np.cross(away, up)
        right /= np.linalg.norm(right)
        return cls(np.array([right, np.cross(right, away), away]))

    def project(self, points: Floats) -> Floats:
        """(n, 3) global points -> (n, 3) picture coordinates: right, up, depth away from the eye (mm)."""
        return np.asarray(points) @ self.axes.T


@dataclass
class Canvas:
    """Pixels over a rectangle of the picture plane.

    Attributes
    ----------
    left, bottom, pixel
        Lower left corner and pixel size, mm of the picture plane.
    depth
        (rows, columns) of the nearest surface, inf where there is none. Row 0 is the bottom.
    colour
        (rows, columns, 4) RGBA in 0..1, transparent where there is nothing.
    """

    left: float
    bottom: float
    pixel: float
    depth: Floats
    colour: Floats

    @classmethod
    def around(cls, flat: Floats, pixels: int, margin: float = 0.02) -> Canvas:
        """Canvas for projected points `flat` (n, >=2) whose longer side has `pixels` pixels."""
        low, high = flat[:, :2].min(axis=0), flat[:, :2].max(axis=0)
        gap = margin * (high - low).max()
        low, high = low - gap, high + gap
        pixel = float((high - low).max() / pixels)
        columns, rows = np.maximum(np.ceil((high - low) / pixel).astype(int), 1)
        return cls(float(low[0]), float(low[1]), pixel, np.full((rows, columns), np.inf), np.zeros((rows, columns, 4)))

    @property
    def extent(self) -> tuple[float, float, float, float]:
        """Left, right, bottom, top in mm, as matplotlib's ``imshow`` takes it (origin lower)."""
        rows, columns = self.depth.shape
        return self.left, self.left + columns * self.pixel, self.bottom, self.bottom + rows * self.pixel

    def to_pixels(self, flat: Floats) -> Floats:
        """(n, 3) picture coordinates -> (n, 3) column, row (pixel centres at whole numbers), depth in mm."""
        return np.column_stack([(flat[:, 0] - self.left) / self.pixel - 0.5,
                                (flat[:, 1] - self.bottom) / self.pixel - 0.5, flat[:, 2]])

    def draw_triangles(self, corners: Floats, values: Floats) -> Floats:
        """Scan-convert triangles.

        Parameters
        ----------
        corners
            (t, 3, 3) triangle, corner, picture coordinate.
        values
            (t, 3, c) quantities to interpolate at the corners.

        Returns
        -------
        (rows, columns, c) interpolated values where this call's triangles are nearest, NaN elsewhere.
        """
        rows, columns = self.depth.shape
        out = np.full((rows * columns, values.shape[2]), np.nan)
        spots = self.to_pixels(corners.reshape(-1, 3)).reshape(-1, 3, 3)
        low = np.clip(np.ceil(spots[:, :, :2].min(axis=1)).astype(int), 0, [columns, rows])
        high = np.clip(np.floor(spots[:, :, :2].max(axis=1)).astype(int) + 1, 0, [columns, rows])
        size = np.maximum(high - low, 0)
        counts = size[:, 0] * size[:, 1]
        batch = np.cumsum(counts) // BATCH_PIXELS
        for number in np.unique(batch[counts > 0]):
            chosen = np.flatnonzero((batch == number) & (counts > 0))
            self._draw_batch(spots[chosen], values[chosen], low[chosen], size[chosen], out)
        return out.reshape(rows, columns, -1)

    def _draw_batch(self, spots: Floats, values: Floats, low: Ints, size: Ints, out: Floats) -> None:
        columns = self.depth.shape[1]
        counts = size[:, 0] * size[:, 1]
        which = np.repeat(np.arange(len(counts)), counts)
        within = np.arange(counts.sum()) - np.repeat(np.cumsum(counts) - counts, counts)
        px = low[which, 0] + within % size[which, 0]
        py = low[which, 1] + within // size[which, 0]
        weights, inside = _barycentric(spots[which, :, :2], px, py)
        which, px, py, weights = which[inside], px[inside], py[inside], weights[inside]
        depth = np.einsum("nk,nk->n", weights, spots[which, :, 2])
        flat_index = py * columns + px
        buffer = self.depth.reshape(-1)
        np.minimum.at(buffer, flat_index, depth)
        nearest = depth <= buffer[flat_index]
        out[flat_index[nearest]] = np.einsum("nk,nkc->nc", weights[nearest], values[which[nearest]])

    def draw_segments(self, ends: Floats, colour: tuple[float, float, float, float], bias: float,
                      thick: int = 1) -> None:
        """Blend the segments `ends` (s, 2, 3), picture coordinates, over the picture where they are not hidden.

        `bias` (mm) is how far behind the nearest surface a line may lie and still be seen.
        """
        rows, columns = self.depth.shape
        spots = self.to_pixels(ends.reshape(-1, 3)).reshape(-1, 2, 3)
        steps = np.ceil(np.abs(spots[:, 1, :2] - spots[:, 0, :2]).max(axis=1)).astype(int) + 1
        which = np.repeat(np.arange(len(steps)), steps)
        along = (np.arange(steps.sum()) - np.repeat(np.cumsum(steps) - steps, steps)) / np.maximum(steps[which] - 1, 1)
        points = spots[which, 0] + along[:, None] * (spots[which, 1] - spots[which, 0])
        px, py = np.rint(points[:, 0]).astype(int), np.rint(points[:, 1]).astype(int)
        mask = np.zeros((rows, columns), dtype=bool)
        for dx in range(-(thick // 2), (thick + 1) // 2):
            for dy in range(-(thick // 2), (thick + 1) // 2):
                x, y = px + dx, py + dy
                inside = (x >= 0) & (x < columns) & (y >= 0) & (y < rows)
                x, y, z = x[inside], y[inside], points[inside, 2]
                seen = z <= self.depth[y, x] + bias
                mask[y[seen], x[seen]] = True
        over, alpha = self.colour[mask], colour[3]
        over[:, :3] = np.where(over[:, 3:] > 0, over[:, :3], np.array(colour[:3])) * (1 - alpha) \
            + alpha * np.array(colour[:3])
        over[:, 3] = over[:, 3] + alpha * (1 - over[:, 3])
        self.colour[mask] = over


def _barycentric(triangle: Floats, px: Ints, py: Ints) -> tuple[Floats, NDArray[np.bool_]]:
    """Barycentric weights (n, 3) of pixels in their triangles (n, 3, 2), and which of them are inside."""
    a, b, c = triangle[:, 0], triangle[:, 1], triangle[:, 2]
    double = (b[:, 0] - a[:, 0]) * (c[:, 1] - a[:, 1]) - (b[:, 1] - a[:, 1]) * (c[:, 0] - a[:, 0])
    safe = np.where(np.abs(double) > 1e-12, double, 1.0)
    wb = ((px - a[:, 0]) * (c[:, 1] - a[:, 1]) - (py - a[:, 1]) * (c[:, 0] - a[:, 0])) / safe
    wc = ((b[:, 0] - a[:, 0]) * (py - a[:, 1]) - (b[:, 1] - a[:, 1]) * (px - a[:, 0])) / safe
    weights = np.column_stack([1.0 - wb - wc, wb, wc])
    # A hair of slack closes the seams between neighbours.
    return weights, (np.abs(double) > 1e-12) & (weights >= -1e-6).all(axis=1)
