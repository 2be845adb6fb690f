"""Names of the regions that a member leaves on the part."""

from __future__ import annotations

from geometry.outline import Line, Outline
from geometry.part import Member

FACES: dict[str, tuple[str, ...]] = {
    "rectangle": ("top", "bottom", "left", "right"),
    "round": ("surface",),
    "tube": ("surface", "bore"),
    "box": ("top", "bottom", "left", "right", "bore"),
    "I": ("top", "bottom", "left", "right", "web_left", "web_right"),
    "channel": ("top", "bottom", "left", "right", "web_left", "web_right"),
    "angle": ("top", "bottom", "left", "right"),
    "tee": ("top", "bottom", "left", "right", "web_left", "web_right"),
    "outline": (),
}
"""Faces along the member, by shape (an outline has those of its flat extreme sides)."""

FLAT = ("top", "bottom", "left", "right", "web_left", "web_right")
"""Faces that are plane when the shape has them."""


def faces_of(member: Member) -> tuple[str, ...]:
    """Faces along the member, without its name."""
    if member.section.outline is not None:
        return _flat_sides(member.section.outline)
    return FACES[member.section.shape]


def regions_of(member: Member) -> tuple[str, ...]:
    """Every region of the member, with its name: ``arm.start``, ``arm.top``, ``arm.hole1`` ..."""
    cuts = dict.fromkeys(name for cut in member.cuts for name in (cut.group, cut.name))
    names = ("start", "end", *faces_of(member), *cuts, *(patch.name for patch in member.patches))
    return tuple(f"{member.name}.{name}" for name in dict.fromkeys(names))


def is_flat(member: Member, region: str) -> bool:
    """Whether a region (without the member's name) is plane: ends, flat faces, patches on them."""
    face = next((patch.face for patch in member.patches if patch.name == region), region)
    return face in ("start", "end", *FLAT)


def _flat_sides(outline: Outline) -> tuple[str, ...]:
    """Sides of the bounding rectangle on which the outline has a straight edge."""
    points = [edge.start for edge in outline.outer]
    if not points:
        return ()
    sides = {
        "top": (1, max(p[1] for p in points)),
        "bottom": (1, min(p[1] for p in points)),
        "left": (0, min(p[0] for p in points)),
        "right": (0, max(p[0] for p in points)),
    }
    scale = max(abs(c) for p in points for c in p)
    return tuple(
        name
        for name, (k, level) in sides.items()
        if any(isinstance(e, Line) and max(abs(e.start[k] - level), abs(e.end[k] - level)) <= 1e-9 * scale
               for e in outline.outer)
    )  # fmt: skip
