"""What cuts leave of a section."""

from __future__ import annotations

from fem.beam.outlines.loops import OutlineError
from fem.beam.outlines.member import member_outline
from geometry.outline import Outline
from geometry.part import Member


def net_section(member: Member, x: float) -> tuple[Outline, ...]:
    """The pieces of the section that are left at `x`."""
    if any(abs(x - cut.at) < max(cut.length, cut.depth) for cut in member.cuts):
        raise OutlineError("cuts are not taken off yet")
    return (member_outline(member, x),)
