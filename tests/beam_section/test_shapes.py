"""Outlines of every shape: drawn as `geometry.part.Shape` says, counter-clockwise, radii as tangent arcs."""

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from fem.beam.outlines import Corner, OutlineError, outline_of, rounded_polygon
from fem.beam.section import outline_integrals
from geometry.outline import Arc, Line, Outline

SHAPES = {
    "rectangle": ({"depth": 60.0, "width": 40.0, "corner_radius": 5.0}, (-20.0, 20.0, -30.0, 30.0)),
    "round": ({"diameter": 40.0}, (-20.0, 20.0, -20.0, 20.0)),
    "tube": ({"diameter": 40.0, "wall": 4.0}, (-20.0, 20.0, -20.0, 20.0)),
    "box": ({"depth": 60.0, "width": 40.0, "wall": 4.0, "corner_radius": 6.0}, (-20.0, 20.0, -30.0, 30.0)),
    "I": (
        {"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 6.0, "root_radius": 4.0, "bottom_width": 50.0,
         "bottom_flange": 8.0},
        (-25.0, 25.0, -30.0, 30.0),
    ),
    "channel": ({"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 6.0, "root_radius": 4.0},
                (0.0, 40.0, -30.0, 30.0)),
    "angle": ({"depth": 60.0, "width": 40.0, "thickness": 5.0, "root_radius": 6.0, "toe_radius": 3.0},
              (0.0, 40.0, -30.0, 30.0)),
    "tee": ({"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 6.0, "root_radius": 4.0}, (-20.0, 20.0, -30.0, 30.0)),
}
# areas by hand: blocks, plus (1 - pi/4) r^2 for each filled corner, less as much for each rounded one
_F = 1 - math.pi / 4
AREAS = {
    "rectangle": 2400 - 4 * _F * 25,
    "round": math.pi * 400,
    "tube": math.pi * (400 - 256),
    "box": 2400 - 4 * _F * 36 - (52 * 32 - 4 * _F * 4),
    "I": 240 + 400 + 46 * 5 + 4 * _F * 16,
    "channel": 2 * 240 + 48 * 5 + 2 * _F * 16,
    "angle": 300 + 175 + _F * 36 - 2 * _F * 9,
    "tee": 240 + 54 * 5 + 2 * _F * 16,
}


def loops(outline: Outline):
    return (outline.outer, *outline.inner)


@pytest.mark.parametrize("shape", SHAPES)
def test_area_and_bounding_rectangle_of_a_shape(shape):
    dims, box = SHAPES[shape]
    exact = outline_integrals(outline_of(shape, dims))
    assert exact.area == pytest.approx(AREAS[shape], rel=1e-12)
    top, bottom, left, right = exact.extremes
    assert (left[0], right[0], bottom[1], top[1]) == pytest.approx(box, abs=1e-12)


@pytest.mark.parametrize("shape", SHAPES)
def test_loops_are_closed_and_arcs_meet_their_lines_without_a_kink(shape):
    for loop in loops(outline_of(shape, SHAPES[shape][0])):
        for before, edge in zip((loop[-1], *loop[:-1]), loop, strict=True):
            assert before.end == pytest.approx(edge.start, abs=1e-12)
            for arc, line, end in ((edge, before, "start"), (before, edge, "end")):
                if isinstance(arc, Arc) and isinstance(line, Line):
                    p = getattr(arc, end)
                    radial = (p[0] - arc.centre[0], p[1] - arc.centre[1])
                    along = (line.end[0] - line.start[0], line.end[1] - line.start[1])
                    assert radial[0] * along[0] + radial[1] * along[1] == pytest.approx(0.0, abs=1e-9)


def test_voids_run_clockwise():
    for shape in ("tube", "box"):
        inner = outline_of(shape, SHAPES[shape][0]).inner[0]
        assert outline_integrals(Outline(inner)).area < 0


def test_the_channel_has_its_web_on_the_left_and_the_angle_its_corner_bottom_left():
    channel, angle, tee = (outline_integrals(outline_of(s, SHAPES[s][0])) for s in ("channel", "angle", "tee"))
    assert 0 < channel.yc < 20
    assert channel.zc == pytest.approx(0.0, abs=1e-12)
    assert angle.yc < 20 and angle.zc < 0
    assert tee.zc > 0


def test_edge_radius_takes_the_place_of_the_corner_radius():
    plain = {"depth": 60.0, "width": 40.0}
    rounded = outline_integrals(outline_of("rectangle", plain, edges={"top left": 8.0}))
    assert rounded.area == pytest.approx(2400 - _F * 64, rel=1e-12)
    assert rounded.yc > 0 and rounded.zc < 0
    tee = outline_integrals(outline_of("tee", SHAPES["tee"][0], edges={"bottom right": 2.0}))
    assert tee.area == pytest.approx(AREAS["tee"] - _F * 4, rel=1e-12)
    assert tee.yc < 0


def test_edge_radius_on_a_free_outline():
    free = Outline(rounded_polygon([Corner(0, 0), Corner(30, 0), Corner(30, 20), Corner(0, 20)]))
    area = outline_integrals(outline_of("outline", {}, free, {"top right": 5.0, "bottom right": 3.0})).area
    assert area == pytest.approx(600 - _F * 34, rel=1e-12)


@pytest.mark.parametrize(
    ("shape", "dims", "words"),
    [
        ("rectangle", {"depth": 10.0, "width": 10.0, "corner_radius": 6.0}, "do not fit"),
        ("box", {"depth": 10.0, "width": 10.0, "wall": 5.0}, "no void"),
        ("I", {"depth": 10.0, "width": 10.0, "web": 2.0, "flange": 5.0}, "do not fit"),
        ("I", {"depth": 10.0, "width": 10.0, "web": 2.0}, "flange"),
        ("tube", {"diameter": 10.0, "wall": 5.0}, "no bore"),
    ],
)
def test_impossible_dimensions_are_refused_in_words(shape, dims, words):
    with pytest.raises(OutlineError, match=words):
        outline_of(shape, dims)


@given(
    angle=st.floats(0.3, 2.8), radius=st.floats(0.1, 2.0), flip=st.booleans(),
)
def test_a_rounded_corner_of_any_angle_loses_what_the_formula_says(angle, radius, flip):
    """Area between a corner of angle a and its arc: r^2 (1/tan(a/2) - (pi - a)/2)."""
    far = 60.0
    # a triangle with the corner at the origin, run either way round the figure by mirroring
    points = [Corner(0, 0, radius), Corner(far, 0), Corner(far * math.cos(angle), far * math.sin(angle))]
    if flip:
        points = [Corner(-c.y, c.z, c.radius) for c in reversed(points)]
    area = outline_integrals(Outline(rounded_polygon(points))).area
    expected = far * far * math.sin(angle) / 2 - radius**2 * (1 / math.tan(angle / 2) - (math.pi - angle) / 2)
    assert area == pytest.approx(expected, rel=1e-11)
