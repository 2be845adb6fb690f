"""Tolerances: at least material, at most material, and parts as made."""

from __future__ import annotations

import itertools
import math
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from geometry.spec import part_from_text, read_part
from geometry.spec.read import part_from_data
from studies.vary.plan.material import area_of, mass_of_tables, volume_of
from studies.vary.plan.place import with_value
from studies.vary.plan.tolerances import Tolerance

EXAMPLES = Path(__file__).parents[2] / "studies" / "examples"
VARY = '[vary]\nroot_depth = ["56 mm", "60 mm"]\n'
TOLERANCES = """[tolerances]
root_depth = "0.4 mm"
bore = { plus = "0.3 mm" }
"members.arm.section.web" = { minus = "0.5 mm", plus = "0.2 mm" }
"members.arm.taper.width" = { minus = "1 mm" }
"""


def test_least_material_is_thin_plates_and_wide_holes_and_most_the_other_way_round(plan):
    made = plan(VARY + TOLERANCES)
    for variant in made.variants():
        drawn = variant.numbers["root_depth"]
        least, most = part_from_data(variant.data), part_from_data(variant.fullest)
        for part, sign, web, bore, tip in ((least, -1, 5.5, 14.3, 29.0), (most, 1, 6.2, 14.0, 30.0)):
            (arm,) = part.members
            assert arm.section.dims["depth"] == pytest.approx(drawn + 0.4 * sign, abs=1e-12)
            assert arm.section.dims["web"] == web
            assert arm.cuts[0].depth == bore
            assert arm.stations[-1].dims["width"] == tip
        assert variant.values["root_depth"] == f"{drawn:g} mm"  # as drawn


def test_no_other_corner_of_the_tolerances_has_less_or_more_material(plan):
    made = plan(VARY + TOLERANCES)
    variant = next(made.variants())
    masses = []
    for sides in itertools.product((0, 1), repeat=4):
        data = made.part_data
        for one, side, nominal in zip(made.tolerances, sides, (56.0, 14.0, 6.0, 30.0), strict=True):
            data = with_value(data, one.path, one.off(nominal, (-one.minus, one.plus)[side]))
        masses.append(mass_of_tables(data))
    assert mass_of_tables(variant.data) == min(masses) < max(masses) == mass_of_tables(variant.fullest)


def test_a_variant_without_tolerances_has_no_fullest_part(plan):
    assert next(plan(VARY).variants()).fullest is None


def test_tolerances_belong_to_the_key(plan):
    base, wide, narrow = (next(plan(VARY + text).variants()) for text in
                          ("", TOLERANCES, TOLERANCES.replace('plus = "0.2 mm"', 'plus = "0.1 mm"')))
    assert len({base.key, wide.key, narrow.key}) == 3
    assert wide.shape_key == narrow.shape_key != base.shape_key  # least material is the same of both


def test_a_tolerance_that_changes_no_material_stays_as_drawn_and_is_told(plan):
    made = plan(VARY + '[tolerances]\n"loads.camera.force[3]" = "20 N"\nbore = "0.1 mm"')
    assert [note.partition(":")[0] for note in made.notes] == ["tolerances.loads.camera.force[3]"]
    variant = next(made.variants())
    assert variant.data["loads"]["camera"]["force"][2] == variant.fullest["loads"]["camera"]["force"][2] == "-180 N"


def test_a_dimension_that_follows_from_parameters_has_its_tolerance_about_its_value(plan):
    made = plan('[vary]\nreach = ["360 mm", "400 mm"]\n[tolerances]\n"members.arm.holes[1].at" = "2 mm"\n'
                '[sampling]\nmethod = "grid"')
    assert any("no material" in note for note in made.notes)  # the web has one thickness all along
    sides = plan('[vary]\nreach = ["360 mm", "400 mm"]\n[base]\n"members.arm.taper.web" = "5 mm"\n'
                 '[tolerances]\n"members.arm.holes[1].at" = "2 mm"')
    # The web is thicker towards the root, so a hole nearer to it takes more out.
    assert [v.data["members"]["arm"]["holes"][0]["at"] for v in sides.variants()] == ["178 mm", "198 mm"]
    assert [v.fullest["members"]["arm"]["holes"][0]["at"] for v in sides.variants()] == ["182 mm", "202 mm"]


def test_a_part_that_cannot_be_at_one_side_is_left_out(plan):
    made = plan('[vary]\nbore = ["12 mm", "13.9 mm"]\n[base]\nbore = "10 mm"\nroot_depth = "54 mm"\n'
                'tip_depth = "30 mm"\n[tolerances]\nbore = "0.2 mm"')
    assert [v.values["bore"] for v in made.variants()] == ["12 mm"]
    assert "holes[1]" in made.left_out()[0].rule


