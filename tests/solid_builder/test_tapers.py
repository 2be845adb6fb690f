"""Tapered members: exact volumes, faces that are planes, cylinders and cones, anchors and placement."""

from __future__ import annotations

import math

import numpy as np
import pytest
from solid_parts import face_types, make_part, region_area, region_centroid

from geometry.part import Station
from geometry.problem import SolidError
from geometry.solid import build_solid

I_SHARP = {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0}


def test_frustum_of_a_rectangle_is_exact() -> None:
    solid = build_solid(
        make_part("rectangle", {"depth": 60, "width": 40}, 300.0, stations=[(300.0, {"depth": 30, "width": 10})])
    )
    assert solid.volume == pytest.approx(300 / 6 * (60 * 40 + 4 * 45 * 25 + 30 * 10), rel=1e-12)
    assert face_types(solid) == {"Plane": 6}
    slope = math.hypot(300, 15)
    assert region_area(solid, "arm.top") == pytest.approx(0.5 * (40 + 10) * slope, rel=1e-12)


def test_tapered_i_with_everything_varying_has_planes_only() -> None:
    far = {"depth": 32, "width": 30, "web": 4, "flange": 5, "bottom_width": 50, "bottom_flange": 6}
    start = I_SHARP | {"bottom_width": 40.0, "bottom_flange": 10.0}
    solid = build_solid(make_part("I", start, 360.0, stations=[(360.0, far)]))
    assert face_types(solid) == {"Plane": 14}

    def area(t: float) -> float:
        d = {k: (1 - t) * start[k] + t * far[k] for k in start}
        return (
            d["width"] * d["flange"]
            + d["bottom_width"] * d["bottom_flange"]
            + d["web"] * (d["depth"] - d["flange"] - d["bottom_flange"])
        )

    assert solid.volume == pytest.approx(60.0 * (area(0) + 4 * area(0.5) + area(1)), rel=1e-12)
    assert region_area(solid, "arm.start") == pytest.approx(area(0))
    assert region_area(solid, "arm.end") == pytest.approx(area(1))


def test_root_radius_along_a_taper_is_an_oblique_cylinder_with_a_circular_section() -> None:
    solid = build_solid(
        make_part("I", I_SHARP | {"root_radius": 6.0}, 360.0, stations=[(360.0, {"depth": 32, "width": 30})])
    )
    assert "BSplineSurface" not in face_types(solid)
    assert face_types(solid)["SurfaceOfExtrusion"] == 4
    sharp = build_solid(make_part("I", I_SHARP, 360.0, stations=[(360.0, {"depth": 32, "width": 30})]))
    # The section keeps four corners of radius 6 at every station.
    assert solid.volume - sharp.volume == pytest.approx(360 * (4 - math.pi) * 36, rel=1e-6)


def test_cone_and_stepless_shaft_have_conical_faces() -> None:
    solid = build_solid(
        make_part("round", {"diameter": 40}, 500.0, stations=[(200.0, {"diameter": 40}), (500.0, {"diameter": 20})])
    )
    assert face_types(solid) == {"Plane": 2, "Cylinder": 2, "Cone": 2}
    cone = math.pi * 300 / 3 * (400 + 200 + 100)
    assert solid.volume == pytest.approx(math.pi * 400 * 200 + cone, rel=1e-9)
    lateral = math.pi * 30 * math.hypot(300, 10)
    assert region_area(solid, "arm.surface") == pytest.approx(2 * math.pi * 20 * 200 + lateral, rel=1e-9)


@pytest.mark.parametrize(("anchor", "straight", "leaning"), [("top", "top", "bottom"), ("bottom", "bottom", "top")])
def test_anchor_keeps_its_side_straight(anchor: str, straight: str, leaning: str) -> None:
    part = make_part(
        "rectangle", {"depth": 60, "width": 40}, 300.0, stations=[(300.0, {"depth": 30})], anchor=anchor, line_at=anchor
    )
    solid = build_solid(part)
    assert np.ptp([solid.faces[i].box[k] for i in solid.regions[f"arm.{straight}"] for k in (2, 5)]) == pytest.approx(
        0.0, abs=1e-6
    )
    sign = -1 if anchor == "top" else 1
    box = solid.faces[solid.regions[f"arm.{leaning}"][0]].box
    assert sorted((abs(box[2]), abs(box[5]))) == pytest.approx([30.0, 60.0], abs=1e-6)
    assert np.sign(box[2]) == sign


def test_round_taper_with_anchored_top_is_still_exact_in_volume() -> None:
    part = make_part("round", {"diameter": 40}, 300.0, stations=[(300.0, {"diameter": 20})], anchor="top")
    solid = build_solid(part)
    assert solid.volume == pytest.approx(math.pi * 100 * (400 + 200 + 100), rel=1e-9)


def test_a_dimension_that_no_station_names_keeps_running() -> None:
    """Depth is named at 0, 100 and 300; width only at 0 and 300: it is linear across the station at 100."""
    solid = build_solid(
        make_part(
            "rectangle",
            {"depth": 60, "width": 40},
            400.0,
            stations=[(100.0, {"depth": 40}), (300.0, {"depth": 40, "width": 10})],
            line_at="origin",
        )
    )
    w = {0: 40.0, 100: 30.0, 300: 10.0}
    volume = 100 / 6 * (60 * 40 + 4 * 50 * 35 + 40 * w[100]) + 40 * 200 * 0.5 * (w[100] + w[300]) + 40 * 10 * 100
    assert solid.volume == pytest.approx(volume, rel=1e-12)


@pytest.mark.parametrize(
    ("word", "y", "z"),
    [
        ("origin", 0, 0),
        ("top", 0, 100),
        ("bottom", 0, -100),
        ("left", 0, 0),
        ("right", 80, 0),
        ("web", 3, 0),
        ("top left", 0, 100),
        ("bottom right", 80, -100),
        ("centroid", 25.60, 0),
    ],
)
def test_line_at_puts_that_point_on_the_line(word: str, y: float, z: float) -> None:
    """UPE 200 (DIN 1026-2): the centroid lies 2.56 cm from the back of the web (reference A5)."""
    dims = {"depth": 200, "width": 80, "web": 6, "flange": 11, "root_radius": 13}
    solid = build_solid(make_part("channel", dims, 100.0, line_at=word))
    assert solid.centroid[1:] == pytest.approx((25.597 - y, -z), abs=0.006)
    assert region_centroid(solid, "arm.left")[1] == pytest.approx(-y, abs=0.006)


def test_radius_that_runs_out_to_zero_is_refused() -> None:
    with pytest.raises(SolidError, match="radius runs"):
        build_solid(make_part("I", I_SHARP | {"root_radius": 6.0}, 360.0, stations=[(360.0, {"root_radius": 0.0})]))


def test_station_off_the_member_is_refused() -> None:
    with pytest.raises(SolidError, match="lies off the member"):
        build_solid(make_part("rectangle", {"depth": 60, "width": 40}, 300.0, stations=[Station(400.0, {"depth": 30})]))
