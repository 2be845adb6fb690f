"""The whole chain from the text of a spec: part, CAD solid, mesh, solid model, and the beam model beside it."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

from fem.beam import BeamResult, solve_beam
from fem.figure import FigureKey
from fem.solid import SolidResult, solve_solid
from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from geometry.part import Part
from geometry.solid import build_solid
from geometry.spec import part_from_text
from mesher import NamedMesh, mesh_solid

BUDGET = Budget(threads=1, memory=8000, seconds=300.0)
STEEL = '{ E = "210 GPa", nu = 0.3, density = "7850 kg/m^3", expansion = "12e-6 1/K" }'
CLAMPED = '[supports.wall]\non = "bar.start"\nhold = "all"\n'


def bar_text(section: str, length: str, rest: str, *, member: str = "", material: str = STEEL) -> str:
    """Spec of one member `bar` along global x with its depth along z."""
    return (
        f'title = "bar"\nmaterial = {material}\n[members.bar]\nfrom = ["0 mm", "0 mm", "0 mm"]\n'
        f'to = ["{length}", "0 mm", "0 mm"]\nsection = {{ {section} }}\n{member}\n{rest}\n'
    )


def rectangle(depth: float, width: float) -> str:
    return f'shape = "rectangle", depth = "{depth:.12g} mm", width = "{width:.12g} mm"'


def end_force(x: float = 0.0, y: float = 0.0, z: float = 0.0, name: str = "tip") -> str:
    """Force (N) spread over the far end."""
    return f'[loads.{name}]\non = "bar.end"\nforce = ["{x:.12g} N", "{y:.12g} N", "{z:.12g} N"]\n'


def end_moment(x: float = 0.0, y: float = 0.0, z: float = 0.0, name: str = "turn") -> str:
    """Moment (N mm) on the far end."""
    return f'[loads.{name}]\non = "bar.end"\nmoment = ["{x:.12g} N mm", "{y:.12g} N mm", "{z:.12g} N mm"]\n'


@dataclass(frozen=True)
class Solved:
    """Both models of one part; a figure is asked for by place, quantity and component."""

    part: Part
    solid: NamedSolid
    mesh: NamedMesh
    solid_result: SolidResult
    beam_result: BeamResult | None

    def from_solid(self, place: str, quantity: str, component: str, case: str = "all") -> float:
        return _figure(self.solid_result, place, quantity, component, case)

    def from_beam(self, place: str, quantity: str, component: str, case: str = "all") -> float:
        assert self.beam_result is not None
        return _figure(self.beam_result, place, quantity, component, case)


def _figure(result: SolidResult | BeamResult, place: str, quantity: str, component: str, case: str) -> float:
    member = quantity in ("section_force", "section_moment", "nominal_stress", "notch_stress")
    wanted = FigureKey(case, place, quantity, component, "member" if member else "global")  # type: ignore[arg-type]
    found = {figure.key: figure.value for figure in result.figures}
    return found[wanted]


@lru_cache(maxsize=8)
def solved(text: str, accuracy: float, beam: bool = True) -> Solved:
    """Solve both models (or the solid alone) of a spec; kept for the next check of the same part."""
    part = part_from_text(text)
    solid = build_solid(part)
    mesh = mesh_solid(solid, accuracy, BUDGET)
    return Solved(part, solid, mesh, solve_solid(part, mesh, BUDGET), solve_beam(part, BUDGET) if beam else None)
