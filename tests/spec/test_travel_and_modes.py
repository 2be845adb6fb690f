"""Travelling loads, natural frequencies, buckling and their limits: what a spec becomes, and what is refused."""

from __future__ import annotations

import pytest

from geometry.part import Buckling, Case, StripLoad, Travel, Vibration
from geometry.problem import Problem, SpecError
from geometry.spec import part_from_text

RAIL = """
material = "S235"
[members.rail]
from = ["0 mm", "0 mm", "0 mm"]
to = ["1200 mm", "0 mm", "0 mm"]
section = { shape = "box", depth = "60 mm", width = "40 mm", wall = "3 mm" }
[supports.left]
on = "rail.start"
hold = "all"
[supports.right]
on = "rail.end"
hold = ["y", "z"]
[loads.trolley]
on = "rail.top"
force = ["0 N", "0 N", "-400 N"]
travels = { from = "30 mm", to = "990 mm", steps = 24, contact = "40 mm", axles = ["0 mm", "180 mm"] }
[loads.lamp]
on = "rail.end"
force = ["0 N", "0 N", "-50 N"]
[cases.crossing]
trolley = 1.2
self_weight = 1.0
[cases.parked]
lamp = 1.0
self_weight = 1.0
[vibration]
modes = 4
[buckling.parked]
fixed = ["self_weight"]
[limits]
frequency = "20 Hz"
buckling_factor = 3
[limits.sag]
quantity = "deflection"
max = "2 mm"
cases = ["crossing"]
"""
TRAVELS = 'travels = { from = "30 mm", to = "990 mm", steps = 24, contact = "40 mm", axles = ["0 mm", "180 mm"] }'
OWN = 'material = { E = "210 GPa", nu = 0.3 }'


def problems(*changes: tuple[str, str]) -> tuple[Problem, ...]:
    """What is found wrong with the rail after some changes."""
    text = RAIL
    for old, new in changes:
        assert old in text, old
        text = text.replace(old, new)
    try:
        part_from_text(text)
    except SpecError as error:
        return error.problems
    return ()


def test_each_position_is_a_load_and_a_case() -> None:
    part = part_from_text(RAIL)
    strips = [load for load in part.loads if isinstance(load, StripLoad)]
    assert len(strips) == 25  # steps + 1
    assert strips[0] == StripLoad("trolley@30", "rail.top", (30.0, 210.0), 40.0, (0.0, 0.0, -400.0))
    assert strips[-1].centres == (990.0, 1170.0)
    crossing = [case for case in part.cases if case.travel]
    assert crossing[8] == Case("crossing@350", {"self_weight": 1.0, "trolley@350": 1.2},
                               Travel("crossing", "trolley", 350.0))  # fmt: skip
    assert [case.travel.position for case in crossing if case.travel] == pytest.approx([30 + 40 * k for k in range(25)])
    assert part.cases[-1] == Case("parked", {"lamp": 1.0, "self_weight": 1.0})


def test_studies_and_limits_in_numbers() -> None:
    part = part_from_text(RAIL)
    assert part.vibration == Vibration(4, free=False)
    assert part.buckling == (Buckling("parked", ("self_weight",), 3),)
    frequency, factor, sag = part.limits
    assert (frequency.quantity, frequency.value) == ("frequency", 20.0)
    assert (factor.quantity, factor.value) == ("buckling_factor", 3.0)
    assert len(sag.cases) == 25
    assert sag.cases[0] == "crossing@30"


def test_defaults_and_named_limits() -> None:
    text = RAIL.replace("modes = 4", 'supports = "none"').replace('fixed = ["self_weight"]', "")
    text += ('[limits.first]\nquantity = "frequency"\nmin = "0.05 kHz"\n'
             '[limits.parked]\nquantity = "buckling_factor"\nmin = 4\ncases = ["parked"]\n')  # fmt: skip
    part = part_from_text(text)
    assert part.vibration == Vibration(6, free=True)
    assert part.buckling == (Buckling("parked", (), 3),)
    by_name = {limit.name: limit for limit in part.limits}
    assert by_name["first"].value == pytest.approx(50.0)
    assert by_name["parked"].cases == ("parked",)


def test_one_axle_and_a_load_that_rests() -> None:
    one = part_from_text(RAIL.replace(', axles = ["0 mm", "180 mm"]', "").replace(", steps = 24", ""))
    strips = [load for load in one.loads if isinstance(load, StripLoad)]
    assert [s.centres for s in strips] == [(pytest.approx(30.0 + 48.0 * k),) for k in range(21)]
    resting = part_from_text(RAIL.replace("trolley = 1.2", "trolley = 0").replace('cases = ["crossing"]', ""))
    assert not any(isinstance(load, StripLoad) for load in resting.loads)
    assert resting.cases[0] == Case("crossing", {"self_weight": 1.0})


