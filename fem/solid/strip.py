"""One position of a load that travels along a face: an even traction on short strips of it."""

from __future__ import annotations

import numpy as np

from fem.solid.frame import Frame
from fem.solid.piece import SurfacePiece, Traction, Window, clipped_facets, node_sums
from fem.solid.region import Region
from fem.solid.shape import Array
from geometry.part import StripLoad
from geometry.problem import SolveError

LEAST_AREA = 1e-6
"""A strip has no area when less than this part of its length times the face's size across is left of it."""


class TravelledFace:
    """A face with the range of its facets along the member, so that a strip touches only its own."""

    def __init__(self, nodes: Array, region: Region, frame: Frame) -> None:
        self.nodes, self.region, self.frame = nodes, region, frame
        local = frame.local(nodes[:, region.facets])
        self.low, self.high = local[0].min(axis=0), local[0].max(axis=0)
        self.across = float(np.linalg.norm(np.ptp(local[1:], axis=(1, 2))))

    def strips(self, load: StripLoad) -> tuple[tuple[SurfacePiece, ...], Array, Array]:
        """Pieces of the load, its force (N) and its moment about the global origin (N mm).

        The traction of a strip is its force over the area that cuts and ends leave of it, so that the whole force
        acts, at the centroid of that area.

        Raises
        ------
        SolveError
            When nothing is left of a strip.
        """
        force, pieces, moment = np.array(load.force, float), [], np.zeros(3)
        for centre in load.centres:
            low, high = centre - load.length / 2, centre + load.length / 2
            touched = np.flatnonzero((self.high > low) & (self.low < high))
            facets, window = self.region.facets[:, touched], Window(self.frame, low, high)
            here = clipped_facets(self.nodes, facets, window.distances(self.nodes[:, facets]))
            areas = here.areas
            area = float(areas.sum())
            if not area > LEAST_AREA * load.length * self.across:
                raise SolveError(
                    f"The travelling load {load.name!r} presses on {load.on!r} from {low:.6g} to {high:.6g} mm, where "
                    "nothing is left of that face: it lies beyond the part or wholly in a cut. Let it travel over a "
                    "stretch of the face that is there, give its contact a greater length, or move the cut."
                )
            shares = node_sums(here, areas / area, facets.shape[1])
            pieces.append(SurfacePiece(facets, _even(force / area), window, shares[:, None, :] * force[:, None]))
            moment += np.cross(here.points @ areas / area, force)
        return tuple(pieces), len(load.centres) * force, moment


def _even(traction: Array) -> Traction:
    """The same traction everywhere."""

    def everywhere(points: Array, _: Array) -> Array:
        return np.broadcast_to(traction.reshape(3, *[1] * (points.ndim - 1)), points.shape)

    return everywhere
