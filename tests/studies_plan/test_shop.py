"""What the shop can make: walls, what cuts leave, inner corners, distance of holes from edges."""

from __future__ import annotations

import math
import re

import numpy as np
import pytest

from geometry.spec import part_from_text
from studies.vary.plan.shop import Shop
from studies.vary.plan.shop.room import chain, gap, ring, rooms_of
from studies.vary.plan.shop.rules import JUST

PART = """
material = "S355"
[members.bar]
from = ["0 mm", "0 mm", "0 mm"]
to = ["300 mm", "0 mm", "0 mm"]
section = { SECTION }
MORE
[supports.wall]
on = "bar.start"
hold = "all"
[loads.tip]
on = "bar.end"
force = ["0 N", "0 N", "-10 N"]
"""


def part(section: str, more: str = ""):
    return part_from_text(PART.replace("SECTION", section).replace("MORE", more))


def least(rule: str, made) -> float:
    """The figure at which a rule begins to be broken, found by halving; what the rule's reason says is the same."""
    low, high = 0.0, 1000.0
    for _ in range(60):
        middle = (low + high) / 2.0
        low, high = (low, middle) if Shop(**{rule: middle}).broken(made) else (middle, high)
    return low * JUST


I = 'shape = "I", depth = "60 mm", width = "46 mm", web = "6 mm", flange = "8 mm", root_radius = "5 mm"'
PLATE = 'shape = "rectangle", depth = "40 mm", width = "10 mm"'


@pytest.mark.parametrize(("section", "more", "thickness", "what"), [
    (I, "", 6.0, "the web at 0 mm"),
    (I, 'taper = { web = "4 mm" }', 4.0, "the web at 300 mm"),
    (I, 'stations = [{ at = "100 mm", flange = "5 mm" }, { at = "200 mm", flange = "8 mm" }]', 5.0,
     "the flange at 100 mm"),
    (I.replace('root', 'bottom_flange = "5.5 mm", root'), "", 5.5, "the bottom flange at 0 mm"),
    (PLATE, "", 10.0, "the width at 0 mm"),
    ('shape = "round", diameter = "12 mm"', "", 12.0, "the diameter at 0 mm"),
    ('shape = "tube", diameter = "30 mm", wall = "2.5 mm"', "", 2.5, "the wall at 0 mm"),
    ('shape = "box", depth = "60 mm", width = "40 mm", wall = "4 mm"', "", 4.0, "the wall at 0 mm"),
    # Along the diagonal: the arc lies R (sqrt 2 - 1) inside the square corner; R = 8 outside, a sharp corner inside.
    ('shape = "box", depth = "60 mm", width = "40 mm", wall = "4 mm", corner_radius = "8 mm", '
     'inner_radius = "0 mm"', "",
     4 * math.sqrt(2) - 8 * (math.sqrt(2) - 1), "the corner of the wall at 0 mm"),
    ('shape = "channel", depth = "60 mm", width = "40 mm", web = "5 mm", flange = "7 mm"', "", 5.0, "the web at 0 mm"),
    ('shape = "angle", depth = "60 mm", width = "40 mm", thickness = "4.5 mm"', "", 4.5, "the thickness at 0 mm"),
    ('shape = "tee", depth = "60 mm", width = "40 mm", web = "5 mm", flange = "3 mm"', "", 3.0, "the flange at 0 mm"),
    # A drawn channel: back 6, legs 4; and a slab with a round void 3 below its top.
    ('shape = "outline", outer = [["0 mm", "0 mm"], ["40 mm", "0 mm"], ["40 mm", "4 mm"], ["6 mm", "4 mm"], '
     '["6 mm", "36 mm"], ["40 mm", "36 mm"], ["40 mm", "40 mm"], ["0 mm", "40 mm"]]', "", 4.0, "the thinnest wall"),
    ('shape = "outline", outer = [["0 mm", "0 mm"], ["40 mm", "0 mm"], ["40 mm", "30 mm"], ["0 mm", "30 mm"]], '
     'circles = [{ y = "20 mm", z = "19 mm", diameter = "16 mm" }]', "", 3.0, "the thinnest wall"),
])
def test_the_thinnest_wall_is_found(section, more, thickness, what):
    made = part(section, more)
    near = 0.02 if "circles" in section else 1e-9  # a circle is a polygon there
    assert least("least_wall", made) == pytest.approx(thickness, abs=near)
    rule, reason = Shop(least_wall=thickness + 0.1).broken(made)
    assert rule == "shop.least_wall" and reason.startswith(what)
    assert Shop(least_wall=thickness * (1 - near)).broken(made) is None


HOLE = '[[members.bar.holes]]\nname = "h"\nalong = "z"\n'


