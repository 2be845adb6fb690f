"""The rectangle: exact integrals, torsion (Timoshenko & Goodier, table of ch. 10) and shear (Gruttmann & Wagner)."""

import numpy as np
import pytest
from skfem import MeshTri, MeshTri2

from fem.beam.outlines import outline_of
from fem.beam.section import outline_integrals, properties_on_mesh, saint_venant, section_properties, shear_stress_at
from geometry.problem import SolveError


def block(depth, width, n=6, m=12):
    """Structured mesh of a rectangle, graded towards its sides."""
    def graded(half, k):
        return -half * np.cos(np.linspace(0, np.pi, k + 1))

    return MeshTri2.from_mesh(MeshTri.init_tensor(graded(width / 2, n), graded(depth / 2, m)))


def test_integrals_of_a_rectangle_are_exact():
    exact = outline_integrals(outline_of("rectangle", {"depth": 100.0, "width": 50.0}))
    assert exact.area == pytest.approx(5000.0, rel=1e-14)
    assert exact.Iyy == pytest.approx(50 * 100**3 / 12, rel=1e-14)
    assert exact.Izz == pytest.approx(100 * 50**3 / 12, rel=1e-14)
    assert exact.W_top == pytest.approx(50 * 100**2 / 6, rel=1e-14)
    assert exact.extremes.tolist() == [[0.0, 50.0], [0.0, -50.0], [-25.0, 0.0], [25.0, 0.0]]


def test_one_call_from_outline_to_properties():
    """a/b = 2: k1 0.22868, k2 0.24588 from the series (REFERENCES A9); k 0.8329 (A15)."""
    p = section_properties(outline_of("rectangle", {"depth": 100.0, "width": 50.0}), 0.3)
    assert pytest.approx(0.22868 * 100 * 50**3, rel=2e-4) == p.J
    assert 1 / p.torsion_stress == pytest.approx(0.24588 * 100 * 50**2, rel=3e-3)
    assert 1 / (p.shear_compliance[1, 1] * p.area) == pytest.approx(0.8329, abs=1e-4)
    assert not p.open_thin


# a/b: k1, k2 from the series (REFERENCES A9)
@pytest.mark.parametrize(
    ("ratio", "k1", "k2"),
    [(1, 0.14058, 0.20817), (1.2, 0.16612, 0.21893), (1.5, 0.19576, 0.23097), (2.5, 0.24937, 0.25759),
     (3, 0.26332, 0.26721), (4, 0.28081, 0.28167), (5, 0.29132, 0.29150), (10, 0.31233, 0.31233)],
)
def test_torsion_of_a_rectangle(ratio, k1, k2):
    outline = outline_of("rectangle", {"depth": 10.0 * ratio, "width": 10.0})
    p = properties_on_mesh(outline, block(10.0 * ratio, 10.0), 0.3)
    assert pytest.approx(k1 * ratio * 1e4, rel=5e-5) == p.J
    assert 1 / p.torsion_stress == pytest.approx(k2 * ratio * 1e3, rel=1e-3)


# h/b: shear coefficient at nu 0, 0.25, 0.5 and 0.3, Saint-Venant flexure series (REFERENCES A15)
@pytest.mark.parametrize(
    ("ratio", "k"),
    [(2, (0.8333, 0.8330, 0.8325, 0.8329)), (1, (0.8333, 0.8295, 0.8227, 0.8282)),
     (0.5, (0.8333, 0.7961, 0.7374, 0.7844)), (0.25, (0.8333, 0.6307, 0.4404, 0.5837))],
)
def test_shear_coefficient_of_a_rectangle(ratio, k):
    mesh = block(40.0 * ratio, 40.0)
    found = [1 / (saint_venant(mesh, nu).compliance[1, 1] * 1600 * ratio) for nu in (0.0, 0.25, 0.5, 0.3)]
    assert found == pytest.approx(k, abs=6e-5)


