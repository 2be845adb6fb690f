"""Cuts: exact volumes, only the wall that was meant, named faces, and refusals that say what is wrong."""

from __future__ import annotations

import functools
import math
from typing import Any

import numpy as np
import pytest
from solid_parts import cut, make_part, region_area

from geometry.problem import SolidError
from geometry.solid import build_solid

I_DIMS = {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 6.0}
BOX = {"depth": 60.0, "width": 40.0, "wall": 5.0}
BAR = {"depth": 60.0, "width": 40.0}


@functools.cache
def plain_volume(shape: str, dims: tuple[tuple[str, float], ...]) -> float:
    """Volume of the uncut member, 300 long (its own checks are in test_shapes)."""
    return build_solid(make_part(shape, dict(dims), 300.0)).volume


def removed(shape: str, dims: dict[str, float], *cuts: Any) -> tuple[float, Any]:
    """Volume that cuts take from a member 300 long, and the solid."""
    solid = build_solid(make_part(shape, dims, 300.0, cuts=cuts))
    return plain_volume(shape, tuple(dims.items())) - solid.volume, solid


def test_hole_in_the_web_takes_a_cylinder_of_the_web_only() -> None:
    gone, solid = removed("I", I_DIMS, cut("bore", "hole", "y", "web", 150, 2, 14))
    assert gone == pytest.approx(math.pi * 49 * 6, rel=1e-9)
    assert region_area(solid, "arm.bore") == pytest.approx(math.pi * 14 * 6, rel=1e-9)
    (hint,) = [h for h in solid.hints if h.kind == "hole"]
    assert (hint.label, hint.radius, hint.thickness) == ("hole bore", 7.0, 6.0)
    assert set(hint.faces) == set(solid.regions["arm.bore"])


def test_hole_axis_lies_where_it_was_put() -> None:
    _, solid = removed("I", I_DIMS, cut("bore", "hole", "y", "web", 150, 2, 14))
    boxes = np.array([solid.faces[i].box for i in solid.regions["arm.bore"]])
    assert boxes[:, :3].min(axis=0) == pytest.approx((143, -3, -5), abs=1e-6)
    assert boxes[:, 3:].max(axis=0) == pytest.approx((157, 3, 9), abs=1e-6)


@pytest.mark.parametrize(
    ("through", "axis", "offset", "thickness"),
    [
        ("left wall", "y", 3.0, 5.0),
        ("right wall", "y", 3.0, 5.0),
        ("top wall", "z", 3.0, 5.0),
        ("bottom wall", "z", 3.0, 5.0),
        ("all", "y", 3.0, 10.0),
        ("all", "z", -3.0, 10.0),
    ],
)
def test_box_is_cut_through_the_named_wall(through: str, axis: str, offset: float, thickness: float) -> None:
    gone, solid = removed("box", BOX, cut("h", "hole", axis, through, 100, offset, 10))
    assert gone == pytest.approx(math.pi * 25 * thickness, rel=1e-9)
    side = {"left wall": (1, -1), "right wall": (1, 1), "top wall": (2, 1), "bottom wall": (2, -1)}.get(through)
    if side:
        assert all(side[1] * solid.faces[i].centroid[side[0]] > 10.0 for i in solid.regions["arm.h"])


