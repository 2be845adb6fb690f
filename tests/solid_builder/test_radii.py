"""Shoulder fillets and edge radii: exact volumes by Pappus, the right edges, refusals with the largest that fits."""

from __future__ import annotations

import math
import re

import pytest
from solid_parts import cut, face_types, make_part, region_area

from geometry.part import EdgeRadius, Station
from geometry.problem import SolidError
from geometry.solid import build_solid
from geometry.solid.fillets import fillet_area

BAR = {"depth": 60.0, "width": 40.0}


def step(at: float, before: dict[str, float], after: dict[str, float], radius: float) -> tuple[Station, Station]:
    """Two stations at one place."""
    return Station(at, before), Station(at, after, radius)


def test_area_of_a_fillet_in_a_right_angle() -> None:
    assert fillet_area(-math.pi / 2, 3.0) == pytest.approx((1 - math.pi / 4) * 9)


def test_flat_shoulder_has_the_exact_volume_and_named_faces() -> None:
    solid = build_solid(make_part("rectangle", BAR, 500.0, stations=step(200, {"depth": 60}, {"depth": 40}, 4.0)))
    assert solid.volume == pytest.approx(40 * (60 * 200 + 40 * 300) + 2 * 40 * (4 - math.pi) * 4, rel=1e-9)
    assert region_area(solid, "arm.top") == pytest.approx(40 * (200 + 296), rel=1e-9)
    (hint,) = [h for h in solid.hints if h.kind == "fillet"]
    assert (hint.label, hint.radius) == ("shoulder at 200 mm", 4.0)
    assert sum(solid.faces[i].area for i in hint.faces) == pytest.approx(2 * 40 * math.pi * 2, rel=1e-9)
    assert solid.sharp_edges == ()


def test_shaft_shoulder_is_a_torus_with_the_volume_of_pappus() -> None:
    solid = build_solid(
        make_part("round", {"diameter": 60.0}, 500.0, stations=step(200, {"diameter": 60}, {"diameter": 40}, 4.0))
    )
    plain = math.pi * (900 * 200 + 400 * 300)
    # Square r x r less the quarter circle, both turned about the axis: centroids r/2 and r - 4r/3pi from the shaft.
    r, a = 4.0, 20.0
    ring = 2 * math.pi * (r * r * (a + r / 2) - math.pi * r * r / 4 * (a + r - 4 * r / (3 * math.pi)))
    assert solid.volume == pytest.approx(plain + ring, rel=1e-9)
    assert face_types(solid)["Torus"] >= 1
    (hint,) = [h for h in solid.hints if h.kind == "fillet"]
    assert all(solid.faces[i].centroid[0] < 204 for i in hint.faces)


def test_sharp_step_is_a_hint_and_a_sharp_edge() -> None:
    solid = build_solid(
        make_part("rectangle", BAR, 500.0, stations=step(200, {"depth": 60}, {"depth": 40, "width": 30}, 0.0))
    )
    assert {e.label for e in solid.sharp_edges} == {"sharp step at 200 mm"}
    assert len(solid.sharp_edges) == 4
    (hint,) = [h for h in solid.hints if h.kind == "step"]
    assert sum(solid.faces[i].area for i in hint.faces) == pytest.approx(60 * 40 - 40 * 30)
    assert region_area(solid, "arm.top") == pytest.approx(200 * 40 + 300 * 30)


def test_step_in_depth_and_width_with_a_radius_all_round() -> None:
    stations = (*step(200, {"depth": 60}, {"depth": 40, "width": 30}, 3.0), Station(500, {"depth": 30}))
    solid = build_solid(make_part("rectangle", BAR, 500.0, stations=stations))
    assert len(next(h for h in solid.hints if h.label == "shoulder at 200 mm").faces) == 4
    assert solid.sharp_edges == ()


@pytest.mark.parametrize("edges", ["top left", "top right", "bottom left", "bottom right"])
def test_radius_on_one_edge_along_the_member(edges: str) -> None:
    solid = build_solid(make_part("rectangle", BAR, 300.0, edge_radii=(EdgeRadius(edges, 5.0),)))
    assert solid.volume == pytest.approx(300 * (2400 - (1 - math.pi / 4) * 25), rel=1e-9)
    words = edges.split()
    assert solid.centroid[2] * (1 if "bottom" in words else -1) > 0
    assert solid.centroid[1] * (1 if "left" in words else -1) > 0
    (hint,) = [h for h in solid.hints if h.kind == "rim"]
    assert hint.label == f"edge radius {edges}"


def test_radius_round_the_end_of_a_bar() -> None:
    solid = build_solid(make_part("round", {"diameter": 40.0}, 300.0, edge_radii=(EdgeRadius("end", 3.0),)))
    r, a = 3.0, 20.0
    ring = 2 * math.pi * (r * r * (a - r / 2) - math.pi * r * r / 4 * (a - r + 4 * r / (3 * math.pi)))
    assert solid.volume == pytest.approx(math.pi * 400 * 300 - ring, rel=1e-9)
    assert region_area(solid, "arm.end") == pytest.approx(math.pi * 17**2)


