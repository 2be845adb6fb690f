"""The plan read against its part: `PlanSpec` to `Plan`, with every mistake at once."""

from __future__ import annotations

import json
from collections.abc import Collection
from pathlib import Path
from typing import Any

from geometry.problem import Problem, SpecError
from geometry.spec.read import data_from_text, part_from_data, text_of_file
from geometry.spec.resolve.values import Values
from geometry.spec.text.units import KINDS, Quantity
from geometry.spec.words.fields import OfKind
from studies.vary.plan.aim import Aim, read_aim
from studies.vary.plan.constraints import read_constraint
from studies.vary.plan.kept import Keep, KeptFigure, read_figure, usual_figures
from studies.vary.plan.key import digest
from studies.vary.plan.place import with_value
from studies.vary.plan.plan import LeftOut, Plan, Run
from studies.vary.plan.ranges import read_varied
from studies.vary.plan.reading import Reading
from studies.vary.plan.sampling import Sampling
from studies.vary.plan.sampling import points as points_of
from studies.vary.plan.shop import read_shop
from studies.vary.plan.stock import BUILT_IN, Stock
from studies.vary.plan.tolerances import Tolerance, extremes, read_tolerance, spread
from studies.vary.plan.varied import Varied
from studies.vary.plan.words import PlanSpec, VariedSpec

SECONDS_EACH = 2.0
"""What a variant may be reckoned to take on one core."""
ENOUGH_TRIED = 500
"""Points that are tried for a first variant before a plan is believed to have one (the quick ones, that a constraint
leaves out, do not count)."""
MOST_TRIED = 100_000
"""Points that are tried at the most."""


def build(
    spec: PlanSpec, folder: Path, name: str, text: str, most: int | None, lost: Collection[str]
) -> tuple[Plan | None, list[Problem]]:
    """The plan as far as it can be made, and the mistakes.

    `most`: points that are not too many. `lost`: tables of which something could not be read.
    """
    reading, part_name, part_text = _read_part(spec, folder)
    varied = _varied(reading, spec, lost)
    tolerances = _tolerances(reading, spec, varied)
    sampling = _sampling(reading, spec, varied)
    if sampling.method == "as made":
        varied = spread(reading.data, reading.scope, tolerances)
    scope = _scope(reading, varied)
    shop = read_shop(reading, spec.shop)
    constraints = [read_constraint(reading, key, one, scope) for key, one in spec.constraints.items()]
    keep = _keep(reading, spec)
    aim = _aim(reading, spec, scope)
    if aim is not None:
        keep = _with_figures(keep, aim.figures)
    run = _run(reading, spec)
    if reading.problems or aim is None:
        return None, reading.problems
    plan = Plan(
        title=spec.title or reading.part.title or Path(name).stem, name=name, text=text, part_name=part_name,
        part_text=part_text, part_data=reading.data, part=reading.part, varied=varied, sampling=sampling,
        constraints=tuple(c for c in constraints if c), shop=shop, tolerances=tolerances,
        aim=aim, keep=keep, run=run, notes=(), key="",
    )  # fmt: skip
    _check_count(reading, plan, most)
    if not reading.problems:
        _check_any(reading, plan)
        _tell_twins(reading, plan)
    return _finished(plan, reading, spec), reading.problems


def _read_part(spec: PlanSpec, folder: Path) -> tuple[Reading, str, str]:
    """The part with the plan's base and limits; raise `SpecError` with its own problems, their paths prefixed."""
    if isinstance(spec.part, str):
        file = folder / spec.part
        name = file.name
        try:
            text = text_of_file(file)
            data: dict[str, Any] = data_from_text(text, name)
            part_from_data(data, text)
        except SpecError as error:
            raise SpecError(_prefixed(name, problem) for problem in error.problems) from None
    else:
        name, text, data = "part.toml", "", spec.part
    problems: list[Problem] = []
    reading = Reading(data, part_from_data(data), Values(data.get("parameters", {})).scope, problems)
    for key, value in spec.base.items():
        path = reading.place(f"base.{key}", key)
        mark = reading.mark(path) if path else None
        if path and (mark is None or _fits(reading, f"base.{key}", value, mark)):
            data = with_value(data, path, value)
    given = spec.limits.model_dump(by_alias=True, exclude_unset=True)
    if given:
        data = {**data, "limits": {**data.get("limits", {}), **given}}
    if spec.base or given:
        reading = _changed(reading, data, problems)
    return reading, name, text


def _fits(reading: Reading, where: str, value: Any, mark: OfKind) -> bool:
    """Whether a value may stand where such a quantity stands; keeps a problem otherwise."""
    values = Values(reading.data.get("parameters", {}))
    values.number(where, value, mark)
    reading.problems += values.problems
    return not values.problems


