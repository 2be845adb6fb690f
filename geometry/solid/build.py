"""From a `Part` to a `NamedSolid`, one step after the other."""

from __future__ import annotations

from geometry.named_solid import NamedSolid
from geometry.part import Part
from geometry.problem import SolidError
from geometry.solid import kernel
from geometry.solid.body import pieces_of, run_body, runs_of
from geometry.solid.frame import member_frame
from geometry.solid.regions import name_faces
from geometry.solid.stretches import stretches_of


def build_solid(part: Part) -> NamedSolid:
    """See `geometry.solid.build_solid`."""
    if len(part.members) != 1:
        raise SolidError(f"members: {len(part.members)} given; the solid builder makes parts of one member.")
    member = part.members[0]
    frame = member_frame(member)
    pieces = pieces_of(member, stretches_of(member, frame.length))
    runs = runs_of(pieces)
    solid = run_body(runs[0], f"member {member.name}")
    regions = name_faces(solid, member, pieces)
    world = kernel.one_solid(kernel.placed(solid, frame), "placing the solid")
    data = kernel.brep_bytes(world)
    again = kernel.one_solid(kernel.from_brep(data), "reading the solid back")
    volume, centroid = kernel.volume_of(again)
    return NamedSolid(
        brep=data, step=kernel.step_bytes(world, part.title),
        faces=tuple(kernel.face_mark(f) for f in kernel.faces_of(again)),
        regions=regions, volume=volume, area=kernel.area_of(again)[0],
        centroid=(float(centroid[0]), float(centroid[1]), float(centroid[2])), volume_estimate=volume,
    )
