"""Slices against exact section integrals, and the same part turned and moved."""

from __future__ import annotations

import numpy as np
import pytest
from solid_parts import cut, make_part, region_area

from geometry.part import EdgeRadius, Patch, Station
from geometry.problem import SolidError
from geometry.solid import build_solid


def test_slices_of_a_tapered_rectangle_are_exact() -> None:
    part = make_part(
        "rectangle",
        {"depth": 60, "width": 40},
        300.0,
        stations=[(300.0, {"depth": 30, "width": 10})],
        line_at="top",
        anchor="top",
    )
    x, *rest = build_solid(part).slices.T
    d, w = 60 - 30 * x / 300, 40 - 30 * x / 300
    assert len(x) >= 7
    exact = [d * w, 0 * x, -d / 2, w * d**3 / 12, d * w**3 / 12, 0 * x]
    for got, wanted in zip(rest, exact, strict=True):
        assert got == pytest.approx(wanted, rel=1e-9, abs=1e-6)


def test_slices_of_a_sharp_angle_have_the_product_of_inertia() -> None:
    """Angle 100 x 100 x 10 (reference A20): A 1900, centroid 28.684, I 1.80004e6, Ixy of size 1.06579e6."""
    solid = build_solid(make_part("angle", {"depth": 100, "width": 100, "thickness": 10}, 300.0, line_at="bottom left"))
    assert solid.slices[4, 1:] == pytest.approx((1900, 28.684, 28.684, 1.80004e6, 1.80004e6, -1.06579e6), rel=2e-5)


def test_slices_keep_off_cuts_and_steps() -> None:
    stations = (Station(150, {"depth": 60}), Station(150, {"depth": 40}, 4.0))
    solid = build_solid(
        make_part(
            "rectangle",
            {"depth": 60, "width": 40},
            300.0,
            stations=stations,
            cuts=(cut("h", "hole", "y", "all", 50, 0, 30),),
        )
    )
    for x, area, *_ in solid.slices:
        assert not 35 < x < 65 and not 149 < x < 156
        assert area == pytest.approx(2400 if x < 150 else 1600, rel=1e-9)


def test_a_turned_and_moved_member_is_the_same_part() -> None:
    dims = {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 6.0}
    more = {
        "stations": [(300.0, {"depth": 40.0})],
        "cuts": (cut("h", "hole", "y", "web", 150, 3, 14),),
        "patches": (Patch("p", "top", 50, 80, (0, 10)),),
    }
    plain = build_solid(make_part("I", dims, 300.0, **more))
    x = np.array([2.0, 1.0, -2.0]) / 3.0
    start = np.array([100.0, -50.0, 30.0])
    up, roll = np.array([0.3, 0.2, 1.0]), 0.7
    turned = build_solid(
        make_part("I", dims, start=tuple(start), end=tuple(start + 300 * x), up=tuple(up), roll=roll, **more)
    )
    z = up - (up @ x) * x
    z /= np.linalg.norm(z)
    z = z * np.cos(roll) + np.cross(x, z) * np.sin(roll)
    axes = np.array([x, np.cross(z, x), z])
    assert turned.volume == pytest.approx(plain.volume, rel=1e-9)
    assert turned.slices == pytest.approx(plain.slices, rel=1e-6, abs=1e-2)
    assert turned.regions == plain.regions
    for a, b in zip(plain.faces, turned.faces, strict=True):
        assert b.area == pytest.approx(a.area, rel=1e-9)
        assert np.array(b.centroid) == pytest.approx(np.array(a.centroid) @ axes + start, abs=1e-5)


def test_positive_roll_turns_z_towards_minus_y() -> None:
    """Right-hand rule about +x: z turns towards -y, so after a quarter turn the top faces -y."""
    solid = build_solid(make_part("rectangle", {"depth": 60, "width": 40}, 300.0, roll=np.pi / 2))
    assert solid.faces[solid.regions["arm.top"][0]].centroid == pytest.approx((150, -30, 0), abs=1e-9)


def test_up_along_the_member_and_no_length_are_refused() -> None:
    with pytest.raises(SolidError, match="is along the member"):
        build_solid(make_part("rectangle", {"depth": 60, "width": 40}, 300.0, up=(1.0, 0.0, 0.0)))
    with pytest.raises(SolidError, match="start and end coincide"):
        build_solid(make_part("rectangle", {"depth": 60, "width": 40}, 0.0))


