"""Whether supports and loads mean something: freedoms, bearings, what the material must know."""

from __future__ import annotations

from geometry.part import BearingLoad, BodyLoad, Member, Part, RemotePoint, Support, TemperatureLoad
from geometry.spec.checks.frame import axes_of, dot, size
from geometry.spec.checks.regions import is_flat
from geometry.spec.checks.section import axes_known
from geometry.spec.resolve.values import Values

SQUARE = 1e-6  # largest share of a bearing force that may point along its hole


def check_supports(values: Values, part: Part) -> None:
    """Keep freedoms that a coupling cannot hold, and freedoms held twice."""
    members = {member.name: member for member in part.members}
    for support in part.supports:
        path = f"supports.{support.name}"
        turns = [freedom for freedom in support.held if freedom in ("rx", "ry", "rz")]
        if turns and support.coupling == "surface":
            values.problem(f"{path}.hold", ", ".join(turns), "x, y, z or normal while every point is held (surface)",
                           'Give coupling = "rigid" or "average" to hold rotations')  # fmt: skip
        if "normal" in support.held:
            _check_normal(values, path, support, members)
    _check_held_once(values, part)


def _check_normal(values: Values, path: str, support: Support, members: dict[str, Member]) -> None:
    if support.coupling != "surface":
        values.problem(f"{path}.coupling", support.coupling, "surface, when normal is held", "Leave coupling out")
    name, _, region = support.on.partition(".")
    if name in members and not is_flat(members[name], region):
        values.problem(f"{path}.hold", f"normal of {support.on}", "normal on a plane region", "Hold x, y or z instead")


def _check_held_once(values: Values, part: Part) -> None:
    held: dict[tuple[str, str], str] = {}
    for support in part.supports:
        for freedom in support.held:
            first = held.setdefault((support.on, freedom), support.name)
            if first != support.name:
                values.problem(f"supports.{support.name}.hold", f"{freedom} of {support.on}",
                               f"freedoms that the support {first} does not hold as well")  # fmt: skip


def check_loads(values: Values, part: Part) -> None:
    """Keep loads that lack a value of the material, and bearing forces that are not square to their hole."""
    own = not part.material.density
    acting = {name for case in part.cases for name in case.factors}
    members = {member.name: member for member in part.members}
    for load in part.loads:
        if isinstance(load, BodyLoad) and own and load.name in acting:
            values.problem("material.density", "nothing", f"a density, for the load {load.name}", "Give density")
        elif isinstance(load, TemperatureLoad) and not part.material.expansion and load.name in acting:
            values.problem("material.expansion", "nothing", f"a thermal expansion, for the load {load.name}",
                           "Give expansion")  # fmt: skip
        elif isinstance(load, BearingLoad):
            _check_bearing(values, load, members)
        elif isinstance(load, RemotePoint):
            _check_inertia(values, load)
    for limit in part.limits:
        if limit.quantity == "mass" and own:
            values.problem("material.density", "nothing", f"a density, for the limit {limit.name}", "Give density")
        if limit.quantity == "yield_factor" and part.material.yield_strength is None:
            values.problem("material.yield", "nothing", f"a yield strength, for the limit {limit.name}", "Give yield")


def _check_bearing(values: Values, load: BearingLoad, members: dict[str, Member]) -> None:
    path = f"loads.{load.name}"
    name, _, region = load.on.partition(".")
    if name not in members:
        return
    member = members[name]
    holes = [cut for cut in member.cuts if region in (cut.name, cut.group)]
    if not holes or holes[0].kind != "hole":
        known = ", ".join(f"{name}.{cut.name}" for cut in member.cuts if cut.kind == "hole") or "this part has none"
        values.problem(f"{path}.on", load.on, f"a round hole: {known}", "A pin bears in a hole")
        return
    if len(holes) > 1:
        values.problem(f"{path}.on", load.on, "one hole: " + ", ".join(f"{name}.{cut.name}" for cut in holes),
                       "How a force divides among several pins is not known here: give each its share")  # fmt: skip
    total = size(load.force)
    if total == 0.0:
        values.problem(f"{path}.bearing", "0 N", "a force", "A bearing force of nothing has no direction")
    if axes_known(member):
        _, y, z = axes_of(member)
        along = dot(load.force, y if holes[0].axis == "y" else z)
        if abs(along) > SQUARE * total:
            values.problem(f"{path}.bearing", f"{along:.6g} N along the hole's axis",
                           f"a force square to the hole, whose axis is the member's {holes[0].axis}",
                           "A pin slides along its hole: put that part of the force on a face")  # fmt: skip


def _check_inertia(values: Values, load: RemotePoint) -> None:
    xx, yy, zz = load.inertia[:3]
    if min(xx, yy, zz) < 0.0:
        values.problem(
            f"loads.{load.name}.inertia", f"{min(xx, yy, zz):.6g} t mm^2", "moments of inertia of at least 0"
        )
    elif max(xx, yy, zz) > (xx + yy + zz - max(xx, yy, zz)) * (1.0 + 1e-9) and max(xx, yy, zz) > 0.0:
        values.problem(f"loads.{load.name}.inertia", f"{xx:.6g}, {yy:.6g}, {zz:.6g} t mm^2",
                       "moments of inertia of which none is larger than the other two together",
                       "No body has such an inertia: look at the order and the units")  # fmt: skip
