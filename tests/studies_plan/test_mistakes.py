"""Each mistake of a plan is named with its place, what was given, what may stand there and the likely repair."""

from __future__ import annotations

import re

import pytest

from geometry.problem import SpecError
from studies.vary.plan import plan_from_data, plan_from_text, read_plan

VARY = '[vary]\nbore = ["10 mm", "12 mm"]\n'


@pytest.mark.parametrize(("text", "path", "words"), [
    # what is varied
    ('[vary]\nrot_depth = ["50 mm"]', "vary.rot_depth", "Did you mean root_depth?"),
    ('[vary]\n"members.arm.section.flnge" = ["6 mm"]', "vary.members.arm.section.flnge",
     "Did you mean members.arm.section.flange?"),
    ('[vary]\n"members.arn.section.flange" = ["6 mm"]', "vary.members.arn.section.flange",
     "Did you mean members.arm?"),
    ('[vary]\n"members.arm.holes[2].diameter" = ["6 mm"]', "vary.members.arm.holes[2].diameter",
     "members.arm.holes has [1]"),
    ('[vary]\n"members.arm.holes[0].diameter" = ["6 mm"]', "vary.members.arm.holes[0].diameter", "has [1]"),
    ('[vary]\n"loads.camra.force[3]" = ["-1 N"]', "vary.loads.camra.force[3]", "Did you mean loads.camera?"),
    ('[vary]\n"a b..c" = ["6 mm"]', "vary.a b..c", "a path such as"),
    ("[vary]\nmembers.arm.section.flange = ['6 mm']", "vary.members.arm", "in quotes"),
    ('[vary]\nbore = "12 mm"', "vary.bore", "[base]"),
    ("[vary]\nbore = []", "vary.bore", "at least one value"),
    ("", "vary", "at least one parameter"),
    ('[vary]\nflange = { path = "members.arm.section.flange", stok = "plate" }', "vary.flange.stok",
     'Did you mean "stock"?'),
    ('[vary]\nbore = { path = "members.arm.section.flange", stock = "plate" }', "vary.bore",
     "The part has a parameter bore"),
    ('[vary]\n"my flange" = { path = "members.arm.section.flange", stock = "plate" }', "vary.my flange",
     "letters, digits"),
    (f'{VARY}"parameters.bore" = ["9 mm"]', "vary.parameters.bore", "each place once"),
    # units and values
    ('[vary]\nbore = ["12 N"]', "vary.bore[1]", "It is a force"),
    ('[vary]\nbore = ["12 mm", 12]', "vary.bore[2]", 'Add the unit: "12 mm"'),
    ('[vary]\nbore = ["12"]', "vary.bore[1]", 'Add the unit: "12 mm"'),
    ('[vary]\nbore = ["1,2 mm"]', "vary.bore[1]", '"1.2 mm"'),
    ('[vary]\nbore = ["12 millimetre"]', "vary.bore[1]", "a known unit"),
    ('[vary]\nbore = ["tip_depth / 3"]', "vary.bore[1]", "Arithmetic on parameters belongs in the part"),
    ('[vary]\nbore = ["12 mm", "1.2 cm"]', "vary.bore[2]", 'each value once: "12 mm" is the same'),
    ('[vary]\n"members.arm.section.flange" = ["-6 mm"]', "vary.members.arm.section.flange[1]", "greater than 0"),
    ('[vary]\n"supports.wall.hold" = ["al"]', "vary.supports.wall.hold[1]", '"all", "pin"'),
    ('[vary]\n"supports.wall.hold" = ["all", "all"]', "vary.supports.wall.hold[2]", "each value once"),
    ('[vary]\n"supports.wall.hold" = { from = "1 mm", to = "2 mm", steps = 2 }', "vary.supports.wall.hold",
     "a list of values"),
    ('[vary]\n"members.arm.holes[1].count" = { from = 1, to = 4, steps = 2 }', "vary.members.arm.holes[1].count",
     "whole numbers"),
    # ranges
    ('[vary]\nbore = { from = "8 mm", to = "12 mm", steps = 0 }', "vary.bore.steps", "One step gives both ends"),
    ('[vary]\nbore = { from = "8 mm", to = "12 mm", steps = -2 }', "vary.bore.steps", "from 1 to"),
    ('[vary]\nbore = { from = "8 mm", to = "12 mm", steps = 2.5 }', "vary.bore.steps", "a whole number"),
    ('[vary]\nbore = { from = "8 mm", to = "12 mm", step = "0 mm" }', "vary.bore.step", "makes 1 to"),
    ('[vary]\nbore = { from = "8 mm", to = "12 mm", step = "3 mm" }', "vary.bore.step", "1.333 steps here"),
    ('[vary]\nbore = { from = "8 mm", to = "12 mm", step = "1 N" }', "vary.bore.step", "It is a force"),
    ('[vary]\nbore = { from = "12 mm", to = "8 mm", steps = 2 }', "vary.bore", "Exchange them"),
    ('[vary]\nbore = { from = "12 mm", to = "12 mm", steps = 2 }', "vary.bore", "[base]"),
    ('[vary]\nbore = { from = "12 mm", to = "14 N", steps = 2 }', "vary.bore.to", "It is a force"),
    ('[vary]\nbore = { from = "12 mm" }', "vary.bore", "Give to"),
    ('[vary]\nbore = { to = "12 mm", steps = 3 }', "vary.bore", "Give from"),
    ('[vary]\nbore = { from = "8 mm", to = "12 mm" }', "vary.bore", "steps = 4 gives five values"),
    ('[vary]\nbore = { from = "8 mm", to = "12 mm", steps = 2, step = "2 mm" }', "vary.bore", "Leave one of them out"),
    ('[vary]\nbore = { values = ["8 mm"], stock = "drill" }', "vary.bore", "Leave out all but one"),
    ('[vary]\nbore = { stock = "drill", steps = 3 }', "vary.bore", "Leave steps out"),
    ('[vary]\nbore = { stock = "dril" }', "vary.bore.stock", 'Did you mean "drill"?'),
    ('[vary]\nbore = { stock = "drill", from = "12.1 mm", to = "12.4 mm" }', "vary.bore",
     "sizes of the stock list drill"),
    ('[stock]\nmine = ["1 mm", "2 N"]\n[vary]\nbore = { stock = "mine" }', "stock.mine[2]", "It is a force"),
    ('[vary]\n"loads.camera.force[3]" = { stock = "plate" }', "vary.loads.camera.force[3].stock", "each is a force"),
    # sampling
    (f'{VARY}[sampling]\nmethod = "sobel"', "sampling.method", 'Did you mean "sobol"?'),
    (f'{VARY}[sampling]\nmethod = "sobol"', "sampling.points", "how many points"),
    (f'{VARY}[sampling]\nmethod = "sobol"\npoints = 0', "sampling.points", "at least 1"),
    (f'{VARY}[sampling]\npoints = 10', "sampling.points", "nothing, for grid"),
    (f'{VARY}[sampling]\nseed = -1', "sampling.seed", "at least 0"),
    (f'{VARY}[sampling]\nseed = "x"', "sampling.seed", "a whole number"),
    ('[sampling]\nmethod = "as made"\npoints = 8', "tolerances", "the tolerances within which"),
    (f'{VARY}[sampling]\nmethod = "as made"\npoints = 8\n[tolerances]\nbore = "0.1 mm"', "vary", "[base]"),
    # constraints
    (f'{VARY}[constraints]\na = "bore < tipdepth"', "constraints.a", "Did you mean tip_depth?"),
    (f'{VARY}[constraints]\na = "bore < 12"', "constraints.a", "compared with"),
    (f'{VARY}[constraints]\na = "bore < 12 N"', "constraints.a", "A length is compared with a force"),
    (f'{VARY}[constraints]\na = "bore = 12 mm"', "constraints.a", 'Write "==" for "="'),
    (f'{VARY}[constraints]\na = "bore - 12 mm"', "constraints.a", "a comparison with"),
    (f'{VARY}[constraints]\na = "< 12 mm"', "constraints.a", "a comparison with"),
    (f'{VARY}[constraints]\na = "1 mm < bore < 2 mm < 3 mm"', "constraints.a", "a comparison with"),
    (f'{VARY}[constraints]\na = "__import__(1) < 2"', "constraints.a", "not declared"),
    (f'{VARY}[constraints]\na = "bore < 1 mm"', "constraints.a", "it leaves out 2 of all 2 points"),
    # shop, tolerances, limits
    (f'{VARY}[shop]\nleast_wall = 4', "shop.least_wall", 'Add the unit: "4 mm"'),
    (f'{VARY}[shop]\nleast_wal = "4 mm"', "shop.least_wal", 'Did you mean "least_wall"?'),
    (f'{VARY}[shop]\nedge_distance = "1.5 mm"', "shop.edge_distance", "It is a length"),
    (f'{VARY}[shop]\nleast_wall = "40 mm"', "shop.least_wall", "leaves out 2 of all 2 points"),
    (f'{VARY}[tolerances]\nbor = "0.1 mm"', "tolerances.bor", "Did you mean bore?"),
    (f'{VARY}[tolerances]\nbore = "0.1 N"', "tolerances.bore", "It is a force"),
    (f'{VARY}[tolerances]\nbore = "-0.1 mm"', "tolerances.bore", "0 or more"),
    (f'{VARY}[tolerances]\nbore = "0 mm"', "tolerances.bore", "a size"),
    (f'{VARY}[tolerances]\nbore = 0.1', "tolerances.bore", "Add the unit"),
    (f'{VARY}[tolerances]\nbore = {{ plus = "0.1 mm", distribution = "gauss" }}', "tolerances.bore.distribution",
     "normal"),
    (f'{VARY}[tolerances]\nmaterial = "0.1 mm"', "tolerances.material", "a dimension"),
    (f'{VARY}[limits]\ndeflection = "0.2 N"', "limits.deflection", "It is a force"),
    (f'{VARY}[limits]\ndeflecton = "0.2 mm"', "limits.deflecton", 'Did you mean "deflection"?'),
    (f'{VARY}[limits.tip]\nquantity = "deflection"\nat = "arm.edn"\nmax = "1 mm"', "limits.tip.at", "arm.end"),
    # base, aim, keep, run
    (f'[base]\nreech = "1 mm"\n{VARY}', "base.reech", "Did you mean reach?"),
    (f'[base]\nreach = "1 N"\n{VARY}', "base.reach", "It is a force"),
    (f'{VARY}[aim]\nleast = "mas"', "aim.least", 'Did you mean "mass"?'),
    (f'{VARY}[aim]\nleast = "mass + deflection"', "aim.least", "A length is added to a mass"),
    (f'{VARY}[aim]\nleast = "mass"\nmost = "stress"', "aim", "one of the two"),
    (f'{VARY}[aim]', "aim", "one of the two"),
    (f'{VARY}[aim]\nleast = "2 kg"', "aim.least", "something that differs"),
    (f'{VARY}[aim]\nleast = "frequency"', "aim.least", "It needs [vibration]"),
    (f'{VARY}[aim]\nleast = "displacement_q@arm.end"', "aim.least", "displacement_q"),
    (f'{VARY}[aim]\nleast = "displacement_z@arm.edn"', "aim.least", 'Did you mean "arm.end"?'),
    (f'{VARY}[keep]\nfigures = ["mass", "stres"]', "keep.figures[2]", 'Did you mean "stress"?'),
    (f'{VARY}[keep]\nfigures = ["reaction_force_x@arm.end"]', "keep.figures[1]", "wall"),
    (f'{VARY}[keep]\nfigures = ["deflection in carying"]', "keep.figures[1]", 'Did you mean "carrying"?'),
    (f'{VARY}[keep]\nfigures = ["mass in carrying"]', "keep.figures[1]", "mass without a case"),
    (f'{VARY}[keep]\nfigures = ["buckling_factor"]', "keep.figures[1]", "It needs [buckling]"),
    (f'{VARY}[keep]\nruns = {{ best = -1 }}', "keep.runs.best", "0 or more"),
    (f'{VARY}[run]\nseconds = "5 mm"', "run.seconds", "It is a length"),
    (f'{VARY}[run]\nmemory = 10', "run.memory", "at least 256"),
    (f'{VARY}[run]\nsafer_mesh = "yes"', "run.safer_mesh", "true or false"),
    # the top
    (f'{VARY}[smapling]\nseed = 1', "smapling", 'Did you mean "sampling"?'),
    (f'titel = "x"\n{VARY}', "titel", 'Did you mean "title"?'),
    (f'title = 3\n{VARY}', "title", "text"),
])
def test_a_mistake_is_named(problems, text, path, words):
    found = problems(text)
    assert found, "nothing was found wrong"
    assert [str(p) for p in found if p.path == path and words in str(p)], "\n".join(map(str, found))
    assert len(found) == 1, "\n".join(map(str, found))


