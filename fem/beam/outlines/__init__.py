"""The beam model's own outlines: each shape, along a member, and with what cuts leave of it.

Made apart from the solid builder on purpose: only the types are shared.
"""

from __future__ import annotations

from fem.beam.outlines.loops import Corner, OutlineError, moved, rounded_polygon, turned
from fem.beam.outlines.member import dims_at, dims_slope, line_offset, member_outline
from fem.beam.outlines.net_sections import chord, net_section, notch_depth
from fem.beam.outlines.shapes import outline_of, with_defaults

__all__ = [
    "Corner",
    "OutlineError",
    "chord",
    "dims_at",
    "dims_slope",
    "line_offset",
    "member_outline",
    "moved",
    "net_section",
    "notch_depth",
    "outline_of",
    "rounded_polygon",
    "turned",
    "with_defaults",
]
