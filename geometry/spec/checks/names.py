"""Names of the spec: legal, used once, and naming something that exists."""

from __future__ import annotations

import re
from collections.abc import Collection, Iterable

from geometry.part import Limit, LineLoad, Member, Part, StripLoad
from geometry.spec.checks.profile import length_of
from geometry.spec.checks.regions import faces_of, is_flat, regions_of
from geometry.spec.model import PartSpec
from geometry.spec.resolve.values import Values, listed
from geometry.spec.text.tokens import nearest

LEGAL = re.compile(r"[A-Za-z_][A-Za-z0-9_-]{0,39}")
LEGAL_WORDS = "1 to 40 letters, digits, _ and -, not starting with a digit"


def check_names(values: Values, spec: PartSpec, part: Part, removed: Collection[str]) -> None:
    """Keep names that are not legal, are used twice, or name nothing."""
    for table in ("members", "places", "supports", "loads", "cases"):
        _check_legal(values, table, getattr(spec, table))
    _check_legal(values, "limits", spec.limits.model_extra or {})
    if "self_weight" in spec.loads:
        values.problem("loads.self_weight", "self_weight", "a name other than self_weight",
                       "It is built in: name it in a case, and set gravity if you must")  # fmt: skip
    for name in spec.places:
        if name in spec.supports:
            values.problem(f"places.{name}", name, "a name that is no support's as well", "Name the place otherwise")
    for member in part.members:
        _check_region_names(values, spec, member)
    for support in part.supports:
        check_region(values, f"supports.{support.name}.on", support.on, part, removed)
    for load in part.loads:
        on = getattr(load, "on", None)
        if isinstance(on, str) and not isinstance(load, StripLoad):
            check_region(values, f"loads.{load.name}.on", on, part, removed)
    for limit in part.limits:
        _check_limit(values, limit, part, removed)


def _check_legal(values: Values, table: str, names: Iterable[str]) -> None:
    for name in names:
        if not LEGAL.fullmatch(name):
            plain = re.sub(r"[^A-Za-z0-9_-]+", "_", name)[:40]
            fix = f'Write "{plain}"' if LEGAL.fullmatch(plain) else ""
            if not name.strip():
                values.problem(f'{table}."{name}"'[:80], "an empty name", LEGAL_WORDS, f"Give each of {table} a name")
                continue
            values.problem(f"{table}.{name}"[:80], name, LEGAL_WORDS, fix)


def _check_region_names(values: Values, spec: PartSpec, member: Member) -> None:
    """Cuts and patches of one member share their names with its faces and ends."""
    path = f"members.{member.name}"
    taken: dict[str, str] = dict.fromkeys(("start", "end", "top", "bottom", "left", "right", "surface", "bore",
                                           "web_left", "web_right"), "a face of the member")  # fmt: skip
    tables = spec.members[member.name]
    named = [(f"{path}.{plural}[{i}]", cut.name or f"{kind}{i}") for kind, plural in
             (("hole", "holes"), ("slot", "slots"), ("opening", "openings"), ("notch", "notches"))
             for i, cut in enumerate(getattr(tables, plural), 1)]  # fmt: skip
    for where, name in [*named, *((f"{path}.patches.{p}", p) for p in tables.patches)]:
        if not LEGAL.fullmatch(name):
            values.problem(f"{where}.name", name, LEGAL_WORDS)
        elif name in taken:
            values.problem(f"{where}.name", name, "a name of its own", f"It is the name of {taken[name]}")
        taken.setdefault(name, where)


def check_region(values: Values, path: str, on: str, part: Part, removed: Collection[str]) -> bool:
    """Whether the part has the region `on`; keeps a problem that lists those of the member otherwise."""
    known = [name for member in part.members for name in regions_of(member)]
    if on in known:
        return True
    # A word unknown in a section changes no region; one unknown in a cut may have been its name.
    if any(gone.startswith("members") and not gone.endswith(".section?") for gone in removed):
        return False  # it may well be among what could not be read
    plain = list(dict.fromkeys(name for name in known if not name.rpartition(".")[2].isdigit()))
    member, dot, _ = on.partition(".")
    if not dot:
        fix = f'Put the member before it: "{part.members[0].name}.{on}"' if part.members else ""
        fix = f'Say which end or face: "{on}.end"' if member in [m.name for m in part.members] else fix
    else:
        near = nearest(on, known)
        fix = f'Did you mean "{near}"?' if near else ""
    values.problem(path, on, f"a region of this part: {listed(plain)}", fix)
    return False


