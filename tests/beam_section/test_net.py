"""Net sections: what cuts leave, against areas and moments by hand and against sums of exact rows."""

import math

import numpy as np
import pytest

from fem.beam.outlines import OutlineError, chord, member_outline, net_section
from fem.beam.outlines.clip import clip, encloses
from fem.beam.section import outline_integrals
from geometry.part import Cut, Member, Section


def member(shape, dims, *cuts, line_at="origin"):
    return Member("arm", (0, 0, 0), (400, 0, 0), (0, 0, 1), 0.0, Section(shape, dims), line_at=line_at, cuts=cuts)


def hole(at, offset, diameter, through="all", axis="y"):
    return Cut("h", "h", "hole", axis, through, at, offset, diameter, diameter)


I_DIMS = {"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 6.0, "root_radius": 4.0}
RECT = {"depth": 60.0, "width": 40.0}


@pytest.mark.parametrize("x", [200.0, 203.0, 206.9])
def test_hole_through_a_rectangle_leaves_two_blocks(x):
    m = member("rectangle", RECT, hole(200, 5, 14))
    half = math.sqrt(49 - (x - 200) ** 2)
    net = outline_integrals(net_section(m, x))
    taken = 2 * half
    assert net.area == pytest.approx(40 * (60 - taken), rel=1e-12)
    zc = -5 * 40 * taken / net.area
    expected = 40 * 60**3 / 12 - 40 * (taken**3 / 12 + taken * 25) - net.area * zc**2
    assert net.Iyy == pytest.approx(expected, rel=1e-10)
    assert len(net_section(m, x)) == 2
    assert net_section(m, 207.0) == (member_outline(m, 207.0),)


def test_cut_in_the_web_and_in_the_flanges_of_an_i():
    gross = outline_integrals(member_outline(member("I", I_DIMS), 0)).area
    web = member("I", I_DIMS, hole(100, 0, 20, "web"))
    assert outline_integrals(net_section(web, 100)).area == pytest.approx(gross - 100, rel=1e-12)
    top = member("I", I_DIMS, hole(100, 12, 8, "top flange", "z"))
    net = outline_integrals(net_section(top, 100))
    assert net.area == pytest.approx(gross - 48, rel=1e-12)
    assert net.zc < 0 and net.yc < 0
    both = member("I", I_DIMS, hole(100, 12, 8, "flanges", "z"))
    assert outline_integrals(net_section(both, 100)).area == pytest.approx(gross - 96, rel=1e-12)


def test_cut_in_one_wall_of_a_box_leaves_the_other_wall():
    m = member("box", {"depth": 60.0, "width": 40.0, "wall": 4.0}, hole(100, 0, 10, "left wall"))
    net = outline_integrals(net_section(m, 100))
    assert net.area == pytest.approx(60 * 40 - 52 * 32 - 40, rel=1e-12)
    assert net.yc == pytest.approx(18 * 40 / net.area, rel=1e-9)
    all_ = member("box", {"depth": 60.0, "width": 40.0, "wall": 4.0}, hole(100, 0, 10))
    assert outline_integrals(net_section(all_, 100)).area == pytest.approx(60 * 40 - 52 * 32 - 80, rel=1e-12)


def test_notches_are_as_deep_as_their_shape_at_the_station():
    square = Cut("n", "n", "notch", "y", "all", 100, 0, 20, 12, edge="top")
    assert outline_integrals(net_section(member("rectangle", RECT, square), 109.9)).area == pytest.approx(40 * 48)
    assert outline_integrals(net_section(member("rectangle", RECT, square), 110.0)).area == pytest.approx(40 * 60)
    round_ = Cut("n", "n", "notch", "z", "all", 100, 0, 20, 15, corner_radius=10, edge="right")
    net = outline_integrals(net_section(member("rectangle", RECT, round_), 106.0))
    assert net.area == pytest.approx(60 * (40 - 5 - 8), rel=1e-12)
    assert net.yc < 0


def test_a_slot_turns_from_x_towards_the_other_axis():
    """See `geometry.part.Cut`: positive from x towards y (axis z) and from x towards z (axis y)."""
    slot = {"kind": "slot", "at": 100.0, "offset": 0.0, "length": 40.0, "depth": 8.0, "turned": math.radians(30)}
    low, high = chord(Cut("s", "s", axis="z", through="all", **slot), 110.0)
    assert (low + high) / 2 == pytest.approx(10 * math.tan(math.radians(30)))
    assert high - low == pytest.approx(8 / math.cos(math.radians(30)))
    low, high = chord(Cut("s", "s", axis="y", through="all", **slot), 110.0)
    assert (low + high) / 2 == pytest.approx(10 * math.tan(math.radians(30)))
    assert chord(Cut("s", "s", axis="y", through="all", **slot), 100 + 16 * math.cos(math.radians(30)) + 4.001) is None


def test_opening_with_corner_radius():
    cut = Cut("o", "o", "opening", "y", "web", 100, 2, 40, 20, corner_radius=5)
    assert chord(cut, 100) == pytest.approx((-8, 12))
    assert chord(cut, 118) == pytest.approx((2 - 5 - 4, 2 + 5 + 4))


@pytest.mark.parametrize("line_at", ["origin", "top left"])
@pytest.mark.parametrize("offset_in_section", [0.0, 17.0, 24.0])
def test_net_section_of_a_tube_against_a_sum_of_rows(line_at, offset_in_section):
    """Rows of the tube, their widths exact, that lie outside the drill."""
    drill = hole(100, offset_in_section - (30 if "top" in line_at else 0), 9)
    m = member("tube", {"diameter": 60.0, "wall": 8.0}, drill, line_at=line_at)
    exact = outline_integrals(net_section(m, 101.0))
    n = 400_000
    z = (np.arange(n) + 0.5) / n * 60 - 30
    width = 2 * (np.sqrt(900 - z**2) - np.sqrt(np.maximum(484 - z**2, 0.0)))
    width[np.abs(z - offset_in_section) < math.sqrt(4.5**2 - 1)] = 0.0
    area = width.sum() * 60 / n
    z0 = (width * z).sum() * 60 / n / area
    assert exact.area == pytest.approx(area, rel=2e-5)
    assert exact.zc - member_outline(m, 0).outer[0].start[1] == pytest.approx(z0, abs=1e-3)
    assert exact.Iyy == pytest.approx((width * (z - z0) ** 2).sum() * 60 / n, rel=2e-5)


def test_both_sides_of_a_cut_add_up_to_the_whole_for_every_level_and_shape():
    dims = {"depth": 60.0, "width": 40.0, "wall": 4.0, "corner_radius": 6.0}
    for shape, d in (("box", dims), ("I", I_DIMS), ("tube", {"diameter": 60.0, "wall": 8.0})):
        outline = member_outline(member(shape, d), 0)
        whole = outline_integrals(outline).area
        for axis in (0, 1):
            # -30 .. 30 meets corners, edges and tangents exactly
            for level in np.linspace(-30, 30, 61):
                parts = [p for above in (True, False) for p in clip(outline, axis, float(level), above)]
                assert sum(outline_integrals(p).area for p in parts) == pytest.approx(whole, rel=1e-7)
                assert all(outline_integrals(p).area > 0 for p in parts)


def test_a_void_stays_with_the_piece_it_lies_in():
    outline = member_outline(member("box", {"depth": 60.0, "width": 40.0, "wall": 4.0}), 0)
    (upper,) = clip(outline, 1, -27.0, True)
    assert len(upper.inner) == 1
    assert encloses(upper.outer, (0.0, 0.0)) and not encloses(upper.outer, (0.0, -28.0))
    assert len(clip(outline, 1, 0.0, True)) == 1 and clip(outline, 1, 0.0, True)[0].inner == ()


def test_nothing_left_is_an_error():
    m = member("rectangle", {"depth": 10.0, "width": 40.0}, hole(100, 0, 12))
    with pytest.raises(OutlineError, match="nothing"):
        net_section(m, 100)
