"""The meshing attempts, in the order in which they are made."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from typing import Any

_FRONTAL, _MESH_ADAPT, _DELAUNAY_2D = 6, 1, 5
_DELAUNAY_3D, _HXT = 1, 10


@dataclass(frozen=True, slots=True)
class Attempt:
    """One way of meshing.

    Attributes
    ----------
    name
        For people.
    surface, volume
        gmsh's numbers of the 2D and 3D algorithm.
    factor
        On all sizes.
    optimise
        gmsh's number of the optimisation of curved elements (0: none, 1: of the bad ones, 2: elastic first).
    fault
        For tests of the chain only: a fault to provoke in the child instead of meshing.
    """

    name: str
    surface: int
    volume: int
    factor: float = 1.0
    optimise: int = 1
    fault: str = ""

    def as_json(self) -> dict[str, Any]:
        return asdict(self)

    @classmethod
    def from_json(cls, data: Mapping[str, Any]) -> Attempt:
        return cls(**{name: data[name] for name in cls.__dataclass_fields__})


CHAIN: tuple[Attempt, ...] = (
    Attempt("frontal surface, HXT volume", _FRONTAL, _HXT),
    Attempt("frontal surface, Delaunay volume", _FRONTAL, _DELAUNAY_3D),
    Attempt("adaptive surface, Delaunay volume", _MESH_ADAPT, _DELAUNAY_3D),
    Attempt("Delaunay surface, HXT volume", _DELAUNAY_2D, _HXT),
    Attempt("frontal surface, Delaunay volume, sizes x 0.8", _FRONTAL, _DELAUNAY_3D, 0.8),
    Attempt("adaptive surface, HXT volume, sizes x 0.7", _MESH_ADAPT, _HXT, 0.7, 2),
)


def gmsh_options(attempt: Attempt) -> dict[str, float]:
    """The kernel's options for an attempt; every option that bears on the mesh and is not a default of gmsh."""
    return {
        "Mesh.Algorithm": attempt.surface,
        "Mesh.Algorithm3D": attempt.volume,
        "Mesh.ElementOrder": 1,  # raised to 2 at the end
        "Mesh.SecondOrderLinear": 0,
        "Mesh.LcIntegrationPrecision": 1e-4,  # of the number of elements along an edge: the default, 1e-9, takes long
        "Mesh.Optimize": 1,
        # HXT works on until it is reached, which takes it minutes where walls are one element thick and it is 0.5.
        "Mesh.OptimizeThreshold": 0.35 if attempt.volume == _HXT else 0.5,
        "Mesh.OptimizeNetgen": 0,  # see `mesher.gmsh_solid`
        "Mesh.HighOrderOptimize": attempt.optimise,
        "Mesh.HighOrderThresholdMin": 0.1,
        # The size field says it all: gmsh's own sources of sizes would be hidden settings.
        "Mesh.MeshSizeExtendFromBoundary": 0,
        "Mesh.MeshSizeFromPoints": 0,
        "Mesh.MeshSizeFromCurvature": 0,
        "Mesh.MaxNumThreads1D": 1,
        "Mesh.MaxNumThreads2D": 1,
        "Mesh.MaxNumThreads3D": 1,
    }
