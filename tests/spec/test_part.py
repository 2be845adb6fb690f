"""What a right spec becomes."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from geometry.outline import Arc, Line
from geometry.part import (
    BearingLoad,
    BodyLoad,
    Case,
    Cut,
    LineLoad,
    Part,
    Pressure,
    RegionLoad,
    RemotePoint,
    TemperatureLoad,
)
from geometry.problem import SpecError
from geometry.spec import PartSpec, part_from_spec, part_from_text, read_part, with_parameters
from geometry.spec.checks.profile import polygon_of
from geometry.spec.resolve.drawn import area

HERE = Path(__file__).parent
EXAMPLES = HERE.parents[1] / "studies" / "examples"
CANTILEVER = Path(__file__).with_name("cantilever.toml").read_text(encoding="utf-8")
CAMERA_ARM = (HERE / "camera_arm.toml").read_text(encoding="utf-8")


def bar(extra: str = "", section: str = 'shape = "rectangle", depth = "40 mm", width = "20 mm"', **words: str) -> Part:
    """A bar of 800 mm along x, held at its start."""
    lines = "\n".join(f"{key} = {value}" for key, value in words.items())
    return part_from_text(
        'material = "S235"\n[members.bar]\nfrom = ["0 mm", "0 mm", "0 mm"]\nto = ["800 mm", "0 mm", "0 mm"]\n'
        f'section = {{ {section} }}\n{lines}\n[supports.wall]\non = "bar.start"\nhold = "all"\n{extra}'
        + ("" if "[loads." in extra else '\n[loads.own]\non = "bar.end"\nforce = ["0 N", "0 N", "-1 N"]\n')
    )


def test_the_plain_cantilever_in_numbers() -> None:
    part = part_from_text(CANTILEVER)
    (member,) = part.members
    assert (member.start, member.end, member.up) == ((0, 0, 0), (800, 0, 0), (0, 0, 1))
    assert member.section.dims == {"depth": 40.0, "width": 20.0, "corner_radius": 0.0}
    assert part.loads == (
        RegionLoad("tip", "bar.end", force=(0.0, 0.0, -300.0)),
        BodyLoad("self_weight", (0.0, 0.0, -9810.0)),
    )
    assert part.cases[1] == Case("tip_force_and_weight", {"tip": 1.0, "self_weight": 1.0})
    assert [(limit.quantity, limit.value) for limit in part.limits] == [("deflection", 3.0), ("yield_factor", 1.5)]
    assert (part.accuracy, part.source_text, part.parameters["reach"]) == (0.02, CANTILEVER, 800.0)


def test_the_sketch_of_the_design_in_numbers() -> None:
    part = part_from_text(CAMERA_ARM)
    (member,) = part.members
    assert member.section.dims["bottom_width"] == 46.0
    # The bottom flange that nobody named follows the top one along the taper.
    assert member.stations[0].at == 360.0
    assert member.stations[0].dims == {"depth": 32.0, "width": 30.0, "bottom_width": 30.0}
    assert member.cuts == (Cut("hole1", "hole1", "hole", "y", "web", 180.0, 0.0, 14.0, 14.0),)
    assert part.material.yield_strength == 260.0  # thickest plate 8 mm: the row 5 to 15 mm
    assert part.limits[0].value == 0.5


PARTS = sorted(path for path in EXAMPLES.glob("*.toml") if not path.stem.endswith("_plan"))


@pytest.mark.parametrize("path", PARTS, ids=lambda p: p.stem)
def test_every_example_is_a_right_spec(path: Path) -> None:
    assert read_part(path).members


def test_rows_and_grids_are_numbered_along_the_member_first() -> None:
    part = bar(
        '[[members.bar.holes]]\nname = "bolts"\nalong = "y"\nat = "100 mm"\noffset = "1 mm"\ncount = 3\n'
        'pitch = "50 mm"\nrows = 2\nrow_pitch = "20 mm"\ndiameter = "6 mm"\n'
    )
    cuts = part.members[0].cuts
    assert [cut.name for cut in cuts] == [f"bolts.{k}" for k in range(1, 7)]
    assert {cut.group for cut in cuts} == {"bolts"}
    assert [cut.at for cut in cuts] == [100, 150, 200, 100, 150, 200]
    assert [cut.offset for cut in cuts] == [-9, -9, -9, 11, 11, 11]


def test_the_axis_of_a_cut_follows_from_the_wall() -> None:
    box = 'shape = "box", depth = "60 mm", width = "40 mm", wall = "3 mm", corner_radius = "6 mm"'
    part = bar(
        '[[members.bar.holes]]\nthrough = "left wall"\nat = "100 mm"\ndiameter = "8 mm"\n'
        '[[members.bar.slots]]\nthrough = "top wall"\nat = "200 mm"\nlength = "20 mm"\nwidth = "8 mm"\n'
        'turned = "90 deg"\n'
        '[[members.bar.openings]]\nthrough = "all"\nalong = "y"\nat = "300 mm"\nlength = "50 mm"\nheight = "20 mm"\n'
        'corner_radius = "3 mm"\n'
        '[[members.bar.notches]]\nedge = "left"\nat = "500 mm"\nlength = "10 mm"\ndepth = "5 mm"\n'
        'corner_radius = "5 mm"\n',
        section=box,
    )
    hole, slot, opening, notch = part.members[0].cuts
    assert [cut.axis for cut in part.members[0].cuts] == ["y", "z", "y", "z"]
    assert (slot.length, slot.depth, slot.turned) == (20.0, 8.0, pytest.approx(math.pi / 2))
    assert (opening.length, opening.depth, opening.corner_radius) == (50.0, 20.0, 3.0)
    assert (notch.edge, notch.through, notch.depth, notch.name) == ("left", "all", 5.0, "notch1")
    assert part.members[0].section.dims["inner_radius"] == 3.0
    assert hole.name == "hole1"


def test_the_inner_radius_of_a_box_follows_its_wall_at_every_station() -> None:
    box = 'shape = "box", depth = "60 mm", width = "40 mm", wall = "3 mm", corner_radius = "6 mm"'
    stations = bar(section=box, taper='{ wall = "2 mm" }').members[0].stations
    assert stations[0].dims == {"wall": 2.0, "inner_radius": 4.0}


def test_every_kind_of_load() -> None:
    part = bar(
        """
        [[members.bar.holes]]
        name = "pin"
        along = "y"
        at = "700 mm"
        diameter = "10 mm"
        [members.bar.patches.pad]
        face = "top"
        from = "100 mm"
        to = "150 mm"
        across = ["-5 mm", "5 mm"]
        [loads.a]
        on = "bar.end"
        force = ["1 kN", "0 N", "0 N"]
        moment = ["0 N m", "2 N m", "0 N m"]
        coupling = "rigid"
        [loads.b]
        on = "bar.end"
        torque = "3 N m"
        [loads.c]
        on = "bar.pad"
        pressure = "0.2 MPa"
        [loads.d]
        on = "bar.pin"
        bearing = ["3 N", "0 N", "4 N"]
        [loads.e]
        on = "bar.top"
        force_per_length = ["0 N/m", "0 N/m", "-500 N/m"]
        from = "100 mm"
        [loads.f]
        on = "bar.end"
        point = ["900 mm", "0 mm", "50 mm"]
        force = ["0 N", "0 N", "-5 N"]
        mass = "2 kg"
        inertia = ["0.01 kg m^2", "0.02 kg m^2", "0.02 kg m^2"]
        [loads.g]
        acceleration = ["0 m/s^2", "0 m/s^2", "2 m/s^2"]
        [loads.h]
        temperature_change = "-40 K"
        """
    )
    assert part.loads == (
        RegionLoad("a", "bar.end", (1000.0, 0.0, 0.0), (0.0, 2000.0, 0.0), "rigid"),
        RegionLoad("b", "bar.end", moment=(3000.0, 0.0, 0.0)),
        Pressure("c", "bar.pad", 0.2),
        BearingLoad("d", "bar.pin", (3.0, 0.0, 4.0)),
        LineLoad("e", "bar.top", 100.0, 800.0, (0.0, 0.0, -0.5), (0.0, 0.0, -0.5)),
        RemotePoint(
            "f", "bar.end", (900.0, 0.0, 50.0), "average", (0.0, 0.0, -5.0), mass=0.002,
            inertia=(10.0, 20.0, 20.0, 0.0, 0.0, 0.0),
        ),
        BodyLoad("g", (0.0, 0.0, -2000.0)),  # what is accelerated upwards is pressed down
        TemperatureLoad("h", -40.0),
    )  # fmt: skip
    assert part.cases == (Case("all", dict.fromkeys("abcdefgh", 1.0)),)


def test_torque_turns_about_a_slanting_member() -> None:
    text = CANTILEVER.replace('["reach", "0 mm", "0 mm"]', '["3 mm", "0 mm", "4 mm"]').replace(
        'force = ["0 N", "0 N", "-300 N"]', 'torque = "10 N mm"'
    )
    load = part_from_text(text).loads[0]
    assert isinstance(load, RegionLoad)
    assert load.moment == pytest.approx((6.0, 0.0, 8.0))


def test_every_way_to_hold() -> None:
    def held(words: str) -> tuple[dict[str, float], str]:
        text = CANTILEVER.replace("[limits]", f'[supports.more]\non = "bar.end"\n{words}\n[limits]')
        support = part_from_text(text).supports[1]
        return dict(support.held), support.coupling

    all_six = dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0)
    assert held('hold = "all"') == ({"x": 0, "y": 0, "z": 0}, "surface")
    assert held('hold = "all"\ncoupling = "rigid"') == (all_six, "rigid")
    assert held('hold = "pin"') == ({"x": 0, "y": 0, "z": 0}, "average")
    assert held('hold = "symmetry"') == ({"normal": 0}, "surface")
    assert held('hold = ["y", "z"]') == ({"y": 0, "z": 0}, "surface")
    moved = held('hold = { z = "-2 mm", ry = "0.5 deg" }\ncoupling = "average"')
    assert moved == ({"z": -2.0, "ry": pytest.approx(math.radians(0.5))}, "average")


def test_defaults_of_anchor_and_up() -> None:
    assert bar(line_at='"top"').members[0].anchor == "top"
    assert bar(line_at='"bottom left"').members[0].anchor == "bottom"
    assert bar(line_at='"left"').members[0].anchor == "centre"
    assert bar(line_at='"top"', anchor='"bottom"').members[0].anchor == "bottom"
    upright = part_from_text(CANTILEVER.replace('["reach", "0 mm", "0 mm"]', '["0 mm", "0 mm", "reach"]'))
    assert upright.members[0].up == (1.0, 0.0, 0.0)


def test_limits_with_names_of_their_own() -> None:
    part = part_from_text(
        CANTILEVER + '\n[limits.sag]\nquantity = "relative_displacement"\nat = "middle"\nrelative_to = "bar.end"\n'
        'component = "z"\nmax = "1 mm"\ncases = ["tip_force"]\n'
        '[limits.push]\nquantity = "reaction"\nat = "wall"\nmax = "1 kN"\n'
        '[places.middle]\nat = "reach / 2"\n'
    )
    sag, push = part.limits[2:]
    assert (sag.value, sag.at, sag.relative_to, sag.component, sag.cases) == (
        1,
        "middle",
        "bar.end",
        "z",
        ("tip_force",),
    )
    assert (push.quantity, push.value, part.places[0].at) == ("reaction", 1000.0, 400.0)


def test_an_outline_has_the_area_that_was_drawn() -> None:
    outline = bar(
        section='shape = "outline", outer = [["0 mm","0 mm"], ["0 mm","40 mm","5 mm"], ["30 mm","40 mm","5 mm"], '
        '["30 mm","0 mm"]], circles = [{ y = "15 mm", z = "20 mm", diameter = "10 mm" }]'
    ).members[0].section.outline  # fmt: skip
    assert outline is not None
    assert sum(isinstance(edge, Arc) for edge in outline.outer) == 2
    assert all(isinstance(edge, (Line, Arc)) for edge in outline.outer)
    for loop in (outline.outer, *outline.inner):
        for edge, following in zip(loop, [*loop[1:], loop[0]], strict=True):
            assert edge.end == pytest.approx(following.start)
            if isinstance(edge, Arc):
                assert math.dist(edge.start, edge.centre) == pytest.approx(math.dist(edge.end, edge.centre))
    # Two corners of radius 5 lose (1 - pi/4) 25 each; the polygon with 0.1 rad chords is 0.2 % of an arc short.
    outer = area([p for edge in outline.outer for p in polygon_of(edge)])
    inner = area([p for edge in outline.inner[0] for p in polygon_of(edge)])
    assert outer == pytest.approx(1200.0 - 2.0 * (1.0 - math.pi / 4.0) * 25.0, rel=1e-4)
    assert inner == pytest.approx(-math.pi * 25.0, rel=2e-3)


def test_parameters_may_refer_to_later_ones_and_be_plain_numbers() -> None:
    text = CANTILEVER.replace('reach = "800 mm"', 'reach = "n * depth"\nn = 20')
    assert part_from_text(text).members[0].end == (800.0, 0.0, 0.0)


def test_other_values_of_parameters_give_another_part() -> None:
    part = with_parameters(CAMERA_ARM, {"bore": "10 mm", "reach": "400 mm"})
    assert part.members[0].cuts[0].at == 200.0
    assert part.members[0].cuts[0].length == 10.0
    assert part.source_text.startswith('# Parameters changed afterwards: bore = "10 mm"')
    with pytest.raises(SpecError, match="Did you mean bore"):
        with_parameters(CAMERA_ARM, {"bor": "10 mm"})


def test_python_and_toml_are_one_model() -> None:
    spec = PartSpec(
        material="S235",
        members={
            "bar": {
                "start": ["0 mm", "0 mm", "0 mm"],
                "end": ["800 mm", "0 mm", "0 mm"],
                "section": {"shape": "rectangle", "depth": "40 mm", "width": "20 mm"},
            }
        },
        supports={"wall": {"on": "bar.start", "hold": "all"}},
        loads={"own": {"on": "bar.end", "force": ["0 N", "0 N", "-1 N"]}},
    )
    from_python, from_text = part_from_spec(spec), bar()
    assert from_python.members == from_text.members
    assert from_python.loads == from_text.loads
    assert with_parameters(spec, {}) == from_python


def test_stations_that_mean_one_place_are_at_exactly_one_place() -> None:
    """Sums that differ in their last digit make a step, not a stretch of 1e-14 mm; the last place is the end itself."""
    text = CANTILEVER
    text = text.replace(
        "[supports.wall]",
        '[[members.bar.stations]]\nat = "110.1 mm * 3"\ndepth = "40 mm"\n'
        '[[members.bar.stations]]\nat = "330.3 mm"\ndepth = "30 mm"\n\n[supports.wall]',
    )
    first, second = part_from_text(text).members[0].stations
    assert first.at == second.at
