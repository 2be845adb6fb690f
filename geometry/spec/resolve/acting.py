"""Supports, loads, cases and limits of the spec in numbers."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from geometry.part import (
    BearingLoad,
    BodyLoad,
    Case,
    Limit,
    LineLoad,
    Load,
    Member,
    Pressure,
    RegionLoad,
    RemotePoint,
    Support,
    TemperatureLoad,
    Vector,
)
from geometry.spec.checks.frame import line_direction, scaled
from geometry.spec.model import LimitSpec, LimitsSpec, LoadSpec, PartSpec, SupportSpec
from geometry.spec.resolve.member import Table, mark_of
from geometry.spec.resolve.travel import Travelling, cases_at_positions, resolve_travelling
from geometry.spec.resolve.values import Values, shown
from geometry.spec.text.tokens import with_article
from geometry.spec.words.fields import OfKind

ZERO: Vector = (0.0, 0.0, 0.0)
TRANSLATIONS = ("x", "y", "z")
ROTATIONS = ("rx", "ry", "rz")
SELF_WEIGHT = "self_weight"

LOAD_WORDS: dict[str, tuple[str, ...]] = {
    "point": ("force", "moment", "mass", "inertia", "coupling", "on"),
    "force_per_length": ("force_per_length_end", "start", "end", "on"),
    "travels": ("force", "on"),
    "pressure": ("on",),
    "bearing": ("on",),
    "acceleration": (),
    "temperature_change": (),
    "torque": ("coupling", "on"),
    "force": ("moment", "coupling", "on"),
    "moment": ("coupling", "on"),
}
"""The word that makes the kind of a load (the first one that is present), and the words that go with it."""


def resolve_support(values: Values, name: str, spec: SupportSpec) -> Support:
    """The support in numbers."""
    path = f"supports.{name}"
    hold = spec.hold
    coupling = spec.coupling or ("average" if hold == "pin" else "surface")
    held: dict[str, float]
    if hold == "all":
        held = dict.fromkeys(TRANSLATIONS if coupling == "surface" else (*TRANSLATIONS, *ROTATIONS), 0.0)
    elif hold == "pin":
        held = dict.fromkeys(TRANSLATIONS, 0.0)
    elif hold == "symmetry":
        held = {"normal": 0.0}
    elif isinstance(hold, Mapping):
        held = {
            freedom: values.number(f"{path}.hold.{freedom}", value, "angle" if freedom in ROTATIONS else "length")
            for freedom, value in hold.items()
        }
    else:
        held = dict.fromkeys(hold, 0.0)
    return Support(name, spec.on, held, coupling, spec.axes)  # type: ignore[arg-type]


def load_kind(spec: LoadSpec) -> str:
    """The word that makes the kind of a load, or an empty text."""
    return next((word for word in LOAD_WORDS if getattr(spec, word) is not None), "")


def resolve_load(values: Values, name: str, spec: LoadSpec, members: Mapping[str, Member]) -> Load | Travelling | None:
    """The load in numbers, or None after keeping a problem about its words."""
    table = Table(values, f"loads.{name}", spec)
    kind = load_kind(spec)
    if not kind:
        values.problem(table.path, "no word that says what acts", "one of " + ", ".join(LOAD_WORDS))
        return None
    if not _words_fit(table, kind):
        return None
    on = spec.on or ""
    if kind == "travels":
        return resolve_travelling(values, name, spec)
    if kind == "acceleration":
        x, y, z = table.vector("acceleration")
        return BodyLoad(name, (0.0 - x, 0.0 - y, 0.0 - z))
    if kind == "temperature_change":
        return TemperatureLoad(name, table.number("temperature_change"))
    if kind == "pressure":
        return Pressure(name, on, table.number("pressure"))
    if kind == "bearing":
        return BearingLoad(name, on, table.vector("bearing"))
    if kind == "force_per_length":
        return _line_load(table, name, on, members)
    if kind == "point":
        return _remote_point(table, name, on)
    moment = table.vector("moment") if spec.moment is not None else ZERO
    if kind == "torque":
        member = members.get(on.partition(".")[0])
        moment = scaled(line_direction(member), table.number("torque")) if member else ZERO
    force = table.vector("force") if spec.force is not None else ZERO
    return RegionLoad(name, on, force, moment, spec.coupling or "surface")


def _words_fit(table: Table, kind: str) -> bool:
    spec: Any = table.spec
    good = True
    for word in LoadSpec.model_fields:
        if word not in (kind, *LOAD_WORDS[kind]) and getattr(spec, word) is not None:
            may = ", ".join(LoadSpec.model_fields[w].alias or w for w in LOAD_WORDS[kind]) or "nothing else"
            table.values.problem(table.at(word), shown(getattr(spec, word)), f"beside {kind}: {may}",
                                 "Make two loads of it, and name both in the case")  # fmt: skip
            good = False
    if "on" in LOAD_WORDS[kind] and spec.on is None:
        table.values.problem(table.at("on"), "nothing", "the region that the load acts on")
        good = False
    return good


def _line_load(table: Table, name: str, on: str, members: Mapping[str, Member]) -> LineLoad:
    spec: Any = table.spec
    member = members.get(on.partition(".")[0])
    length = math.dist(member.start, member.end) if member else math.nan
    first = table.vector("force_per_length")
    last = table.vector("force_per_length_end") if spec.force_per_length_end is not None else first
    start = table.number("start") if spec.start is not None else 0.0
    end = table.number("end") if spec.end is not None else length
    return LineLoad(name, on, start, end, first, last)


def _remote_point(table: Table, name: str, on: str) -> RemotePoint:
    spec: Any = table.spec
    if spec.coupling == "surface":
        table.values.problem(
            table.at("coupling"), "surface", "rigid or average", "A point off the part needs a coupling"
        )
    inertia = [0.0] * 6
    for i, text in enumerate(spec.inertia or ()):
        inertia[i] = table.values.number(f"{table.at('inertia')}[{i + 1}]", text, "mass moment of inertia")
    if len(spec.inertia or ()) in (4, 5):
        table.values.problem(table.at("inertia"), f"{len(spec.inertia)} values", "xx, yy, zz or xx, yy, zz, xy, yz, zx")
    return RemotePoint(
        name, on, table.vector("point"), "rigid" if spec.coupling == "rigid" else "average",
        table.vector("force") if spec.force is not None else ZERO,
        table.vector("moment") if spec.moment is not None else ZERO,
        table.number("mass") if spec.mass is not None else 0.0,
        (inertia[0], inertia[1], inertia[2], inertia[3], inertia[4], inertia[5]),
    )  # fmt: skip


def resolve_cases(
    values: Values, spec: PartSpec, loads: tuple[str, ...], travelling: Mapping[str, Travelling]
) -> tuple[Case, ...]:
    """The cases, one a position of a travelling load; one case ``all`` with every load at 1 when none is given."""
    known = (*loads, SELF_WEIGHT)
    if not spec.cases:
        return cases_at_positions(values, "all", dict.fromkeys(loads, 1.0), travelling, declared=False)
    cases: list[Case] = []
    for name, factors in spec.cases.items():
        path = f"cases.{name}"
        if not factors:
            values.problem(path, "no load", f"load = factor, with any of {', '.join(known)}")
        numbers = {}
        for load, factor in factors.items():
            if load not in known:
                values.unknown(f"{path}.{load}", load, known, "a load")
            numbers[load] = values.number(f"{path}.{load}", factor, "number")
        cases += cases_at_positions(values, name, numbers, travelling, declared=True)
    return tuple(cases)


LIMIT_KINDS = {
    "deflection": "length", "displacement": "length", "relative_displacement": "length", "rotation": "angle",
    "stress": "stress", "yield_factor": "number", "mass": "mass", "reaction": "force",
    "frequency": "frequency", "buckling_factor": "number",
}  # fmt: skip
"""What each limited quantity is measured in."""

LEAST = ("yield_factor", "frequency", "buckling_factor")
"""Quantities that a limit keeps from being too small."""


def resolve_limits(values: Values, spec: LimitsSpec) -> tuple[Limit, ...]:
    """The limits in numbers, simple ones first."""
    limits = []
    for name in LimitsSpec.model_fields:
        if (given := getattr(spec, name)) is not None:
            limits.append(Limit(name, name, values.number(f"limits.{name}", given, mark_of(LimitsSpec, name))))
    for name, named in (spec.model_extra or {}).items():
        limits.append(_limit(values, name, named))
    return tuple(limits)


def _limit(values: Values, name: str, spec: LimitSpec) -> Limit:
    path = f"limits.{name}"
    word, other = ("min", "max") if spec.quantity in LEAST else ("max", "min")
    given = getattr(spec, word)
    value = math.nan
    if getattr(spec, other) is not None:
        values.problem(f"{path}.{other}", shown(getattr(spec, other)), f"{word} only, for {spec.quantity}")
    elif given is None:
        what = with_article(LIMIT_KINDS[spec.quantity])
        values.problem(f"{path}.{word}", "nothing", what, f"{spec.quantity} needs {word}")
    if given is not None:
        value = values.number(f"{path}.{word}", given, OfKind(LIMIT_KINDS[spec.quantity], above=0.0))
    return Limit(name, spec.quantity, value, spec.at, spec.relative_to, spec.component, spec.basis, tuple(spec.cases))
