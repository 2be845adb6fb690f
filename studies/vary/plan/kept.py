"""Figures that are kept of each variant, by their names.

The usual ones are kept of every variant that has them. Any other is named by quantity, component and place, and by a
case if it is wanted of one case only: ``displacement_z@arm.end``, ``reaction_force_z@wall``, ``stress@cable``,
``rotation_y@arm.end in carrying``. Without a case it is the largest size over all cases, with its sign; without a
component the size of the vector; without a place the largest of all places. `studies.vary.work.figures` reads the same
names where the figures are made.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass
from typing import NamedTuple

from geometry.part import Part
from geometry.spec.checks.profile import length_of
from geometry.spec.resolve.values import shown
from geometry.spec.text.units import KINDS, Kind
from studies.vary.plan.reading import Reading


class Sort(NamedTuple):
    """A sort of figure: its kind, its meaning, the components it may have ("" is the size), and where it may be:
    ``place`` (ends, named places, stations), ``station`` (one of the 21 along the member, ``arm@120``), ``support``,
    ``cut``, or nowhere in particular (empty)."""

    kind: str
    meaning: str
    components: tuple[str, ...] = ("",)
    at: str = ""


_SIZE_XYZ = ("", "x", "y", "z")
SORTS: dict[str, Sort] = {
    "mass": Sort("mass", "mass of the part; where the plan has tolerances, at most material"),
    "deflection": Sort("length", "largest size of a section's mean displacement", at="place"),
    "rotation": Sort("angle", "rotation of a section", _SIZE_XYZ, "place"),
    "stress": Sort("stress", "highest established stress of the solid; with a place that of a notch", at="cut"),
    "yield_factor": Sort("number", "least factor against first yield"),
    "reaction": Sort("force", "size of the force at a support", at="support"),
    "frequency": Sort("frequency", "lowest natural frequency; frequency_2, frequency_3 ... the next ones"),
    "buckling_factor": Sort("number", "least positive buckling factor"),
    "displacement": Sort("length", "mean displacement of a section", _SIZE_XYZ, "place"),
    "reaction_force": Sort("force", "force that a support exerts on the part", _SIZE_XYZ, "support"),
    "reaction_moment": Sort("moment", "moment that a support exerts on the part", _SIZE_XYZ, "support"),
    "section_force": Sort("force", "section force, member axes", ("N", "Vy", "Vz"), "station"),
    "section_moment": Sort("moment", "section moment, member axes", ("T", "My", "Mz"), "station"),
    "nominal_stress": Sort("stress", "longitudinal stress at the outer fibres", at="station"),
    "notch_stress": Sort("stress", "stress at the rims of cuts and shoulders", at="cut"),
    "denting": Sort("length", "largest local deformation of a loaded region"),
    "strain_energy": Sort("moment", "strain energy of the part"),
}
"""What figures there are."""

USUAL = ("mass", "deflection", "rotation", "stress", "yield_factor", "reaction", "frequency", "buckling_factor")
"""Names of the figures that are always kept where the part has them."""

STATIONS = 20
"""Steps from station to station along a member."""

NO_CASE = ("mass", "frequency")
"""Figures that belong to no case."""

_NAME = re.compile(r"([a-z_]+?)(?:_(x|y|z|N|Vy|Vz|T|My|Mz|[1-9][0-9]?))?(?:@([A-Za-z0-9_.@-]+))?(?: in (\S+))?")


@dataclass(frozen=True)
class KeptFigure:
    """One kept figure: its name, and what it is made of (empty: any place, the size, all cases)."""

    name: str
    quantity: str
    component: str
    place: str
    case: str
    kind: Kind


@dataclass(frozen=True)
class Keep:
    """What is kept of each variant.

    `figures`: all of them, the usual ones first. `extra`: names of those beside the usual ones. The rest: of how many
    variants the whole run folder is kept (`every`: every n-th; 0: none).
    """

    figures: tuple[KeptFigure, ...]
    extra: tuple[str, ...] = ()
    best: int = 3
    worst: int = 1
    suspicious: int = 5
    every: int = 0

    @property
    def names(self) -> tuple[str, ...]:
        """Names of all kept figures."""
        return tuple(figure.name for figure in self.figures)


def usual_figures(part: Part) -> Iterator[KeptFigure]:
    """The usual figures that a part has."""
    for name in USUAL:
        if not _needs(part, name):
            yield KeptFigure(name, name, "", "", "", KINDS[SORTS[name].kind])


def _needs(part: Part, quantity: str) -> str:
    """What the part lacks for figures of this quantity; empty when it has them."""
    if quantity == "yield_factor" and part.material.yield_strength is None:
        return "a material with a yield strength"
    if quantity == "frequency" and part.vibration is None:
        return "[vibration] in the part"
    if quantity == "buckling_factor" and not part.buckling:
        return "[buckling] in the part"
    return ""


def places_of(part: Part, at: str) -> list[str]:
    """Places that a figure may have, by `Sort.at`."""
    if at == "support":
        return [support.name for support in part.supports]
    if at == "cut":
        return [cut.name for member in part.members for cut in member.cuts]
    stations = [f"{m.name}@{length_of(m) * k / STATIONS:.6g}" for m in part.members for k in range(STATIONS + 1)]
    ends = [f"{member.name}.{end}" for member in part.members for end in ("start", "end")]
    return [*ends, *(place.name for place in part.places)] if at == "place" else stations if at else []


def is_figure(name: str) -> bool:
    """Whether a name is that of a figure, whatever part it is of."""
    found = _NAME.fullmatch(name)
    return found is not None and found[1] in SORTS


def read_figure(reading: Reading, where: str, name: str) -> KeptFigure | None:
    """A figure by its name, or None after keeping a problem."""
    found = _NAME.fullmatch(name)
    quantity, component, place, case = (text or "" for text in (found.groups() if found else ("", "", "", "")))
    sort = SORTS.get(quantity)
    if sort is None:
        with_place = [f"{quantity}@PLACE" for quantity in SORTS if quantity not in USUAL and SORTS[quantity].at]
        reading.unknown(where, name, [*USUAL, *with_place, "denting", "strain_energy"], "a figure")
        return None
    if needs := _needs(reading.part, quantity):
        reading.problem(where, shown(name), "a figure that the part has", f"It needs {needs}")
        return None
    good = [_check_component(reading, where, name, quantity, component),
            _check_place(reading, where, name, place, sort.at),
            _check_case(reading, where, name, quantity, case)]  # fmt: skip
    return KeptFigure(name, quantity, component, place, case, KINDS[sort.kind]) if all(good) else None


def _check_component(reading: Reading, where: str, name: str, quantity: str, component: str) -> bool:
    vibration = reading.part.vibration
    if quantity == "frequency" and vibration is not None and (component or "1").isdigit():
        if int(component or 1) <= vibration.modes:
            return True
        reading.problem(where, shown(name), f"at most frequency_{vibration.modes}", "The part asks for no more modes")
        return False
    components = SORTS[quantity].components
    if component not in components:
        known = [f"{quantity}_{c}" if c else quantity for c in components]
        reading.problem(where, shown(name), f"one of {', '.join(known)}")
    return component in components


def _check_place(reading: Reading, where: str, name: str, place: str, at: str) -> bool:
    known = places_of(reading.part, at)
    member = reading.part.members[0].name
    station = at in ("place", "station") and re.fullmatch(rf"{re.escape(member)}@[0-9.]+", place)
    step = at == "cut" and re.fullmatch(rf"(?:{re.escape(member)}\.)?step@[0-9.]+", place)
    if not place or place in known or place.removeprefix(f"{member}.") in known or station or step:
        return True
    if not at:
        reading.problem(where, shown(name), f"{name.partition('@')[0]} without a place")
    else:
        reading.unknown(where, place, known, f"a {at} of the part")
    return False


def _check_case(reading: Reading, where: str, name: str, quantity: str, case: str) -> bool:
    known = list(dict.fromkeys(c.travel.case if c.travel else c.name for c in reading.part.cases))
    if not case or (case in known and quantity not in NO_CASE):
        return True
    if quantity in NO_CASE:
        reading.problem(where, shown(name), f"{quantity} without a case")
    else:
        reading.unknown(where, case, known, "a case of the part")
    return False
