"""The model's error messages in the words of the spec, and what is left of the spec without the mistakes.

The checks that need values must run even when a word elsewhere is wrong, or mistakes come one at a time.
So what cannot be read is replaced: an unreadable quantity by `UNREADABLE`, which later reads as NaN
without a message, anything else by leaving out its table.
"""

from __future__ import annotations

import copy
from collections.abc import Mapping
from typing import Annotated, Any, get_args, get_origin

from annotated_types import MaxLen, MinLen
from pydantic import ValidationError
from pydantic.fields import FieldInfo
from pydantic_core import ErrorDetails

from geometry.problem import Problem
from geometry.spec.model import LimitsSpec, PartSpec
from geometry.spec.resolve.values import UNREADABLE, listed, shown
from geometry.spec.text.tokens import nearest
from geometry.spec.words.structure import (
    Path,
    alternatives,
    at_path,
    below,
    described,
    mark_in,
    model_of,
    words_of,
    written,
)

MOST_ROUNDS = 50
MISSPELT = "?"
"""Behind a table's path: it lost only a word that it does not know, which may have been meant for another."""


def read_leniently(data: Mapping[str, Any]) -> tuple[PartSpec | None, list[Problem], set[str]]:
    """The spec as far as it can be read, the mistakes of structure, and the tables that lost something."""
    problems: dict[str, Problem] = {}
    removed: set[str] = set()
    respelt: set[Path] = set()
    rest: Any = copy.deepcopy(dict(data))
    for _ in range(MOST_ROUNDS):
        try:
            return PartSpec.model_validate(rest), list(problems.values()), removed
        except ValidationError as error:
            found = _by_path(error.errors(include_url=False), rest)
        first = not problems
        # Later rounds find what the repairs leave behind, and new mistakes only in tables that were misspelt.
        new = {path for path in found if first or any(path[: len(table)] == table for table in respelt)}
        meant = _meant({path: found[path] for path in new}, rest)
        for path, details in found.items():
            if path in new and path not in meant.values():  # a word that is there, misspelt, is not missing as well
                problems.setdefault(written(path), _problem(path, details, rest))
        respelt.update(meant.values())
        respelt.update(p for p in new if "union_tag_invalid" in {e["type"] for e in found[p]})
        # Deepest first: a table may have to go as a whole after something in it was replaced.
        for path in sorted(found, key=len, reverse=True):
            if path in meant:
                _respell(rest, path, str(meant[path][-1]))
            elif path not in meant.values() or below(_parent(rest, path), path[-1]) is None:
                _repair(rest, path, found[path], removed)
    return None, list(problems.values()), removed


def _meant(found: Mapping[Path, list[ErrorDetails]], data: Any) -> dict[Path, Path]:
    """Misspelt words and what they stand for, so that what follows in their tables is read as it was meant."""
    meant: dict[Path, Path] = {}
    for path, errors in found.items():
        parent = _parent(data, path)
        if "extra_forbidden" not in {error["type"] for error in errors} or not isinstance(parent, dict):
            continue
        model = model_of(at_path(PartSpec, data, path[:-1]), parent)
        near = nearest(str(path[-1]), words_of(model)) if model else ""
        target = (*path[:-1], near)
        if near and near not in parent and target not in meant.values():
            meant[path] = target
    return meant


def _parent(data: Any, path: Path) -> Any:
    for step in path[:-1]:
        data = below(data, step)
    return data


def _respell(data: Any, path: Path, word: str) -> None:
    parent = _parent(data, path)
    if isinstance(parent, dict) and path[-1] in parent:
        parent[word] = parent.pop(path[-1])


def _by_path(errors: list[ErrorDetails], data: Any) -> dict[Path, list[ErrorDetails]]:
    """Errors by the place in the data, without the model's marks for members of unions."""
    found: dict[Path, list[ErrorDetails]] = {}
    for error in errors:
        path: list[str | int] = []
        value = data
        for k, step in enumerate(error["loc"]):
            last = k == len(error["loc"]) - 1
            child = below(value, step)
            there = child is not None or (isinstance(value, Mapping) and step in value)
            if there:
                path.append(step)
                value = child
            elif last and error["type"] == "missing":
                path.append(step)
        found.setdefault(tuple(path), []).append(error)
    # A list of freedoms with a wrong word is also "no table" to the model: only what lies deeper is the mistake.
    above = {path[:k] for path in found for k in range(len(path))}
    return {path: errors for path, errors in found.items() if path not in above}


def _problem(path: Path, errors: list[ErrorDetails], data: Any) -> Problem:
    """One problem for everything that the model says about one place."""
    kinds = {error["type"] for error in errors}
    given: Any = data
    for step in path:
        given = below(given, step)
    annotation = at_path(PartSpec, data, path)
    where = written(path)
    if "missing" in kinds:
        return Problem(where, "nothing", _meaning(path, data) or described(annotation), f"Give {path[-1]}")
    if "extra_forbidden" in kinds:
        return _unknown_word(path, data)
    if kinds & {"union_tag_invalid", "union_tag_not_found"}:
        return _unknown_shape(where, given)
    allowed = described(annotation) or "something else"
    if kinds & {"too_short", "too_long"}:
        low, high = _counts(annotation)
        count = f"{low}" if low == high else f"{low} to {high}" if high else f"at least {low}"
        return Problem(where, f"{len(given)} values", f"{count} values: {allowed}")
    fix = ""
    mark = mark_in(annotation)
    unknown_limit = path[0] == "limits" and len(path) == 2 and path[-1] not in words_of(LimitsSpec)
    if unknown_limit and not isinstance(given, Mapping):
        near = nearest(str(path[-1]), words_of(LimitsSpec))
        fix = f'Did you mean "{near}"?' if near else f"The simple limits are {', '.join(words_of(LimitsSpec))}"
    elif isinstance(given, (int, float)) and not isinstance(given, bool) and mark and mark.kind.unit:
        fix = f'Add the unit: "{given} {mark.kind.units[0]}"'
    elif isinstance(given, str):
        choices = [c for e in errors if e["type"] == "literal_error" for c in _choices(e)]
        near = nearest(given, choices)
        fix = f'Did you mean "{near}"?' if near else ""
    return Problem(where, _briefly(given), allowed, fix)