@pytest.mark.parametrize(
    ("shape", "dims", "count"),
    [
        ("I", {"depth": 60, "width": 46, "web": 6, "flange": 8}, 4),
        ("channel", {"depth": 60, "width": 46, "web": 6, "flange": 8}, 2),
        ("tee", {"depth": 60, "width": 46, "web": 6, "flange": 8}, 2),
        ("angle", {"depth": 60, "width": 46, "thickness": 6}, 1),
        ("box", {"depth": 60, "width": 46, "wall": 6}, 4),
    ],
)
def test_inner_corners_without_radius_are_sharp_edges(shape: str, dims: dict[str, float], count: int) -> None:
    solid = build_solid(make_part(shape, dims, 300.0))
    assert [e.label for e in solid.sharp_edges] == ["inner corner without radius along arm"] * count
    for edge in solid.sharp_edges:
        assert np.ptp(edge.points[:, 0]) == pytest.approx(300.0)
        assert edge.points.shape[1] == 3


def test_opening_and_notch_with_sharp_corners() -> None:
    cuts = (cut("o", "opening", "y", "all", 100, 0, 20, 20), cut("n", "notch", "y", "all", 200, 0, 20, 8, edge="top"))
    solid = build_solid(make_part("rectangle", {"depth": 60, "width": 40}, 300.0, cuts=cuts))
    labels = [e.label for e in solid.sharp_edges]
    assert labels.count("sharp corner of opening arm.o") == 4
    assert labels.count("sharp corner of notch arm.n") == 2
    assert len(labels) == 6


def test_a_taper_that_turns_inwards_is_a_kink() -> None:
    solid = build_solid(make_part("rectangle", {"depth": 60, "width": 40}, 300.0, stations=[(100.0, {"depth": 30})]))
    assert {e.label for e in solid.sharp_edges} == {"kink at 100 mm"}
    assert len(solid.sharp_edges) == 2


def test_edge_radius_along_a_tapered_i_and_its_patch() -> None:
    part = make_part(
        "I",
        {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 6.0},
        300.0,
        stations=[(300.0, {"depth": 40.0})],
        edge_radii=(EdgeRadius("top left", 2.0),),
        patches=(Patch("p", "top", 100, 200),),
    )
    solid = build_solid(part)
    assert region_area(solid, "arm.p") == pytest.approx(100 * 44 * np.hypot(300, 10) / 300, rel=1e-9)


SHAPES = [
    ("I", {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 6.0},
     {"depth": 32.0, "width": 30.0}),
    ("tube", {"diameter": 40.0, "wall": 4.0}, {"diameter": 30.0}),
    ("box", {"depth": 60.0, "width": 40.0, "wall": 4.0, "corner_radius": 8.0}, {"depth": 45.0}),
    ("round", {"diameter": 40.0}, {"diameter": 25.0}),
    ("angle", {"depth": 60.0, "width": 40.0, "thickness": 6.0, "root_radius": 6.0}, {}),
]


@pytest.mark.parametrize(("shape", "dims", "end"), SHAPES, ids=[s[0] for s in SHAPES])
def test_curves_of_a_cut_agree_with_the_kernels_own_intersection(shape: str, dims: dict[str, float],
                                                                 end: dict[str, float]) -> None:
    """Through plain stretches and right through a hole. The kernel fits the curves on oblique cylinders to 1e-7 mm."""
    from geometry.solid.kernel import from_brep
    from geometry.solid.slices import kernel_slices, slices_of

    hole = cut("h", "hole", "y", "web" if shape == "I" else "all", 150, 0, 12)
    stations = [(300.0, {**end})] if end else []
    cuts = (hole,) if shape in ("I", "round") else ()
    solid = from_brep(build_solid(make_part(shape, dims, 300.0, stations=stations, cuts=cuts)).brep)
    places = [20.0, 97.3, 152.0, 280.0]
    found, wanted = slices_of(solid, places, 200.0), kernel_slices(solid, places, 200.0)
    for row in found:
        _, area, _, _, Iyy, Izz, _ = wanted[row[0]]
        size = np.array([1.0, area, area**0.5, area**0.5, Iyy, Izz, max(Iyy, Izz)])
        assert np.abs((row - wanted[row[0]]) / size).max() < 2e-7


def test_a_cut_that_is_not_plain_is_left_to_the_kernel() -> None:
    """A plane through a hole leaves the web's side in two pieces, and one along a step's shoulder touches a face."""
    from geometry.solid.kernel import from_brep
    from geometry.solid.plane_cut import PlaneCuts
    from geometry.solid.slices import slices_of

    dims = {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 6.0}
    part = make_part("I", dims, 300.0, cuts=(cut("h", "hole", "y", "web", 150, 0, 12),))
    solid = from_brep(build_solid(part).brep)
    assert PlaneCuts(solid).moments(100.0) is not None
    assert PlaneCuts(solid).moments(152.0) is None
    [row] = slices_of(solid, [150.0], 200.0)
    whole = PlaneCuts(solid).moments(100.0)
    assert whole is not None and row[1] == pytest.approx(whole[0] - 12 * 6, rel=1e-9)