def test_every_mistake_is_named_at_once(problems):
    found = problems('titel = "x"\n[vary]\nrot_depth = ["50 mm"]\nbore = { from = "9 mm", to = "8 mm", steps = 2 }\n'
                     '[sampling]\nmethod = "grid"\npoints = 4\n[constraints]\nslope = "bore < 3"\n'
                     '[aim]\nleast = "mas"\n[keep]\nfigures = ["stres"]\n[shop]\nleast_wall = 3\n[run]\nmemory = 1\n'
                     '[tolerances]\nbore = "1 N"')
    assert {p.path for p in found} == {
        "titel", "vary.rot_depth", "vary.bore", "sampling.points", "constraints.slope", "aim.least", "keep.figures[1]",
        "shop.least_wall", "run.memory", "tolerances.bore"}


def test_ten_million_variants_are_counted_and_asked_about_not_made(plan, problems):
    import time

    text = ('[vary]\nroot_depth = { from = "50 mm", to = "70 mm", steps = 99 }\n'
            'tip_depth = { from = "30 mm", to = "40 mm", steps = 99 }\n'
            'bore = { from = "8 mm", to = "12 mm", steps = 9 }\n'
            '"members.arm.section.web" = { from = "4 mm", to = "8 mm", steps = 9 }\n'
            '"members.arm.section.flange" = { from = "6 mm", to = "8 mm", steps = 9 }\n')
    start = time.process_time()
    (found,) = problems(text)
    assert time.process_time() - start < 2.0
    assert found.path == "vary"
    assert found.given == "10,000,000 points (100 x 100 x 10 x 10 x 10)"
    assert "--yes" in found.fix and "231 days" in found.fix  # 2e7 s
    assert plan(text, allow_many=True).count() == 10**7
    (sampled,) = problems(text + '[sampling]\nmethod = "latin hypercube"\npoints = 200000')
    assert sampled.path == "sampling.points" and sampled.given == "200,000 points"
    assert problems(text + '[sampling]\nmethod = "latin hypercube"\npoints = 2000') == ()


