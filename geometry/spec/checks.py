"""Checks of a spec that need values, or more than one field."""

from __future__ import annotations

from collections.abc import Collection

from geometry.part import Part
from geometry.spec.model import PartSpec
from geometry.spec.values import Values


def check_part(values: Values, spec: PartSpec, part: Part, removed: Collection[str]) -> None:
    """Keep every mistake that can be seen in the resolved part."""
    if len(part.members) > 1:
        values.problem("members", ", ".join(m.name for m in part.members), "one member",
                       "Joined members come in a later version: describe one of them")  # fmt: skip
