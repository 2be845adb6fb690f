"""Figures of the solid model under the keys that the beam model uses too."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from fem.figure import Figure, FigureKey, Quantity, station_place
from fem.solid.cut import Cut, Cutter, section_means
from fem.solid.frame import Frame, member_frame, stations
from fem.solid.model import SolidModel
from fem.solid.reaction import Reactions
from fem.solid.shape import Array

_XYZ = ("x", "y", "z")


def vector_figures(cases: tuple[str, ...], place: str, quantity: Quantity, values: Array, unit: str) -> Iterator[Figure]:
    """Components x, y, z (global) of values (c, 3)."""
    for case, row in zip(cases, values, strict=True):
        for component, value in zip(_XYZ, row, strict=True):
            yield Figure(FigureKey(case, place, quantity, component), float(value), unit)


def section_places(model: SolidModel) -> dict[str, dict[float, list[str]]]:
    """Names of the places of each member by station: ends, named places, and the 21 stations."""
    out: dict[str, dict[float, list[str]]] = {}
    for member in model.part.members:
        length = member_frame(member).length
        places = {float(x): [station_place(member.name, float(x))] for x in stations(length)}
        places[0.0].append(f"{member.name}.start")
        places[max(places)].append(f"{member.name}.end")
        for place in model.part.places:
            if place.member == member.name:
                places.setdefault(place.at, []).append(place.name)
        out[member.name] = dict(sorted(places.items()))
    return out


def displacement_figures(model: SolidModel, cutter: Cutter, u: Array,
                         sections: dict[str, dict[float, Cut]]) -> Iterator[Figure]:
    """Mean displacement (mm) and rotation (rad) of every section; u (c, 3, n)."""
    cases = tuple(case.name for case in model.part.cases)
    places = section_places(model)
    for member in model.part.members:
        frame = member_frame(member)
        for at, names in places[member.name].items():
            mean, turn = section_means(sections[member.name][at], u, model.mesh.tets, frame)
            for name in names:
                yield from vector_figures(cases, name, "displacement", mean, "mm")
                yield from vector_figures(cases, name, "rotation", turn, "rad")


def reaction_figures(model: SolidModel, reactions: Reactions) -> Iterator[Figure]:
    """Force (N) and moment (N mm) of each support on the part."""
    cases = tuple(case.name for case in model.part.cases)
    for name in reactions.force:
        yield from vector_figures(cases, name, "reaction_force", reactions.force[name], "N")
        yield from vector_figures(cases, name, "reaction_moment", reactions.moment[name], "N mm")


def scalar_figures(model: SolidModel, energy: Array) -> Iterator[Figure]:
    """Strain energy (N mm) of each case, mass (t) and centre of mass (mm)."""
    for case, value in zip(model.part.cases, energy, strict=True):
        yield Figure(FigureKey(case.name, "", "strain_energy", ""), float(value), "N mm")
    yield Figure(FigureKey("", "", "mass", ""), model.mass, "t", note="material of the part, no remote masses")
    for component, value in zip(_XYZ, model.centre_of_mass, strict=True):
        yield Figure(FigureKey("", "", "centre_of_mass", component), float(value), "mm")


__all__ = ["Frame", "displacement_figures", "np", "reaction_figures", "scalar_figures", "section_places"]