@pytest.mark.parametrize(("distribution", "exact"), [
    ("uniform", stats.uniform(-0.5, 0.7)),
    ("normal", stats.truncnorm(-3, 3, loc=-0.15, scale=0.35 / 3)),
    ("triangular", stats.triang(0.5 / 0.7, -0.5, 0.7)),
])
def test_parts_as_made_follow_their_distribution(plan, distribution, exact):
    web = Tolerance("web", ("web",), "length", "mm", "mm", 0.5, 0.2, distribution)
    shares = np.linspace(0.001, 0.999, 97)
    assert [web.deviation(s) for s in shares] == pytest.approx(exact.ppf(shares), abs=1e-9)
    made = plan('[sampling]\nmethod = "as made"\npoints = 200\n[tolerances]\n"members.arm.section.web" = '
                f'{{ minus = "0.5 mm", plus = "0.2 mm", distribution = "{distribution}" }}\nbore = "0.2 mm"')
    off = np.array([v.numbers["members.arm.section.web"] - 6.0 for v in made.variants()])
    assert len(off) == made.count() == 200
    assert off.min() >= -0.5 - 1e-9 and off.max() <= 0.2 + 1e-9
    # Latin hypercube: one part in each of 200 slices of equal probability.
    assert np.array_equal(np.sort(np.minimum((exact.cdf(off) * 200 + 1e-4).astype(int), 199)), np.arange(200))
    assert all(v.fullest is None for v in itertools.islice(made.variants(), 3))


def _sections():
    from geometry.part import Section

    yield Section("rectangle", {"depth": 40.0, "width": 20.0, "corner_radius": 3.0})
    yield Section("round", {"diameter": 30.0})
    yield Section("tube", {"diameter": 30.0, "wall": 4.0})
    yield Section("box", {"depth": 40.0, "width": 30.0, "wall": 3.0, "corner_radius": 6.0, "inner_radius": 2.0})
    yield Section("I", {"depth": 60.0, "width": 46.0, "web": 6.0, "flange": 8.0, "root_radius": 5.0,
                        "bottom_width": 30.0, "bottom_flange": 5.0})
    yield Section("channel", {"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 7.0, "root_radius": 4.0})
    yield Section("angle", {"depth": 60.0, "width": 40.0, "thickness": 5.0, "root_radius": 6.0, "toe_radius": 2.0})
    yield Section("tee", {"depth": 60.0, "width": 40.0, "web": 5.0, "flange": 7.0, "root_radius": 4.0})


@pytest.mark.parametrize("section", tuple(_sections()), ids=lambda s: s.shape)
def test_areas_are_those_of_the_exact_integrals(section):
    from fem.beam.outlines import member_outline
    from fem.beam.section import outline_integrals
    from geometry.part import Member

    member = Member("bar", (0.0, 0.0, 0.0), (300.0, 0.0, 0.0), (0.0, 0.0, 1.0), 0.0, section)
    exact = outline_integrals(member_outline(member, 150.0)).area
    assert area_of(member, dict(section.dims)) == pytest.approx(exact, rel=1e-12)


def test_the_volume_of_a_frustum_with_a_hole_is_exact():
    made = part_from_text("""
material = "S355"
[members.bar]
from = ["0 mm", "0 mm", "0 mm"]
to = ["300 mm", "0 mm", "0 mm"]
section = { shape = "rectangle", depth = "60 mm", width = "40 mm" }
taper = { depth = "20 mm", width = "30 mm" }
[[members.bar.holes]]
along = "z"
at = "150 mm"
diameter = "10 mm"
[supports.wall]
on = "bar.start"
hold = "all"
[loads.tip]
on = "bar.end"
force = ["0 N", "0 N", "-10 N"]
""")
    prismoid = 300.0 / 6.0 * (60 * 40 + 4 * 40 * 35 + 20 * 30)
    assert volume_of(made.members[0]) == pytest.approx(prismoid - math.pi * 25 * 40, rel=1e-12)


@pytest.mark.parametrize("name", ["camera_arm", "gripper_finger", "vent_channel"])
def test_the_mass_of_the_examples_is_near_enough(name):
    """Within 2 %: rims, edge radii and cuts in tapering walls are not exact, and need not be."""
    from fem.beam import solve_beam

    part = read_part(EXAMPLES / f"{name}.toml")
    mass = next(f.value for f in solve_beam(part).figures if f.key.quantity == "mass")
    assert volume_of(part.members[0]) * part.material.density == pytest.approx(mass, rel=0.02)


def test_a_tolerance_of_a_length_leaves_the_part_as_drawn_for_strength(plan):
    """A shorter arm has less material, but is the stiffer one."""
    made = plan('[vary]\nroot_depth = ["60 mm"]\n[tolerances]\nreach = "10 mm"\nroot_depth = "0.5 mm"\n')
    (variant,) = made.variants()
    least, most = part_from_data(variant.data).members[0], part_from_data(variant.fullest).members[0]
    assert least.end[0] == pytest.approx(360.0)
    assert most.end[0] == pytest.approx(370.0)  # mass at most
    assert least.section.dims["depth"] == pytest.approx(59.5)
    assert [note.split(":")[0] for note in made.notes if "stays as drawn" in note] == ["tolerances.reach"]