@pytest.mark.parametrize(("section", "more", "thickness", "what"), [
    # A plate 40 wide (y), 10 deep: hole of 14 with its middle 11 beside the line leaves 20 - 11 - 7.
    ('shape = "rectangle", depth = "10 mm", width = "40 mm"',
     HOLE + 'at = "150 mm"\noffset = "11 mm"\ndiameter = "14 mm"', 2.0, "what h leaves to the right edge"),
    ('shape = "rectangle", depth = "10 mm", width = "40 mm"',
     HOLE + 'at = "10 mm"\ndiameter = "14 mm"', 3.0, "what h leaves to the start"),
    ('shape = "rectangle", depth = "10 mm", width = "40 mm"',
     HOLE + 'at = "289 mm"\ndiameter = "14 mm"', 4.0, "what h leaves to the end"),
    ('shape = "rectangle", depth = "10 mm", width = "40 mm"',
     HOLE + 'at = "100 mm"\ndiameter = "14 mm"\ncount = 3\npitch = "16.5 mm"', 2.5,
     "what h.1 and h.2 leave between them"),
    # Flange tip of the I: 23 from the middle; the hole's middle at 15, radius 4.
    (I, HOLE.replace('along = "z"', 'through = "flanges"') + 'at = "150 mm"\noffset = "15 mm"\ndiameter = "8 mm"', 4.0,
     "what h leaves to the right edge of the"),
    # A slot square to the member: its end 20 - 12 = 8 from the edge, radius 3.
    ('shape = "rectangle", depth = "10 mm", width = "40 mm"',
     '[[members.bar.slots]]\nname = "s"\nalong = "z"\nat = "150 mm"\nlength = "30 mm"\nwidth = "6 mm"\n'
     'turned = "90 deg"', 5.0,
     "what s leaves to the"),
    # An opening between two notches: 40 deep, opening 12 high, notch 9 deep from the top: 20 - 6 - 9 between.
    (PLATE, '[[members.bar.openings]]\nname = "o"\nalong = "y"\nat = "150 mm"\nlength = "30 mm"\nheight = "12 mm"\n'
     '[[members.bar.notches]]\nname = "n"\nedge = "top"\nat = "150 mm"\nlength = "10 mm"\ndepth = "9 mm"', 5.0,
     "what o and n leave between them"),
    (PLATE, '[[members.bar.notches]]\nname = "n"\nedge = "bottom"\nat = "150 mm"\nlength = "10 mm"\ndepth = "33 mm"',
     7.0, "what n leaves to the top edge"),
])
def test_what_cuts_leave_is_a_wall_too(section, more, thickness, what):
    made = part(section, more)
    assert least("least_wall", made) == pytest.approx(thickness, abs=1e-9)
    assert Shop(least_wall=thickness + 0.01).broken(made)[1].startswith(what)


def test_a_hole_beside_a_sloping_edge_is_measured_square_to_the_edge():
    # A plate 40 mm deep tapering to 20 mm: its edges fall 10 in 300.
    made = part(PLATE, 'taper = { depth = "20 mm" }\n[[members.bar.holes]]\nalong = "y"\nat = "150 mm"\n'
                       'diameter = "10 mm"\noffset = "6 mm"')
    upright = 15.0 - 6.0
    exact = upright * math.cos(math.atan(10.0 / 300.0))
    assert least("edge_distance", made) == pytest.approx(exact / 10.0, abs=1e-12)
    assert least("least_wall", made) == pytest.approx(exact - 5.0, abs=1e-12)


def test_gaps_are_those_of_finely_drawn_rims():
    """Against brute force: 1500 points on each of two turned rims."""
    made = part('shape = "rectangle", depth = "10 mm", width = "90 mm"', """
[[members.bar.openings]]
along = "z"
at = "120 mm"
offset = "10 mm"
length = "30 mm"
height = "18 mm"
corner_radius = "4 mm"
turned = "25 deg"
[[members.bar.slots]]
along = "z"
at = "165 mm"
offset = "-12 mm"
length = "40 mm"
width = "9 mm"
turned = "-50 deg"
""")
    slot, opening = sorted(rooms_of(made.members[0]), key=lambda room: room.radius, reverse=True)
    found = gap(ring(slot.points), ring(opening.points)) - slot.radius - opening.radius

    def rim(room, n=1500):
        corners = np.array(room.points)
        steps = np.linspace(0, len(corners), n, endpoint=False)
        k, t = steps.astype(int), (steps % 1)[:, None]
        return corners[k] * (1 - t) + corners[(k + 1) % len(corners)] * t

    one, two = rim(slot), rim(opening)
    brute = np.sqrt(((one[:, None] - two[None]) ** 2).sum(-1)).min() - slot.radius - opening.radius
    assert found == pytest.approx(brute, abs=1e-3) and found < brute + 1e-9
    assert gap(ring([(0.0, 0.0)]), chain([(3.0, -1.0), (3.0, 5.0)])) == 3.0


