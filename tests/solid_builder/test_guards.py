"""The builder's own checks fire when the kernel's work is wrong."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import replace
from typing import Any

import pytest
from solid_parts import cut, make_part

from geometry.part import Member, Part, Patch, Section, Station
from geometry.problem import SolidError
from geometry.solid import build as steps
from geometry.solid import build_solid, cuts, fillets, kernel, lofts

BAR = {"depth": 60.0, "width": 40.0}


def test_importing_the_package_loads_no_cad_kernel() -> None:
    code = "import sys, geometry.solid; print(sorted({'OCP', 'cadquery', 'gmsh'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True)
    assert done.stdout.strip() == "[]"


def test_a_tool_of_the_wrong_size_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    whole = cuts.tool_solid
    monkeypatch.setattr(cuts, "tool_solid", lambda t: whole(replace(t, low=0.0)))
    with pytest.raises(SolidError, match=r"arm.h: it removed .* but should remove 3141"):
        build_solid(make_part("rectangle", BAR, 300.0, cuts=(cut("h", "hole", "y", "all", 150, 0, 10),)))


def test_a_body_of_the_wrong_volume_is_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(steps, "gross_volume", lambda member, stretches: 300.0 * 2401.0)
    with pytest.raises(SolidError, match="but sections, cuts and radii give 720300"):
        build_solid(make_part("rectangle", BAR, 300.0))


def test_a_fillet_of_the_wrong_volume_is_refused(monkeypatch: pytest.MonkeyPatch) -> None:
    stations = (Station(150, {"depth": 60}), Station(150, {"depth": 40}, 4.0))
    part = make_part("rectangle", BAR, 300.0, stations=stations)
    build_solid(part)
    area = fillets.fillet_area
    monkeypatch.setattr(fillets, "fillet_area", lambda angle, radius: 3.0 * area(angle, radius))
    with pytest.raises(SolidError, match="a radius of 4 mm does not fit"):
        build_solid(part)


def test_faces_in_another_order_are_noticed(monkeypatch: pytest.MonkeyPatch) -> None:
    listed = kernel.faces_of
    monkeypatch.setattr(kernel, "faces_of", lambda shape: listed(shape)[::-1] if shape.Locked() else listed(shape))
    read = kernel.from_brep

    def locked(data: bytes) -> Any:
        shape = read(data)
        shape.Locked(True)
        return shape

    monkeypatch.setattr(kernel, "from_brep", locked)
    monkeypatch.setattr(kernel, "one_solid", lambda shape, *_: shape)
    with pytest.raises(SolidError, match="face 0 is not the one that was named"):
        build_solid(make_part("rectangle", BAR, 300.0))


def test_open_shells_and_several_solids_are_refused() -> None:
    from OCP.BRepPrimAPI import BRepPrimAPI_MakeBox
    from OCP.TopoDS import TopoDS_Shape

    with pytest.raises(SolidError, match="returned nothing"):
        kernel.one_solid(TopoDS_Shape(), "test")
    with pytest.raises(SolidError, match="0 solids"):
        kernel.one_solid(BRepPrimAPI_MakeBox(1.0, 1.0, 1.0).Shell(), "test")
    with pytest.raises(SolidError, match="inside out"):
        kernel.one_solid(BRepPrimAPI_MakeBox(1.0, 1.0, 1.0).Solid().Reversed(), "test")


def test_a_ruled_face_is_used_only_where_no_plane_fits() -> None:
    from OCP.BRepAdaptor import BRepAdaptor_Surface

    from geometry.outline import Line

    flat = lofts.side_face(Line((0, 0), (10, 0)), Line((2, 5), (8, 5)), 0.0, 100.0)
    twisted = lofts.side_face(Line((0, 0), (10, 0)), Line((2, 5), (8, 7)), 0.0, 100.0)
    corner = lofts.side_face(Line((0, 0), (10, 0)), Line((5, 5), (5, 5)), 0.0, 100.0)
    kinds = [str(BRepAdaptor_Surface(f).GetType()).rpartition("GeomAbs_")[2] for f in (flat, twisted, corner)]
    assert kinds[0] == kinds[2] == "Plane"
    assert kinds[1] != "Plane"
    # Bilinear patch (0,0,0) (0,10,0) (100,8,7) (100,2,5): area from a fine grid of its own parametrisation.
    import numpy as np

    n = 400
    u = (np.arange(n) + 0.5) / n
    U, V = np.meshgrid(u, u)
    along = np.stack([100 + 0 * U, (2 - 0) * (1 - U) + (8 - 10) * U, 5 * (1 - U) + 7 * U])
    across = np.stack([0 * V, 10 * (1 - V) + 6 * V, 0 * (1 - V) + 2 * V])
    area = np.linalg.norm(np.cross(along, across, axis=0), axis=0).mean()
    assert kernel.area_of(twisted)[0] == pytest.approx(area, rel=1e-5)


def test_parts_of_several_members_are_refused() -> None:
    part = make_part("rectangle", BAR, 300.0)
    two = replace(part, members=(*part.members, replace(part.members[0], name="foot")))
    with pytest.raises(SolidError, match="2 given; the solid builder makes parts of one member"):
        build_solid(two)


def test_a_patch_that_lies_wholly_in_a_hole_is_refused() -> None:
    holes = (cut("h", "hole", "z", "all", 150, 0, 20),)
    part: Part = make_part("rectangle", BAR, 300.0, cuts=holes, patches=(Patch("p", "top", 147, 153, (-2, 2)),))
    with pytest.raises(SolidError, match=r"region arm.p: it has no face"):
        build_solid(part)


def test_stations_may_vary_only_what_the_section_names() -> None:
    part = make_part(
        "I", {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0}, 300.0, stations=[(300.0, {"root_radius": 5})]
    )
    with pytest.raises(SolidError, match="stations vary root_radius"):
        build_solid(part)


def test_a_missing_dimension_is_named() -> None:
    member = Member(
        "arm", (0, 0, 0), (100, 0, 0), (0, 0, 1), 0.0, Section("I", {"depth": 60.0, "width": 46.0, "web": 6.0})
    )
    part = replace(make_part("rectangle", BAR), members=(member,))
    with pytest.raises(SolidError, match="shape I needs 'flange'"):
        build_solid(part)