def test_without_cases_the_one_case_travels() -> None:
    head, _, rest = RAIL.partition("[cases.crossing]")
    part = part_from_text(head + "[vibration]" + rest.partition("[vibration]")[2].partition("[buckling")[0])
    assert [case.name for case in part.cases][:2] == ["all@30", "all@70"]
    assert part.cases[0].factors == {"lamp": 1.0, "trolley@30": 1.0}


@pytest.mark.parametrize(
    ("old", "new", "path", "word"),
    [
        # positions, strips and axles
        ('from = "30 mm", to', 'from = "-5 mm", to', "loads.trolley.travels.from", "from 0 to less than 1020 mm"),
        ('to = "990 mm"', 'to = "1170 mm"', "loads.trolley.travels.to", "up to 1020 mm"),
        ('to = "990 mm"', 'to = "30 mm"', "loads.trolley.travels.to", "more than 30 mm"),
        ('to = "990 mm"', 'to = "30.1 mm"', "loads.trolley.travels.steps", "steps of at least 0.012 mm"),
        ("steps = 24", "steps = 0", "loads.trolley.travels.steps", "at least 1 and at most 200"),
        ("steps = 24", "steps = 201", "loads.trolley.travels.steps", "at least 1 and at most 200"),
        ("steps = 24", 'steps = "2.5"', "loads.trolley.travels.steps", "a whole number"),
        ("steps = 24", "steps = 2.5", "loads.trolley.travels.steps", "a whole number"),
        ('contact = "40 mm"', 'contact = "0 mm"', "loads.trolley.travels.contact", "greater than 0"),
        ('contact = "40 mm", axles = ["0 mm", "180 mm"]', 'contact = "1300 mm"', "loads.trolley.travels.contact",
         "at most the face: 1200 mm"),
        ('contact = "40 mm", ', "", "loads.trolley.travels.contact", "spread"),
        ('contact = "40 mm"', "contact = 40", "loads.trolley.travels.contact", 'Add the unit: "40 mm"'),
        ('["0 mm", "180 mm"]', '["180 mm", "0 mm"]', "loads.trolley.travels.axles[1]", "0 mm: the other axles"),
        ('["0 mm", "180 mm"]', '["0 mm", "180 mm", "90 mm"]', "loads.trolley.travels.axles[3]", "at least 220 mm"),
        ('["0 mm", "180 mm"]', '["0 mm", "30 mm"]', "loads.trolley.travels.axles[2]", "at least 40 mm"),
        ('["0 mm", "180 mm"]', '["0 mm", "1.3 m"]', "loads.trolley.travels.axles", "less than the member's length"),
        ('["0 mm", "180 mm"]', "[]", "loads.trolley.travels.axles", "1 to 20 values"),
        ('axles = ["0', 'axels = ["0', "loads.trolley.travels.axels", 'Did you mean "axles"'),
        # what acts, and on what
        ('on = "rail.top"', 'on = "rail.start"', "loads.trolley.on", "a face along the member: rail.top"),
        ('on = "rail.top"', 'on = "rail.tpo"', "loads.trolley.on", 'Did you mean "rail.top"'),
        ('force = ["0 N", "0 N", "-400 N"]', "", "loads.trolley.force", "of each axle"),
        ('force = ["0 N", "0 N", "-400 N"]', 'force = ["0 N", "0 N", "0 N"]', "loads.trolley.force", "other than 0"),
        ('force = ["0 N", "0 N", "-400 N"]', 'pressure = "1 MPa"', "loads.trolley.pressure", "beside travels"),
        (TRAVELS, 'travels = "1 m"', "loads.trolley.travels", "a table of from, to, steps, contact, axles"),
        # cases
        ("lamp = 1.0\n", "trolley = 1.0\ntrain = 1.0\n", "cases.parked", "one travelling load"),
        # vibration
        ("modes = 4", "modes = 0", "vibration.modes", "at least 1 and at most 40"),
        ("modes = 4", "modes = 41", "vibration.modes", "at least 1 and at most 40"),
        ("modes = 4", 'supports = "free"', "vibration.supports", '"declared", "none"'),
        ("[vibration]\nmodes = 4\n", "", "vibration", "for the limit frequency"),
        # buckling
        ("[buckling.parked]", "[buckling.praked]", "buckling.praked", 'Did you mean "parked"'),
        ("[buckling.parked]", "[buckling.crossing]", "buckling.crossing", "make a case with a still load"),
        ('fixed = ["self_weight"]', 'fixed = ["lmap"]', "buckling.parked.fixed[1]", 'Did you mean "lamp"'),
        ('fixed = ["self_weight"]', 'fixed = ["trolley"]', "buckling.parked.fixed[1]", "acts in the case parked"),
        ('fixed = ["self_weight"]', 'fixed = ["self_weight", "lamp"]', "buckling.parked.fixed", "must grow"),
        ('fixed = ["self_weight"]', "modes = 50", "buckling.parked.modes", "at most 40"),
        ('[buckling.parked]\nfixed = ["self_weight"]\n', "", "buckling", "CASE one of parked"),
        # limits
        ('frequency = "20 Hz"', "frequency = 20", "limits.frequency", 'Add the unit: "20 Hz"'),
        ('frequency = "20 Hz"', 'frequency = "0.05 s"', "limits.frequency", "It is a time"),
        ('"deflection"\nmax = "2 mm"', '"frequency"\nmax = "2 Hz"', "limits.sag.max", "min only, for frequency"),
        ('"deflection"\nmax = "2 mm"', '"frequency"\nmin = "2 Hz"', "limits.sag.cases", "belongs to no case"),
        ('"deflection"\nmax = "2 mm"', '"buckling_factor"\nmin = 2', "limits.sag.cases", "[buckling.CASE]: parked"),
        ('"deflection"\nmax = "2 mm"\ncases = ["crossing"]', '"frequency"\nmin = "2 Hz"\nat = "rail.end"',
         "limits.sag.at", "that of the whole part"),
        ('cases = ["crossing"]', 'cases = ["crosing"]', "limits.sag.cases", 'Did you mean "crossing"'),
    ],
)  # fmt: skip
def test_a_mistake_in_the_rail(old: str, new: str, path: str, word: str) -> None:
    train = ("[loads.lamp]", f'[loads.train]\non = "rail.top"\nforce = ["0 N", "0 N", "-1 N"]\n{TRAVELS}\n[loads.lamp]')
    changes = [(old, new), train] if "train" in new else [(old, new)]
    found = problems(*changes)
    # Other mistakes may follow from it: of a case with another load, of a limit with another quantity.
    (text,) = [str(p) for p in found if p.path == path]
    assert len(found) == 1 or "Did you mean" in word or new.startswith(("trolley", '"frequency"', '["180 mm"'))
    assert text.startswith(path), text
    assert word in text, text


