"""Figures of the solid model under the keys that the beam model uses too."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from fem.figure import Figure, FigureKey, Quantity, station_place
from fem.solid.frame import member_frame, stations
from fem.solid.model import SolidModel
from fem.solid.reaction import Reactions
from fem.solid.sections import Motions, section_places
from fem.solid.shape import Array

_XYZ = ("x", "y", "z")


def vector_figures(
    cases: tuple[str, ...], place: str, quantity: Quantity, values: Array, unit: str, errors: Array | None = None
) -> Iterator[Figure]:
    """Components x, y, z (global) of values (c, 3); errors (c,) relative to the vector's size."""
    for k, (case, row) in enumerate(zip(cases, values, strict=True)):
        error = None if errors is None else float(errors[k] * np.linalg.norm(row))
        for component, value in zip(_XYZ, row, strict=True):
            yield Figure(FigureKey(case, place, quantity, component), float(value), unit, error)


def displacement_figures(
    model: SolidModel, motions: Motions, relative_error: Array
) -> Iterator[Figure]:
    """Mean displacement (mm) and rotation (rad) of every section; relative_error (c,) of the energy."""
    cases = tuple(case.name for case in model.part.cases)
    places = section_places(model)
    for member in model.part.members:
        for at, names in places[member.name].items():
            mean, turn = motions[member.name][at]
            for name in names:
                yield from vector_figures(cases, name, "displacement", mean, "mm", relative_error)
                yield from vector_figures(cases, name, "rotation", turn, "rad", relative_error)


def reaction_figures(model: SolidModel, reactions: Reactions) -> Iterator[Figure]:
    """Force (N) and moment (N mm) of each support on the part."""
    cases = tuple(case.name for case in model.part.cases)
    for name in reactions.force:
        yield from vector_figures(cases, name, "reaction_force", reactions.force[name], "N")
        yield from vector_figures(cases, name, "reaction_moment", reactions.moment[name], "N mm")


def scalar_figures(model: SolidModel, energy: Array, relative_error: Array) -> Iterator[Figure]:
    """Strain energy (N mm) of each case, mass (t) and centre of mass (mm)."""
    for case, value, error in zip(model.part.cases, energy, relative_error, strict=True):
        yield Figure(FigureKey(case.name, "", "strain_energy", ""), float(value), "N mm", float(error * value))
    yield Figure(FigureKey("", "", "mass", ""), model.mass, "t", note="material of the part, no remote masses")
    for component, value in zip(_XYZ, model.centre_of_mass, strict=True):
        yield Figure(FigureKey("", "", "centre_of_mass", component), float(value), "mm")


def section_force_figures(model: SolidModel, forces: dict[str, Array]) -> Iterator[Figure]:
    """N, Vy, Vz (N) and T, My, Mz (N mm) of each member at the 21 stations, forces (21, c, 6)."""
    for member in model.part.members:
        for at, values in zip(stations(member_frame(member).length), forces[member.name], strict=True):
            place = station_place(member.name, float(at))
            for case, row in zip(model.part.cases, values, strict=True):
                for k, component in enumerate(("N", "Vy", "Vz", "T", "My", "Mz")):
                    quantity: Quantity = "section_force" if k < 3 else "section_moment"
                    yield Figure(
                        FigureKey(case.name, place, quantity, component, "member"),
                        float(row[k]),
                        "N" if k < 3 else "N mm",
                    )
