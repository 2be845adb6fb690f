"""What the part *is*: the spec, its quantities and sections, the solid, and the named regions on it.

Knows CadQuery (in `geometry.solid` only); knows no mesh and no physics. Importing this package, or
`geometry.spec`, loads neither the CAD kernel nor the mesher.

`geometry.spec`    TOML or Python objects to a resolved `Part`
`geometry.solid`   a `Part` to a `NamedSolid`
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from geometry.budget import Budget
    from geometry.outline import Arc, Line, Outline
    from geometry.part import Part
    from geometry.problem import HaunchError, MeshError, Problem, RunError, SolidError, SolveError, SpecError

__all__ = [
    "Arc",
    "Budget",
    "HaunchError",
    "Line",
    "MeshError",
    "Outline",
    "Part",
    "Problem",
    "RunError",
    "SolidError",
    "SolveError",
    "SpecError",
]

_HOME = {"Arc": "outline", "Budget": "budget", "Line": "outline", "Outline": "outline", "Part": "part"}


def __getattr__(name: str) -> Any:
    # Looked up on first use: the command line's help needs none of them.
    if name not in __all__:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f"geometry.{_HOME.get(name, 'problem')}"), name)
