"""Named solids for the mesher's tests, straight from CadQuery."""

from __future__ import annotations

import io
from collections.abc import Sequence
from dataclasses import replace

import cadquery as cq

from geometry.named_solid import FaceMark, NamedSolid, SizeHint


def named(shape: cq.Workplane, hints: Sequence[SizeHint] = (), least_wall: float = 0.0, **regions: str) -> NamedSolid:
    """`regions`: name -> CadQuery face selector; ``__`` in a name stands for a dot."""
    solid = shape.val()
    faces = solid.Faces()
    marks = []
    for face in faces:
        box, centre = face.BoundingBox(), face.Center()
        marks.append(
            FaceMark(face.Area(), centre.toTuple(), (box.xmin, box.ymin, box.zmin, box.xmax, box.ymax, box.zmax))
        )
    named_regions = {}
    for name, selector in regions.items():
        chosen = shape.faces(selector).vals()
        named_regions[name.replace("__", ".")] = tuple(
            i for i, face in enumerate(faces) if any(face.isSame(c) for c in chosen)
        )
    buffer = io.BytesIO()
    solid.exportBrep(buffer)
    return NamedSolid(
        brep=buffer.getvalue(),
        step=b"",
        faces=tuple(marks),
        regions=named_regions,
        volume=solid.Volume(),
        area=solid.Area(),
        centroid=solid.Center().toTuple(),
        volume_estimate=solid.Volume(),
        hints=tuple(hints),
        least_wall=least_wall,
    )


def bar(length: float = 200.0, width: float = 20.0, depth: float = 30.0) -> NamedSolid:
    shape = cq.Workplane("XY").box(length, width, depth, centered=(False, True, True))
    return named(shape, least_wall=min(width, depth), arm__start="<X", arm__end=">X", arm__top=">Z", arm__bottom="<Z")


def rounded_bar(radius: float = 1.0) -> NamedSolid:
    shape = cq.Workplane("XY").box(60.0, 20.0, 30.0).edges("|X").fillet(radius)
    solid = named(shape, least_wall=20.0, arm__start="<X", arm__end=">X", arm__top=">Z")
    return with_region(solid, "arm.roundings", _indices(shape, "CYLINDER", radius))


def _indices(shape: cq.Workplane, kind: str, radius: float) -> tuple[int, ...]:
    """Faces of one kind (``CYLINDER``) with one radius."""
    found = []
    for i, face in enumerate(shape.val().Faces()):
        if face.geomType() == kind and abs(face._geomAdaptor().Cylinder().Radius() - radius) < 1e-6:
            found.append(i)
    return tuple(found)


def plate_with_hole(
    length: float = 120.0, width: float = 40.0, thickness: float = 5.0, diameter: float = 12.0
) -> NamedSolid:
    shape = cq.Workplane("XY").box(length, width, thickness).faces(">Z").workplane().hole(diameter)
    faces = _indices(shape, "CYLINDER", diameter / 2)
    hint = SizeHint("hole", "hole pin", faces, diameter / 2, thickness)
    solid = named(shape, [hint], thickness, plate__start="<X", plate__end=">X", plate__top=">Z")
    return with_region(solid, "plate.pin", faces)


def with_region(solid: NamedSolid, name: str, faces: Sequence[int]) -> NamedSolid:
    return replace(solid, regions={**solid.regions, name: tuple(faces)})


def round_bar(length: float = 150.0, diameter: float = 20.0) -> NamedSolid:
    shape = cq.Workplane("YZ").circle(diameter / 2).extrude(length)
    solid = named(shape, least_wall=diameter, rod__start="<X", rod__end=">X")
    return with_region(solid, "rod.surface", _indices(shape, "CYLINDER", diameter / 2))


def tube(length: float = 200.0, diameter: float = 60.0, wall: float = 4.0) -> NamedSolid:
    shape = cq.Workplane("YZ").circle(diameter / 2).circle(diameter / 2 - wall).extrude(length)
    solid = named(shape, least_wall=wall, rod__start="<X", rod__end=">X")
    solid = with_region(solid, "rod.surface", _indices(shape, "CYLINDER", diameter / 2))
    return with_region(solid, "rod.bore", _indices(shape, "CYLINDER", diameter / 2 - wall))


def stepped_shaft(first: float = 40.0, second: float = 25.0, fillet: float = 4.0) -> NamedSolid:
    shape = cq.Workplane("YZ").circle(first / 2).extrude(80).faces(">X").workplane().circle(second / 2).extrude(80)
    edges = shape.edges(cq.selectors.BoxSelector((79, -second, -second), (81, second, second)))
    inner = [e for e in edges.vals() if abs(e.radius() - second / 2) < 1e-6]
    shape = cq.Workplane(obj=shape.val().fillet(fillet, inner))
    torus = tuple(i for i, f in enumerate(shape.val().Faces()) if f.geomType() == "TORUS")
    hint = SizeHint("fillet", "shoulder at 80 mm", torus, fillet, second)
    return named(shape, [hint], second, rod__start="<X", rod__end=">X")


def camera_arm() -> NamedSolid:
    """Tapered I, depth 60 to 32, width 46, 360 long, web 6, flange 8, root radius 6, three holes of 14 in the web."""
    length, d0, d1, width, web, flange, root = 360.0, 60.0, 32.0, 46.0, 6.0, 8.0, 6.0

    def slab(points: list[tuple[float, float]], thick: float) -> cq.Workplane:
        return cq.Workplane("XZ").polyline(points).close().extrude(thick / 2, both=True)

    middle = slab([(0, -d0 / 2), (length, -d1 / 2), (length, d1 / 2), (0, d0 / 2)], web)
    top = slab([(0, d0 / 2 - flange), (length, d1 / 2 - flange), (length, d1 / 2), (0, d0 / 2)], width)
    shape = middle.union(top).union(top.mirror("XY"))
    roots = [
        e
        for e in shape.edges().vals()
        if e.geomType() == "LINE"
        and e.Length() > 300
        and abs(abs(e.Center().y) - web / 2) < 1e-6
        and abs(e.Center().z) < (d0 + d1) / 4 - 1
    ]
    shape = cq.Workplane(obj=shape.val().fillet(root, roots))
    shape = shape.cut(cq.Workplane("XZ").pushPoints([(60, 0), (150, 0), (240, 0)]).circle(7).extrude(50, both=True))
    holes = _indices(shape, "CYLINDER", 7.0)
    hint = SizeHint("hole", "hole row", holes, 7.0, web)
    solid = named(shape, [hint], web, arm__start="<X", arm__end=">X")
    return with_region(solid, "arm.row", holes)
