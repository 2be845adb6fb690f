"""Transfer matrices: exact where the section is constant, order 4 where it varies."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import expm

from fem.beam.element import exponentials, transfer_matrices
from fem.beam.law import LineProperties


def properties(area, Iyy):
    """Made-up thin section, unsymmetric about everything."""
    one = np.ones_like(area)
    shear = np.zeros((len(area), 5, 5))
    shear[:, 0, 0], shear[:, 1, 1], shear[:, 0, 1], shear[:, 1, 0] = 2e-3, 3e-3, 4e-4, 4e-4
    return LineProperties(area, 3.0 * one, -5.0 * one, Iyy, 4e5 * one, 1e5 * one, 20.0 * one, 7.0 * one, 3e3 * one,
                          2e8 * one, shear, 0.02 * one, -0.03 * one)


def test_exponentials_against_scipy():
    """Each matrix of a batch with mixed sizes."""
    rng = np.random.default_rng(3)
    A = rng.normal(size=(5, 8, 8)) * np.array([1e-6, 1e-2, 0.3, 1.0, 2.0])[:, None, None]
    assert exponentials(A) == pytest.approx(np.stack([expm(a) for a in A]), rel=1e-12, abs=1e-12)


@pytest.mark.parametrize("warping", [False, True])
def test_a_length_is_two_halves_where_constant(warping):
    """Group property of the exact solution."""
    def constant(x):
        return properties(np.full(len(x), 500.0), np.full(len(x), 9e5))

    whole, first, second = transfer_matrices(np.array([[0.0, 80.0], [0.0, 40.0], [40.0, 80.0]]), constant, 2e5, 8e4,
                                             warping)
    scale = np.abs(second) @ np.abs(first) + 1e-30
    assert np.max(np.abs(second @ first - whole) / scale) < 1e-12


def test_order_four_where_the_section_varies():
    """Halving the length divides the error of a fixed stretch by about 16."""
    def varying(x):
        return properties(500.0 + 3.0 * x, 9e5 * (1.0 + x / 100.0) ** 3)

    def chain(n):
        cuts = np.linspace(0.0, 200.0, n + 1)
        M = np.eye(25)
        for T in transfer_matrices(np.stack([cuts[:-1], cuts[1:]], 1), varying, 2e5, 8e4, False):
            M = T @ M
        return M[:6, 6:12]

    exact = chain(256)
    errors = [np.linalg.norm((chain(n) - exact) / (np.abs(exact) + 1e-30)) for n in (4, 8, 16)]
    rates = np.log2(np.array(errors[:-1]) / errors[1:])
    assert rates == pytest.approx(4.0, abs=0.4)


@pytest.mark.parametrize("warping", [False, True])
def test_a_bar_that_lies_askew_twists_about_itself(warping):
    """A torque T about the line turns a prismatic bar of length L by T.e L/GJ along its direction e = (1, a, b)
    and by the rest of T over E I square to it (statics of a straight bar, first order in the slope)."""
    a, b, E, G, J, I, L, T = 0.01, -0.02, 2e5, 8e4, 3e3, 5e5, 50.0, 1e4

    def askew(x):
        one = np.ones_like(x)
        return LineProperties(500 * one, a * x, b * x, I * one, I * one, 0 * one, a * x, b * x, J * one, 1e6 * one,
                              np.zeros((len(x), 5, 5)), a * one, b * one)

    M = transfer_matrices(np.array([[0.0, L]]), askew, E, G, warping)[0]
    n = 7 if warping else 6
    state = np.zeros(2 * n + 13)
    state[n + 3] = T
    if warping:
        state[6] = T / (G * J)  # warping free: twisted evenly from the start
    turned = (M @ state)[3:6]
    each = T * L * (1.0 / (G * J) - 1.0 / (E * I))
    assert turned == pytest.approx([T * L / (G * J), a * each, b * each], rel=1e-3)
