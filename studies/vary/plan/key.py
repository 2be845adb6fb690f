"""Keys: what a variant is known by.

The key of a variant holds the content of its resolved part, not its text: ``"5 cm"`` and ``"50 mm"`` are one. A
title, a comment, the order of tables that are looked up by name, or a parameter that nothing uses do not count.
"""

from __future__ import annotations

import dataclasses
import hashlib
import json
from collections.abc import Mapping, Sequence
from functools import cache
from typing import Any

from geometry.part import LineLoad, Part

MATTER = ("results", "cadquery", "cadquery-ocp", "gmsh", "scikit-fem", "numpy", "scipy", "pypardiso")
"""Versions that numbers depend on."""


@cache
def _versions() -> tuple[tuple[str, str], ...]:
    from studies.check.run import versions

    found = versions()
    return tuple((name, found[name]) for name in MATTER)


@cache
def _fields(kind: type) -> tuple[str, ...]:
    return tuple(field.name for field in dataclasses.fields(kind))


def content(value: Any) -> Any:
    """Dataclasses of numbers and text as plain lists, each with the name of its class."""
    if isinstance(value, str | float | int) or value is None:
        return value
    if dataclasses.is_dataclass(value):
        kind: type = type(value)
        return [kind.__name__, *(content(getattr(value, name)) for name in _fields(kind))]
    if isinstance(value, Mapping):
        return {str(name): content(item) for name, item in value.items()}
    return [content(item) for item in value]


def digest(*plain: Any) -> str:
    """SHA-256 of plain data, as 64 hexadecimal digits."""
    text = json.dumps(plain, sort_keys=True, separators=(",", ":"), ensure_ascii=False)
    return hashlib.sha256(text.encode()).hexdigest()


def _whole(part: Part) -> dict[str, Any]:
    skip = ("title", "parameters", "source_text")
    return {name: content(getattr(part, name)) for name in _fields(Part) if name not in skip}


def part_key(part: Part, fullest: Part | None = None, kept: Sequence[str] = ()) -> str:
    """Key of a variant: its part, the versions that matter and, where there are any, the part at most material and
    figures that are kept beside the usual ones."""
    return digest(_versions(), _whole(part), _whole(fullest) if fullest else None, sorted(kept))


def shape_key(part: Part) -> str:
    """Key of what the solid and its mesh depend on: members, stretches of line loads (drawn on the faces), accuracy.

    Loads, supports, materials, cases and limits do not count: every face is a region of the mesh, held or not.
    """
    stretches = [[load.name, load.on, load.start, load.end] for load in part.loads if isinstance(load, LineLoad)]
    return digest(_versions(), content(part.members), stretches, part.accuracy)