def _counts(annotation: Any) -> tuple[int, int | None]:
    """Least and greatest number of values of a list."""
    lengths = [m for m in getattr(annotation, "__metadata__", ()) if isinstance(m, (MinLen, MaxLen, FieldInfo))]
    flat = [m for one in lengths for m in (one.metadata if isinstance(one, FieldInfo) else (one,))]
    low = max((m.min_length for m in flat if isinstance(m, MinLen)), default=0)
    high = min((m.max_length for m in flat if isinstance(m, MaxLen)), default=0)
    if not flat and get_origin(annotation) is not Annotated:
        found = [_counts(a) for a in get_args(annotation)]
        return next((c for c in found if c != (0, None)), (0, None))
    return low, high or None


def _meaning(path: Path, data: Any) -> str:
    """One-line meaning of a field, with what it holds."""
    parent = data
    for step in path[:-1]:
        parent = below(parent, step)
    annotation = at_path(PartSpec, data, path[:-1])
    model = model_of(annotation, parent)
    info = next((i for n, i in model.model_fields.items() if path[-1] in (n, i.alias)), None) if model else None
    if info is None or not info.description:
        return ""
    mark = mark_in(at_path(PartSpec, data, path))
    return f'{info.description}, such as "{mark.kind.example}"' if mark else info.description


def _choices(error: ErrorDetails) -> list[str]:
    expected = str(error.get("ctx", {}).get("expected", ""))
    return [word.strip().strip("'") for word in expected.replace(" or ", ", ").split(",")]


def _briefly(given: Any) -> str:
    if isinstance(given, Mapping):
        return shown("a table of " + ", ".join(map(str, given))).strip('"')
    return shown(given)


def _unknown_word(path: Path, data: Any) -> Problem:
    parent = data
    for step in path[:-1]:
        parent = below(parent, step)
    model = model_of(at_path(PartSpec, data, path[:-1]), parent)
    words = words_of(model) if model else ()
    near = nearest(str(path[-1]), words)
    fix = f'Did you mean "{near}"?' if near else ""
    return Problem(written(path), str(path[-1]), f"one of {listed(words)}", fix)


def _unknown_shape(where: str, given: Any) -> Problem:
    from geometry.spec.resolve.member import DIMS

    if not isinstance(given, Mapping):
        return Problem(where, shown(given), "a table with shape and its dimensions")
    shape = given.get("shape")
    if shape is None:
        return Problem(f"{where}.shape", "nothing", f"one of {listed(DIMS)}", "Give shape")
    near = nearest(shape, list(DIMS)) if isinstance(shape, str) else ""
    return Problem(f"{where}.shape", shown(shape), f"one of {listed(DIMS)}", f'Did you mean "{near}"?' if near else "")


def _near_shape(parent: Any, last: str | int) -> str:
    from geometry.spec.resolve.member import DIMS

    given = below(parent, last)
    shape = given.get("shape") if isinstance(given, dict) else None
    return nearest(shape, list(DIMS)) if isinstance(shape, str) else ""


def _repair(data: Any, path: Path, errors: list[ErrorDetails], removed: set[str]) -> None:
    """Take the mistake at `path` out of `data`, in place."""
    if not path:
        return
    kinds = {error["type"] for error in errors}
    parent = data
    for step in path[:-1]:
        parent = below(parent, step)
    last = path[-1]
    if parent is None:
        return  # it has gone with a table above it
    annotation = at_path(PartSpec, data, path)
    if path[0] == "supports" and len(path) > 2 and path[2] == "hold" and isinstance(data["supports"][path[1]], dict):
        data["supports"][path[1]]["hold"] = "all"  # its region is looked at all the same
        return
    if "union_tag_invalid" in kinds and _near_shape(parent, last):
        parent[last]["shape"] = _near_shape(parent, last)  # its dimensions tell whether that was meant
        return
    if "extra_forbidden" not in kinds and annotation is not None and mark_in(annotation) is not None:
        parent[last] = UNREADABLE
    elif "extra_forbidden" not in kinds and (low := _counts(annotation)[0]) and _holds_quantities(annotation):
        parent[last] = [UNREADABLE] * low
    elif "missing" in kinds and len(path) == 1:
        parent[last] = {}  # members, supports, material
        removed.add(str(last))
    elif "missing" in kinds or isinstance(last, int):
        _leave_out(data, path[:-1], removed)
    elif isinstance(parent, dict):
        parent.pop(last, None)
        removed.add(written(path[:-1]) + MISSPELT if "extra_forbidden" in kinds else written(path))


def _holds_quantities(annotation: Any) -> bool:
    return any(get_origin(o) is list and mark_in(get_args(o)[0]) for o in alternatives(annotation))


def _leave_out(data: Any, path: Path, removed: set[str]) -> None:
    """Leave out a table; of a list the whole, so that the numbers of its other tables stay right."""
    while path and isinstance(path[-1], int):
        path = path[:-1]
    if not path:
        return
    parent = data
    for step in path[:-1]:
        parent = below(parent, step)
    if isinstance(parent, dict) and path[-1] in parent:
        del parent[path[-1]]
    removed.add(written(path))
