"""The reference of the spec and its JSON schema, both made from the model."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping
from typing import Any, Literal, get_args, get_origin

from pydantic import BaseModel
from pydantic.fields import FieldInfo

from geometry.spec.checks.regions import FACES
from geometry.spec.materials import GRADES, Grade
from geometry.spec.model import (
    BucklingSpec,
    LimitSpec,
    LimitsSpec,
    LoadSpec,
    MaterialSpec,
    PartSpec,
    PlaceSpec,
    SupportSpec,
    TravelSpec,
    VibrationSpec,
)
from geometry.spec.resolve.acting import LOAD_WORDS
from geometry.spec.resolve.member import WALLS
from geometry.spec.text.units import KINDS, NUMBER
from geometry.spec.words.fields import OfKind
from geometry.spec.words.member import (
    AngleSection,
    BoxSection,
    ChannelSection,
    EdgeRadiusSpec,
    HoleSpec,
    ISection,
    MemberSpec,
    NotchSpec,
    OpeningSpec,
    OutlineSection,
    PatchSpec,
    RectangleSection,
    RoundSection,
    SlotSpec,
    StationSpec,
    TeeSection,
    TubeSection,
)
from geometry.spec.words.structure import alternatives, described, field_annotation, mark_in

SCHEMA_DIALECT = "https://json-schema.org/draft/2020-12/schema"

TABLES: tuple[tuple[str, type[BaseModel]], ...] = (
    ("the top of the file", PartSpec),
    ("[material] (instead of a name)", MaterialSpec),
    ("[members.NAME]", MemberSpec),
    ('section = { shape = "rectangle", ... }', RectangleSection),
    ('section = { shape = "round", ... }', RoundSection),
    ('section = { shape = "tube", ... }', TubeSection),
    ('section = { shape = "box", ... }', BoxSection),
    ('section = { shape = "I", ... }', ISection),
    ('section = { shape = "channel", ... }', ChannelSection),
    ('section = { shape = "angle", ... }', AngleSection),
    ('section = { shape = "tee", ... }', TeeSection),
    ('section = { shape = "outline", ... }', OutlineSection),
    ("[[members.NAME.stations]]", StationSpec),
    ("[[members.NAME.holes]]", HoleSpec),
    ("[[members.NAME.slots]]", SlotSpec),
    ("[[members.NAME.openings]]", OpeningSpec),
    ("[[members.NAME.notches]]", NotchSpec),
    ("[[members.NAME.edge_radii]]", EdgeRadiusSpec),
    ("[members.NAME.patches.NAME]", PatchSpec),
    ("[places.NAME]", PlaceSpec),
    ("[supports.NAME]", SupportSpec),
    ("[loads.NAME]", LoadSpec),
    ("travels = { ... }", TravelSpec),
    ("[vibration]", VibrationSpec),
    ("[buckling.CASE]", BucklingSpec),
    ("[limits]", LimitsSpec),
    ("[limits.NAME]", LimitSpec),
)
"""Every table, in the order of the reference."""


def json_schema() -> dict[str, Any]:
    """JSON schema of the TOML file, for editors: name it on the first line, ``#:schema part.schema.json``.

    It knows words, shapes and which fields are text; values, names and sizes are checked by `part_from_text`.
    """
    schema = PartSpec.model_json_schema(by_alias=True)
    schema["$schema"] = SCHEMA_DIALECT
    schema["title"] = "Haunch part"
    for _, model in TABLES:
        table = schema if model is PartSpec else schema.get("$defs", {}).get(model.__name__)
        if table is not None:
            describe_fields(table, model)
    return schema


def describe_fields(table: dict[str, Any], model: type[BaseModel]) -> None:
    """Put the kind, the range and an example of each quantity into its description."""
    for name, info in model.model_fields.items():
        entry = table.get("properties", {}).get(info.alias or name)
        if entry is None:
            continue
        entry.pop("title", None)
        entry["description"] = f"{info.description} ({_holds(model, name)})"
        mark = _quantity(field_annotation(model, name))
        if mark is not None:
            entry["examples"] = [mark.kind.example]


def spec_reference() -> str:
    """The reference of the spec, as Markdown: every table and word, with unit, range, default and meaning."""
    tables = (table_of_words(title, model) for title, model in TABLES)
    parts = [_introduction(), *tables, _free_tables(), _loads(), _names(), _units(), _materials()]
    return "\n".join(parts).rstrip() + "\n"


def _introduction() -> str:
    return """# The part spec