def test_what_has_no_mass_does_not_vibrate() -> None:
    found = problems(('material = "S235"', OWN), ("self_weight = 1.0", ""), ('fixed = ["self_weight"]', ""))
    assert [(p.path, p.allowed) for p in found] == [("material.density", "a density, for [vibration]")]


def test_a_gap_of_the_face_under_an_axle_is_refused_with_its_positions() -> None:
    opening = ('[supports.left]', '[[members.rail.notches]]\nedge = "top"\nat = "600 mm"\nlength = "50 mm"\n'
               'depth = "2 mm"\n[supports.left]')  # fmt: skip
    solid = ('shape = "box", depth = "60 mm", width = "40 mm", wall = "3 mm"',
             'shape = "rectangle", depth = "60 mm", width = "40 mm"')  # fmt: skip
    (problem,) = problems(opening, solid)
    # A strip of 40 mm meets the notch, 575 to 625 mm, while its middle is between 555 and 645 mm.
    assert problem.path == "loads.trolley.travels"
    assert "575 to 625 mm (notch1) with the first axle at 390, 430, 590 ... 630 mm" in problem.given


def test_every_mistake_at_once() -> None:
    found = problems(('to = "990 mm"', 'to = "2 m"'), ("steps = 24", "steps = 300"), ("modes = 4", "modes = 99"),
                     ("[buckling.parked]", "[buckling.crossing]"),
                     ('frequency = "20 Hz"', "frequency = 20"))  # fmt: skip
    assert {p.path for p in found} == {"loads.trolley.travels.to", "loads.trolley.travels.steps", "vibration.modes",
                                       "buckling.crossing", "limits.frequency"}  # fmt: skip


def test_an_axle_that_cannot_be_read_leaves_no_nan_in_what_is_told_of_the_positions() -> None:
    """The range of the positions is then that of the axles that can be read."""
    wrong = RAIL.replace('to = "990 mm"', 'to = "30 mm"').replace('"180 mm"', '"180"')
    with pytest.raises(SpecError) as caught:
        part_from_text(wrong)
    told = {problem.path: problem.allowed for problem in caught.value.problems}
    assert "a length" in told["loads.trolley.travels.axles[2]"]
    assert told["loads.trolley.travels.to"].startswith("more than 30 mm, up to 1200 mm")
