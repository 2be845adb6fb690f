"""Exact integrals: circles, fillets, tables of rolled and hollow sections, and what turning and moving must do."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from fem.beam.outlines import Corner, moved, outline_of, rounded_polygon, turned
from fem.beam.section import outline_integrals
from geometry.outline import Outline


def printed_like(value: float, text: str) -> str:
    """`value` with as many decimals as the printed `text`."""
    return f"{value:.{len(text.partition('.')[2])}f}"


def test_circle_and_quarter_disc_are_exact():
    disc = outline_integrals(outline_of("round", {"diameter": 40.0}))
    assert (disc.area, disc.Iyy, disc.Izz) == pytest.approx((math.pi * 400, math.pi * 4e4, math.pi * 4e4), rel=1e-13)
    # square of side r with a corner radius r is a quarter disc: centroid 4r/(3 pi) from its straight sides
    corners = [Corner(0, 0), Corner(9, 0), Corner(9, 9, 9.0), Corner(0, 9)]
    quarter = outline_integrals(Outline(rounded_polygon(corners)))
    assert quarter.yc == pytest.approx(4 * 9 / (3 * math.pi), rel=1e-13)
    assert quarter.Iyz == pytest.approx((1 / 8 - 4 / (9 * math.pi)) * 9**4, rel=1e-12)


# h, b, tw, tf, r: A cm2, Iy cm4, Wel,y cm3, Iz, Wel,z: EN 10365 dimensions, REFERENCES A1-A4 and A5 (recomputed row)
@pytest.mark.parametrize(
    ("shape", "dims", "values"),
    [
        ("I", (300, 150, 7.1, 10.7, 15), "53.81 8356 557.1 603.8 80.50"),
        ("I", (200, 100, 5.6, 8.5, 12), "28.48 1943 194.3 142.4 28.47"),
        ("I", (190, 200, 6.5, 10, 18), "53.83 3692 388.6 1336 133.6"),
        ("I", (200, 200, 9, 15, 18), "78.08 5696 569.6 2003 200.3"),
        ("channel", (200, 80, 6, 11, 13), "29.005 1909.3 190.9 187.30 34.43"),
    ],
)
def test_rolled_sections_to_the_printed_digits(shape, dims, values):
    named = dict(zip(("depth", "width", "web", "flange", "root_radius"), map(float, dims), strict=True))
    p = outline_integrals(outline_of(shape, named))
    W_z = min(p.W_left, p.W_right)
    found = (p.area / 1e2, p.Iyy / 1e4, p.W_top / 1e3, p.Izz / 1e4, W_z / 1e3)
    assert [printed_like(v, w) for v, w in zip(found, values.split(), strict=True)] == values.split()


def test_centroid_of_the_channel_from_the_back_of_its_web():
    p = outline_integrals(outline_of("channel", {"depth": 200, "width": 80, "web": 6, "flange": 11, "root_radius": 13}))
    assert p.yc == pytest.approx(25.60, abs=5e-3)  # REFERENCES A5: e 2.560 cm


# REFERENCES A6-A8 (EN 10210-2, recomputed row)
@pytest.mark.parametrize(
    ("shape", "dims", "values"),
    [
        ("box", {"depth": 200, "width": 100, "wall": 5, "corner_radius": 7.5, "inner_radius": 5},
         "28.73 1494.6 505.3 149.5 101.1"),
        ("box", {"depth": 100, "width": 100, "wall": 5, "corner_radius": 7.5, "inner_radius": 5},
         "18.73 279.4 279.4 55.89 55.89"),
        ("tube", {"diameter": 114.3, "wall": 5}, "17.17 256.9 256.9 44.96 44.96"),
        ("tube", {"diameter": 219.1, "wall": 6.3}, "42.12 2386.1 2386.1 217.8 217.8"),
    ],
)
def test_hollow_sections(shape, dims, values):
    p = outline_integrals(outline_of(shape, dims))
    found = (p.area / 1e2, p.Iyy / 1e4, p.Izz / 1e4, p.W_top / 1e3, p.W_right / 1e3)
    assert [printed_like(v, w) for v, w in zip(found, values.split(), strict=True)] == values.split()


def test_angle_with_sharp_corners():
    """REFERENCES A20: A 1900, centroid 28.684, Ix 1.80004e6, Ixy -1.06579e6, Iu 2.86583e6, Iv 7.3425e5."""
    p = outline_integrals(outline_of("angle", {"depth": 100.0, "width": 100.0, "thickness": 10.0}))
    assert p.area == pytest.approx(1900, rel=1e-13)
    assert (p.yc, p.zc + 50) == pytest.approx((28.684, 28.684), abs=5e-4)
    assert (p.Iyy, p.Izz, p.Iyz) == pytest.approx((1.80004e6, 1.80004e6, -1.06579e6), rel=5e-6)
    assert (p.I1, p.I2) == pytest.approx((2.86583e6, 7.3425e5), rel=1e-5)
    # the axis of the larger moment runs along the legs' bisector, up to the right
    assert p.principal_angle == pytest.approx(math.pi / 4, rel=1e-9)


@settings(max_examples=40, deadline=None)
@given(angle=st.floats(-3.0, 3.0), dy=st.floats(-1e4, 1e4), dz=st.floats(-1e4, 1e4))
def test_moving_and_turning_transform_the_moments_as_a_tensor(angle, dy, dz):
    base = outline_of("angle", {"depth": 90.0, "width": 60.0, "thickness": 8.0, "root_radius": 9.0, "toe_radius": 4.0})
    a, b = outline_integrals(base), outline_integrals(moved(turned(base, angle), dy, dz))
    R = np.array([[math.cos(angle), -math.sin(angle)], [math.sin(angle), math.cos(angle)]])
    Sa, Sb = (np.array([[p.Izz, p.Iyz], [p.Iyz, p.Iyy]]) for p in (a, b))
    np.testing.assert_allclose(Sb, R @ Sa @ R.T, rtol=0, atol=1e-9 * a.I1)
    np.testing.assert_allclose([b.yc - dy, b.zc - dz], R @ [a.yc, a.zc], atol=1e-8)
    assert (b.I1, b.I2) == pytest.approx((a.I1, a.I2), rel=1e-9)
    difference = (b.principal_angle - a.principal_angle - angle) / math.pi
    assert difference == pytest.approx(round(difference), abs=1e-8)


def test_extremes_take_the_middle_of_a_flat_side_and_the_upper_of_two():
    i = {"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 6.0}
    assert outline_integrals(outline_of("I", i)).extremes.tolist() == [[0, 30], [0, -30], [-20, 27], [20, 27]]
    round_ = outline_integrals(turned(outline_of("round", {"diameter": 40.0}), 0.7)).extremes
    np.testing.assert_allclose(round_, [[0, 20], [0, -20], [-20, 0], [20, 0]], atol=1e-12)
    angle = outline_integrals(outline_of("angle", {"depth": 60, "width": 40, "thickness": 5})).extremes
    assert angle.tolist() == [[2.5, 30], [20, -30], [0, 0], [40, -27.5]]
