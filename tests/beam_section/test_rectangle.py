"""The rectangle: exact integrals, torsion (Timoshenko & Goodier, table of ch. 10) and shear (Gruttmann & Wagner)."""

import pytest

from fem.beam.outlines import outline_of
from fem.beam.section import outline_integrals, section_properties


def test_integrals_of_a_rectangle_are_exact():
    exact = outline_integrals(outline_of("rectangle", {"depth": 100.0, "width": 50.0}))
    assert exact.area == pytest.approx(5000.0, rel=1e-14)
    assert exact.Iyy == pytest.approx(50 * 100**3 / 12, rel=1e-14)
    assert exact.Izz == pytest.approx(100 * 50**3 / 12, rel=1e-14)
    assert exact.W_top == pytest.approx(50 * 100**2 / 6, rel=1e-14)
    assert exact.extremes.tolist() == [[0.0, 50.0], [0.0, -50.0], [-25.0, 0.0], [25.0, 0.0]]


# a/b, k1, k2: from the series (REFERENCES A9, recomputed row)
@pytest.mark.parametrize(("ratio", "k1", "k2"), [(1, 0.14058, 0.20817), (2, 0.22868, 0.24588), (5, 0.29132, 0.29150)])
def test_torsion_of_a_rectangle(ratio, k1, k2):
    p = section_properties(outline_of("rectangle", {"depth": 10.0 * ratio, "width": 10.0}), 0.3)
    assert p.J == pytest.approx(k1 * ratio * 1e4, rel=2e-4)
    assert 1 / p.torsion_stress == pytest.approx(k2 * ratio * 1e3, rel=3e-3)
    assert not p.open_thin


# h/b, shear coefficient at nu 0.3 from the Saint-Venant flexure series (REFERENCES A15)
@pytest.mark.parametrize(("ratio", "k"), [(2, 0.8329), (1, 0.8282), (0.5, 0.7844), (0.25, 0.5837)])
def test_shear_coefficient_of_a_rectangle(ratio, k):
    p = section_properties(outline_of("rectangle", {"depth": 40.0 * ratio, "width": 40.0}), 0.3)
    assert 1 / (p.shear_compliance[1, 1] * p.area) == pytest.approx(k, abs=2e-4)
