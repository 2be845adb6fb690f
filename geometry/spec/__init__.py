"""The spec: what the engineer writes, in numbers for everybody else.

``read_part`` and ``part_from_text`` give the resolved `Part`, or raise `SpecError` with every mistake at
once. The same spec can be written in Python as a `PartSpec`. Nothing here loads a CAD or mesh kernel.
"""

from typing import Any

from geometry.spec.model import PartSpec
from geometry.spec.read import part_from_spec, part_from_text, read_part, with_parameters

__all__ = [
    "PartSpec",
    "json_schema",
    "part_from_spec",
    "part_from_text",
    "read_part",
    "spec_reference",
    "with_parameters",
]


def json_schema() -> dict[str, Any]:
    """JSON schema of the TOML file, for editors."""
    from geometry.spec.reference import json_schema as made

    return made()


def spec_reference() -> str:
    """The reference of the spec, as Markdown."""
    from geometry.spec.reference import spec_reference as made

    return made()
