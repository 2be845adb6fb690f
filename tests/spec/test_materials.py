"""The table of materials, held against the values as published."""

from __future__ import annotations

from pathlib import Path

import pytest

from geometry.problem import SpecError
from geometry.spec import part_from_text
from geometry.spec.materials import GRADES, find

CANTILEVER = Path(__file__).with_name("cantilever.toml").read_text(encoding="utf-8")


@pytest.mark.parametrize(
    ("name", "thickness", "E", "density", "proof", "ultimate"),
    [
        # EN 1993-1-1:2005 table 3.1 (fu of S355 as corrected by AC:2009) and EN 1991-1-1 table A.4
        ("S235", 40, 210000, 7850, 235, 360),
        ("S235", 41, 210000, 7850, 215, 360),
        ("S275", 40, 210000, 7850, 275, 430),
        ("S275", 80, 210000, 7850, 255, 410),
        ("S355", 16, 210000, 7850, 355, 490),
        ("S355", 60, 210000, 7850, 335, 470),
        # EN 1999-1-1:2007 table 3.2b (6082 from memory)
        ("EN AW-6082 T6", 5, 70000, 2700, 250, 290),
        ("EN AW-6082 T6", 5.1, 70000, 2700, 260, 310),
        ("EN AW-6061 T6", 20, 70000, 2700, 240, 260),
        ("EN AW-6005A T6", 5, 70000, 2700, 225, 270),
        ("EN AW-6005A T6", 10, 70000, 2700, 215, 260),
        ("EN AW-6005A T6", 25, 70000, 2700, 200, 250),
        ("EN AW-6060 T6", 15, 70000, 2700, 140, 170),
        ("EN AW-6063 T6", 25, 70000, 2700, 160, 195),
        ("EN AW-5083 H111", 200, 70000, 2700, 110, 270),
        ("EN AW-5083 H111 sheet", 50, 70000, 2700, 125, 275),
        # From memory: ASM Metals Handbook; EN 10088-2; and ASTM B348 grade 5 (supplier data)
        ("EN AW-7075 T6", 10, 71700, 2810, 503, 572),
        ("1.4301 cold strip", 3, 200000, 7900, 230, 540),
        ("1.4404 plate", 30, 200000, 8000, 220, 520),
        ("Ti-6Al-4V", 10, 114000, 4430, 828, 895),
    ],
)
def test_a_grade_has_its_published_values(
    name: str, thickness: float, E: float, density: float, proof: float, ultimate: float
) -> None:
    material = GRADES[name].at(thickness)
    assert (material.E, material.yield_strength, material.ultimate) == (E, proof, ultimate)
    assert material.density == pytest.approx(density * 1e-12)


def test_every_grade_says_what_its_strength_is_and_where_it_comes_from() -> None:
    for name, grade in GRADES.items():
        assert find(name) is grade
        assert grade.kind in ("characteristic", "minimum", "typical")
        assert grade.source
        assert ("from memory" in grade.at(1.0).source) or grade.checked
        thickness = [row[0] for row in grade.strengths]
        assert thickness == sorted(thickness)


def test_the_way_a_name_is_written_does_not_matter() -> None:
    assert find("en aw 6082-t6") is GRADES["EN AW-6082 T6"]
    assert find("S 355") is GRADES["S355"]
    assert find("S356") is None


def test_the_thickest_plate_chooses_the_row() -> None:
    thick = CANTILEVER.replace('depth = "40 mm"', 'depth = "90 mm"').replace('width = "20 mm"', 'width = "50 mm"')
    assert part_from_text(CANTILEVER).material.yield_strength == 235.0
    assert part_from_text(thick).material.yield_strength == 215.0
    # A taper that grows thicker counts with its thickest place.
    grows = CANTILEVER.replace('width = "width" }', 'width = "width" }\ntaper = { depth = "60 mm", width = "50 mm" }')
    assert part_from_text(grows).material.yield_strength == 215.0
    with pytest.raises(SpecError, match="thickest plate of at most 80 mm"):
        part_from_text(thick.replace('width = "50 mm"', 'width = "85 mm"'))


def test_the_thickest_plate_of_an_i_section_is_the_one_that_counts() -> None:
    i_section = 'shape = "I", depth = "200 mm", width = "100 mm", web = "10 mm", flange = "45 mm"'
    text = CANTILEVER.replace('shape = "rectangle", depth = "depth", width = "width"', i_section)
    assert part_from_text(text).material.yield_strength == 215.0  # flange 45 mm, not web 10 mm


def test_an_unknown_material_lists_the_known_ones() -> None:
    with pytest.raises(SpecError) as caught:
        part_from_text(CANTILEVER.replace('"S235"', '"S236"'))
    said = str(caught.value)
    assert all(name in said for name in GRADES)
    assert 'Did you mean "S235"' in said


def test_own_values() -> None:
    own = '{ name = "oak", E = "11 GPa", nu = 0.3, density = "690 kg/m^3", yield = "30 MPa", kind = "typical" }'
    material = part_from_text(CANTILEVER.replace('"S235"', own)).material
    assert (material.name, material.E, material.kind) == ("oak", 11000.0, "typical")
    assert material.source == "declared in the spec"
    assert material.density == pytest.approx(6.9e-10)
    assert material.ultimate is None
