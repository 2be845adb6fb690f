"""Patches and line-load stretches: split faces with exact areas, one solid left, empty regions refused."""

from __future__ import annotations

import math
from typing import Any

import pytest
from solid_parts import cut, make_part, region_area, region_centroid

from geometry.part import LineLoad, Part, Patch, RegionLoad, Station, Support
from geometry.problem import SolidError
from geometry.solid import build_solid

BAR = {"depth": 60.0, "width": 40.0}
I_DIMS = {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 6.0}


def line_load(on: str, start: float, end: float) -> LineLoad:
    return LineLoad("rail", on, start, end, (0.0, 0.0, -1.0), (0.0, 0.0, -1.0))


def test_patches_on_a_bar_have_their_areas_and_places() -> None:
    patches = (
        Patch("pad", "top", 50, 80),
        Patch("spot", "top", 100, 120, (-5, 10)),
        Patch("side", "left", 10, 30, (0, 20)),
    )
    solid = build_solid(make_part("rectangle", BAR, 300.0, patches=patches))
    assert region_area(solid, "arm.pad") == pytest.approx(30 * 40, rel=1e-9)
    assert region_area(solid, "arm.spot") == pytest.approx(20 * 15, rel=1e-9)
    assert region_centroid(solid, "arm.spot") == pytest.approx((110, 2.5, 30), abs=1e-6)
    assert region_centroid(solid, "arm.side") == pytest.approx((20, -20, 10), abs=1e-6)
    assert region_area(solid, "arm.top") == pytest.approx(300 * 40, rel=1e-9)
    assert len(solid.regions["arm.top"]) >= 4
    assert solid.volume == pytest.approx(300 * 2400, rel=1e-12)


def test_patch_to_the_very_end_and_over_the_whole_face() -> None:
    solid = build_solid(
        make_part("rectangle", BAR, 300.0, patches=(Patch("a", "top", 200, 300), Patch("b", "bottom", 0, 300)))
    )
    assert region_area(solid, "arm.a") == pytest.approx(4000)
    assert solid.regions["arm.b"] == solid.regions["arm.bottom"]


def test_overlapping_patches_share_a_face() -> None:
    patches = (Patch("a", "top", 50, 150), Patch("b", "top", 100, 200))
    solid = build_solid(make_part("rectangle", BAR, 300.0, patches=patches))
    assert region_area(solid, "arm.a") == pytest.approx(4000)
    assert region_area(solid, "arm.b") == pytest.approx(4000)
    shared = set(solid.regions["arm.a"]) & set(solid.regions["arm.b"])
    assert sum(solid.faces[i].area for i in shared) == pytest.approx(2000)


def test_line_load_on_a_taper_goes_over_two_stretches_and_a_hole() -> None:
    stations = (Station(150, {"depth": 40}), Station(300, {"depth": 40, "width": 20}))
    hole = cut("h", "hole", "z", "all", 100, 0, 12)
    part = make_part(
        "rectangle",
        BAR,
        300.0,
        stations=stations,
        cuts=(hole,),
        loads=(line_load("arm.top", 50, 250),),
        line_at="origin",
    )
    solid = build_solid(part)

    def width(x: float) -> float:
        return 40 - 20 * x / 300

    steep = math.hypot(150, 10) / 150
    area = 100 * steep * 0.5 * (width(50) + width(150)) - math.pi * 36 * steep + 100 * 0.5 * (width(150) + width(250))
    assert region_area(solid, "arm.load:rail") == pytest.approx(area, rel=1e-6)


def test_line_load_on_a_round_bar_is_a_strip_all_round() -> None:
    solid = build_solid(make_part("round", {"diameter": 40.0}, 300.0, loads=(line_load("arm.surface", 50, 250),)))
    assert region_area(solid, "arm.load:rail") == pytest.approx(math.pi * 40 * 200, rel=1e-9)
    assert region_area(solid, "arm.surface") == pytest.approx(math.pi * 40 * 300, rel=1e-9)


def test_patch_across_a_step_leaves_the_shoulder_out() -> None:
    stations = (Station(150, {"depth": 60}), Station(150, {"depth": 40}))
    solid = build_solid(make_part("rectangle", BAR, 300.0, stations=stations, patches=(Patch("p", "top", 100, 200),)))
    assert region_area(solid, "arm.p") == pytest.approx(4000)


def test_patches_on_both_sides_of_the_web() -> None:
    patches = (Patch("l", "web_left", 50, 100, (-8, 8)), Patch("r", "web_right", 50, 100))
    solid = build_solid(make_part("I", I_DIMS, 300.0, patches=patches))
    assert region_area(solid, "arm.l") == pytest.approx(50 * 16, rel=1e-9)
    assert region_area(solid, "arm.r") == pytest.approx(50 * 32, rel=1e-9)
    assert region_centroid(solid, "arm.l")[1] == pytest.approx(-3)


@pytest.mark.parametrize(
    ("patch", "message"),
    [
        (Patch("p", "bore", 50, 100), "no face 'bore'"),
        (Patch("p", "top", 100, 100), "no stretch of the member"),
        (Patch("p", "top", 250, 350), "no stretch of the member"),
        (Patch("p", "top", 50, 100, (30, 40)), "region arm.p: it has no face"),
        (Patch("p", "top", 50, 100, (5, -5)), "low and a high value"),
    ],
)
def test_bad_patches_are_refused_by_name(patch: Patch, message: str) -> None:
    with pytest.raises(SolidError, match=message):
        build_solid(make_part("rectangle", BAR, 300.0, patches=(patch,)))


@pytest.mark.parametrize("field", ["supports", "loads"])
def test_a_support_or_load_on_a_missing_region_is_refused(field: str) -> None:
    plain = make_part("rectangle", BAR, 300.0)
    wrong: Any = Support("wall", "arm.bore", {"x": 0.0}) if field == "supports" else RegionLoad("pull", "arm.bore")
    part = Part(
        plain.title, plain.material, plain.members, *(((wrong,), ()) if field == "supports" else ((), (wrong,))), ()
    )
    with pytest.raises(SolidError, match=f"{field}.{wrong.name}: region arm.bore has no face"):
        build_solid(part)