def test_flange_hole_grid_is_one_group() -> None:
    grid = [
        cut(f"bolts.{k}", "hole", "z", "top flange", 60 + 40 * (k // 2), (-15, 15)[k % 2], 7, group="bolts")
        for k in range(6)
    ]
    gone, solid = removed("I", I_DIMS, *grid)
    assert gone == pytest.approx(6 * math.pi * 12.25 * 8, rel=1e-9)
    assert region_area(solid, "arm.bolts") == pytest.approx(6 * math.pi * 7 * 8, rel=1e-9)
    assert region_area(solid, "arm.bolts.3") == pytest.approx(math.pi * 7 * 8, rel=1e-9)
    assert region_area(solid, "arm.top") == pytest.approx(300 * 46 - 6 * math.pi * 12.25, rel=1e-9)


def test_both_flanges() -> None:
    gone, _ = removed("I", I_DIMS, cut("b", "hole", "z", "flanges", 60, 15, 7))
    assert gone == pytest.approx(2 * math.pi * 12.25 * 8, rel=1e-9)


@pytest.mark.parametrize("turned", [0.0, 0.3, math.pi / 2])
def test_slot_and_opening_volumes(turned: float) -> None:
    gone, solid = removed("rectangle", BAR, cut("s", "slot", "y", "all", 100, 0, 30, 12, turned=turned))
    assert gone == pytest.approx(40 * (18 * 12 + math.pi * 36), rel=1e-9)
    assert region_area(solid, "arm.s") == pytest.approx(40 * (36 + math.pi * 12), rel=1e-9)
    gone, _ = removed("rectangle", BAR, cut("o", "opening", "z", "all", 100, 0, 30, 20, corner_radius=4, turned=turned))
    assert gone == pytest.approx(60 * (600 - (4 - math.pi) * 16), rel=1e-9)


def test_hole_across_a_round_bar_is_the_known_integral() -> None:
    """Volume common to two cylinders, radius b through radius a: 8 int_0^b sqrt(a^2 - t^2) sqrt(b^2 - t^2) dt."""
    gone, solid = removed("round", {"diameter": 40.0}, cut("h", "hole", "z", "all", 150, 0, 12))
    t, w = np.polynomial.legendre.leggauss(60)
    angle = 0.25 * np.pi * (t + 1)
    wanted = 8 * 0.25 * np.pi * np.sum(w * np.sqrt(400 - (6 * np.sin(angle)) ** 2) * (6 * np.cos(angle)) ** 2)
    assert gone == pytest.approx(wanted, rel=1e-5)
    assert solid.volume_estimate == pytest.approx(solid.volume, rel=1e-4)


@pytest.mark.parametrize(
    ("edge", "axis", "wide"), [("top", "y", 40), ("bottom", "y", 40), ("left", "z", 60), ("right", "z", 60)]
)
def test_half_round_and_square_notches(edge: str, axis: str, wide: float) -> None:
    gone, solid = removed("rectangle", BAR, cut("n", "notch", axis, "all", 150, 0, 10, 5, corner_radius=5, edge=edge))
    assert gone == pytest.approx(wide * math.pi * 12.5, rel=1e-9)
    assert region_area(solid, "arm.n") == pytest.approx(wide * math.pi * 5, rel=1e-9)
    gone, solid = removed("rectangle", BAR, cut("n", "notch", axis, "all", 150, 0, 10, 8, corner_radius=2, edge=edge))
    assert gone == pytest.approx(wide * (80 - (2 - math.pi / 2) * 4), rel=1e-9)
    k, sign = {"top": (2, 1), "bottom": (2, -1), "left": (1, -1), "right": (1, 1)}[edge]
    assert all(sign * solid.faces[i].centroid[k] > 0 for i in solid.regions["arm.n"])


def test_crossing_holes_share_their_volume() -> None:
    """Holes of one diameter that cross at right angles share 16 r^3 / 3."""
    gone, _ = removed(
        "rectangle", BAR, cut("a", "hole", "y", "all", 150, 0, 12), cut("b", "hole", "z", "all", 150, 0, 12)
    )
    assert gone == pytest.approx(math.pi * 36 * 100 - 16 * 216 / 3, rel=1e-5)


def test_web_hole_in_the_fillet_takes_the_fillet_too() -> None:
    gone, solid = removed("I", I_DIMS, cut("h", "hole", "y", "web", 150, 14, 12))
    assert gone > math.pi * 36 * 6
    assert solid.volume_estimate == pytest.approx(solid.volume, rel=1e-5)


@pytest.mark.parametrize(
    ("shape", "dims", "bad", "message"),
    [
        ("rectangle", BAR, cut("h", "opening", "y", "all", 150, 0, 20, 80), "arm.h: the cut severs the part"),
        ("rectangle", BAR, cut("h", "hole", "y", "all", 150, 90, 10), "meets no material"),
        ("rectangle", BAR, cut("h", "hole", "y", "all", 350, 0, 10), "lies off the member"),
        ("rectangle", BAR, cut("h", "hole", "y", "web", 150, 0, 10), "has no 'web'"),
        ("I", I_DIMS, cut("h", "hole", "z", "web", 150, 0, 10), "axis must be y"),
        ("I", I_DIMS, cut("h", "hole", "y", "web", 150, 20, 10), "reaches 3 mm past the web"),
        ("I", I_DIMS, cut("h", "hole", "z", "top flange", 150, 4, 6), "stands behind the top flange"),
        ("box", BOX, cut("h", "hole", "y", "left wall", 150, 22, 10), "reaches 2 mm past the left wall"),
        ("rectangle", BAR, cut("h", "slot", "y", "all", 150, 0, 10, 20), "cannot be 20 mm wide"),
        ("rectangle", BAR, cut("h", "opening", "y", "all", 150, 0, 10, 20, corner_radius=6), "do not fit"),
    ],
)
def test_bad_cuts_are_refused_with_the_reason(shape: str, dims: dict[str, float], bad: Any, message: str) -> None:
    with pytest.raises(SolidError, match=message):
        build_solid(make_part(shape, dims, 300.0, cuts=(bad,)))
