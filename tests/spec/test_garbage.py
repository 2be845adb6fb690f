"""Whatever is thrown at the reader, it answers with a part or with a `SpecError`."""

from __future__ import annotations

import copy
import dataclasses
import math
import random
import tomllib
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st

from geometry.problem import SpecError
from geometry.spec import part_from_text
from geometry.spec.read import part_from_data
from geometry.spec.text.expression import evaluate
from geometry.spec.text.tokens import ExpressionError
from geometry.spec.text.units import LENGTH, UNITS, Quantity

FOLDER = Path(__file__).parents[2] / "studies" / "examples"
EXAMPLES = sorted(path for path in FOLDER.glob("*.toml") if not path.stem.endswith("_plan"))
BASES = [tomllib.loads(path.read_text(encoding="utf-8")) for path in EXAMPLES]
TEXTS = [path.read_text(encoding="utf-8") for path in EXAMPLES]

WORDS = ["reach", "h", "(", ")", "+", "-", "*", "/", "^", "**", ",", " ", ".", "1", "9", "1e9", "0", "sqrt(", "min("]
WORDS += ["\0", "\n", "é", "µ", "²", "٣", "_", '"', *UNITS]
LETTERS = "[]{}=\"'.,#\n\t abehlmopst0123456789_-\0\u2028é"
JUNK: list[Any] = [
    5, -3, 0, 1e300, math.nan, math.inf, True, 10**400, "", "x", "0 mm", "-5 mm", "1e-9 mm", "1e5 mm", "50 mm",
    "30 deg", "9**9 mm", "reach", "reach*reach", "all", "y", "web", "upright leg", "arm.end", "bar.hole1", "1000 N",
    "\0unreadable", [], {}, ["a"], [["0 mm", "0 mm"]], {"a": 1}, [{}], [{"at": "1 mm"}], ["1 mm", "2 mm", "3 mm"],
    ["0 N", "0 N", "5 N"], {"shape": []}, {"shape": "tube", "diameter": "30 mm", "wall": "20 mm"},
    {"shape": "outline", "outer": [["0 mm", "0 mm"], ["10 mm", "0 mm"], ["10 mm", "20 mm", "3 mm"]]},
]  # fmt: skip
KEYS = ["foo", "on", "at", "through", "taper", "stations", "holes", "count", "rows", "hold", "name", "slots",
        "openings", "notches", "edge_radii", "patches", "line_at", "anchor", "up", "roll", "turned"]  # fmt: skip


@given(st.lists(st.sampled_from(WORDS), max_size=20).map("".join))
def test_any_text_is_a_quantity_or_an_expression_error(text: str) -> None:
    try:
        value = evaluate(text, {"reach": Quantity(3.0, LENGTH), "h": Quantity(2.0)})
    except ExpressionError:
        return
    assert math.isfinite(value.value)


@given(st.text(LETTERS, max_size=40))
def test_any_text_is_refused(text: str) -> None:
    with pytest.raises(SpecError):
        part_from_text(text)


@given(st.sampled_from(TEXTS), st.integers(0, 2000), st.integers(0, 60), st.text(LETTERS, max_size=5))
def test_a_damaged_example_is_a_part_or_a_spec_error(text: str, at: int, lost: int, put: str) -> None:
    at %= len(text)
    _answers(lambda: part_from_text(text[:at] + put + text[at + lost :]))


def test_examples_with_junk_in_them_are_parts_or_spec_errors() -> None:
    chance = random.Random(20)
    parts = 0
    for _ in range(150):
        data = copy.deepcopy(chance.choice(BASES))
        for _ in range(chance.choice([1, 1, 2, 4])):
            _spoil(chance, data)
        parts += _answers(lambda data=data: part_from_data(data))
    assert 2 < parts < 100  # both answers do occur


def _spoil(chance: random.Random, data: dict[str, Any]) -> None:
    """Remove, add or replace something anywhere in the data."""
    paths = list(_paths(data))
    if not paths:
        return
    path = chance.choice(paths)
    table: Any = data
    for step in path[:-1]:
        table = table[step]
    lot = chance.random()
    if lot < 0.15:
        del table[path[-1]]
    elif lot < 0.35 and isinstance(table, dict):
        table[chance.choice(KEYS)] = copy.deepcopy(chance.choice(JUNK))
    else:
        table[path[-1]] = copy.deepcopy(chance.choice(JUNK))


def _paths(data: Any, path: tuple[Any, ...] = ()) -> Iterator[tuple[Any, ...]]:
    items = data.items() if isinstance(data, dict) else enumerate(data) if isinstance(data, list) else ()
    for key, value in items:
        yield (*path, key)
        yield from _paths(value, (*path, key))


def _answers(read: Any) -> bool:
    """Whether a part came of it; its numbers are finite, and a refusal names at least one problem in words."""
    try:
        part = read()
    except SpecError as error:
        assert error.problems
        for problem in error.problems:
            assert problem.path
            assert problem.allowed
            assert isinstance(problem.given, str)
            assert len(str(problem)) < 2500
        return False
    assert all(math.isfinite(number) for number in _numbers(part))
    return True


def _numbers(value: Any) -> Iterator[float]:
    if isinstance(value, float):
        yield value
    elif dataclasses.is_dataclass(value):
        for field in dataclasses.fields(value):
            yield from _numbers(getattr(value, field.name))
    elif isinstance(value, dict):
        for item in value.values():
            yield from _numbers(item)
    elif isinstance(value, tuple):
        for item in value:
            yield from _numbers(item)
