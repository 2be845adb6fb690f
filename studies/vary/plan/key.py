"""Keys: what a variant is known by.

The key of a variant holds the content of its resolved part, not its text: ``"5 cm"`` and ``"50 mm"`` are one. A
title, a comment, or a parameter that nothing uses do not count.
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
    kind: type = type(value)
    if kind in _PLAIN:
        return value
    if kind is tuple or kind is list:
        return [item if type(item) in _PLAIN else content(item) for item in value]
    if dataclasses.is_dataclass(kind):
        return [kind.__name__, *[content(getattr(value, name)) for name in _fields(kind)]]
    if isinstance(value, Mapping):
        return {str(name): content(item) for name, item in value.items()}
    raise TypeError(f"{kind.__name__} is nothing that a part is made of")


_PLAIN = frozenset({float, str, int, bool, type(None)})
_encoded = json.JSONEncoder(sort_keys=True, separators=(",", ":"), ensure_ascii=False).encode


def digest(*plain: Any) -> str:
    """SHA-256 of plain data, as 64 hexadecimal digits."""
    return hashlib.sha256(_encoded(plain).encode()).hexdigest()


def keys_of(part: Part, fullest: Part | None = None, kept: Sequence[str] = ()) -> tuple[str, str]:
    """Key and shape key of a variant.

    The key: the part, the versions that matter and, where there are any, the part at most material and figures that are
    kept beside the usual ones. The shape key: what the solid and its mesh depend on, that is members, stretches of line
    loads (drawn on the faces) and accuracy. Loads, supports, materials, cases and limits do not count there, for every
    face is a region of the mesh, held or not.
    """
    members = _encoded(content(part.members))
    stretches = [[load.name, load.on, load.start, load.end] for load in part.loads if isinstance(load, LineLoad)]
    full = _rest(fullest) + [_encoded(content(fullest.members))] if fullest else None
    whole = digest(_versions(), members, _rest(part), full, sorted(kept))
    return whole, digest(_versions(), members, stretches, part.accuracy)


def _rest(part: Part) -> list[Any]:
    """A part's content without its members, and without what no number depends on."""
    skip = ("title", "parameters", "source_text", "members")
    return [content(getattr(part, name)) for name in _fields(Part) if name not in skip]
