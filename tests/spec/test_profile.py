"""Where sections lie about the member's line: what cuts and supports are judged by."""

from __future__ import annotations

import math

import pytest

from geometry.part import Member, Section, Station
from geometry.spec.checks.frame import axes_of
from geometry.spec.checks.profile import centroid, dims_at, profile_of

CHANNEL = Section("channel", {"depth": 200.0, "width": 80.0, "web": 6.0, "flange": 11.0, "root_radius": 13.0})


def member(section: Section, stations: tuple[Station, ...] = (), **words: object) -> Member:
    return Member("m", (0.0, 0.0, 0.0), (100.0, 0.0, 0.0), (0.0, 0.0, 1.0), 0.0, section, stations=stations, **words)  # type: ignore[arg-type]


def test_the_centroid_of_a_channel_as_published() -> None:
    # UPE 200 (DIN 1026-2 / EN 10365): 2.56 cm from the back of the web, recomputed 2.560 cm.
    y, z = centroid(CHANNEL)
    assert (y, z) == pytest.approx((25.60, 0.0), abs=0.005)


def test_the_centroid_of_an_angle_by_hand() -> None:
    # Legs 60 x 40, 5 thick, sharp: areas 300 and 175 at y 2.5, 22.5 and z 30, 2.5 from the lower corner.
    y, z = centroid(Section("angle", {"depth": 60.0, "width": 40.0, "thickness": 5.0}))
    assert y == pytest.approx((300 * 2.5 + 175 * 22.5) / 475)
    assert z == pytest.approx((300 * 30.0 + 175 * 2.5) / 475 - 30.0)


@pytest.mark.parametrize(
    ("line_at", "box"),
    [
        ("origin", (0.0, 80.0, -100.0, 100.0)),
        ("top", (0.0, 80.0, -200.0, 0.0)),
        ("bottom", (0.0, 80.0, 0.0, 200.0)),
        ("left", (0.0, 80.0, -100.0, 100.0)),
        ("right", (-80.0, 0.0, -100.0, 100.0)),
        ("top right", (-80.0, 0.0, -200.0, 0.0)),
        ("web", (-3.0, 77.0, -100.0, 100.0)),
    ],
)
def test_the_line_goes_through_the_named_point(line_at: str, box: tuple[float, ...]) -> None:
    m = member(CHANNEL, line_at=line_at)
    assert profile_of(m).box(dims_at(m, 0.0)) == pytest.approx(box)


@pytest.mark.parametrize(
    ("anchor", "low", "high"), [("top", -2.0, 20.0), ("centre", -11.0, 11.0), ("bottom", -20.0, 2.0)]
)
def test_the_anchored_side_stays_straight(anchor: str, low: float, high: float) -> None:
    m = member(Section("rectangle", {"depth": 40.0, "width": 10.0}), (Station(100.0, {"depth": 22.0}),), anchor=anchor)
    assert profile_of(m).box(dims_at(m, 100.0))[2:] == pytest.approx((low, high))


def test_dimensions_run_linearly_between_the_places_that_name_them() -> None:
    stations = (
        Station(40.0, {"depth": 20.0}),
        Station(50.0, {"width": 8.0}),
        Station(50.0, {"depth": 12.0, "width": 6.0}),
    )
    m = member(Section("rectangle", {"depth": 40.0, "width": 10.0}), stations)
    assert dims_at(m, 20.0) == pytest.approx({"depth": 30.0, "width": 9.2})
    # Only the second station at 50 mm names the depth: it stays 20 up to there and jumps; the width steps from 8 to 6.
    assert dims_at(m, 50.0, before=True) == pytest.approx({"depth": 20.0, "width": 8.0})
    assert dims_at(m, 50.0) == pytest.approx({"depth": 12.0, "width": 6.0})
    assert dims_at(m, 90.0) == pytest.approx({"depth": 12.0, "width": 6.0})


def test_axes_are_right_handed_and_roll_turns_about_x() -> None:
    m = Member("m", (0, 0, 0), (3, 0, 4), (0, 0, 1), math.pi / 2, CHANNEL)
    x, y, z = axes_of(m)
    assert x == pytest.approx((0.6, 0.0, 0.8))
    # Without roll z is (-0.8, 0, 0.6) and y (0, 1, 0); a quarter turn takes y to z and z to -y.
    assert y == pytest.approx((-0.8, 0.0, 0.6))
    assert z == pytest.approx((0.0, -1.0, 0.0))
