"""Fabricated parts, meshes and results for the tests of `studies` (no CAD kernel, no mesher, no solver)."""

from __future__ import annotations

import dataclasses
from types import SimpleNamespace
from typing import Literal

import numpy as np

from fem.figure import Figure, FigureKey, Quantity, station_place
from fem.solid import result as solid_result
from fem.solid.result import SolidResult
from geometry.named_solid import FaceMark, NamedSolid
from geometry.part import (
    BodyLoad,
    Case,
    Limit,
    Material,
    Member,
    Part,
    Place,
    RegionLoad,
    RemotePoint,
    Section,
    Support,
)
from mesher.named_mesh import NamedMesh
from studies.check.result import IndependentCheck, LimitVerdict, Pair, PeakPlace
from studies.check.run import Models
from studies.check.words import JudgementWord
from studies.judge import Judgement

Axes = Literal["global", "member"]
L, WIDTH, DEPTH = 200.0, 20.0, 30.0


def make_part() -> Part:
    """A rectangular cantilever along x with a tip force and its own weight."""
    member = Member("arm", (0.0, 0.0, 0.0), (L, 0.0, 0.0), (0.0, 0.0, 1.0), 0.0,
                    Section("rectangle", {"depth": DEPTH, "width": WIDTH}))
    steel = Material("steel", 210000.0, 0.3, 7.85e-9, 1.2e-5, 355.0, 470.0, "minimum", "from memory")
    return Part(
        title="Test cantilever", material=steel, members=(member,),
        supports=(Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0}),),
        loads=(RegionLoad("tip", "arm.end", (0.0, 0.0, -500.0)), BodyLoad("self_weight", (0.0, 0.0, -9806.65)),
               RemotePoint("lamp", "arm.end", (L + 60.0, 0.0, 40.0), "rigid", force=(0.0, 30.0, 0.0), mass=1e-3)),
        cases=(Case("carrying", {"tip": 1.0, "self_weight": 1.0}),),
        limits=(Limit("deflection", "deflection", 0.5, "arm.end"),), places=(Place("middle", "arm", L / 2),),
        source_text='title = "Test cantilever"\n',
    )


def make_mesh(n: tuple[int, int, int] = (20, 2, 3)) -> NamedMesh:
    """A block of straight 10-node tetrahedra over the cantilever, its six faces named."""
    from skfem import MeshTet, MeshTet2

    grids = [np.linspace(0.0, L, n[0] + 1), np.linspace(-WIDTH / 2, WIDTH / 2, n[1] + 1),
             np.linspace(-DEPTH / 2, DEPTH / 2, n[2] + 1)]
    mesh = MeshTet2.from_mesh(MeshTet.init_tensor(*grids))
    nodes, facets = mesh.doflocs, mesh.boundary_facets()
    of_facet, of_edge = mesh.facets[:, facets], {tuple(e): i for i, e in enumerate(mesh.edges.T)}
    middles = mesh.dofs.edge_dofs[0]
    boundary = np.empty((6, len(facets)), dtype=np.int64)
    centre = np.array([L / 2, 0.0, 0.0])
    for k, corners in enumerate(of_facet.T):
        a, b, c = nodes[:, corners].T
        if np.cross(b - a, c - a) @ ((a + b + c) / 3 - centre) < 0:
            corners = corners[[0, 2, 1]]
        pairs = [(0, 1), (1, 2), (0, 2)]
        mids = [middles[of_edge[tuple(sorted((int(corners[i]), int(corners[j]))))]] for i, j in pairs]
        boundary[:, k] = [*corners, *mids]
    mean = nodes[:, boundary[:3]].mean(axis=1)
    sides = [np.isclose(mean[0], 0), np.isclose(mean[0], L), np.isclose(mean[1], -WIDTH / 2),
             np.isclose(mean[1], WIDTH / 2), np.isclose(mean[2], -DEPTH / 2), np.isclose(mean[2], DEPTH / 2)]
    names = ["start", "end", "left", "right", "bottom", "top"]
    face = np.select(sides, list(range(6)), -1)
    tets = np.vstack([mesh.t, middles[mesh.t2e]])
    area = {"start": WIDTH * DEPTH, "end": WIDTH * DEPTH, "left": L * DEPTH, "right": L * DEPTH, "bottom": L * WIDTH,
            "top": L * WIDTH}
    named = {f"arm.{name}": value for name, value in area.items()}
    return NamedMesh(nodes, tets, {f"arm.{name}": boundary[:, side] for name, side in zip(names, sides, strict=True)},
                     boundary, face.astype(np.int64), np.full(tets.shape[1], 0.5), L * WIDTH * DEPTH, named, named,
                     {"algorithm": "block"})


