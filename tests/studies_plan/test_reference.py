"""The reference of the plan, its schema, and the example that the README runs."""

from __future__ import annotations

import json
import tomllib

import jsonschema
import pytest
from pydantic import BaseModel

from studies.cli import main
from studies.vary.plan import plan_reference, plan_schema, read_plan
from studies.vary.plan.kept import SORTS, USUAL
from studies.vary.plan.reference import TABLES
from studies.vary.plan.stock import BUILT_IN


def test_the_committed_schema_is_what_the_command_prints(examples, capsys):
    """When this fails: ``haunch schema plan > studies/examples/plan.schema.json``."""
    assert main(["schema", "plan"]) == 0
    printed = json.loads(capsys.readouterr().out)
    assert printed == plan_schema() == json.loads((examples / "plan.schema.json").read_text(encoding="utf-8"))
    jsonschema.Draft202012Validator.check_schema(printed)


@pytest.mark.parametrize(("text", "fits"), [
    ("", True),
    ('[sampling]\nmethod = "grit"', False),
    ('[vary]\nbore = { stok = "drill" }', False),
    ("[vary]\nbore = 3", False),
    ('[vary]\nbore = ["1 mm"]\nweb = { stock = "plate" }\n[aim]\nleast = "mass"\n[keep.runs]\nbest = 2', True),
    ('[limits.tip]\nquantity = "deflection"\nmax = "1 mm"', True),
    ("[run]\nmemory = '2 GB'", False),
])
def test_the_schema_knows_the_words(text, fits):
    data = tomllib.loads('part = "x.toml"\n' + text)
    assert jsonschema.Draft202012Validator(plan_schema()).is_valid(data) is fits


def test_the_reference_names_every_word_every_figure_and_every_list(capsys):
    assert main(["reference", "plan"]) == 0
    page = capsys.readouterr().out
    assert page.strip() == plan_reference().strip()
    for title, model in TABLES:
        assert issubclass(model, BaseModel)
        for name, info in model.model_fields.items():
            assert f"| `{info.alias or name}` |" in page, (title, name)
            assert info.description and info.description in page
    for name in (*SORTS, *USUAL, *BUILT_IN):
        assert f"`{name}`" in page


def test_the_example_has_sixty_variants_and_leaves_none_out(examples):
    text = (examples / "camera_arm_plan.toml").read_text(encoding="utf-8")
    assert text.startswith("#:schema plan.schema.json\n")
    assert jsonschema.Draft202012Validator(plan_schema()).is_valid(tomllib.loads(text))
    plan = read_plan(examples / "camera_arm_plan.toml")
    variants = list(plan.variants())
    assert plan.count() == len(variants) == len({v.key for v in variants}) == 60
    assert plan.left_out() == []
    assert (plan.aim.text, plan.aim.sense) == ("mass", "least")
    assert {limit.name: limit.value for limit in plan.part.limits} == {"deflection": 0.18, "yield_factor": 1.5}
