"""The solid of a part: exact faces where they exist, every region named by geometry.

`build_solid` turns a `Part` into a `NamedSolid`. The CAD kernel is imported when it is called, not before.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from geometry.named_solid import NamedSolid
    from geometry.part import Part

__all__ = ["build_solid"]


def build_solid(part: Part, early: Callable[[NamedSolid], None] | None = None) -> NamedSolid:
    """The solid of `part` (global axes, mm) with its regions, size hints, sharp edges and slices.

    `early` is given the solid as soon as it can be meshed, yet without STEP text, sharp edges and slices.

    Raises
    ------
    SolidError
        The solid could not be built, is not one valid solid, has not the volume it must have, or a region
        that the part names has no face.
    """
    from geometry.solid.build import build_solid as build

    return build(part, early)
