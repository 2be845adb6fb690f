"""A member's outline at a station: dimensions along it, anchor, placement on the declared line."""

import pytest

from fem.beam.outlines import OutlineError, dims_at, dims_slope, member_outline, outline_of
from fem.beam.section import outline_integrals
from geometry.part import EdgeRadius, Member, Section, Station


def member(shape="rectangle", dims=None, stations=(), **more):
    dims = dims or {"depth": 60.0, "width": 40.0}
    return Member("arm", (0, 0, 0), (400, 0, 0), (0, 0, 1), 0.0, Section(shape, dims), stations=tuple(stations), **more)


def test_a_dimension_is_linear_between_the_places_that_name_it_and_constant_after():
    m = member(stations=[Station(100, {"width": 30.0}), Station(200, {"depth": 20.0}), Station(300, {"width": 10.0})])
    assert dims_at(m, 50) == {"depth": 50.0, "width": 35.0}
    assert dims_at(m, 200) == {"depth": 20.0, "width": 20.0}
    assert dims_at(m, 350) == {"depth": 20.0, "width": 10.0}
    assert dims_slope(m, 50) == pytest.approx({"depth": -0.2, "width": -0.1})
    assert dims_slope(m, 100, "before") == pytest.approx({"depth": -0.2, "width": -0.1})
    assert dims_slope(m, 200, "before") == pytest.approx({"depth": -0.2, "width": -0.1})
    assert dims_slope(m, 200, "after") == pytest.approx({"depth": 0.0, "width": -0.1})
    assert dims_slope(m, 300, "after") == {"depth": 0.0, "width": 0.0}


def test_two_stations_at_one_place_are_a_step():
    m = member(stations=[Station(100, {"depth": 50.0}), Station(100, {"depth": 30.0}), Station(300, {"depth": 10.0})])
    assert dims_at(m, 100, "before")["depth"] == 50.0
    assert dims_at(m, 100, "after")["depth"] == 30.0
    assert dims_at(m, 200)["depth"] == 20.0
    assert dims_slope(m, 100, "before")["depth"] == pytest.approx(-0.1)
    assert dims_slope(m, 100, "after")["depth"] == pytest.approx(-0.1)


def test_a_dimension_named_by_the_second_station_of_a_step_jumps_there():
    m = member(stations=[Station(100, {}), Station(100, {"depth": 30.0})])
    assert dims_at(m, 99)["depth"] == 60.0
    assert dims_at(m, 100, "before")["depth"] == 60.0
    assert dims_at(m, 100)["depth"] == 30.0


def test_defaults_follow_the_dimension_they_come_from():
    dims = {"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 6.0}
    even = member("I", dims, [Station(400, {"width": 20.0})])
    exact = outline_integrals(member_outline(even, 400))
    assert exact.extremes[1, 1] == pytest.approx(-30)
    assert exact.zc == pytest.approx(0.0, abs=1e-12)
    # named by a station only: it starts from its default and ends where it is said to
    lopsided = member("I", dims, [Station(400, {"bottom_width": 20.0})])
    assert dims_at(lopsided, 200)["bottom_width"] == 30.0


@pytest.mark.parametrize(("anchor", "top", "bottom"), [("top", 30, 10), ("centre", 10, -10), ("bottom", -10, -30)])
def test_the_anchored_side_stays_straight(anchor, top, bottom):
    m = member(stations=[Station(400, {"depth": 20.0})], anchor=anchor)
    extremes = outline_integrals(member_outline(m, 400)).extremes
    assert (extremes[0, 1], extremes[1, 1]) == pytest.approx((top, bottom))


# the range of y and z that the channel 40 wide, 60 deep, web 5 must fill for each place on the line
@pytest.mark.parametrize(
    ("line_at", "left", "bottom"),
    [("origin", 0, -30), ("top", 0, -60), ("bottom", 0, 0), ("left", 0, -30), ("right", -40, -30), ("web", -2.5, -30),
     ("top left", 0, -60), ("bottom right", -40, 0)],
)
def test_the_declared_line_runs_through_the_named_point(line_at, left, bottom):
    m = member("channel", {"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 6.0}, line_at=line_at)
    extremes = outline_integrals(member_outline(m, 100)).extremes
    assert (extremes[2, 0], extremes[1, 1]) == pytest.approx((left, bottom))


def test_the_centroid_of_the_start_section_lies_on_the_line():
    dims = {"depth": 60.0, "width": 40.0, "thickness": 5.0}
    m = member("angle", dims, [Station(400, {"depth": 30.0})], line_at="centroid")
    start = outline_integrals(member_outline(m, 0))
    assert (start.yc, start.zc) == pytest.approx((0, 0), abs=1e-12)
    assert outline_integrals(member_outline(m, 400)).yc > 0.5  # the line is straight, the centroid is not


def test_edge_radii_round_the_outline_but_do_not_move_it():
    m = member(edge_radii=(EdgeRadius("top left", 8.0), EdgeRadius("start", 2.0)))
    rounded = outline_integrals(member_outline(m, 0))
    assert rounded.area == pytest.approx(outline_integrals(
        outline_of("rectangle", {"depth": 60.0, "width": 40.0}, edges={"top left": 8.0})).area)
    assert rounded.extremes[1, 1] == pytest.approx(-30)


def test_the_web_of_a_rectangle_is_refused():
    with pytest.raises(OutlineError, match="no web"):
        member_outline(member(line_at="web"), 0)
