"""Specs from files and text."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Collection, Mapping
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from geometry.part import Part
from geometry.problem import Problem, SpecError
from geometry.spec.model import PartSpec
from geometry.spec.resolve.part import resolve_and_check
from geometry.spec.resolve.values import shown
from geometry.spec.text.tokens import nearest
from geometry.spec.text.toml_errors import not_toml
from geometry.spec.words.translate import MISSPELT, read_leniently

DEEPEST = 20  # levels of tables and lists; a spec has about seven
# The TOML reader takes time that grows with the square of the number of dots, so they are counted before.
_KEY = r"""(?:[A-Za-z0-9_-]++|"[^"\n]*+"|'[^'\n]*+')"""
_DOTTED = re.compile(rf"(?<![A-Za-z0-9_-])(?:{_KEY}[ \t]*+\.[ \t]*+){{{DEEPEST}}}")
LARGEST_FILE = 1_000_000  # bytes: a spec is a page or two of text


def read_part(path: str | Path) -> Part:
    """The part that a TOML file describes; raise `SpecError` with every mistake found."""
    file = Path(path)
    return part_from_text(text_of_file(file), file.name)


def text_of_file(file: Path) -> str:
    """Text of a TOML file of ordinary size; raise `SpecError` when there is none, or it cannot be read."""
    try:
        size = file.stat().st_size
        if file.is_dir():
            raise _file_problem(file, "a folder", "a TOML file", "Name the file in it")
        if not file.is_file():
            raise _file_problem(file, "not an ordinary file", "a TOML file")
        if size > LARGEST_FILE:
            raise _file_problem(file, f"{size} bytes", f"at most {LARGEST_FILE} bytes", "Is it a spec at all?")
        with file.open("rb") as stream:
            data = stream.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise _file_problem(file, "no such file", "a TOML file", "Look at the spelling and at the folder") from None
    except (OSError, ValueError) as error:
        reason = error.strerror if isinstance(error, OSError) and error.strerror else str(error)
        raise _file_problem(file, reason, "a file that can be read") from None
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        given = f"a byte on line {line} that is not UTF-8"
        raise _file_problem(file, given, "UTF-8 text", "Save it as UTF-8") from None


def part_from_text(text: str, name: str = "part.toml") -> Part:
    """The part that a TOML text describes; raise `SpecError` with every mistake found."""
    return part_from_data(data_from_text(text, name), text)


def _file_problem(file: Path, given: str, allowed: str, fix: str = "") -> SpecError:
    return SpecError([Problem(file.name or str(file), given, allowed, fix)])


def data_from_text(text: str, name: str) -> dict[str, Any]:
    """The tables of a TOML text."""
    if len(text) > LARGEST_FILE:
        raise SpecError([Problem(name, f"{len(text)} characters", f"at most {LARGEST_FILE} characters")])
    if _DOTTED.search(text):
        raise SpecError([Problem(name, "a name nested too deeply", f"at most {DEEPEST} names joined by dots")])
    try:
        return tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise SpecError([not_toml(text, name, error)]) from None
    except ValueError as error:  # a whole number of thousands of digits
        raise SpecError([Problem(name, str(error).partition(";")[0], "numbers of ordinary size")]) from None
    except RecursionError:
        raise SpecError([Problem(name, "brackets nested too deeply", "TOML of a few levels")]) from None


def part_from_data(data: Mapping[str, Any], text: str = "") -> Part:
    """The part that plain data (the tables of a TOML file) describes; raise `SpecError` with every mistake."""
    check_depth(data)
    try:
        spec = PartSpec.model_validate(data)
    except ValidationError:
        spec_left, problems, removed = read_leniently(data)
        if spec_left is not None:
            more = resolve_and_check(spec_left, text, removed, lenient=True)[1]
            problems += [p for p in more if not _follows_from(p, removed)]
        raise SpecError(problems) from None
    return spec.resolve(text)


def check_depth(data: Mapping[str, Any]) -> None:
    """Refuse tables nested more deeply than any spec: dotted keys nest without end, and what copies them recurses."""
    waiting: list[tuple[Any, int, str]] = [(data, 0, "")]
    while waiting:
        value, depth, first = waiting.pop()
        if depth > DEEPEST:
            raise SpecError([Problem(first, "tables nested too deeply", f"at most {DEEPEST} levels")])
        items = value.values() if isinstance(value, Mapping) else value if isinstance(value, list) else ()
        keys = value if isinstance(value, Mapping) else items
        waiting += [(item, depth + 1, first or str(key)) for key, item in zip(keys, items, strict=True)]


def _follows_from(problem: Problem, removed: Collection[str]) -> bool:
    """Whether a message may only come from something that was left out because it could not be read."""
    path = problem.path
    for gone in removed:
        table = gone.removesuffix(MISSPELT)
        within = path.startswith((table + ".", table + "["))
        if gone.endswith(MISSPELT):
            if path == table or (within and problem.given == "nothing"):
                return True
        elif within or path == table or table.startswith(path + "."):
            return True
    return False


def part_from_spec(spec: PartSpec) -> Part:
    """The part that a spec written in Python describes; raise `SpecError` with every mistake found."""
    return spec.resolve()


def with_parameters(spec: PartSpec | str, values: Mapping[str, str | float]) -> Part:
    """The part with other values of some of its parameters; raise `SpecError` also for unknown names."""
    text = spec if isinstance(spec, str) else ""
    data = data_from_text(spec, "part.toml") if isinstance(spec, str) else spec.model_dump(by_alias=True)
    known = data.get("parameters")
    known = dict(known) if isinstance(known, Mapping) else {}
    unknown = [name for name in values if name not in known]
    if unknown:
        raise SpecError(
            Problem(f"parameters.{name}", name, f"a parameter of the spec: {', '.join(known) or 'none'}",
                    f"Did you mean {near}?" if (near := nearest(name, known)) else "")
            for name in unknown
        )  # fmt: skip
    changed = ", ".join(f"{name} = {shown(value)}" for name, value in values.items())
    text = f"# Parameters changed afterwards: {changed}\n{text}" if text and values else text
    return part_from_data({**data, "parameters": {**known, **values}}, text)