@pytest.mark.parametrize(("section", "more", "radius", "what"), [
    (I, "", 5.0, "the root at 0 mm"),
    (I, 'taper = { root_radius = "3 mm" }', 3.0, "the root at 300 mm"),
    (I.replace('"5 mm"', '"0 mm"'), "", 0.0, "the root"),
    (PLATE, '[[members.bar.openings]]\nname = "o"\nalong = "y"\nat = "150 mm"\nlength = "30 mm"\nheight = "12 mm"\n'
            'corner_radius = "2.5 mm"', 2.5, "a corner of o"),
    (PLATE, '[[members.bar.slots]]\nname = "s"\nalong = "y"\nat = "150 mm"\nlength = "30 mm"\nwidth = "7 mm"', 3.5,
     "an end of s"),
    (PLATE, '[[members.bar.notches]]\nname = "n"\nedge = "top"\nat = "150 mm"\nlength = "10 mm"\ndepth = "9 mm"', 0.0,
     "a corner of n"),
    (PLATE, 'stations = [{ at = "100 mm", depth = "40 mm" }, '
            '{ at = "100 mm", depth = "30 mm", shoulder_fillet = "4 mm" }]',
     4.0, "the shoulder at 100 mm"),
    ('shape = "outline", outer = [["0 mm", "0 mm"], ["40 mm", "0 mm"], ["40 mm", "4 mm"], ["6 mm", "4 mm", "2 mm"], '
     '["6 mm", "40 mm"], ["0 mm", "40 mm"]]', "", 2.0, "the sharpest inner corner"),
    ('shape = "outline", outer = [["0 mm", "0 mm"], ["40 mm", "0 mm"], ["40 mm", "4 mm"], ["6 mm", "4 mm"], '
     '["6 mm", "40 mm"], ["0 mm", "40 mm"]]', "", 0.0, "the sharpest inner corner"),
    ('shape = "outline", outer = [["0 mm", "0 mm"], ["40 mm", "0 mm"], ["40 mm", "30 mm"], ["0 mm", "30 mm"]], '
     'inner = [[["10 mm", "10 mm", "3 mm"], ["30 mm", "10 mm", "3 mm"], ["30 mm", "20 mm", "3 mm"], '
     '["10 mm", "20 mm", "3 mm"]]]', "", 3.0, "the sharpest inner corner"),
])
def test_inner_corners_have_their_radius(section, more, radius, what):
    made = part(section, more)
    assert least("tool_radius", made) == pytest.approx(radius, abs=1e-9)
    assert Shop(tool_radius=radius + 0.01).broken(made)[1].startswith(what)


def test_round_holes_and_outer_corners_need_no_milling_tool():
    made = part('shape = "rectangle", depth = "10 mm", width = "40 mm"', HOLE + 'at = "150 mm"\ndiameter = "2 mm"')
    assert Shop(tool_radius=50.0).broken(made) is None
    outer = ('shape = "outline", outer = [["0 mm", "0 mm"], ["40 mm", "0 mm", "1 mm"], ["40 mm", "30 mm"], '
             '["0 mm", "30 mm"]]')
    assert Shop(tool_radius=50.0).broken(part(outer)) is None


@pytest.mark.parametrize(("section", "more", "times"), [
    ('shape = "rectangle", depth = "10 mm", width = "40 mm"',
     HOLE + 'at = "150 mm"\noffset = "-11 mm"\ndiameter = "6 mm"', 9.0 / 6.0),
    ('shape = "rectangle", depth = "10 mm", width = "40 mm"', HOLE + 'at = "12 mm"\ndiameter = "10 mm"', 1.2),
    # The web of an I ends in flanges: only the ends of the member are edges.
    (I, HOLE.replace('along = "z"', 'through = "web"') + 'at = "150 mm"\ndiameter = "10 mm"', 15.0),
    ('shape = "angle", depth = "60 mm", width = "40 mm", thickness = "5 mm"',
     'line_at = "origin"\n' + HOLE.replace('along = "z"', 'through = "upright leg"') + 'at = "150 mm"\n'
     'offset = "18 mm"\ndiameter = "10 mm"', 1.2),
    ('shape = "tee", depth = "60 mm", width = "40 mm", web = "5 mm", flange = "5 mm"',
     'line_at = "origin"\n' + HOLE.replace('along = "z"', 'through = "web"') + 'at = "150 mm"\noffset = "-10 mm"\n'
     'diameter = "10 mm"', 2.0),
    ('shape = "channel", depth = "60 mm", width = "40 mm", web = "5 mm", flange = "5 mm"',
     'line_at = "origin"\n' + HOLE.replace('along = "z"', 'through = "top flange"') + 'at = "150 mm"\n'
     'offset = "25 mm"\ndiameter = "10 mm"', 1.5),
])
def test_holes_keep_their_distance_from_edges(section, more, times):
    assert least("edge_distance", part(section, more)) == pytest.approx(times, abs=1e-9)


def test_variants_that_break_a_rule_are_left_out_with_the_rule(plan):
    made = plan('[vary]\n"members.arm.section.web" = ["3 mm", "4 mm", "5 mm"]\nbore = ["8 mm", "10 mm"]\n'
                '[shop]\nleast_wall = "4 mm"\ntool_radius = "6 mm"\nedge_distance = 1.5')
    assert [v.numbers["members.arm.section.web"] for v in made.variants()] == [4.0, 4.0, 5.0, 5.0]
    assert {(p.rule, p.number) for p in made.left_out()} == {("shop.least_wall", 1), ("shop.least_wall", 2)}
    assert re.match(r"the web at 0 mm is 3 mm thick; at least 4 mm", made.left_out()[0].reason)
