"""Parts of one member, and a section analysis that is done once per outline for all tests."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

import numpy as np
import pytest

from fem.beam import BeamResult, solve_beam
from fem.beam.section import SectionProperties, outline_integrals, sections_properties
from geometry.outline import Outline
from geometry.part import Case, Material, Member, Part, Section, Support

STEEL = Material("steel", 210000.0, 0.3, 7.85e-9, 12e-6, 235.0, 360.0, "characteristic", "EN 1993-1-1")
_CACHE: dict[tuple[Outline, float], Any] = {}


def solved_once(outlines, nu):
    """`sections_properties` with a memory."""
    missing = [o for o in dict.fromkeys(outlines) if (o, nu) not in _CACHE]
    if missing:
        _CACHE.update({(o, nu): p for o, p in zip(missing, sections_properties(missing, nu), strict=True)})
    return [_CACHE[o, nu] for o in outlines]


def plain_rules(outlines, nu):
    """Exact integrals, and rules of thumb for the rest: for rows that do not ask for torsion or shear."""
    found = []
    for o in outlines:
        e = outline_integrals(o)
        found.append(SectionProperties(
            e.area, e.yc, e.zc, e.Iyy, e.Izz, e.Iyz, e.I1, e.I2, e.principal_angle, e.yc, e.zc,
            np.eye(2) * 1.2 / e.area, e.area**4 / (40 * (e.Iyy + e.Izz)), 0.0, False, e.extremes, e.W_top, e.W_bottom,
            e.W_left, e.W_right, 0.0, np.zeros(4)))
    return found


def make_part(section: Section | None = None, length: float = 2000.0, loads=(), supports=None, cases=None,
              material: Material = STEEL, places=(), **member: Any) -> Part:
    """One member ``arm`` along x, clamped at its start unless supports are given; one case ``c`` of all loads."""
    section = section or Section("rectangle", {"depth": 100.0, "width": 50.0})
    frame = {"start": (0.0, 0.0, 0.0), "end": (length, 0.0, 0.0), "up": (0.0, 0.0, 1.0), "roll": 0.0} | member
    if supports is None:
        supports = (Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0}),)
    if cases is None:
        cases = (Case("c", {load.name: 1.0 for load in loads}),)
    return Part("test", material, (Member("arm", section=section, **frame),), tuple(supports), tuple(loads),
                tuple(cases), places=tuple(places))


class Reader:
    """Figures of a result by short names."""

    def __init__(self, result: BeamResult) -> None:
        self.result = result
        self.values: Mapping[tuple[str, str, str, str], float] = {
            (f.key.case, f.key.place, f.key.quantity, f.key.component): f.value for f in result.figures}

    def __call__(self, place: str, quantity: str, component: str = "", case: str = "c") -> float:
        return self.values[case, place, quantity, component]


@pytest.fixture
def part() -> Callable[..., Part]:
    return make_part


@pytest.fixture
def solve() -> Callable[..., Reader]:
    def run(part: Part, plain: bool = False, **options: Any) -> Reader:
        return Reader(solve_beam(part, section_solver=plain_rules if plain else solved_once, **options))

    run.sections, run.plain = solved_once, plain_rules  # type: ignore[attr-defined]
    return run