One TOML file describes one part. This page is made from the model that reads the file.

- A quantity is text with its unit: `"12 mm"`. A bare number where a unit belongs is a mistake.
- Arithmetic on parameters: `"reach / 2 - 3 mm"`, with `+ - * /`, parentheses, powers `^` from 0 to 4, and
  `sqrt`, `min`, `max`, `abs`. A unit may follow only a number, so parameters may be called `h`, `t` or `m`.
  A unit with a slash has no spaces: `"2 N/mm"`; with spaces the slash divides: `"10 N / width"`.
- A decimal comma is a mistake. So are an unknown word, an unknown name and an unknown unit.
- Axes are right-handed. A member has its own: x from its start to its end, z towards `up`, y = z cross x.
- Pressure is positive when it pushes into the part; moments and rotations turn by the right-hand rule.
- Names have letters, digits, `_` and `-`. In messages the first of several tables is `[1]`.

"Needed" in the column of defaults marks a word that must be given.
"""


def table_of_words(title: str, model: type[BaseModel], holds: Mapping[str, str] | None = None) -> str:
    """One table of the reference: its words with what they hold (or what is said of it instead), default, meaning."""
    words = title.startswith(("[", "section", "travels")) or "=" in title
    lines = [f"## `{title}`" if words else f"## {title[:1].upper()}{title[1:]}", ""]
    lines += [(model.__doc__ or "").strip().split("\n\n")[0].replace("``", "`"), ""]
    lines += ["| word | holds | default | meaning |", "|---|---|---|---|"]
    for name, info in model.model_fields.items():
        word = info.alias or name
        held = (holds or {}).get(word) or _holds(model, name)
        lines.append(f"| `{word}` | {held} | {_default(info)} | {info.description} |")
    return "\n".join([*lines, ""])


def _holds(model: type[BaseModel], name: str) -> str:
    """What a field holds, in a few words."""
    annotation = field_annotation(model, name)
    words = list(dict.fromkeys(filter(None, (_option(o, annotation) for o in alternatives(annotation)))))
    return " or ".join(words)


def _option(option: Any, annotation: Any) -> str:
    if option is type(None):
        return ""
    mark = mark_in(annotation)
    if option in (str, float, int) and mark is not None:
        return _kind_and_range(mark)
    if get_origin(option) is list and (mark := mark_in(get_args(option)[0])) is not None:
        return f"list: {_kind_and_range(mark)}"
    if get_origin(option) is dict and (mark := mark_in(get_args(option)[1])) and "=" not in described(option):
        return f"table: {_kind_and_range(mark)}"
    if get_origin(option) is list and any(get_origin(o) is list for o in alternatives(get_args(option)[0])):
        return "list of corners"
    if get_origin(option) in (list, dict) and not described(option).startswith(("a list of", "a table of")):
        return "tables" if get_origin(option) is dict or _is_model(get_args(option)[0]) else "list of names"
    if _is_model(option):
        return "table"
    if get_origin(option) is Literal:
        return ", ".join(f"`{word}`" for word in get_args(option) if word)
    return described(option)


def _is_model(option: Any) -> bool:
    return isinstance(option, type) and issubclass(option, BaseModel)


def _quantity(annotation: Any) -> OfKind | None:
    found = mark_in(annotation)
    if found is None:
        lists = (o for o in alternatives(annotation) if get_origin(o) is list)
        found = next(filter(None, (mark_in(get_args(o)[0]) for o in lists)), None)
    return found


def _kind_and_range(mark: OfKind) -> str:
    return f"{mark.word} {mark.range}".strip() if mark.range else mark.word


def _default(info: FieldInfo) -> str:
    if info.is_required():
        return "needed"
    value = info.get_default(call_default_factory=True)
    if value is None or value in ("", [], {}) or isinstance(value, BaseModel):
        return ""
    return f"`{json.dumps(value)}`"


def _free_tables() -> str:
    return """## Tables with names of your own

