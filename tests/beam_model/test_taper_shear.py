"""Shear in tapered members against the wedge's closed form and against equilibrium."""

from __future__ import annotations

import math

import numpy as np
import pytest

from fem.beam.outlines import outline_of
from fem.beam.taper_shear import above, level_form, polygon_edges, tapered_shear
from geometry.part import RegionLoad, Section, Station


def block(x):
    """Depth 80 shrinking by 0.1 per mm, width 30."""
    return outline_of("rectangle", {"depth": 80.0 - 0.1 * x, "width": 30.0})


def test_area_and_first_moment_above_a_level():
    """A rectangle: width, area and moment of its upper part."""
    area, first, width = above(polygon_edges(block(0.0), 1), np.array([10.0]))
    assert (area[0], first[0], width[0]) == pytest.approx((30 * 30, 30 * 30 * 25, 30))
    area, first, width = above(polygon_edges(block(0.0), 0), np.array([5.0]))
    assert (area[0], first[0], width[0]) == pytest.approx((80 * 10, 80 * 10 * 10, 80))


def test_prismatic_rectangle_is_six_fifths():
    """No taper: 1.2/A for V and nothing else."""
    form, _ = level_form(lambda x: block(0.0), 0.0, 0.01, 1)
    want = np.zeros((3, 3))
    want[0, 0] = 1.2 / 2400
    assert form == pytest.approx(want, abs=1e-15)


def test_wedge():
    """Equilibrium gives tau = 1.5 (V - F)/A (1 - s^2) + 3 F/A s^2 with F = M h'/h and s the level over h/2: the energy
    is (1.2 V^2 - 1.2 V F + 1.8 F^2)/A; an axial force adds (N h'/h)^2 int z^2 dA/A^2 = (N h')^2/(12 A) and nothing
    mixed with V, because its shear stress is odd in z."""
    h, dh, A = 80.0, -0.1, 2400.0
    form, _ = level_form(block, 0.0, 0.01, 1)
    f = dh / h
    want = np.array([[1.2, 0.0, -0.6 * f], [0.0, dh**2 / 12, 0.0], [-0.6 * f, 0.0, 1.8 * f * f]]) / A
    assert form == pytest.approx(want, rel=1e-5, abs=1e-12)


def test_web_of_an_I_carries_v_less_m_over_lever_arm():
    """With a thin web the V-M entry is - (d'/d) times the V-V entry, d the lever arm of the flanges (Bleich)."""
    def beam(x):
        return outline_of("I", {"depth": 300.0 - 0.1 * x, "width": 120.0, "web": 0.5, "flange": 15.0})

    form, _ = level_form(beam, 0.0, 0.01, 1)
    assert form[0, 2] / form[0, 0] == pytest.approx(0.1 / 285.0, rel=0.02)


def test_axial_force_along_an_inclined_centroid_line():
    """Straight top: a force along the centroid line's own slope, V = N zc', leaves no V - zc' N."""
    def anchored(x):
        h = 80.0 - 0.1 * x
        from fem.beam.outlines import moved

        return moved(outline_of("rectangle", {"depth": h, "width": 30.0}), 0.0, -h / 2)

    form, _ = level_form(anchored, 0.0, 0.01, 1)
    slope = 0.05
    v = np.array([slope, 1.0, 0.0])
    centred, _ = level_form(block, 0.0, 0.01, 1)
    # what is left is the fibres' own inclination, as in the symmetric wedge, and the mean slope of all fibres
    assert v @ form @ v == pytest.approx(centred[1, 1] + slope**2 / 2400, rel=1e-4)


def test_deflection_of_a_wedge_cantilever(part, solve):
    """B18 with shear: the standard formula with the local area gives 0.004119 for k 5/6; the inclined sides take that
    to int (1.2 - 1.2 F + 1.8 F^2) with F = s/(1 + s), s from the tip, i.e. less."""
    tip = RegionLoad("tip", "arm.end", force=(0.0, 0.0, -1000.0))
    wedge = part(Section("rectangle", {"depth": 100.0, "width": 50.0}), 1000.0, [tip],
                 stations=(Station(1000.0, {"depth": 50.0}),))
    shear = -solve(wedge, plain=True)("arm.end", "displacement", "z") - 0.0
    shear += solve(wedge, plain=True, shear=False)("arm.end", "displacement", "z")
    s = (np.arange(20000) + 0.5) / 20000
    F = s / (1 + s)
    G = 210000 / 2.6
    want = 1000.0 * 1000.0 / (G * 2500) * np.mean((1.2 - 1.2 * F + 1.8 * F**2) / (1 + s))
    assert shear == pytest.approx(want, rel=2e-5)  # the form is interpolated between five sections
    standard = 1000.0 * 1000.0 / (G * 2500) * 1.2 * math.log(2)
    assert standard == pytest.approx(0.627179 - 0.623060, rel=1e-3)
    assert 0.86 < want / standard < 0.88


def test_form_is_scaled_to_the_compliance():
    """Both directions, and the mixed term of the section analysis kept."""
    C = np.array([[2e-3, 1e-4], [1e-4, 3e-3]])
    Q = tapered_shear(block, 0.0, 0.01, C)
    assert Q[:2, :2] == pytest.approx(C)
    assert pytest.approx(Q.T) == Q
    assert Q[1, 3] == pytest.approx(0.5 * 0.1 / 80 * 3e-3, rel=1e-5)
    assert Q[0, 4] == pytest.approx(0.0, abs=1e-12)  # the width does not vary
