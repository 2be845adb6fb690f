"""Sections of every member: which elements are the member's, its cuts at every place, and its section forces."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.figure import station_place
from fem.solid.cut import Cut, Cutter, section_means
from fem.solid.frame import Frame, member_frame, stations
from fem.solid.model import SolidModel
from fem.solid.reaction import Reactions
from fem.solid.section_force import element_loads, raw_section_force, section_force
from fem.solid.shape import Array
from fem.solid.stress import point_stress
from geometry.part import Member
from geometry.problem import SolveError
from mesher.named_mesh import NamedMesh

Motions = dict[str, dict[float, tuple[Array, Array]]]
"""Mean displacement and rotation (c, 3) of each section, by member and station."""

_OUTER = ("top", "bottom", "left", "right", "surface", "start", "end")


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
                near = min(places, key=lambda x, at=place.at: abs(x - at))  # type: ignore[misc]
                at = near if abs(near - place.at) < 1e-9 * length else place.at
                places.setdefault(at, []).append(place.name)
        out[member.name] = dict(sorted(places.items()))
    return out


def member_elements(mesh: NamedMesh, member: Member, frame: Frame, alone: bool, at: float) -> NDArray[np.bool_]:
    """(m,) elements that belong to the member near a station.

    A part of one member: all. Else those whose centroid lies in the box of the member's own outer faces near the
    station (or anywhere along it when none is near).
    """
    if alone:
        return np.ones(mesh.tets.shape[1], dtype=bool)
    own = [mesh.facets[name] for name in (f"{member.name}.{side}" for side in _OUTER) if name in mesh.facets]
    if not own:
        raise SolveError(f"The mesh names no outer face of the member {member.name!r}; its sections cannot be told.")
    corners = frame.local(mesh.nodes[:, np.concatenate(own, axis=1)[:3]])  # (3, 3, k)
    near = (corners[0].min(axis=0) <= at) & (corners[0].max(axis=0) >= at)
    box = corners[1:, :, near if near.sum() >= 4 else slice(None)].reshape(2, -1)
    margin = 1e-3 * np.ptp(box, axis=1)
    centre = frame.local(mesh.nodes[:, mesh.tets[:4]].mean(axis=1))
    low, high = box.min(axis=1) - margin, box.max(axis=1) + margin
    return np.asarray(((centre[1:] >= low[:, None]) & (centre[1:] <= high[:, None])).all(axis=0))


def member_sections(model: SolidModel, cutter: Cutter) -> dict[str, dict[float, Cut]]:
    """Cut of every member at every place.

    Raises
    ------
    SolveError
        When a station holds no material.
    """
    out: dict[str, dict[float, Cut]] = {}
    alone = len(model.part.members) == 1
    for member in model.part.members:
        frame = member_frame(member)
        out[member.name] = {}
        for at, names in section_places(model)[member.name].items():
            inside = member_elements(model.mesh, member, frame, alone, at)
            cut = cutter.cut(frame, at, inside)
            if not cut.weights.size:
                raise SolveError(f"The mesh has no material at {names[0]}: the section there cannot be measured.")
            out[member.name][at] = cut
    return out


def section_motions(model: SolidModel, u: Array, sections: dict[str, dict[float, Cut]]) -> Motions:
    """Mean displacement (mm) and rotation (rad), global components, of every section; u (c, 3, n)."""
    return {
        member.name: {
            at: section_means(cut, u, model.mesh.tets, member_frame(member))
            for at, cut in sections[member.name].items()
        }
        for member in model.part.members
    }


def section_forces(
    model: SolidModel, u: Array, reacting: Reactions, sections: dict[str, dict[float, Cut]]
) -> tuple[dict[str, Array], Array]:
    """Section forces (21, c, 6) of each member, and the gap (members, 21, c, 6) of the raw stress integrals to them."""
    loads = element_loads(model, u)
    alone = len(model.part.members) == 1
    forces, gaps = {}, []
    for member in model.part.members:
        frame = member_frame(member)
        rows, gap = [], []
        for at in map(float, stations(frame.length)):
            inside = member_elements(model.mesh, member, frame, alone, at)
            value = section_force(model, loads, reacting.nodal, frame, at, inside)
            cut = sections[member.name][at]
            raw = raw_section_force(frame, cut.weights, cut.points, point_stress(model, u, cut.elements, cut.bary))
            rows.append(value)
            gap.append(raw - value)
        forces[member.name] = np.array(rows)
        gaps.append(gap)
    return forces, np.array(gaps)
