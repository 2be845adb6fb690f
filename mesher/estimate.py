"""How many nodes a mesh will have and how much memory its solution will need, told before meshing."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

VOLUME_COEFFICIENT = 1.5
SURFACE_COEFFICIENT = 7.9
"""Fitted to 18 meshes (bar, plate with a hole, round bar, tube, shouldered shaft, tapered I with holes; accuracy 5, 2
and 1 %): every one of them within 22 %."""


def node_integrals(areas: Sequence[float], sizes: Sequence[Floats], volume: float) -> tuple[float, float]:
    """The integrals of h^-3 over the volume and of h^-2 over the surface.

    The parts are thin: what lies inside is near the surface, so the volume integral is taken as
    ``V / A`` times that of h^-3 over the surface. `sizes` are samples of h (mm) on each face.
    """
    total = float(sum(areas))
    cubes = sum(area * float(np.mean(h**-3.0)) for area, h in zip(areas, sizes, strict=True))
    squares = sum(area * float(np.mean(h**-2.0)) for area, h in zip(areas, sizes, strict=True))
    return volume / total * cubes, squares


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