def test_radius_on_both_rims_of_a_hole() -> None:
    cuts = (cut("h", "hole", "y", "all", 150, 0, 20),)
    solid = build_solid(make_part("rectangle", BAR, 300.0, cuts=cuts, edge_radii=(EdgeRadius("h", 2.0),)))
    r, a = 2.0, 10.0
    ring = 2 * math.pi * (r * r * (a + r / 2) - math.pi * r * r / 4 * (a + r - 4 * r / (3 * math.pi)))
    assert solid.volume == pytest.approx(40 * (60 * 300 - math.pi * 100) - 2 * ring, rel=1e-9)
    assert region_area(solid, "arm.h") == pytest.approx(math.pi * 20 * 36, rel=1e-9)


def test_a_radius_that_does_not_fit_says_which_edges_and_what_fits() -> None:
    stations = step(200, {"depth": 60}, {"depth": 40}, 15.0)
    with pytest.raises(SolidError, match="shoulder at 200 mm: a radius of 15 mm does not fit on 2 edges") as caught:
        build_solid(make_part("rectangle", BAR, 500.0, stations=stations))
    fits = float(re.search(r"largest that fits is about ([\d.]+) mm", str(caught.value)).group(1))  # type: ignore[union-attr]
    assert 9.0 < fits <= 10.0


def test_unknown_edges_are_refused() -> None:
    with pytest.raises(SolidError, match="'middle': no such edges; allowed: start, end"):
        build_solid(make_part("rectangle", BAR, 300.0, edge_radii=(EdgeRadius("middle", 2.0),)))


def test_edge_radius_on_a_taper_keeps_its_radius_in_the_section() -> None:
    dims = {"depth": 60.0, "width": 40.0, "web": 6.0, "flange": 8.0, "root_radius": 4.0}
    radii = (EdgeRadius("bottom left", 2.0), EdgeRadius("right top", 3.0))
    more = {"stations": [(300.0, {"depth": 40.0})], "line_at": "top", "anchor": "top"}
    plain = build_solid(make_part("tee", dims, 300.0, **more))
    solid = build_solid(make_part("tee", dims, 300.0, edge_radii=radii, **more))
    assert plain.volume - solid.volume == pytest.approx(300 * (1 - math.pi / 4) * (4 + 9), rel=1e-6)
    assert region_area(solid, "arm.bottom") == pytest.approx(4.0 * math.hypot(300, 20), rel=1e-9)
    assert {h.label for h in solid.hints if h.kind == "rim"} == {"edge radius bottom left", "edge radius top right"}


def test_edge_radius_replaces_the_corner_radius_and_the_end_rim_follows_it() -> None:
    radii = (EdgeRadius("top left", 8.0), EdgeRadius("end", 2.0))
    solid = build_solid(make_part("rectangle", BAR | {"corner_radius": 3.0}, 300.0, edge_radii=radii[:1]))
    assert solid.volume == pytest.approx(300 * (2400 - (1 - math.pi / 4) * (64 + 3 * 9)), rel=1e-9)
    both = build_solid(make_part("rectangle", BAR | {"corner_radius": 3.0}, 300.0, edge_radii=radii))
    # The end face is the section less 2 mm all round: radii 6 and 1.
    assert region_area(both, "arm.end") == pytest.approx(56 * 36 - (1 - math.pi / 4) * (36 + 3), rel=1e-6)


def test_edge_radius_that_does_not_fit_says_what_does() -> None:
    with pytest.raises(
        SolidError, match="top left: a radius of 50 mm does not fit; the largest that fits is about 40 mm"
    ):
        build_solid(make_part("rectangle", BAR, 300.0, edge_radii=(EdgeRadius("top left", 50.0),)))


def test_hole_through_a_filleted_shoulder() -> None:
    stations = step(200, {"depth": 60}, {"depth": 40}, 4.0)
    solid = build_solid(
        make_part("rectangle", BAR, 500.0, stations=stations, cuts=(cut("h", "hole", "z", "all", 203, 0, 10),))
    )
    assert region_area(solid, "arm.h") > math.pi * 10 * 40


def test_faces_flush_past_a_filleted_step_keep_their_names() -> None:
    """Flange tips and root fillets that a shoulder fillet touches are still whole regions."""
    dims = {"depth": 80.0, "width": 50.0, "web": 8.0, "flange": 9.0, "root_radius": 6.0}
    solid = build_solid(make_part("I", dims, 480.0, stations=step(200, {"depth": 80}, {"depth": 64}, 4.0)))
    fillet = (1 - math.pi / 4) * 16
    # Each tip: 9 mm over both stretches and the two corners that the shoulder fillets add.
    assert region_area(solid, "arm.left") == pytest.approx(2 * (9 * 480 + 2 * fillet), rel=1e-6)
    assert region_area(solid, "arm.right") == pytest.approx(region_area(solid, "arm.left"), rel=1e-9)
    (root,) = [h for h in solid.hints if h.label == "root fillet"]
    assert len(root.faces) == 8
    (shoulder,) = [h for h in solid.hints if h.label == "shoulder at 200 mm"]
    assert all(195.9 < solid.faces[i].box[0] and solid.faces[i].box[3] < 204.1 for i in shoulder.faces)
