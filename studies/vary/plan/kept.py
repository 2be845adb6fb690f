"""Figures that are kept of each variant, by their names.

The usual ones are kept of every variant that has them. Any other is named by quantity, component and place:
``displacement_z@arm.end``, ``reaction_force_z@wall``, ``stress@arm.cable``.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

from geometry.part import Part
from geometry.spec.resolve.values import shown
from geometry.spec.text.units import KINDS, Kind
from studies.vary.plan.reading import Reading

USUAL: dict[str, tuple[str, str]] = {
    "mass": ("mass", "of the part"),
    "deflection": ("length", "largest size of the section's mean displacement, over all cases and stations"),
    "rotation": ("angle", "largest rotation of a section, over all cases and stations"),
    "stress": ("stress", "highest established stress, over all cases"),
    "yield_factor": ("number", "least factor against first yield"),
    "reaction": ("force", "largest force at a support, over all cases"),
    "frequency": ("frequency", "lowest natural frequency; frequency_2, frequency_3 ... the next ones"),
    "buckling_factor": ("number", "least positive buckling factor, over all cases with [buckling]"),
}
"""Kind and meaning of each figure that is always kept where the part has it."""

PLACED: dict[str, tuple[str, tuple[str, ...]]] = {
    "displacement": ("length", ("", "x", "y", "z")),
    "rotation": ("angle", ("", "x", "y", "z")),
    "reaction_force": ("force", ("", "x", "y", "z")),
    "reaction_moment": ("moment", ("", "x", "y", "z")),
    "section_force": ("force", ("N", "Vy", "Vz")),
    "section_moment": ("moment", ("T", "My", "Mz")),
    "stress": ("stress", ("",)),
}
"""Kind and components of each figure that has a place; without a component it is the size. The value is the one of
the largest size over all cases, with its sign."""

_NAME = re.compile(r"([a-z_]+?)(?:_(x|y|z|N|Vy|Vz|T|My|Mz))?@([A-Za-z0-9_.-]+)")
_MODE = re.compile(r"frequency_([2-9]|[1-9][0-9])")


@dataclass(frozen=True)
class KeptFigure:
    """One kept figure: its name, and what it is made of. `place` is empty for the usual ones."""

    name: str
    quantity: str
    component: str
    place: str
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
    has = {"yield_factor": part.material.yield_strength is not None, "frequency": part.vibration is not None,
           "buckling_factor": bool(part.buckling)}  # fmt: skip
    for name, (kind, _) in USUAL.items():
        if has.get(name, True):
            yield KeptFigure(name, name, "", "", KINDS[kind])
            if name == "frequency" and part.vibration is not None:
                for mode in range(2, part.vibration.modes + 1):
                    yield KeptFigure(f"frequency_{mode}", "frequency", str(mode), "", KINDS["frequency"])


def places_of(part: Part, quantity: str) -> list[str]:
    """Places that a figure of this quantity may have."""
    if quantity.startswith("reaction"):
        return [support.name for support in part.supports]
    if quantity == "stress":
        return [f"{member.name}.{cut.name}" for member in part.members for cut in member.cuts]
    ends = [f"{member.name}.{end}" for member in part.members for end in ("start", "end")]
    return [*ends, *(place.name for place in part.places)]


def read_figure(reading: Reading, where: str, name: str) -> KeptFigure | None:
    """A figure by its name, or None after keeping a problem."""
    usual = {figure.name: figure for figure in usual_figures(reading.part)}
    if name in usual:
        return usual[name]
    found = _NAME.fullmatch(name)
    if found is None or found[1] not in PLACED:
        if name in USUAL or _MODE.fullmatch(name):
            needs = {"yield_factor": "a yield strength", "buckling_factor": "[buckling]"}.get(name, "[vibration]")
            reading.problem(where, shown(name), f"a figure that the part has: {', '.join(usual)}", f"It needs {needs}")
            return None
        quantities = [f"{quantity}@PLACE" for quantity in PLACED]
        reading.unknown(where, name, [*usual, *quantities], "a figure")
        return None
    quantity, component, place = found[1], found[2] or "", found[3]
    kind, components = PLACED[quantity]
    if component not in components:
        known = [f"{quantity}_{c}" if c else quantity for c in components]
        reading.problem(where, shown(name), f"one of {', '.join(known)} before the @")
        return None
    if place not in (known := places_of(reading.part, quantity)):
        reading.unknown(where, place, known, f"a place of {quantity}")
        return None
    return KeptFigure(name, quantity, component, place, KINDS[kind])
