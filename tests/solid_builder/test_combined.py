"""The whole of it at once: a tapered I-arm with root radius, cuts, patches and a line load; quick and repeatable."""

from __future__ import annotations

import dataclasses
import math
import time

import numpy as np
import pytest
from solid_parts import cut, face_types, make_part, region_area

from geometry.named_solid import NamedSolid
from geometry.part import LineLoad, Part, Patch
from geometry.solid import build_solid


def combined_part() -> Part:
    """A camera arm that carries every kind of feature."""
    cuts = (
        cut("pivot", "hole", "y", "web", 180, 0, 14),
        cut("slot", "slot", "y", "web", 250, 0, 28, 8, turned=0.1),
        cut("window", "opening", "y", "web", 100, 0, 30, 16, corner_radius=3),
        *(
            cut(f"bolts.{k}", "hole", "z", "top flange", 40 + 25 * (k // 2), (-15, 15)[k % 2], 6, group="bolts")
            for k in range(4)
        ),
        cut("foot", "hole", "z", "bottom flange", 40, 14, 6),
    )
    patches = (
        Patch("p1", "top", 150, 200),
        Patch("p2", "top", 160, 230, (-5, 5)),
        Patch("p3", "bottom", 300, 360),
        Patch("p4", "left", 20, 40),
        Patch("p5", "web_left", 300, 320, (-3, 3)),
        Patch("p6", "top", 200, 240, (0, 10)),
        Patch("p7", "right", 20, 40),
        Patch("p8", "web_right", 300, 320, (-3, 3)),
    )
    return make_part(
        "I",
        {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 6.0},
        360.0,
        stations=[(360.0, {"depth": 32.0, "width": 30.0})],
        cuts=cuts,
        patches=patches,
        loads=(LineLoad("rail", "arm.top", 100, 300, (0, 0, -1), (0, 0, -1)),),
    )


@pytest.fixture(scope="module")
def built() -> tuple[NamedSolid, float]:
    """The combined solid and the processor seconds it took."""
    build_solid(make_part("rectangle", {"depth": 10.0, "width": 10.0}, 100.0))
    start = time.process_time()
    solid = build_solid(combined_part())
    return solid, time.process_time() - start


def test_it_takes_a_few_seconds(built: tuple[NamedSolid, float]) -> None:
    assert built[1] < 8.0


def test_volume_and_faces(built: tuple[NamedSolid, float]) -> None:
    solid = built[0]
    assert solid.volume == pytest.approx(solid.volume_estimate, rel=1e-5)
    assert set(face_types(solid)) == {"Plane", "Cylinder", "SurfaceOfExtrusion"}
    assert solid.least_wall == 6.0
    assert solid.sharp_edges == ()


def test_patch_areas_on_sloping_faces(built: tuple[NamedSolid, float]) -> None:
    solid = built[0]
    slope, tip = math.hypot(360, 14) / 360, math.hypot(360, 8) / 360

    def width(x: float) -> float:
        return 46 - 16 * x / 360

    wanted = {
        "arm.p1": 50 * slope * width(175),
        "arm.p2": 700 * slope,
        "arm.p3": 60 * slope * width(330),
        "arm.p4": 2 * 20 * 8 * tip,
        "arm.p5": 120.0,
        "arm.p6": 400 * slope,
        "arm.p7": 2 * 20 * 8 * tip,
        "arm.p8": 120.0,
        "arm.load:rail": 200 * slope * width(200),
        "arm.top": (360 * width(180) - 4 * math.pi * 9) * slope,
        "arm.pivot": math.pi * 14 * 6,
        "arm.window": (60 - 12 + 32 - 12 + 6 * math.pi) * 6,
        "arm.slot": (40 + 8 * math.pi) * 6,
    }
    assert {n: region_area(solid, n) for n in wanted} == pytest.approx(wanted, rel=1e-6)


def test_every_face_has_a_mark_and_the_regions_cover_what_they_should(built: tuple[NamedSolid, float]) -> None:
    solid = built[0]
    assert sum(f.area for f in solid.faces) == pytest.approx(solid.area, rel=1e-9)
    named = {i for ids in solid.regions.values() for i in ids}
    # Only the flanges' inner sides (4) and the root fillets (4) carry no region.
    assert len(solid.faces) - len(named) == 8
    kinds = {h.kind for h in solid.hints}
    assert kinds == {"hole", "fillet", "wall"}
    assert {h.label for h in solid.hints if h.kind == "wall"} == {"web", "top flange", "bottom flange"}
    assert all(h.faces for h in solid.hints)


def test_two_builds_are_identical(built: tuple[NamedSolid, float]) -> None:
    again = build_solid(combined_part())
    for name in (f.name for f in dataclasses.fields(NamedSolid)):
        first, second = getattr(built[0], name), getattr(again, name)
        assert np.array_equal(first, second) if name == "slices" else first == second, name


def test_step_is_readable_and_carries_no_time(
    built: tuple[NamedSolid, float], tmp_path_factory: pytest.TempPathFactory
) -> None:
    from OCP.STEPControl import STEPControl_Reader

    from geometry.solid.kernel import one_solid, volume_of

    path = tmp_path_factory.mktemp("step") / "part.step"
    path.write_bytes(built[0].step)
    reader = STEPControl_Reader()
    reader.ReadFile(str(path))
    reader.TransferRoots()
    assert volume_of(one_solid(reader.OneShape(), "step"))[0] == pytest.approx(built[0].volume, rel=1e-9)
    assert b"FILE_NAME('test part','1970-01-01T00:00:00'" in built[0].step