def fabricated_figures(part: Part, tip: float = -0.2, wobble: float = 0.0) -> tuple[Figure, ...]:
    """Figures of the cantilever in the shape that both models give; `wobble` makes one model differ."""
    member, case = part.members[0].name, part.cases[0].name
    figures: list[Figure] = []

    def add(place: str, quantity: Quantity, component: str, value: float, unit: str, axes: Axes = "global") -> None:
        figures.append(Figure(FigureKey(case, place, quantity, component, axes), value * (1 + wobble), unit))

    force = -tip * 2500.0
    for k in range(21):
        x = k * L / 20
        place = station_place(member, x)
        for component, value in zip("xyz", (0.0, 0.0, tip * (1.5 * (x / L) ** 2 - 0.5 * (x / L) ** 3)), strict=True):
            add(place, "displacement", component, value, "mm")
        for component, value in {"N": 0.0, "Vy": 0.0, "Vz": -force}.items():
            add(place, "section_force", component, value, "N", "member")
        for component, value in {"T": 0.0, "My": force * (L - x), "Mz": 0.0}.items():
            add(place, "section_moment", component, value, "N mm", "member")
        stress = force * (L - x) * 6 / (WIDTH * DEPTH**2)
        for side, value in {"top": stress, "bottom": -stress, "left": 0.0, "right": 0.0}.items():
            add(place, "nominal_stress", f"xx@{side}", value, "MPa", "member")
    add(f"{member}.end", "displacement", "z", tip, "mm")
    add("wall", "reaction_force", "z", force, "N")
    return (*figures, Figure(FigureKey("", "", "mass", ""), L * WIDTH * DEPTH * 7.85e-9 * (1 + wobble), "t"))


def make_models(wobble: float = 0.001) -> Models:
    """Both models of the cantilever, fabricated: a plausible field and figures, no solver."""
    part, mesh = make_part(), make_mesh()
    x, _, z = mesh.nodes
    u = np.zeros((1, 3, mesh.nodes.shape[1]))
    u[0, 2], u[0, 0] = -0.3 * (x / L) ** 2, 0.6 * x / L**2 * z
    stress = np.zeros((1, 6, mesh.nodes.shape[1]))
    stress[0, 0] = z * (L - x) / 100
    von_mises = np.abs(stress[:, 0])
    node = int(von_mises[0].argmax())
    spot = (float(mesh.nodes[0, node]), float(mesh.nodes[1, node]), float(mesh.nodes[2, node]))
    case = part.cases[0].name
    value = float(von_mises.max())
    peak = solid_result.PeakPlace(case, value, spot, node, ("arm.start",), (0,), False, "rim of a support", value)
    given = {
        "cases": (case,), "mesh": mesh, "u": u, "stress": stress, "stress_error": 0.01 * von_mises,
        "von_mises": von_mises,
        "figures": fabricated_figures(part, wobble=wobble), "peaks": (peak,),
        "case_stress": (solid_result.CaseStress(case, 0.9 * value, value, 355 / (0.9 * value), 355 / value),),
        "denting": (solid_result.Denting(case, "arm.end", 1e-4),), "section_gap": np.zeros((1, 21, 1, 6)),
        "mass": L * WIDTH * DEPTH * 7.85e-9, "centre_of_mass": np.array([L / 2, 0.0, 0.0]),
        "external_work": np.array([1.0]), "strain_energy": np.array([1.0]),
        "checks": (solid_result.Check("balance", 1e-12, 1e-6, True),),
    }
    # What the solid model says beyond that does not matter here.
    more = [f for f in dataclasses.fields(SolidResult) if f.name not in given and f.default is dataclasses.MISSING
            and f.default_factory is dataclasses.MISSING]
    solid = SolidResult(**given, **{f.name: np.zeros(1) for f in more})
    marks = (FaceMark(1.0, (0.0, 0.0, 0.0), (0.0,) * 6),)
    named = NamedSolid(b"brep", b"ISO-10303-21;", marks, {}, mesh.volume, 1.0, (0.0, 0.0, 0.0), mesh.volume)
    beam = SimpleNamespace(figures=fabricated_figures(part), notes=("No factor.",), diagrams={})
    return Models(part, named, mesh, beam, solid)  # type: ignore[arg-type]


def make_judgement(models: Models) -> Judgement:
    """A plain judgement: 2 % of the value for everything, one limit met."""
    beam = {figure.key: figure.value for figure in models.beam.figures}
    pairs = []
    for figure in models.solid.figures:
        difference = figure.value - beam[figure.key]
        band = 0.02 * abs(beam[figure.key]) + 1e-12
        word: JudgementWord = "agrees" if abs(difference) <= band else "suspicious"
        pairs.append(Pair(figure.key, figure.value, beam[figure.key], figure.unit, difference, abs(figure.value), band,
                          (), word, "" if word == "agrees" else "the load"))
    limit = LimitVerdict("deflection", "deflection", 0.5, 0.2, "mm", "carrying", "arm.end", "met")
    peaks = tuple(PeakPlace(p.case, "arm.start", "support", p.position, p.value, None, False, p.reason)
                  for p in models.solid.peaks)
    return Judgement(tuple(pairs), (limit,), (IndependentCheck("b", 0.0, 1.0, True, "t"),), peaks, ("A test.",))
