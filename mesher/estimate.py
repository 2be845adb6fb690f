"""How many nodes a mesh will have and how much memory its solution will need, told before meshing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

VOLUME_COEFFICIENT = 3.8
SURFACE_COEFFICIENT = 6.7
"""Fitted to 14 meshes (shouldered shaft, tapered I with holes, plate with a hole and tube at accuracy 5, 2 and 1 %, bar
at 5 and 2 %), checked on 3 more (round bar): every one of them within 22 %. Of nine example parts meshed by HXT, with
and without the slow improvement: 0.75 to 1.22 times the nodes they have."""


def node_integrals(
    areas: Sequence[float], sizes: Sequence[Floats], volume: float, grows: Sequence[bool], bulk: float, slope: float
) -> tuple[float, float]:
    """The integrals of h^-3 over the volume and of h^-2 over the surface.

    The parts are thin: the volume is taken as a column of depth ``V / A`` under the surface. `sizes` are samples of
    h (mm) on each face. Under a face that asks for less than its surroundings (`grows`) h grows with `slope` up to
    `bulk`; under any other (the sides of a plate around a hole) it stays what it is at the surface.
    """
    depth = volume / float(sum(areas))
    cubes = sum(
        area * float(np.mean(_column(h, depth, bulk, slope) if inwards else depth * h**-3.0))
        for area, h, inwards in zip(areas, sizes, grows, strict=True)
    )
    squares = sum(area * float(np.mean(h**-2.0)) for area, h in zip(areas, sizes, strict=True))
    return cubes, squares


def _column(h: Floats, depth: float, bulk: float, slope: float) -> Floats:
    """The integral of min(h + slope t, bulk)^-3 over t from 0 to `depth`."""
    growing = np.clip((bulk - h) / slope, 0.0, depth)
    return (h**-2.0 - (h + slope * growing) ** -2.0) / (2 * slope) + (depth - growing) * bulk**-3.0


def estimated_nodes(volume_integral: float, surface_integral: float) -> int:
    """Nodes (corner and mid-edge) of the mesh."""
    return round(VOLUME_COEFFICIENT * volume_integral + SURFACE_COEFFICIENT * surface_integral)


_MEMORY_AT, _MEMORY, _MEMORY_POWER = 15_000.0, 60.0, 1.15


def solver_memory(nodes: float) -> float:
    """MiB for a direct factorisation with 3 unknowns at each node.

    Fitted to the solver's own forecast for six slender parts (15 000 to 125 000 unknowns: 3.0 to 5.4 KiB each,
    this is 0.92 to 1.40 times that). A compact block needs about twice as much; the solver checks again.
    """
    return float(_MEMORY * (3.0 * nodes / _MEMORY_AT) ** _MEMORY_POWER)


def nodes_within(memory: float) -> int:
    """The inverse of `solver_memory`."""
    return int((memory / _MEMORY) ** (1.0 / _MEMORY_POWER) * _MEMORY_AT / 3.0)