def test_a_part_that_is_not_there_is_named(tmp_path):
    with pytest.raises(SpecError) as error:
        plan_from_text('part = "gone.toml"\n' + VARY, tmp_path)
    (found,) = error.value.problems
    assert found.path == "part (gone.toml)" and found.given == "no such file"


def test_a_wrong_part_has_its_own_mistakes_listed_under_its_name(tmp_path, examples):
    text = (examples / "camera_arm.toml").read_text(encoding="utf-8")
    wrong = text.replace('web = "6 mm"', 'web = "60 mm"').replace('"-180 N"', '"-180 mm"')
    (tmp_path / "arm.toml").write_text(wrong, encoding="utf-8")
    with pytest.raises(SpecError) as error:
        plan_from_text('part = "arm.toml"\n' + VARY, tmp_path)
    paths = {p.path for p in error.value.problems}
    assert {"part (arm.toml): members.arm.section.web", "part (arm.toml): loads.camera.force[3]"} <= paths


def test_a_part_and_a_plan_that_are_not_toml_are_named(tmp_path, examples):
    (tmp_path / "arm.toml").write_text("title = \n", encoding="utf-8")
    (tmp_path / "plan.toml").write_text('part = "arm.toml"\n' + VARY, encoding="utf-8")
    with pytest.raises(SpecError, match=re.escape("part (arm.toml)")):
        read_plan(tmp_path / "plan.toml")
    (tmp_path / "plan.toml").write_text("[vary\nbore = 3", encoding="utf-8")
    with pytest.raises(SpecError, match=r"plan\.toml"):
        read_plan(tmp_path / "plan.toml")
    with pytest.raises(SpecError, match="no such file"):
        read_plan(tmp_path / "none.toml")
    with pytest.raises(SpecError, match="a folder"):
        read_plan(tmp_path)
    with pytest.raises(SpecError, match="part: given nothing"):
        plan_from_text(VARY)


