"""The reference of the plan and its JSON schema, both made from the model."""

from __future__ import annotations

from typing import Any

from pydantic import BaseModel

from geometry.spec.model import LimitSpec, LimitsSpec
from geometry.spec.reference import SCHEMA_DIALECT, describe_fields, table_of_words
from studies.vary.plan.kept import SORTS, USUAL
from studies.vary.plan.stock import BUILT_IN
from studies.vary.plan.words import (
    AimSpec,
    KeepSpec,
    PlanSpec,
    RunSpec,
    RunsSpec,
    SamplingSpec,
    ShopSpec,
    ToleranceSpec,
    VariedSpec,
)

TABLES: tuple[tuple[str, type[BaseModel]], ...] = (
    ("the top of the file", PlanSpec),
    ("[vary] NAME = { ... }", VariedSpec),
    ("[sampling]", SamplingSpec),
    ("[shop]", ShopSpec),
    ("[tolerances] NAME = { ... }", ToleranceSpec),
    ("[aim]", AimSpec),
    ("[keep]", KeepSpec),
    ("[keep] runs = { ... }", RunsSpec),
    ("[run]", RunSpec),
)
"""Every table of a plan, in the order of the reference. `[limits]` is that of a part."""


HOLDS: dict[str, dict[str, str]] = {
    "the top of the file": {
        "part": "text", "base": "name = value", "vary": "name = list or table", "stock": "name = list of sizes",
        "constraints": "name = text", "tolerances": "name = quantity or table",
    },
    "[vary] NAME = { ... }": {"values": "list", "from": "quantity or number", "to": "quantity or number",
                              "step": "quantity or number"},
    "[tolerances] NAME = { ... }": {"minus": "quantity", "plus": "quantity"},
}  # fmt: skip
"""What words hold whose model does not say it."""


def plan_schema() -> dict[str, Any]:
    """JSON schema of the TOML file: name it on the first line, ``#:schema plan.schema.json``.

    It knows words and types; names, paths, values and units are checked by `plan_from_text`.
    """
    schema = PlanSpec.model_json_schema(by_alias=True)
    schema["$schema"] = SCHEMA_DIALECT
    schema["title"] = "Haunch plan"
    models: list[type[BaseModel]] = [*(model for _, model in TABLES), LimitsSpec, LimitSpec]
    for model in models:
        table = schema if model is PlanSpec else schema["$defs"].get(model.__name__)
        if table is not None:
            describe_fields(table, model)
    return schema


def plan_reference() -> str:
    """The reference of the plan, as Markdown: every table and word, with range, default and meaning."""
    tables = [table_of_words(title, model, HOLDS.get(title)) for title, model in TABLES]
    return "\n".join([_INTRODUCTION, *tables, _ARITHMETIC, _figures(), _stock()]).rstrip() + "\n"


_INTRODUCTION = """# The plan

One TOML file describes one study: a part, and what varies. This page is made from the model that reads the file.

- What varies is a parameter of the part by its name, or any field of it by its path in quotes:
  `"members.arm.section.flange"`, `"members.arm.holes[1].diameter"`, `"loads.camera.force[3]"`, `"supports.wall.hold"`.
  The first of several tables is `[1]`.
- Its values are a list, `["48 mm", "54 mm"]`; a range, `{ from = "48 mm", to = "72 mm", steps = 4 }` (five values); or
  sizes that can be bought, `{ stock = "plate", from = "4 mm", to = "8 mm" }`. A range without steps is for
  `latin hypercube`, `sobol` and `haunch lightest`. Sampled points fall on listed values and steps where there are any.
- A path may have a short name of its own: `flange = { path = "members.arm.section.flange", stock = "plate" }`.
- Quantities are written as in a part, with their units. Arithmetic on parameters belongs in the part, in
  `[constraints]` and in `[aim]`.
- A point that breaks a constraint or a rule of the shop, or that is no possible part, is left out, with the reason.
- With tolerances, stiffness and strength are judged at least material and the mass at most: of each dimension, the side
  of its tolerance that leaves less, or more. A tolerance that changes no material stays as drawn.
"""

_ARITHMETIC = """## `[constraints]` and `[aim]`

A constraint compares two sides, or three: `"tip_depth <= root_depth - 10 mm"`, `"6 mm <= flange < web * 2"`, with `<`,
`<=`, `>`, `>=`, `==`. Sides that are equal but for rounding are equal. It may use parameters of the part, and what is
varied under a plain name. An aim may use these and kept figures: `"2.1 * mass / (1 kg) + abs(displacement_z@arm.end) /
(1 mm)"`. Without an aim the least mass is best.
"""


def _figures() -> str:
    lines = ["## Figures", "", "Always kept where the part has them: " + ", ".join(f"`{name}`" for name in USUAL) + ".",
             "Any other is named by quantity, component, place and case, of which only the quantity is needed:",
             "`displacement_z@arm.end in carrying`. Without a case it is the largest over all cases, with its sign;",
             "without a place the largest of all places; without a component the size.", "",
             "| figure | kind | components | place | meaning |", "|---|---|---|---|---|"]  # fmt: skip
    place = {"": "", "place": "end, named place, station", "station": "station (`arm@120`)", "support": "support",
             "cut": "cut, step"}  # fmt: skip
    for name, sort in SORTS.items():
        parts = ", ".join(f"`_{part}`" for part in sort.components if part)
        lines.append(f"| `{name}` | {sort.kind} | {parts} | {place[sort.at]} | {sort.meaning} |")
    return "\n".join([*lines, ""])


def _stock() -> str:
    lines = ["## Stock lists", "", "Lists of your own stand under `[stock]`, and come before these.", "",
             "| list | sizes, mm | source |", "|---|---|---|"]  # fmt: skip
    for name, stock in BUILT_IN.items():
        sizes = ", ".join(size.removesuffix(" mm") for size in stock.sizes)
        lines.append(f"| `{name}` | {sizes} | {stock.source} |")
    return "\n".join([*lines, ""])
