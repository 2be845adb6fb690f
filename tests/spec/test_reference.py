"""The schema and the reference are made from the model, and say what it reads."""

from __future__ import annotations

import tomllib
from pathlib import Path

import jsonschema
import pytest

from geometry.spec import json_schema, spec_reference
from geometry.spec.reference import TABLES
from geometry.spec.words.structure import words_of

FOLDER = Path(__file__).parents[2] / "studies" / "examples"
EXAMPLES = [
    *sorted(path for path in FOLDER.glob("*.toml") if not path.stem.endswith("_plan")),
    Path(__file__).with_name("camera_arm.toml"),
]
VALIDATOR = jsonschema.Draft202012Validator(json_schema())


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda p: p.stem)
def test_the_schema_accepts_the_examples(path: Path) -> None:
    VALIDATOR.validate(tomllib.loads(path.read_text(encoding="utf-8")))


def test_the_schema_is_one() -> None:
    jsonschema.Draft202012Validator.check_schema(json_schema())


@pytest.mark.parametrize(
    ("old", "new"),
    [
        ("diameter =", "diametre ="),
        ('flange = "8 mm"', "flange = 8"),
        ('hold = "all"', 'hold = "al"'),
        ('shape = "I"', 'shape = "H"'),
        ('"0 N", "0 N", "-180 N"', '"0 N", "-180 N"'),
        ("yield_factor = 1.5", "yeild_factor = 1.5"),
        ("[supports.wall]", "[support.wall]"),
    ],
)
def test_the_schema_refuses_mistakes_of_structure(old: str, new: str) -> None:
    text = EXAMPLES[-1].read_text(encoding="utf-8")
    assert old in text
    with pytest.raises(jsonschema.ValidationError):
        VALIDATOR.validate(tomllib.loads(text.replace(old, new)))


def test_the_reference_has_a_line_for_every_word() -> None:
    text = spec_reference()
    sections = text.split("\n## ")
    for title, model in TABLES:
        section = next(s for s in sections if s.lower().lstrip("`").startswith(title.lower()))
        for word in words_of(model):
            line = next(li for li in section.splitlines() if li.startswith(f"| `{word}` |"))
            cells = [cell.strip() for cell in line.strip("|").split(" | ")]
            assert len(cells) == 4, line
            assert cells[1], line
            assert cells[3] not in ("", "None"), line


def test_the_reference_states_units_ranges_and_defaults() -> None:
    text = spec_reference()
    assert '| `accuracy` | number at least 0.001 and at most 0.2 | `"2 %"` |' in text
    assert "| `web` | length greater than 0 | needed | web thickness |" in text
    assert "| force | `N`, `kN`, `MN`, `lbf`, `kip` | N |" in text
    assert "S355" in text
    assert "from memory" in text
