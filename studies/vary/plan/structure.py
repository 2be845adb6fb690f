"""The model's error messages in the words of the plan, and what is left of the plan without the mistakes."""

from __future__ import annotations

import copy
from collections.abc import Mapping
from typing import Any

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from geometry.problem import Problem, SpecError
from geometry.spec.model import LimitsSpec, PartSpec
from geometry.spec.read import check_depth
from geometry.spec.resolve.values import listed, shown
from geometry.spec.text.tokens import nearest
from geometry.spec.words.structure import Path, at_path, below, described, mark_in, model_of, words_of, written
from studies.vary.plan.words import PlanSpec

MOST_ROUNDS = 50


def read_structure(data: Mapping[str, Any]) -> tuple[PlanSpec | None, list[Problem]]:
    """The plan as far as it can be read, and the mistakes of structure. None: there is no part to read it against."""
    check_depth(data)
    rest: Any = copy.deepcopy(dict(data))
    problems: dict[str, Problem] = {}
    for _ in range(MOST_ROUNDS):
        try:
            return PlanSpec.model_validate(rest), list(problems.values())
        except ValidationError as error:
            for path, errors in _by_path(error.errors(include_url=False, include_context=False), rest).items():
                problem = _problem(path, errors, rest)
                problems.setdefault(problem.path, problem)
                _leave_out(rest, path)
            if "part" not in rest:
                return None, list(problems.values())
    raise SpecError(problems.values())


def _by_path(errors: list[ErrorDetails], data: Any) -> dict[Path, list[ErrorDetails]]:
    """Errors by the place in the data, without the model's marks for members of unions."""
    found: dict[Path, list[ErrorDetails]] = {}
    for error in errors:
        path: list[str | int] = []
        value = data
        for step in error["loc"]:
            if below(value, step) is not None or (isinstance(value, Mapping) and step in value):
                path.append(step)
                value = below(value, step)
        if error["type"] == "missing":
            path.append(error["loc"][-1])
        found.setdefault(tuple(path), []).append(error)
    above = {path[:k] for path in found for k in range(len(path))}
    return {path: errors for path, errors in found.items() if path not in above}


def _problem(path: Path, errors: list[ErrorDetails], data: Any) -> Problem:
    """One problem for everything that the model says about one place."""
    kinds = {error["type"] for error in errors}
    given: Any = data
    for step in path:
        given = below(given, step)
    annotation = at_path(PlanSpec, data, path)
    if "missing" in kinds:
        return Problem(written(path), "nothing", described(annotation), f"Give {path[-1]}")
    if "extra_forbidden" in kinds:
        return _unknown_word(path, data)
    fix, mark = "", mark_in(annotation)
    if path[0] == "limits" and len(path) == 2 and not isinstance(given, Mapping):
        near = nearest(str(path[1]), words_of(LimitsSpec))
        fix = f'Did you mean "{near}"?' if near and near != path[1] else ""
    elif path[0] == "vary" and len(path) == 2:
        fix = "One value for all variants stands under [base]" if not isinstance(given, Mapping) else ""
    elif isinstance(given, str):
        choices = [word.strip('"') for word in described(annotation).removeprefix("one of ").split(", ")]
        near = nearest(given, choices)
        fix = f'Did you mean "{near}"?' if near else ""
    elif isinstance(given, int | float) and not isinstance(given, bool) and mark and mark.kind.units and mark.kind.unit:
        fix = f'Add the unit: "{given} {mark.kind.units[0]}"'
    elif path[0] == "tolerances" and isinstance(given, int | float):
        fix = "Add the unit, as text"
    if any(kind in kinds for kind in ("too_short", "too_long")):
        return Problem(written(path), "an empty list", "at least one value")
    quoted = "a table of " + ", ".join(map(str, given)) if isinstance(given, Mapping) else shown(given)
    return Problem(written(path), quoted, described(annotation) or "something else", fix)


def _unknown_word(path: Path, data: Any) -> Problem:
    parent = data
    for step in path[:-1]:
        parent = below(parent, step)
    model = model_of(at_path(PlanSpec, data, path[:-1]), parent) if len(path) > 1 else PlanSpec
    words = words_of(model) if model else ()
    if path[0] == "vary" and len(path) == 3:
        inside = isinstance(below(parent, path[-1]), Mapping | list) and path[1] in words_of(PartSpec)
        near = "" if inside else nearest(str(path[-1]), words)
        fix = f'Put the whole path in quotes: "{written(path[1:])}..." = ...' if inside else ""
    else:
        near, fix = nearest(str(path[-1]), words), ""
    return Problem(written(path), str(path[-1]), f"one of {listed(words)}", f'Did you mean "{near}"?' if near else fix)


def _leave_out(data: Any, path: Path) -> None:
    """Leave out the entry, or the word of a table, in which the mistake is."""
    if not path:
        return
    keep = path[:3] if len(path) > 2 and path[0] in ("keep", "limits") and isinstance(path[1], str) else path[:2]
    parent = data
    for step in keep[:-1]:
        parent = below(parent, step)
    if isinstance(parent, dict):
        parent.pop(keep[-1], None)