def _check_limit(values: Values, limit: Limit, part: Part, removed: Collection[str]) -> None:
    path = f"limits.{limit.name}"
    cases = list(dict.fromkeys(case.travel.case if case.travel else case.name for case in part.cases))
    for case in limit.cases:
        if case not in cases and not _lost(removed, "cases"):
            values.unknown(f"{path}.cases", case, cases, "a case")
    _check_limit_words(values, path, limit)
    places = [place.name for place in part.places]
    supports = [support.name for support in part.supports]
    regions = [name for member in part.members for name in regions_of(member)]
    known = supports if limit.quantity == "reaction" else [*places, *regions]
    if _lost(removed, "supports", "places", "members"):
        return
    for word, given in (("at", limit.at), ("relative_to", limit.relative_to)):
        if given and given not in known:
            what = "a support" if limit.quantity == "reaction" else "a place or a region"
            values.unknown(f"{path}.{word}", given, [n for n in known if not n.rpartition(".")[2].isdigit()], what)


def _check_limit_words(values: Values, path: str, limit: Limit) -> None:
    if limit.quantity == "relative_displacement":
        for word, given in (("at", limit.at), ("relative_to", limit.relative_to)):
            if not given:
                values.problem(f"{path}.{word}", "nothing", "a place or a region", "It is measured between two")
        if limit.at and limit.at == limit.relative_to:
            values.problem(f"{path}.relative_to", limit.relative_to, "another place than at")
    elif limit.relative_to:
        values.problem(f"{path}.relative_to", limit.relative_to, "nothing", "Only a relative_displacement has it")
    vectors = ("displacement", "rotation", "relative_displacement", "reaction")
    if limit.component and limit.quantity not in vectors:
        values.problem(f"{path}.component", limit.component, "nothing", f"A {limit.quantity} has no components")
    if limit.quantity == "displacement" and not limit.component:
        values.problem(f"{path}.component", "nothing", "x, y or z", "The size of a displacement is a deflection")
    if limit.quantity == "mass" and limit.at:
        values.problem(f"{path}.at", limit.at, "nothing", "The mass is that of the whole part")


def _lost(removed: Collection[str], *tables: str) -> bool:
    return any(gone.split(".")[0].split("[")[0] in tables and not gone.endswith("?") for gone in removed)


def check_faces(values: Values, part: Part) -> None:
    """Keep patches and line loads on what is no face along the member, or beyond its ends."""
    for member in part.members:
        faces, length = faces_of(member), length_of(member)
        for patch in member.patches:
            path = f"members.{member.name}.patches.{patch.name}"
            if patch.face not in faces:
                face = patch.face.removeprefix(f"{member.name}.")
                values.unknown(f"{path}.face", patch.face, faces, "a face of this shape")
                if face in faces:
                    continue
            _check_stretch(values, path, patch.start, patch.end, length)
            if patch.across is not None and patch.across[0] >= patch.across[1]:
                values.problem(f"{path}.across", f"{patch.across[0]:g} to {patch.across[1]:g} mm", "from less to more")
            if patch.across is not None and not is_flat(member, patch.face):
                values.problem(f"{path}.across", patch.face, "a plane face", "On a round face leave across out")
    by_name = {member.name: member for member in part.members}
    for load in part.loads:
        if isinstance(load, LineLoad):
            name, _, face = load.on.partition(".")
            if name in by_name:
                known = [f"{name}.{f}" for f in faces_of(by_name[name])]
                if face and load.on not in known and load.on in regions_of(by_name[name]):
                    values.unknown(f"loads.{load.name}.on", load.on, known, "a face along the member")
                _check_stretch(values, f"loads.{load.name}", load.start, load.end, length_of(by_name[name]))


def _check_stretch(values: Values, path: str, start: float, end: float, length: float) -> None:
    if start < 0.0 or start >= length:
        values.problem(f"{path}.from", f"{start:.6g} mm", f"from 0 to less than {length:.6g} mm")
    if end <= start or end > length * (1.0 + 1e-9):
        values.problem(f"{path}.to", f"{end:.6g} mm", f"more than {start:.6g} mm, up to {length:.6g} mm")