def _changed(reading: Reading, data: dict[str, Any], problems: list[Problem]) -> Reading:
    try:
        part = part_from_data(data)
    except SpecError as error:
        problems += [Problem(p.path if p.path.startswith("limits") else f"base: {p.path}", p.given, p.allowed, p.fix)
                     for p in error.problems]  # fmt: skip
        return reading
    return Reading(data, part, Values(data.get("parameters", {})).scope, problems)


def _prefixed(name: str, problem: Problem) -> Problem:
    path = f"part ({name})" if problem.path == name else f"part ({name}): {problem.path}"
    return Problem(path, problem.given, problem.allowed, problem.fix)


def _varied(reading: Reading, spec: PlanSpec, lost: Collection[str]) -> dict[str, Varied]:
    stocks = {**BUILT_IN, **{key: Stock(tuple(sizes), "") for key, sizes in spec.stock.items()}}
    used = dict.fromkeys(one.stock for one in spec.vary.values() if isinstance(one, VariedSpec) and one.stock)
    reading.notes += [f"stock list {name}: {stocks[name].source}"
                      for name in used if name in stocks and stocks[name].source]  # fmt: skip
    if not spec.vary and "vary" not in lost and spec.sampling.method != "as made":
        reading.problem("vary", "nothing", "at least one parameter or path", 'root_depth = ["48 mm", "60 mm"]')
    found: dict[str, Varied] = {}
    for name, one in spec.vary.items():
        varied = read_varied(reading, name, one, stocks)
        if varied is None:
            continue
        twin = next((other for other in found.values() if _overlap(other.path, varied.path)), None)
        if twin:
            reading.problem(f"vary.{name}", f"the same place as {twin.name}", "each place once")
        found[name] = varied
    return found


def _overlap(a: tuple[str | int, ...], b: tuple[str | int, ...]) -> bool:
    """Whether one is the other, or a table that holds the other."""
    return a[: len(b)] == b[: len(a)]


def _tolerances(reading: Reading, spec: PlanSpec, varied: dict[str, Varied]) -> tuple[Tolerance, ...]:
    found = [read_tolerance(reading, name, one, varied) for name, one in spec.tolerances.items()]
    tolerances = tuple(one for one in found if one)
    if spec.sampling.method == "as made":
        if not spec.tolerances:
            reading.problem("tolerances", "nothing", "the tolerances within which parts are made")
        if spec.vary:
            reading.problem("vary", ", ".join(spec.vary), "nothing, for as made: one part is made many times",
                            "Put the dimensions as drawn under [base]")  # fmt: skip
    elif tolerances:
        sides = extremes(reading.data, reading.scope, tolerances)
        reading.notes += [f"tolerances.{name}: it changes no material, so it stays as drawn; as made would vary it"
                          for name in sides.idle]  # fmt: skip
        reading.notes += [f"tolerances.{name}: it changes the length of the part, and the shorter one is not the "
                          "weaker one, so for strength it stays as drawn; vary it, or take as made"
                          for name in sides.reaching]  # fmt: skip
    return tolerances


def _sampling(reading: Reading, plan: PlanSpec, varied: dict[str, Varied]) -> Sampling:
    spec = plan.sampling
    listed = spec.method in ("grid", "one at a time")
    if listed and spec.points is not None:
        reading.problem("sampling.points", str(spec.points), f"nothing, for {spec.method}",
                        "The values of [vary] say how many there are")  # fmt: skip
    if not listed and spec.points is None:
        reading.problem("sampling.points", "nothing", f"how many points, for {spec.method}", "points = 64")
    if spec.points is not None and spec.points < 1:
        reading.problem("sampling.points", str(spec.points), "at least 1")
    if spec.seed < 0:
        reading.problem("sampling.seed", str(spec.seed), "at least 0")
    for one in varied.values():
        if listed and not one.values:
            reading.problem(f"vary.{one.name}", "a range without steps", f"steps or step, for {spec.method}",
                            "steps = 4 gives five values")  # fmt: skip
        if spec.method == "one at a time" and one.base is None:
            reading.problem(f"vary.{one.name}", "a field that the part leaves out", "a value to start from",
                            "Give it in the part, or under [base]")  # fmt: skip
    if spec.method == "sobol" and spec.points and spec.points & (spec.points - 1):
        less = 1 << (spec.points.bit_length() - 1)
        reading.notes.append(f"sampling.points: a Sobol sequence is most even with a power of two: {less} or "
                             f"{2 * less}, rather than {spec.points}")  # fmt: skip
    return Sampling(spec.method, spec.points, spec.seed)


def _scope(reading: Reading, varied: dict[str, Varied]) -> dict[str, Quantity]:
    """What arithmetic of the plan may use: parameters of the part, and what is varied under a name of its own."""
    scope = dict(reading.scope)
    for name, one in varied.items():
        if one.numeric and name not in scope and name.isidentifier():
            assert one.low is not None
            start = one.low if one.base_number is None else one.base_number
            scope[name] = Quantity(start, KINDS[one.kind].dimension)
    return scope


