"""Sections of every member: which elements are the member's, its cuts at every place, and its section forces."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from fem.figure import station_place
from fem.solid.cut import Cut, Cutter, section_means
from fem.solid.frame import Frame, member_frame, stations
from fem.solid.kernels.parallel import ranges, run
from fem.solid.model import SolidModel
from fem.solid.reaction import Reactions
from fem.solid.section_force import SectionForces, raw_section_force
from fem.solid.shape import Array
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
    return _Elements(mesh, member, frame, alone).near(at)


class _Elements:
    """Which elements belong to a member near a station; see `member_elements`."""

    def __init__(self, mesh: NamedMesh, member: Member, frame: Frame, alone: bool) -> None:
        self.all = np.ones(mesh.tets.shape[1], dtype=bool) if alone else None
        if alone:
            return
        own = [mesh.facets[name] for name in (f"{member.name}.{side}" for side in _OUTER) if name in mesh.facets]
        if not own:
            raise SolveError(
                f"The mesh names no outer face of the member {member.name!r}; its sections cannot be told."
            )
        self.corners = frame.local(mesh.nodes[:, np.concatenate(own, axis=1)[:3]])  # (3, 3, k)
        self.low, self.high = self.corners[0].min(axis=0), self.corners[0].max(axis=0)
        self.centre = frame.local(mesh.nodes[:, mesh.tets[:4]].mean(axis=1))[1:]

    def near(self, at: float) -> NDArray[np.bool_]:
        """(m,) at a station."""
        if self.all is not None:
            return self.all
        near = (self.low <= at) & (self.high >= at)
        box = self.corners[1:, :, near if near.sum() >= 4 else slice(None)].reshape(2, -1)
        margin = 1e-3 * np.ptp(box, axis=1)
        low, high = box.min(axis=1) - margin, box.max(axis=1) + margin
        return np.asarray(((self.centre >= low[:, None]) & (self.centre <= high[:, None])).all(axis=0))


def member_sections(model: SolidModel, cutter: Cutter, threads: int = 1) -> dict[str, dict[float, Cut]]:
    """Cut of every member at every place.

    Raises
    ------
    SolveError
        When a station holds no material.
    """
    out: dict[str, dict[float, Cut]] = {}
    places = section_places(model)
    for member in model.part.members:
        frame = member_frame(member)
        elements = _Elements(model.mesh, member, frame, len(model.part.members) == 1)
        cutter.view(frame)
        at = list(places[member.name])

        def cut(i: int, _: int, at: list[float] = at, frame: Frame = frame, elements: _Elements = elements) -> Cut:
            return cutter.cut(frame, at[i], elements.near(at[i]))

        cuts = run(cut, ranges(len(at), len(at)), threads)
        for found in cuts:
            if not found.weights.size:
                name = places[member.name][found.at][0]
                raise SolveError(f"The mesh has no material at {name}: the section there cannot be measured.")
        out[member.name] = dict(zip(at, cuts, strict=True))
    return out


def section_motions(model: SolidModel, u: Array, sections: dict[str, dict[float, Cut]]) -> Motions:
    """Mean displacement (mm) and rotation (rad), global components, of every section; u (c, 3, n)."""
    return {
        member.name: {
            at: section_means(cut, u, member_frame(member))
            for at, cut in sections[member.name].items()
        }
        for member in model.part.members
    }


def section_forces(
    model: SolidModel,
    u: Array,
    reacting: Reactions,
    sections: dict[str, dict[float, Cut]],
    cutter: Cutter | None = None,
    threads: int = 1,
) -> tuple[dict[str, Array], Array]:
    """Section forces (21, c, 6) of each member, and the gap (members, 21, c, 6) of the raw stress integrals to them."""
    cutter = cutter or Cutter(model.mesh)
    solved = SectionForces(model, cutter, u, reacting.nodal)
    forces, gaps = {}, []
    for member in model.part.members:
        frame, cuts = member_frame(member), sections[member.name]
        elements = _Elements(model.mesh, member, frame, len(model.part.members) == 1)
        at = stations(frame.length).tolist()
        view = cutter.view(frame)
        reach = None if elements.all is None else solved.reach(view, elements.all)

        def one(
            i: int,
            _: int,
            at: list[float] = at,
            frame: Frame = frame,
            elements: _Elements = elements,
            reach: tuple[Array, Array] | None = reach,
        ) -> Array:
            return solved.at(frame, at[i], elements.near(at[i]), reach)

        forces[member.name] = np.array(run(one, ranges(len(at), len(at)), threads))
        raw = [raw_section_force(model, cuts[x], u, frame) for x in at]
        gaps.append(np.array(raw) - forces[member.name])
    return forces, np.array(gaps)
