"""Figures of one part taken from both rooms without a solution: sections, mass, regions, resultants of loads."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from OCP.BRepBuilderAPI import BRepBuilderAPI_Transform
from OCP.gp import gp_Trsf

from fem.beam import solve_beam
from fem.beam.figures import mass_figures
from fem.beam.mesh import BeamMesh
from fem.beam.section import SectionProperties, outline_integrals
from fem.beam.slices import sections_at
from fem.solid.load import solid_loads, surface_vector
from fem.solid.region import surface_region
from geometry.named_solid import NamedSolid
from geometry.outline import Outline
from geometry.part import Part
from geometry.solid.frame import member_frame
from geometry.solid.kernel import from_brep
from geometry.solid.slices import slices_of
from mesher.named_mesh import NamedMesh

Array = NDArray[np.float64]


def plain_sections(outlines: Sequence[Outline], nu: float) -> list[SectionProperties]:
    """Exact integrals, and rules of thumb where a section would have to be solved (nothing compared here asks)."""
    found = []
    for o in outlines:
        e = outline_integrals(o)
        found.append(
            SectionProperties(
                e.area, e.yc, e.zc, e.Iyy, e.Izz, e.Iyz, e.I1, e.I2, e.principal_angle, e.yc, e.zc,
                np.eye(2) * 1.2 / e.area, e.area**4 / (40 * (e.Iyy + e.Izz)), 0.0, False, e.extremes,
                e.W_top, e.W_bottom, e.W_left, e.W_right, 0.0, np.zeros(4),
            )
        )  # fmt: skip
    return found


def telling_places(part: Part) -> list[float]:
    """Stations in and beside everything that happens: cuts, steps, the ends."""
    member = part.members[0]
    length = member_frame(member).length
    places = list(np.array([0.01, 0.12, 0.35, 0.52, 0.78, 0.99]) * length)
    places += [cut.at + share * cut.length for cut in member.cuts for share in (-0.37, 0.02, 0.21)]
    for station in member.stations:
        clear = 1.5 * station.shoulder_fillet + 1e-3 * length
        places += [station.at - clear, station.at + clear]
    return [float(x) for x in places if 0.0 < x < length and not _in_a_rim(part, x)]


def _in_a_rim(part: Part, x: float) -> bool:
    """Whether a shoulder fillet lies here: no section that the beam has."""
    return any(abs(x - s.at) <= 1.2 * s.shoulder_fillet for s in part.members[0].stations)


def section_gaps(part: Part, solid: NamedSolid) -> Array:
    """(n, 6) x and the differences of area, centroid, Iyy, Izz, Iyz, each over its scale."""
    frame = member_frame(part.members[0])
    back = gp_Trsf()
    m, o = frame.axes, -frame.axes @ frame.origin
    back.SetValues(*(float(v) for row in np.column_stack([m, o]) for v in row))
    drawn = BRepBuilderAPI_Transform(from_brep(solid.brep), back, True).Shape()
    places = telling_places(part)
    a = slices_of(drawn, places, 1e3)
    b = sections_at(part.members[0], places)
    size = np.sqrt(a[:, 1])
    large = np.maximum(a[:, 4], a[:, 5])
    return np.column_stack([
        a[:, 0],
        np.abs(b[:, 1] / a[:, 1] - 1),
        np.hypot(b[:, 2] - a[:, 2], b[:, 3] - a[:, 3]) / size,
        np.abs(b[:, 4] - a[:, 4]) / large,
        np.abs(b[:, 5] - a[:, 5]) / large,
        np.abs(b[:, 6] - a[:, 6]) / large,
    ])  # fmt: skip


@dataclass(frozen=True, slots=True)
class Gap:
    """A difference of the two rooms, over the scale of the thing."""

    what: str
    value: float


def beam_mesh(part: Part) -> BeamMesh:
    """The beam model's geometry without solved sections."""
    return BeamMesh.of(part, plain_sections)


def mass_gaps(part: Part, solid: NamedSolid, mesh: BeamMesh) -> list[Gap]:
    """Mass and centre of mass of the CAD solid against the beam's figures."""
    beam = {f.key[2:4]: f.value for f in mass_figures(mesh)}
    where = np.array([beam["centre_of_mass", c] for c in "xyz"])
    return [
        Gap("mass", abs(beam["mass", ""] / (solid.volume * part.material.density) - 1)),
        Gap("centre of mass", float(np.linalg.norm(where - solid.centroid)) / mesh.length),
    ]


def region_gaps(part: Part, solid: NamedSolid, mesh: BeamMesh) -> list[Gap]:
    """Area (relative) and centroid (over its size) of every region that both rooms know."""
    frame = member_frame(part.members[0])
    gaps = []
    for name, faces in solid.regions.items():
        region = mesh.region(name)
        area = sum(solid.faces[i].area for i in faces)
        centre = sum(solid.faces[i].area * np.array(solid.faces[i].centroid) for i in faces) / area
        mine = frame.to_global(region.centroid)
        gaps.append(Gap(f"area of {name}", abs(region.area / area - 1)))
        gaps.append(Gap(f"centroid of {name}", float(np.linalg.norm(mine - centre)) / np.sqrt(area)))
    return gaps


def load_gaps(part: Part, mesh: NamedMesh) -> list[Gap]:
    """Resultant of each load: what the solid applies against the beam's reaction at the only support."""
    held = surface_region(mesh, part.supports[0].on)
    beam = {f.key[:4]: f.value for f in solve_beam(part, section_solver=plain_sections).figures}
    loads, gaps = solid_loads(part, mesh), []
    arm = float(np.ptp(mesh.nodes, axis=1).max())
    for case in part.cases:
        (name,) = case.factors
        pushed = np.zeros((mesh.nodes.shape[1], 3))
        for piece in loads[name].pieces:
            pushed += surface_vector(mesh, piece)
        force = pushed.sum(axis=0)
        moment = np.cross(mesh.nodes.T - held.centroid, pushed).sum(axis=0)
        support = part.supports[0].name
        f, m = (np.array([-beam[case.name, support, q, c] for c in "xyz"])
                for q in ("reaction_force", "reaction_moment"))  # fmt: skip
        scale = max(float(np.abs(pushed).sum()), float(np.linalg.norm(moment)) / arm)
        if scale > 0.0:
            gaps.append(Gap(f"force of {name}", float(np.linalg.norm(f - force)) / scale))
            gaps.append(Gap(f"moment of {name}", float(np.linalg.norm(m - moment)) / (scale * arm)))
    return gaps


__all__ = ["Gap", "beam_mesh", "load_gaps", "mass_gaps", "plain_sections", "region_gaps", "section_gaps"]