def test_parabola_of_shear_stress_at_nu_zero():
    solved = saint_venant(block(100.0, 50.0), 0.0)
    z = np.array([0.0, 20.0, -45.0, 50.0])
    tau = shear_stress_at(solved, np.array([[3.0, -7.0, 12.0, 0.0], z]))
    np.testing.assert_allclose(tau[1, 1], 1.5 / 5000 * (1 - (z / 50) ** 2), atol=1e-12)
    np.testing.assert_allclose(tau[1, 0], 0.0, atol=1e-12)


def test_a_point_outside_the_section_is_refused():
    with pytest.raises(ValueError, match="outside"):
        shear_stress_at(saint_venant(block(100.0, 50.0), 0.0), np.array([[0.0], [51.0]]))


@pytest.mark.parametrize("order", [2, 3])
def test_rate_of_the_torsion_constant_and_the_shear_compliance(order):
    """Energies converge as h^4: the cubic element is held back by r^2 log r at the corners of the warping."""
    exact_J = 16 / 3 * 25**4 * 2 * (1 - 192 / np.pi**5 / 2 * sum(np.tanh(n * np.pi) / n**5 for n in range(1, 99, 2)))
    errors = []
    for n in (4, 8, 16):
        grid = MeshTri.init_tensor(np.linspace(-25, 25, n + 1), np.linspace(-50, 50, 2 * n + 1))
        solved = saint_venant(MeshTri2.from_mesh(grid), 0.3, order)
        errors.append([solved.J / exact_J - 1, 1 / (solved.compliance[0, 0] * 5000)])
    J = np.array(errors)[:, 0]
    assert (J > 0).all()  # the warping form bounds J from above
    assert np.log2(J[:-1] / J[1:]).min() > 3.5
    assert J[-1] < (1.2e-5 if order == 2 else 2e-7)
    k = np.array(errors)[:, 1]
    assert abs(k[1] - k[2]) < abs(k[0] - k[1]) / 11


def test_a_section_in_two_pieces_is_refused():
    left = MeshTri.init_tensor(np.linspace(0, 1, 3), np.linspace(0, 1, 3))
    both = left + left.translated((3.0, 0.0))
    with pytest.raises(SolveError, match="piece"):
        saint_venant(MeshTri2.from_mesh(both), 0.3)


def ellipse(a, b, refinements=3):
    """Curved triangles of an ellipse."""
    circle = MeshTri2.init_circle(refinements)
    return MeshTri2(np.array([[a], [b]]) * circle.doflocs, circle.dofs.element_dofs)


def test_ellipse_in_torsion():
    """REFERENCES A10: J = pi a^3 b^3/(a^2 + b^2) = 521988; T 1e6: tau 53.05 at the end of the minor axis."""
    solved = saint_venant(ellipse(30.0, 20.0), 0.3)
    assert solved.J == pytest.approx(521988, rel=2e-5)
    tau = shear_stress_at(solved, np.array([[0.0, 30.0], [19.999, 0.0]]))[2]
    assert -1e6 * tau[0, 0] == pytest.approx(53.05, rel=1e-3)
    assert 1e6 * tau[1, 1] == pytest.approx(53.05 * 20 / 30, rel=1e-3)
    # omega = -(a^2 - b^2)/(a^2 + b^2) y z
    assert solved.Iw == pytest.approx((5 / 13) ** 2 * np.pi * 30**3 * 20**3 / 24, rel=1e-4)


def test_rate_on_a_curved_outline():
    """J of an ellipse: omega itself is met exactly, what is left is the outline, h^4."""
    exact = np.pi * 30**3 * 20**3 / (30**2 + 20**2)
    errors = np.array([abs(saint_venant(ellipse(30.0, 20.0, n), 0.3).J / exact - 1) for n in (1, 2, 3)])
    assert np.log2(errors[:-1] / errors[1:]).min() > 3.5