| table | holds |
|---|---|
| `[parameters]` | name = quantity (of any kind) or number; may use other parameters |
| `[cases.NAME]` | load = factor; `self_weight` is a built-in load that uses `gravity` |
| `[buckling.CASE]` | a case whose buckling factors are wanted, by its name |
| `taper = { ... }` | dimension = its value at the far end |
| `[[members.NAME.stations]]` | beside `at`: any dimension of the section = its value there |

A dimension varies linearly from one place that names it to the next, and stays constant after the last.
Two stations at one place are a step: the first ends the stretch before, the second begins the next. A dimension that
only the second names keeps its last value up to the step and jumps there.
"""


def _loads() -> str:
    lines = ["## Kinds of load", "", "The first of these words that a load has makes its kind.", ""]
    lines += ["| word | goes with |", "|---|---|"]
    for word, others in LOAD_WORDS.items():
        also = ", ".join(f"`{LoadSpec.model_fields[o].alias or o}`" for o in others)
        lines.append(f"| `{word}` | {also or 'nothing: it acts on the whole part'} |")
    return "\n".join([*lines, ""])


def _names() -> str:
    lines = ["## Regions and walls", ""]
    lines += [
        "Every member has the regions `NAME.start` and `NAME.end`, one for each cut (`NAME.hole1`; of a row also",
        "`NAME.hole1.2`), one for each patch, and these faces; a cut may pass these walls:",
        "",
        "| shape | faces | walls |",
        "|---|---|---|",
    ]
    for shape, faces in FACES.items():
        named = ", ".join(f"`{face}`" for face in faces) or "`top` ... of its flat outermost sides"
        lines.append(f"| {shape} | {named} | {', '.join(f'`{wall}`' for wall in WALLS[shape])} |")
    lines += ["", "`web` cuts sideways (along y), flanges up and down (along z), a side wall along y, `top wall` and"]
    lines += ["`bottom wall` along z. A cut through `all` says `along` itself.", ""]
    return "\n".join(lines)


def _units() -> str:
    lines = ["## Units", "", "| quantity | units | kept in |", "|---|---|---|"]
    for kind in KINDS.values():
        if kind.dimension != NUMBER:
            lines.append(f"| {kind.word} | {', '.join(f'`{u}`' for u in kind.units)} | {kind.unit} |")
    lines.append("| number | `%` or none | |")
    return "\n".join([*lines, ""])


def _materials() -> str:
    lines = ["## Materials", "", "| name | E MPa | nu | density kg/m^3 | strength, MPa | kind | source |"]
    lines += ["|---|---|---|---|---|---|---|"]
    lines += [_material(grade) for grade in GRADES.values()]
    return "\n".join([*lines, "", "The row for the thickest plate of the section is used.", ""])


def _material(grade: Grade) -> str:
    strengths = "; ".join(_rows(grade))
    source = ", ".join(filter(None, (grade.source, grade.note, "" if grade.checked else "from memory")))
    return f"| {grade.name} | {grade.E:g} | {grade.nu:g} | {grade.density:g} | {strengths} | {grade.kind} | {source} |"


def _rows(grade: Grade) -> Iterator[str]:
    for most, proof, ultimate in grade.strengths:
        reach = f"t <= {most:g} mm: " if most < float("inf") else ""
        yield f"{reach}{proof:g} / {ultimate:g}"
