"""What the best variant has least or most of."""

from __future__ import annotations

import math

import pytest

VARY = '[vary]\nbore = ["8 mm", "10 mm"]\n'
FIGURES = {"mass": 1.2e-3, "deflection": 0.4, "stress": 80.0, "displacement_z@arm.end": -0.39, "reaction@wall": 191.0}


@pytest.mark.parametrize(("text", "value", "unit"), [
    ("mass", 1.2e-3, "t"),
    ("deflection", 0.4, "mm"),
    ("2.1 * mass / (1 kg) + 0.4 * deflection / (1 mm)", 2.1 * 1.2 + 0.4 * 0.4, ""),
    ("abs(displacement_z@arm.end)", 0.39, "mm"),
    ("mass * bore", 1.2e-2, "quantity in mm^1 t^1"),
    ("max(mass, 1 kg) + reach / (1 m) * 1 kg", 1.2e-3 + 0.36e-3, "t"),
    ("stress / (yield_factor + 1)", math.nan, "MPa"),
])
def test_its_value_is_that_of_the_arithmetic(plan, text, value, unit):
    aim = plan(f'{VARY}[aim]\nleast = "{text}"').aim
    assert aim.value(FIGURES, {"bore": 10.0}) == pytest.approx(value, nan_ok=True)
    assert aim.unit == unit


def test_more_is_better_where_most_is_wanted(plan):
    aim = plan(f'{VARY}[aim]\nmost = "stress"').aim
    assert (aim.sense, aim.value(FIGURES, {}), aim.cost(FIGURES, {})) == ("most", 80.0, -80.0)


def test_without_an_aim_the_least_mass_is_wanted(plan):
    aim = plan(VARY).aim
    assert (aim.text, aim.sense, [f.name for f in aim.figures]) == ("mass", "least", ["mass"])


def test_figures_that_the_aim_needs_are_kept(plan):
    made = plan(f'{VARY}[aim]\nleast = "displacement_z@arm.end / (1 mm) + nominal_stress / (1 MPa)"')
    assert {"displacement_z@arm.end", "nominal_stress"} <= set(made.keep.names)
    assert set(made.keep.extra) == {"displacement_z@arm.end", "nominal_stress"}
    assert {"mass", "deflection", "stress", "yield_factor", "reaction"} <= set(made.keep.names)
    assert made.keep.names.count("mass") == 1


def test_a_figure_without_a_value_leaves_the_aim_without_one(plan):
    aim = plan(f'{VARY}[aim]\nleast = "mass + 0 * stress / (1 MPa) * 1 kg"').aim
    assert math.isnan(aim.value({"mass": 1e-3, "stress": None}, {}))
    assert math.isnan(aim.value({"mass": 1e-3}, {}))
    assert aim.value({"mass": 1e-3, "stress": 3.0}, {}) == 1e-3


def test_the_names_are_those_of_the_room_that_makes_the_figures(plan, examples):
    """Both rooms read the names by themselves; they must mean the same."""
    from geometry.spec import read_part
    from studies.vary.plan.kept import SORTS, usual_figures
    from studies.vary.work.figures import headline, not_there, parse

    for name in ("camera_arm", "shelf_angle", "mount_column", "sensor_mast", "trolley_rail"):
        part = read_part(examples / f"{name}.toml")
        assert {f.name for f in usual_figures(part)} == set(headline(part))
        assert not_there(part, [f.name for f in usual_figures(part)]) == []
    for quantity, sort in SORTS.items():
        for component in sort.components:
            word = f"{quantity}_{component}" if component else quantity
            parsed = parse(word)
            assert parsed is not None and (parsed.what, parsed.component) == (quantity, component), word
