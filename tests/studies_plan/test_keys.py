"""What a variant is known by."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from geometry.spec import part_from_text
from geometry.spec.read import part_from_data
from studies.vary.plan.key import keys_of

ARM = (Path(__file__).parents[2] / "studies" / "examples" / "camera_arm.toml").read_text(encoding="utf-8")


def keys(*changes: tuple[str, str]) -> tuple[str, str]:
    text = ARM
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    return keys_of(part_from_text(text))


@pytest.mark.parametrize(("old", "new"), [
    ('reach      = "360 mm"', 'reach = "36 cm"'),
    ("Fruit-picker camera arm", "Another title"),
    ('bore       = "14 mm"', 'bore = "14 mm"\nunused = "3 mm"'),
    ("# at the far end", "# a comment"), ('hold = "all"', 'hold = ["x", "y", "z"]'),
])
def test_the_same_content_has_the_same_keys(old, new):
    assert keys((old, new)) == keys()


@pytest.mark.parametrize(("old", "new"), [
    ("-180 N", "-181 N"), ('hold = "all"', 'hold = "all"\ncoupling = "rigid"'), ("camera      = 1.0", "camera = 1.1"),
    ("yield_factor = 1.5", "yield_factor = 1.6"), ("EN AW-6082 T6", "S355"), ('"0.5 mm"', '"0.6 mm"'),
])
def test_what_changes_no_shape_changes_the_key_and_not_the_shape_key(old, new):
    assert keys((old, new))[0] != keys()[0]
    assert keys((old, new))[1] == keys()[1]


@pytest.mark.parametrize(("old", "new"), [
    ('"14 mm"', '"14.0000001 mm"'), ('web = "6 mm"', 'web = "6.1 mm"'), ('"reach / 2"', '"reach / 2 + 1 mm"'),
    ('material =', 'accuracy = "3 %"\nmaterial ='),
    ("[loads.camera]", '[loads.line]\non = "arm.top"\nforce_per_length = ["0 N/mm", "0 N/mm", "-1 N/mm"]\n'
                       'from = "20 mm"\nto = "90 mm"\n[loads.camera]'),
])
def test_what_changes_the_solid_or_its_mesh_changes_both(old, new):
    assert keys((old, new))[0] != keys()[0]
    assert keys((old, new))[1] != keys()[1]


def test_the_size_of_a_line_load_leaves_the_shape_key_alone_and_its_stretch_does_not():
    load = ('[loads.line]\non = "arm.top"\nforce_per_length = ["0 N/mm", "0 N/mm", "-1 N/mm"]\nfrom = "20 mm"\n'
            'to = "90 mm"\n[cases.carrying]\nline = 1.0\n')
    base = keys(("[cases.carrying]", load))
    assert keys(("[cases.carrying]", load.replace("-1 N/mm", "-2 N/mm")))[1] == base[1]
    assert keys(("[cases.carrying]", load.replace("90 mm", "91 mm")))[1] != base[1]


def test_other_versions_of_what_matters_make_other_keys(monkeypatch):
    import studies.vary.plan.key as module

    before = keys()
    monkeypatch.setattr(module, "_versions", lambda: (*module.MATTER, "another"))
    assert keys()[0] != before[0] and keys()[1] != before[1]


def test_figures_kept_beside_the_usual_ones_make_another_key(plan):
    vary = '[vary]\nbore = ["14 mm"]\n'
    plain, usual, more = (next(plan(vary + text).variants()) for text in (
        "", '[keep]\nfigures = ["mass", "stress"]', '[keep]\nfigures = ["displacement_z@arm.end"]'))
    assert plain.key == usual.key != more.key
    assert plain.shape_key == more.shape_key


def test_keys_do_not_depend_on_the_process():
    code = ("import sys; from geometry.spec import read_part; from studies.vary.plan.key import keys_of; "
            "print(*keys_of(read_part(sys.argv[1])))")
    path = str(Path(__file__).parents[2] / "studies" / "examples" / "camera_arm.toml")
    surroundings = {"PYTHONHASHSEED": "4711", "PYTHONPATH": str(Path(__file__).parents[2])}
    done = subprocess.run([sys.executable, "-c", code, path], capture_output=True, text=True, timeout=60, check=True,
                          env=surroundings)
    assert tuple(done.stdout.split()) == keys()


def test_the_way_variants_are_made_gives_the_part_and_key_of_a_spec_written_out(plan):
    made = plan('[vary]\nroot_depth = { from = "48 mm", to = "72 mm", steps = 8 }\nbore = ["9 mm", "10 mm"]\n'
                '"members.arm.section.web" = ["5 mm", "6 mm"]')
    for variant in made.variants():
        text = ARM.replace('root_depth = "60 mm"', f'root_depth = "{variant.values["root_depth"]}"')
        text = text.replace('bore       = "14 mm"', f'bore = "{variant.values["bore"]}"')
        text = text.replace('web = "6 mm"', f'web = "{variant.values["members.arm.section.web"]}"')
        assert (variant.key, variant.shape_key) == keys_of(part_from_text(text))
        assert (variant.key, variant.shape_key) == keys_of(part_from_data(variant.data))


def test_the_key_of_a_study_holds_what_is_varied_and_not_the_aim_or_the_bounds(plan):
    vary = '[vary]\nbore = ["9 mm", "14 mm"]\n'
    base = plan(vary).key
    same = (vary + '[aim]\nleast = "deflection"', vary + "[run]\nmemory = 4096", vary + "[keep]\nruns = { best = 1 }",
            'title = "Another"\n' + vary)
    other = ('[vary]\nbore = ["9 mm", "15 mm"]\n', vary + '[sampling]\nmethod = "one at a time"',
             vary + '[limits]\nmass = "2 kg"', vary + '[tolerances]\nbore = "0.1 mm"',
             '[base]\nreach = "350 mm"\n' + vary,
             vary + '[constraints]\na = "bore < 20 mm"', vary + '[shop]\nleast_wall = "2 mm"')
    assert {plan(text).key for text in same} == {base}
    assert len({plan(text).key for text in other} | {base}) == len(other) + 1


@pytest.mark.heavy
def test_variants_of_one_shape_key_have_one_solid_and_one_mesh(plan):
    import numpy as np

    from geometry.budget import Budget
    from geometry.solid import build_solid
    from mesher import mesh_solid

    made = plan('[vary]\n"loads.camera.force[3]" = ["-180 N", "-90 N"]\n"supports.wall.on" = ["arm.start", "arm.end"]\n'
                'material = ["EN AW-6082 T6", "S355"]')
    variants = list(made.variants())
    first, last = variants[0], variants[-1]
    assert first.shape_key == last.shape_key and first.key != last.key
    solids = [build_solid(part_from_data(v.data)) for v in (first, last)]
    meshes = [mesh_solid(solid, 0.05, Budget(threads=1)) for solid in solids]
    assert np.array_equal(meshes[0].nodes, meshes[1].nodes) and np.array_equal(meshes[0].tets, meshes[1].tets)
