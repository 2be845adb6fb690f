"""The job that makes a mesh."""

from __future__ import annotations

import time
from pathlib import Path
from typing import Any

from solver_timing import meshes
from solver_timing.child import Tell
from solver_timing.shapes import SHAPES


def mesh(job: dict[str, Any], tell: Tell) -> None:
    """Make the mesh of ``shape`` and ``size`` and write it to ``mesh``."""
    begun = time.perf_counter()
    made = meshes.make(SHAPES[job["shape"]], job["size"])
    meshes.save(made, Path(job["mesh"]))
    tell(
        seconds=time.perf_counter() - begun,
        unknowns=made.nodes.size,
        tets=made.tets.shape[1],
        quality=float(made.quality.min()),
    )
