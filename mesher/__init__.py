"""The solid, or the outline of a section, as a mesh whose regions are still named.

Meshing runs in a child process that is bounded in time and memory; only arrays come back. This package
knows gmsh (inside the child only); it knows no physics.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

_HOME = {
    "NamedMesh": "mesher.named_mesh",
    "OutlineMesh": "mesher.outline_mesh",
    "mesh_outlines": "mesher.outline_mesher",
    "mesh_solid": "mesher.solid_mesher",
    "outline_to_skfem": "mesher.skfem_mesh",
    "read_vtu": "mesher.vtu",
    "to_skfem": "mesher.skfem_mesh",
    "write_vtu": "mesher.vtu",
}

__all__ = [
    "NamedMesh",
    "OutlineMesh",
    "mesh_outlines",
    "mesh_solid",
    "outline_to_skfem",
    "read_vtu",
    "to_skfem",
    "write_vtu",
]


def __getattr__(name: str) -> Any:
    # Looked up on first use: a caller that wants one name need not load the rest.
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(_HOME[name]), name)
