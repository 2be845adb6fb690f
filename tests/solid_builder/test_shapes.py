"""Prismatic members: volumes against published areas, exact region areas, kinds of faces."""

from __future__ import annotations

import math

import pytest
from solid_parts import face_types, make_part, region_area

from geometry.outline import Arc, Line, Outline
from geometry.solid import build_solid

# EN 10365:2017, EN 10210-2:2006 and DIN 1026-2 dimensions; areas in cm^2 as printed there (references A1 to A8).
TABLE = [
    ("I", {"depth": 300, "width": 150, "web": 7.1, "flange": 10.7, "root_radius": 15}, 53.81, 0.005),
    ("I", {"depth": 200, "width": 100, "web": 5.6, "flange": 8.5, "root_radius": 12}, 28.48, 0.005),
    ("I", {"depth": 190, "width": 200, "web": 6.5, "flange": 10, "root_radius": 18}, 53.83, 0.005),
    ("I", {"depth": 200, "width": 200, "web": 9, "flange": 15, "root_radius": 18}, 78.08, 0.005),
    ("channel", {"depth": 200, "width": 80, "web": 6, "flange": 11, "root_radius": 13}, 29.005, 0.0005),
    ("box", {"depth": 200, "width": 100, "wall": 5, "corner_radius": 7.5, "inner_radius": 5}, 28.73, 0.005),
    ("box", {"depth": 100, "width": 100, "wall": 5, "corner_radius": 7.5, "inner_radius": 5}, 18.73, 0.005),
    ("tube", {"diameter": 114.3, "wall": 5}, 17.17, 0.005),
    ("tube", {"diameter": 219.1, "wall": 6.3}, 42.12, 0.005),
    ("angle", {"depth": 100, "width": 100, "thickness": 10}, 19.00, 1e-9),
]


@pytest.mark.parametrize(("shape", "dims", "area", "printed"), TABLE)
def test_volume_is_the_published_area_times_length(
    shape: str, dims: dict[str, float], area: float, printed: float
) -> None:
    solid = build_solid(make_part(shape, dims, 400.0))
    assert solid.volume / 400.0 / 100.0 == pytest.approx(area, abs=printed)
    assert solid.volume_estimate == pytest.approx(solid.volume, rel=1e-9)
    assert set(face_types(solid)) <= {"Plane", "Cylinder"}


def test_rectangular_cantilever_is_exact() -> None:
    solid = build_solid(make_part("rectangle", {"depth": 60.0, "width": 40.0}, 500.0))
    assert solid.volume == pytest.approx(60 * 40 * 500, rel=1e-12)
    assert solid.area == pytest.approx(2 * (60 * 40 + 60 * 500 + 40 * 500), rel=1e-12)
    assert solid.centroid == pytest.approx((250.0, 0.0, 0.0), abs=1e-9)
    areas = {name: region_area(solid, name) for name in solid.regions}
    assert areas == pytest.approx(
        {
            "arm.start": 2400.0,
            "arm.end": 2400.0,
            "arm.top": 20000.0,
            "arm.bottom": 20000.0,
            "arm.left": 30000.0,
            "arm.right": 30000.0,
        },
        rel=1e-12,
    )
    assert solid.faces[solid.regions["arm.top"][0]].centroid == pytest.approx((250.0, 0.0, 30.0), abs=1e-9)
    assert solid.faces[solid.regions["arm.left"][0]].centroid == pytest.approx((250.0, -20.0, 0.0), abs=1e-9)
    assert solid.faces[solid.regions["arm.top"][0]].box == pytest.approx((0, -20, 30, 500, 20, 30), abs=1e-6)
    assert solid.least_wall == 40.0


def test_regions_of_an_i_section_have_their_areas() -> None:
    dims = {"depth": 300, "width": 150, "web": 7.1, "flange": 10.7, "root_radius": 15}
    solid = build_solid(make_part("I", dims, 100.0))
    wanted = {
        "arm.top": 15000.0,
        "arm.bottom": 15000.0,
        "arm.left": 2140.0,
        "arm.right": 2140.0,
        "arm.web_left": (300 - 2 * 25.7) * 100,
        "arm.web_right": (300 - 2 * 25.7) * 100,
    }
    assert {n: region_area(solid, n) for n in wanted} == pytest.approx(wanted, rel=1e-12)


def test_channel_angle_tee_name_their_faces() -> None:
    channel = build_solid(
        make_part("channel", {"depth": 200, "width": 80, "web": 6, "flange": 11, "root_radius": 13}, 100.0)
    )
    assert region_area(channel, "arm.left") == pytest.approx(20000.0)
    assert channel.regions["arm.left"] == channel.regions["arm.web_left"]
    assert region_area(channel, "arm.web_right") == pytest.approx((200 - 2 * 24) * 100)
    assert region_area(channel, "arm.right") == pytest.approx(2200.0)
    angle = build_solid(
        make_part("angle", {"depth": 100, "width": 80, "thickness": 10, "root_radius": 12, "toe_radius": 6}, 100.0)
    )
    wanted = {"arm.left": 1e4, "arm.bottom": 8e3, "arm.top": 400.0, "arm.right": 400.0}
    assert {n: region_area(angle, n) for n in wanted} == pytest.approx(wanted)
    tee = build_solid(make_part("tee", {"depth": 100, "width": 80, "web": 8, "flange": 10, "root_radius": 6}, 100.0))
    wanted = {"arm.top": 8e3, "arm.bottom": 800.0, "arm.left": 1e3, "arm.web_left": 8400.0}
    assert {n: region_area(tee, n) for n in wanted} == pytest.approx(wanted)


def test_round_and_tube_surface_and_bore() -> None:
    tube = build_solid(make_part("tube", {"diameter": 40, "wall": 5}, 100.0))
    assert region_area(tube, "arm.surface") == pytest.approx(math.pi * 4000)
    assert region_area(tube, "arm.bore") == pytest.approx(math.pi * 3000)
    box = build_solid(make_part("box", {"depth": 60, "width": 40, "wall": 5}, 100.0))
    assert region_area(box, "arm.bore") == pytest.approx(2 * (50 + 30) * 100)


def test_free_outline_with_arcs_and_a_void() -> None:
    # A stadium 40 x 20 with a round void of radius 5 about (-8, 0).
    outer = (
        Line((-10.0, -10.0), (10.0, -10.0)),
        Arc((10.0, -10.0), (10.0, 10.0), (10.0, 0.0), True),
        Line((10.0, 10.0), (-10.0, 10.0)),
        Arc((-10.0, 10.0), (-10.0, -10.0), (-10.0, 0.0), True),
    )
    void = (Arc((-3.0, 0.0), (-13.0, 0.0), (-8.0, 0.0), False), Arc((-13.0, 0.0), (-3.0, 0.0), (-8.0, 0.0), False))
    part = make_part("outline", {}, 200.0, outline=Outline(outer, (void,)), line_at="origin")
    solid = build_solid(part)
    area = 400 + math.pi * 100 - math.pi * 25
    assert solid.volume == pytest.approx(200 * area, rel=1e-9)
    assert solid.centroid == pytest.approx((100.0, 25 * math.pi * 8 / area, 0.0), abs=1e-6)
    assert region_area(solid, "arm.top") == pytest.approx(4000.0)
    assert "arm.bore" not in solid.regions
