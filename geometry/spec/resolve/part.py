"""The spec in numbers: `PartSpec` to `Part`, with every mistake at once."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import replace

from geometry.part import BodyLoad, Buckling, Limit, Load, Material, Member, Part, Place, Vibration
from geometry.problem import Problem, SpecError
from geometry.spec.checks.part import check_part
from geometry.spec.checks.plates import thickest_plate
from geometry.spec.materials import GRADES, Grade, find
from geometry.spec.model import MaterialSpec, PartSpec
from geometry.spec.resolve.acting import (
    SELF_WEIGHT,
    resolve_cases,
    resolve_limits,
    resolve_load,
    resolve_support,
)
from geometry.spec.resolve.member import Table, resolve_member
from geometry.spec.resolve.travel import Travelling
from geometry.spec.resolve.values import Values


def resolve(spec: PartSpec, source_text: str = "") -> Part:
    """The part in numbers; raise `SpecError` with every mistake found."""
    part, problems = resolve_and_check(spec, source_text)
    if problems or part is None:
        raise SpecError(problems)
    return part


def resolve_and_check(
    spec: PartSpec, source_text: str = "", removed: Collection[str] = (), lenient: bool = False
) -> tuple[Part | None, list[Problem]]:
    """The part as far as it can be read, and the mistakes.

    `removed` names the tables from which something unreadable was taken out before (``supports.wall``);
    what depends on all of them is not judged then. `lenient`: quantities may be `UNREADABLE`.
    """
    values = Values(spec.parameters, lenient)
    members = {name: resolve_member(values, name, member) for name, member in spec.members.items()}
    loads: list[Load] = []
    travelling: dict[str, Travelling] = {}
    for name, load_spec in spec.loads.items():
        load = resolve_load(values, name, load_spec, members)
        if isinstance(load, Travelling):
            travelling[name] = load
        elif load:
            loads.append(load)
    lost = [path.split(".")[1] for path in removed if path.startswith("loads.")]
    cases = resolve_cases(values, spec, tuple(dict.fromkeys((*spec.loads, *lost))), travelling)
    used = {case.travel.load for case in cases if case.travel}
    loads += [strip for name, moving in travelling.items() if name in used for strip in moving.strips]
    gravity = values.vector("gravity", spec.gravity, "acceleration")
    if any(SELF_WEIGHT in case.factors for case in cases):
        loads.append(BodyLoad(SELF_WEIGHT, gravity))
    accuracy = Table(values, "", spec).number("accuracy")
    part = Part(
        title=spec.title,
        material=_material(values, spec, tuple(members.values())),
        members=tuple(members.values()),
        supports=tuple(resolve_support(values, name, support) for name, support in spec.supports.items()),
        loads=tuple(loads),
        cases=cases,
        limits=resolve_limits(values, spec.limits),
        places=_places(values, spec, members),
        vibration=_vibration(values, spec),
        buckling=tuple(
            Buckling(name, tuple(study.fixed), Table(values, f"buckling.{name}", study).whole("modes"))
            for name, study in spec.buckling.items()
        ),
        accuracy=accuracy,
        parameters={name: quantity.value for name, quantity in values.scope.items()},
        source_text=source_text,
    )
    check_part(values, spec, part, removed, tuple(travelling.values()))
    return replace(part, limits=_limits_at_positions(part)), values.problems


def _vibration(values: Values, spec: PartSpec) -> Vibration | None:
    if spec.vibration is None:
        return None
    modes = Table(values, "vibration", spec.vibration).whole("modes")
    return Vibration(modes, free=spec.vibration.supports == "none")


def _limits_at_positions(part: Part) -> tuple[Limit, ...]:
    """A limit that names a case with a travelling load is judged at every position of it."""
    positions: dict[str, list[str]] = {}
    for case in part.cases:
        if case.travel:
            positions.setdefault(case.travel.case, []).append(case.name)
    return tuple(
        replace(limit, cases=tuple(name for case in limit.cases for name in positions.get(case, [case])))
        for limit in part.limits
    )


def _places(values: Values, spec: PartSpec, members: dict[str, Member]) -> tuple[Place, ...]:
    places = []
    for name, place in spec.places.items():
        table = Table(values, f"places.{name}", place)
        member = place.member or next(iter(members), "")
        if member not in members:
            values.unknown(table.at("member"), member, members, "a member")
        places.append(Place(name, member, table.number("at")))
    return tuple(places)


def _material(values: Values, spec: PartSpec, members: tuple[Member, ...]) -> Material:
    if isinstance(spec.material, MaterialSpec):
        return _own_material(values, spec.material)
    grade = find(spec.material)
    if grade is None:
        values.unknown("material", spec.material, GRADES, "a material of the table, or a table of values")
        return Material(spec.material, 1.0, 0.3, 1.0, 1.0, None, None, "", "")
    return _at_thickness(values, grade, max((thickest_plate(m) for m in members), default=0.0))


def _at_thickness(values: Values, grade: Grade, thickness: float) -> Material:
    try:
        return grade.at(thickness)
    except ValueError:
        if thickness > grade.thickest:  # not NaN
            values.problem(
                "material",
                grade.name,
                f"a thickest plate of at most {grade.thickest:g} mm",
                f"The thickest plate is {thickness:.6g} mm: declare the material by values of its own",
            )
        return grade.at(grade.thickest)


def _own_material(values: Values, spec: MaterialSpec) -> Material:
    table = Table(values, "material", spec)
    return Material(
        spec.name, table.number("E"), table.number("nu"), table.optional("density") or 0.0,
        table.optional("expansion") or 0.0, table.optional("yield_strength"), table.optional("ultimate"),
        spec.kind, spec.source,
    )  # fmt: skip