def test_a_plan_given_for_a_part_and_a_part_given_for_a_plan_are_told(examples):
    with pytest.raises(SpecError) as error:
        read_plan(examples / "camera_arm.toml")
    assert "part" in {p.path for p in error.value.problems}


@pytest.mark.parametrize("data", [
    {"part": 3}, {"part": None, "vary": {}}, {"part": {}, "vary": {"a": [1]}}, {"part": "camera_arm.toml", "vary": 3},
    {"part": "camera_arm.toml", "vary": {"bore": {"from": float("nan"), "to": 2, "steps": 1}}},
    {"part": "camera_arm.toml", "vary": {"bore": [None, True, {}, []]}},
    {"part": "camera_arm.toml", "vary": {"": ["1 mm"], "[1]": ["1 mm"], "parameters": ["1 mm"]}},
    {"part": "camera_arm.toml", "vary": {"bore": ["9" * 400 + " mm"]}},
    {"part": "camera_arm.toml", "vary": {"bore": ["9**9**9 mm"]}},
    {"part": "camera_arm.toml", "vary": {"bore": ["1 mm"]}, "keep": {"figures": ["@", "mass@", " in x", "a" * 5000]}},
    {"part": "camera_arm.toml", "vary": {"bore": ["1 mm"]}, "constraints": {"a": "(" * 200 + "1 < 2"}},
    {"part": "camera_arm.toml", "vary": {"bore": ["1 mm"]}, "aim": {"least": "mass@@@ in in in"}},
    {"part": "../../../etc/passwd", "vary": {"bore": ["1 mm"]}},
    {"part": "camera_arm.toml\0", "vary": {"bore": ["1 mm"]}},
])
def test_rubbish_is_refused_in_words(data, examples):
    with pytest.raises(SpecError) as error:
        plan_from_data(data, examples)
    assert all(p.path and p.allowed for p in error.value.problems)
