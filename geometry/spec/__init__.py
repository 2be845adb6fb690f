"""The spec: what the engineer writes, in numbers for everybody else.

``read_part`` and ``part_from_text`` give the resolved `Part`, or raise `SpecError` with every mistake at
once. The same spec can be written in Python as a `PartSpec`. Nothing here loads a CAD or mesh kernel.
"""

from geometry.spec.model import PartSpec
from geometry.spec.read import part_from_text, read_part

__all__ = ["PartSpec", "part_from_text", "read_part"]
