"""One variant: the part with a value chosen for everything that the plan varies."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any


@dataclass(frozen=True, slots=True)
class Variant:
    """One point of a plan, ready to be evaluated. JSON throughout: it crosses processes and machines.

    Attributes
    ----------
    number
        Its place in the plan, from 1. Two points may have the same content, and so the same key.
    values
        What is varied -> its value as it would be written in the spec (``"62.5 mm"``, ``"all"``, ``["x", "y"]``).
    numbers
        The same in base units (N, mm, MPa, t, s, rad, K), where it is a quantity.
    data
        The tables of the spec of this variant. Where the plan has tolerances: at least material.
    key
        Content of the resolved part and the versions that its numbers depend on, as 64 hexadecimal digits.
    shape_key
        Content of what the solid and its mesh depend on. Variants that share it can share a mesh.
    fullest
        The tables of the spec at most material, for its mass; None where the plan has no tolerances.
    """

    number: int
    values: Mapping[str, Any]
    numbers: Mapping[str, float]
    data: Mapping[str, Any]
    key: str
    shape_key: str
    fullest: Mapping[str, Any] | None = field(default=None)