def _keep(reading: Reading, spec: PlanSpec) -> Keep:
    runs = spec.keep.runs
    for word in ("best", "worst", "suspicious", "every"):
        if getattr(runs, word) < 0:
            reading.problem(f"keep.runs.{word}", str(getattr(runs, word)), "0 or more")
    wanted = [read_figure(reading, f"keep.figures[{i}]", name) for i, name in enumerate(spec.keep.figures, 1)]
    keep = Keep(tuple(usual_figures(reading.part)), (), runs.best, runs.worst, runs.suspicious, runs.every)
    return _with_figures(keep, tuple(figure for figure in wanted if figure))


def _with_figures(keep: Keep, figures: tuple[KeptFigure, ...]) -> Keep:
    more = tuple(dict.fromkeys(figure for figure in figures if figure.name not in keep.names))
    return Keep(**{**vars(keep), "figures": keep.figures + more, "extra": (*keep.extra, *(f.name for f in more))})


def _aim(reading: Reading, spec: PlanSpec, scope: dict[str, Quantity]) -> Aim | None:
    if spec.aim is None:
        return read_aim(reading, "mass", "least", scope)
    if (spec.aim.least is None) == (spec.aim.most is None):
        given = "both" if spec.aim.least is not None else "neither"
        reading.problem("aim", given, "least or most, one of the two", 'least = "mass"')
        return None
    if spec.aim.least is not None:
        return read_aim(reading, spec.aim.least, "least", scope)
    assert spec.aim.most is not None
    return read_aim(reading, spec.aim.most, "most", scope)


def _run(reading: Reading, spec: PlanSpec) -> Run:
    seconds = spec.run.seconds
    if isinstance(seconds, int | float) and not isinstance(seconds, bool):
        seconds = f"{seconds} s"  # the word says what it is measured in
    value = reading.number("run.seconds", seconds, OfKind("time", above=0.0))
    if spec.run.memory < 256:
        reading.problem("run.memory", str(spec.run.memory), "at least 256 (MiB)")
    return Run(value or 300.0, spec.run.memory, spec.run.safer_mesh)


def _check_count(reading: Reading, plan: Plan, most: int | None) -> None:
    count = plan.count()
    if most is None or count <= most:
        return
    what = " x ".join(str(len(one.values)) for one in plan.varied.values()) if plan.sampling.method == "grid" else ""
    hours = count * SECONDS_EACH / 3600.0
    days = f"{hours / 24.0:,.0f} days" if hours > 48.0 else f"{hours:,.0f} hours"
    reading.problem(
        "vary" if what else "sampling.points", f"{count:,} points" + (f" ({what})" if what else ""),
        f"at most {most:,} unless you say that they are meant",
        f"At {SECONDS_EACH:g} s each on one core they take {days}: take fewer steps, or a latin hypercube with fewer "
        "points. If they are meant: --yes (allow_many=True in Python)",
    )  # fmt: skip


def _check_any(reading: Reading, plan: Plan) -> None:
    """Keep a problem when the plan has no variant at all."""
    reasons: dict[str, tuple[int, str]] = {}
    tried = 0
    for point in plan.points():
        if not isinstance(point, LeftOut):
            return
        tried += 1
        count, first = reasons.get(point.rule, (0, point.reason))
        reasons[point.rule] = (count + 1, first)
        by_constraints = sum(n for rule, (n, _) in reasons.items() if rule.startswith("constraints."))
        if tried - by_constraints >= ENOUGH_TRIED or tried >= MOST_TRIED:
            return  # the study itself will tell
    for rule, (count, first) in sorted(reasons.items(), key=lambda item: -item[1][0]):
        reading.problem(rule, f"a plan in which it leaves out {count} of all {tried} points",
                        "a plan that leaves at least one variant", f"The first: {first}")  # fmt: skip


def _tell_twins(reading: Reading, plan: Plan) -> None:
    """Tell how many sampled points are the same as an earlier one."""
    if plan.sampling.method in ("grid", "one at a time") or not all(one.values for one in plan.varied.values()):
        return
    different = len({json.dumps(list(point.values())) for point in points_of(plan.varied, plan.sampling)})
    if different < plan.count():
        reading.notes.append(f"sampling: {plan.count() - different} of the {plan.count()} points fall on values that "
                             "an earlier one has; they are in the table, and computed once")  # fmt: skip


def _finished(plan: Plan, reading: Reading, spec: PlanSpec) -> Plan:
    import dataclasses

    words = {"vary", "sampling", "constraints", "shop", "tolerances"}
    made = spec.model_dump(by_alias=True, mode="json", include=words)
    stocks = {one.name: [str(value) for value in one.values] for one in plan.varied.values()}
    return dataclasses.replace(plan, key=digest(plan.part_data, made, stocks), notes=tuple(reading.notes))


