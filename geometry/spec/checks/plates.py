"""Plates that a section is made of: enough geometry to judge a spec, and used for nothing else."""

from __future__ import annotations

from geometry.part import Member, Section


def thickest_plate(member: Member) -> float:
    """Thickness (mm) of the thickest plate at the start or at any station: what strengths go by."""
    thickest = plate_thickness(member.section)
    for station in member.stations:
        dims = {**member.section.dims, **station.dims}
        thickest = max(thickest, plate_thickness(Section(member.section.shape, dims, member.section.outline)))
    return thickest


def plate_thickness(section: Section) -> float:
    """Thickness of the thickest plate of a section; of solid ones the smaller side or the diameter."""
    d = section.dims
    match section.shape:
        case "rectangle":
            return min(d["depth"], d["width"])
        case "round":
            return d["diameter"]
        case "tube" | "box":
            return d["wall"]
        case "I":
            return max(d["web"], d["flange"], d["bottom_flange"])
        case "channel" | "tee":
            return max(d["web"], d["flange"])
        case "angle":
            return d["thickness"]
    if section.outline is None or not section.outline.outer:
        return float("nan")
    points = [edge.start for edge in section.outline.outer]
    return min(max(p[k] for p in points) - min(p[k] for p in points) for k in (0, 1))
