"""Checks of a spec that need values, or more than one field."""

from __future__ import annotations

from collections.abc import Collection, Sequence

from geometry.part import Part
from geometry.spec.checks.acting import check_loads, check_supports
from geometry.spec.checks.cuts import check_cuts
from geometry.spec.checks.face_gaps import check_line_loads
from geometry.spec.checks.held import check_held
from geometry.spec.checks.modes import check_modes
from geometry.spec.checks.names import check_faces, check_names
from geometry.spec.checks.profile import length_of
from geometry.spec.checks.section import axes_known, check_edges, check_member
from geometry.spec.checks.travel import check_travelling
from geometry.spec.model import PartSpec
from geometry.spec.resolve.travel import Travelling
from geometry.spec.resolve.values import Values


def check_part(
    values: Values, spec: PartSpec, part: Part, removed: Collection[str], travelling: Sequence[Travelling] = ()
) -> None:
    """Keep every mistake that can be seen in the resolved part.

    `removed` names tables that could not be read: nothing is said about what may only be missing with them.
    """
    if len(part.members) > 1:
        values.problem("members", ", ".join(m.name for m in part.members), "one member",
                       "Joined members come in a later version: describe one of them")  # fmt: skip
    if not part.members and "members" not in removed:
        values.problem("members", "nothing", "one member", "Give [members.NAME]")
    if not part.supports and not _any_of(removed, "supports"):
        values.problem("supports", "nothing", "at least one support", "Give [supports.NAME]")
    if not part.loads and not _any_of(removed, "loads", "cases"):
        values.problem("loads", "nothing", "at least one load", "Give [loads.NAME], or self_weight = 1 in a case")
    check_names(values, spec, part, removed)
    for member in part.members:
        before = len(values.problems)
        check_member(values, member)
        if len(values.problems) == before:  # cuts and edges can be judged only in sections that exist
            check_cuts(values, member, _cut_paths(spec, member.name))
            check_edges(values, member)
    for place in part.places:
        length = next((length_of(m) for m in part.members if m.name == place.member), 0.0)
        if place.at > length * (1.0 + 1e-9) > 0.0:
            values.problem(f"places.{place.name}.at", f"{place.at:.6g} mm", f"from 0 to {length:.6g} mm")
    check_faces(values, part)
    check_supports(values, part)
    check_loads(values, part)
    if not any(p.path.startswith("members") for p in values.problems):
        check_line_loads(values, part)
    check_travelling(values, part, travelling, removed)
    check_modes(values, spec, part, removed)
    regions_known = not any(p.path.startswith("supports.") for p in values.problems)
    if part.members and regions_known and not _any_of(removed, "supports", "members"):
        if all(axes_known(m) for m in part.members):
            check_held(values, part)


def _any_of(removed: Collection[str], *tables: str) -> bool:
    return any(gone.split(".")[0].split("[")[0] in tables and not gone.endswith("?") for gone in removed)


def _cut_paths(spec: PartSpec, name: str) -> dict[str, str]:
    """Path of the table of each group of cuts."""
    member = spec.members[name]
    return {
        cut.name or f"{kind}{i}": f"members.{name}.{plural}[{i}]"
        for kind, plural in (("hole", "holes"), ("slot", "slots"), ("opening", "openings"), ("notch", "notches"))
        for i, cut in enumerate(getattr(member, plural), 1)
    }
