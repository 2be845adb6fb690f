"""Plain slender parts (length 20 depths, compact sections, load through the shear centre): both models within 1 %.

The criterion is the tool's own. The tip force is moved from the end face's centroid to the shear centre by a torque;
the shear centre is that of the section analysis, which has checks of its own.
"""

from __future__ import annotations

from math import cos, radians, sin

import numpy as np
import pytest
from chain import CLAMPED, bar_text, end_moment, solved

from fem.beam.outlines import member_outline
from fem.beam.section import section_properties
from geometry.spec import part_from_text

SECTIONS = {
    "rectangle": 'shape = "rectangle", depth = "30 mm", width = "20 mm"',
    "round": 'shape = "round", diameter = "30 mm"',
    "tube": 'shape = "tube", diameter = "30 mm", wall = "6 mm"',
    "box": 'shape = "box", depth = "30 mm", width = "24 mm", wall = "6 mm"',
    "I": 'shape = "I", depth = "30 mm", width = "24 mm", web = "6 mm", flange = "6 mm"',
    "tee": 'shape = "tee", depth = "30 mm", width = "24 mm", web = "8 mm", flange = "8 mm"',
    "channel": 'shape = "channel", depth = "30 mm", width = "20 mm", web = "7 mm", flange = "7 mm"',
    "angle": 'shape = "angle", depth = "30 mm", width = "30 mm", thickness = "8 mm"',
}
QUICK = ("rectangle", 90.0)
LENGTH, FORCE, ACCURACY = 600.0, 100.0, 0.05
CURVED = ("round", "tube")
"""Stress at a point of a coarse curved face scatters by 1.3 % here (accuracy 5 %): held to 2 %, all else to 1 %."""


def _text(shape: str, towards: float) -> str:
    """Cantilever with a tip force at `towards` (deg) from y to z in the section's plane."""
    section = SECTIONS[shape]
    part = part_from_text(bar_text(section, f"{LENGTH:g} mm", CLAMPED + end_moment(x=1.0)))
    p = section_properties(member_outline(part.members[0], 0.0), 0.3)
    y, z = FORCE * cos(radians(towards)), FORCE * sin(radians(towards))
    torque = (p.ys - p.yc) * z - (p.zs - p.zc) * y
    load = (
        f'[loads.tip]\non = "bar.end"\nforce = ["0 N", "{y:.12g} N", "{z:.12g} N"]\n'
        f'moment = ["{torque:.12g} N mm", "0 N mm", "0 N mm"]\n'
    )
    return bar_text(section, f"{LENGTH:g} mm", CLAMPED + load)


CASES = [
    *((shape, towards) for shape in SECTIONS if shape not in ("round", "tube", "angle") for towards in (90.0, 0.0)),
    ("round", 90.0),
    ("tube", 90.0),
    ("angle", 45.0),  # along and across the axis of symmetry: the principal axes
    ("angle", 135.0),
]


@pytest.mark.parametrize(
    ("shape", "towards"),
    [
        pytest.param(*case, id=f"{case[0]} {case[1]:g} deg", marks=() if case == QUICK else pytest.mark.heavy)
        for case in CASES
    ],
)  # fmt: skip
def test_solid_and_beam_agree_within_one_per_cent(shape: str, towards: float) -> None:
    part = solved(_text(shape, towards), ACCURACY)
    way = np.array([0.0, cos(radians(towards)), sin(radians(towards))])
    across = np.array([0.0, -way[2], way[1]])

    def vector(model: str, place: str, quantity: str) -> np.ndarray:
        give = part.from_solid if model == "solid" else part.from_beam
        return np.array([give(place, quantity, c) for c in "xyz"])

    for place in ("bar@300", "bar.end"):
        solid, beam = (vector(m, place, "displacement") for m in ("solid", "beam"))
        assert way @ solid == pytest.approx(way @ beam, rel=0.01)
        assert abs(across @ solid - across @ beam) <= 0.01 * abs(way @ beam)
    solid, beam = (vector(m, "bar.end", "rotation") for m in ("solid", "beam"))
    assert np.linalg.norm(solid[1:] - beam[1:]) <= 0.01 * np.linalg.norm(beam[1:])
    assert part.from_solid("", "strain_energy", "") == pytest.approx(part.from_beam("", "strain_energy", ""), rel=0.01)
    sides = ("top", "bottom", "left", "right")
    worst = max(abs(part.from_beam("bar@300", "nominal_stress", f"xx@{s}")) for s in sides)
    band = 0.02 if shape in CURVED else 0.01
    for s in sides:
        given = part.from_solid("bar@300", "nominal_stress", f"xx@{s}")
        assert given == pytest.approx(part.from_beam("bar@300", "nominal_stress", f"xx@{s}"), abs=band * worst)
    assert part.from_solid("", "mass", "", "") == pytest.approx(part.from_beam("", "mass", "", ""), rel=1e-3)
