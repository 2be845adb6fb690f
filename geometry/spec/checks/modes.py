"""Whether vibration, buckling and their limits ask for something that can be worked out."""

from __future__ import annotations

from collections.abc import Collection

from geometry.part import Part
from geometry.spec.model import PartSpec
from geometry.spec.resolve.values import Values, listed


def check_modes(values: Values, spec: PartSpec, part: Part, removed: Collection[str]) -> None:
    """Keep a part that is to vibrate without a mass, cases that cannot buckle, and limits that nothing is found for."""
    if part.vibration is not None and not part.material.density:
        values.problem("material.density", "nothing", "a density, for [vibration]", "Give density")
    gone = {path.split(".")[0].split("[")[0] for path in removed if not path.endswith("?")}
    if not gone & {"cases", "loads"}:
        for name in spec.buckling:
            _check_buckling(values, spec, part, name)
    _check_limits(values, part, gone)


def _check_buckling(values: Values, spec: PartSpec, part: Part, name: str) -> None:
    path = f"buckling.{name}"
    cases = {case.name: case for case in part.cases}
    travelling = {case.travel.case: case.travel.load for case in part.cases if case.travel}
    if name in travelling:
        values.problem(path, f"{name}, in which {travelling[name]} travels",
                       f"a case whose loads stand still: {listed(c for c in cases if cases[c].travel is None)}",
                       "Name one position: make a case with a still load there, such as force_per_length over the "
                       "contact")  # fmt: skip
        return
    if name not in cases:
        values.unknown(path, name, [c for c in cases if cases[c].travel is None], "a case")
        return
    acting = [load for load, factor in cases[name].factors.items() if factor != 0.0]
    fixed = spec.buckling[name].fixed
    for k, load in enumerate(fixed, 1):
        if load not in acting:
            values.unknown(f"{path}.fixed[{k}]", load, acting, f"a load that acts in the case {name}")
    if acting and not set(acting) - set(fixed):
        values.problem(f"{path}.fixed", listed(fixed), f"not every load of the case: {listed(acting)}",
                       "At least one load must grow")  # fmt: skip
    if not acting:
        values.problem(path, f"{name}, in which no load acts", "a case with a load")


def _check_limits(values: Values, part: Part, gone: Collection[str]) -> None:
    studied = [study.case for study in part.buckling]
    for limit in part.limits:
        path = f"limits.{limit.name}"
        if limit.quantity == "frequency" and part.vibration is None and "vibration" not in gone:
            values.problem("vibration", "nothing", f"natural frequencies, for the limit {limit.name}",
                           "Give [vibration]")  # fmt: skip
        if limit.quantity == "buckling_factor" and not studied and "buckling" not in gone:
            values.problem("buckling", "nothing", f"a case to study, for the limit {limit.name}",
                           f"Give [buckling.CASE], CASE one of {listed(_still(part))}")  # fmt: skip
        if limit.quantity == "frequency" and limit.cases:
            values.problem(f"{path}.cases", listed(limit.cases), "nothing", "A natural frequency belongs to no case")
        if limit.quantity in ("frequency", "buckling_factor") and limit.at:
            values.problem(f"{path}.at", limit.at, "nothing", f"A {limit.quantity} is that of the whole part")
        if limit.quantity == "buckling_factor" and studied:
            for case in limit.cases:
                if case in {c.travel.case if c.travel else c.name for c in part.cases} and case not in studied:
                    values.problem(f"{path}.cases", case, f"cases with [buckling.CASE]: {listed(studied)}",
                                   f"Give [buckling.{case}]" if case in _still(part) else "")  # fmt: skip


def _still(part: Part) -> list[str]:
    return [case.name for case in part.cases if case.travel is None]
