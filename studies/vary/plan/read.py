"""Plans from files, text and plain data."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

from geometry.problem import SpecError
from geometry.spec.read import data_from_text, text_of_file
from studies.vary.plan.build import build
from studies.vary.plan.plan import Plan
from studies.vary.plan.structure import read_structure

MOST_POINTS = 100_000
"""More are made only when asked for."""


def read_plan(path: str | Path, *, allow_many: bool = False) -> Plan:
    """The plan that a TOML file describes; raise `SpecError` with every mistake found, in it and in its part.

    `allow_many`: more than `MOST_POINTS` points are meant.
    """
    file = Path(path)
    return plan_from_text(text_of_file(file), file.parent, file.name, allow_many=allow_many)


def plan_from_text(text: str, folder: str | Path = ".", name: str = "plan.toml", *, allow_many: bool = False) -> Plan:
    """The plan that a TOML text describes; its part lies in `folder`."""
    return plan_from_data(data_from_text(text, name), folder, name, text=text, allow_many=allow_many)


def plan_from_data(
    data: Mapping[str, Any], folder: str | Path = ".", name: str = "plan.toml", *, text: str = "",
    allow_many: bool = False,
) -> Plan:  # fmt: skip
    """The plan that plain data (the tables of a TOML file) describes. `part` may be the tables of a part too.

    Without a `text`, `Plan.text` and `Plan.part_text` are written from the tables, for the record.
    """
    spec, problems = read_structure(data)
    if spec is None:
        raise SpecError(problems)
    lost = {problem.path.partition(".")[0] for problem in problems}
    plan, more = build(spec, Path(folder), name, text, MOST_POINTS if not allow_many else None, lost)
    problems += [p for p in more if p not in problems]
    if problems or plan is None:
        raise SpecError(problems)
    return plan if text else _with_texts(plan, data)


def _with_texts(plan: Plan, data: Mapping[str, Any]) -> Plan:
    """The plan with its text, and that of a part that came as tables."""
    from studies.vary.work.toml import dumps

    part = data["part"]
    if isinstance(part, str):
        return replace(plan, text=dumps(data))
    return replace(plan, text=dumps({**data, "part": plan.part_name}), part_text=dumps(part))


