"""Published stress concentration factors of flat and round bars.

All are elastic, on the *net* (narrow) section's nominal stress unless said otherwise. Arguments outside the range of
a fit raise `OutOfRange`; nothing is extrapolated. Sources: R. B. Heywood, Designing by Photoelasticity, 1952; W. D.
Pilkey and D. F. Pilkey, Peterson's Stress Concentration Factors, 3rd ed., 2008 (coefficients partly from memory and
from secondary sources; the one sign that those print wrongly is settled by C1 + .. + C4 -> 1 for no step).
Photoelastic fits are up to 7 % low for shallow steps in flat bars and up to 16 % low for stepped round bars in
tension (N.-A. Noda, Y. Takase and K. Monda, Int. J. Fatigue 19 (1997) 75-84; S. M. Tipton, J. R. Sorem and
R. D. Rolovic, J. Mech. Des. 118 (1996) 321-327): hence the bands.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

FLAT_BAND, ROUND_TENSION_BAND = 0.08, 0.20
"""Half-width of the band of a factor, as a fraction."""

Coefficients = Sequence[tuple[float, float, float]]

FLAT_TENSION: tuple[Coefficients, Coefficients] = (
    ((1.006, 1.008, -0.044), (-0.115, -0.584, 0.315), (0.245, -1.006, -0.257), (-0.135, 0.582, -0.017)),
    ((1.020, 1.009, -0.048), (-0.065, -0.165, -0.007), (-3.459, 1.266, -0.016), (3.505, -2.109, 0.069)))
FLAT_BENDING: tuple[Coefficients, Coefficients] = (
    ((1.006, 0.967, 0.013), (-0.270, -2.372, 0.708), (0.662, 1.157, -0.908), (-0.405, 0.249, 0.200)),
    ((1.058, 1.002, -0.038), (-3.652, 1.639, -0.436), (6.170, -5.687, 1.175), (-2.558, 3.046, -0.701)))
ROUND_TENSION: tuple[Coefficients, Coefficients] = (
    ((0.926, 1.157, -0.099), (0.012, -3.036, 0.961), (-0.302, 3.977, -1.744), (0.365, -2.098, 0.878)),
    ((1.200, 0.860, -0.022), (-1.805, -0.346, -0.038), (2.198, -0.486, 0.165), (-0.593, -0.028, -0.106)))
ROUND_BENDING: tuple[Coefficients, Coefficients] = (
    ((0.947, 1.206, -0.131), (0.022, -3.405, 0.915), (0.869, 1.777, -0.555), (-0.810, 0.422, -0.260)),
    ((1.232, 0.832, -0.008), (-3.813, 0.968, -0.260), (7.423, -4.868, 0.869), (-3.839, 3.070, -0.600)))


class OutOfRange(ValueError):
    """The published factor does not reach this shape; the message says why."""


def hole_tension(d: float, width: float) -> float:
    """Central circular hole in a flat bar in tension, on the net section (D1; Pilkey & Pilkey, chart 4.1)."""
    _within("hole / width", d / width, 0.0, 0.8)
    p = 1.0 - d / width
    return 2.0 + 0.284 * p - 0.600 * p**2 + 1.32 * p**3


def hole_tension_heywood(d: float, width: float) -> float:
    """The same after Heywood: 2 + (1 - d/W)^3."""
    _within("hole / width", d / width, 0.0, 0.8)
    return 2.0 + (1.0 - d / width) ** 3


def hole_bending(d: float, depth: float) -> float:
    """Central circular hole in a flat bar bent in its plane, on the net section's stress at the hole's edge (D2a)."""
    _within("hole / depth", d / depth, 0.0, 0.7)
    return 2.0


def shoulder(wide: float, narrow: float, radius: float, fit: tuple[Coefficients, Coefficients]) -> float:
    """Shoulder fillet on both sides (D3 flat, D5 round): Kt = C1 + C2 x + C3 x^2 + C4 x^3, x = 2t/H."""
    t = 0.5 * (wide - narrow)
    if t <= 0.0 or radius <= 0.0:
        raise OutOfRange("there is no filleted step")
    _within("step height / radius", t / radius, 0.1, 20.0)
    x = 2.0 * t / wide
    terms = fit[0] if t / radius <= 2.0 else fit[1]
    return sum((a + b * math.sqrt(t / radius) + c * t / radius) * x**k for k, (a, b, c) in enumerate(terms))


def notch_tension(r: float, depth: float) -> float:
    """Opposite semicircular edge notches in a flat bar in tension, on the net section (D4)."""
    x = 2.0 * r / depth
    _within("two radii / depth", x, 0.0, 0.6)
    return 3.065 - 3.472 * x + 1.009 * x**2 + 0.405 * x**3


def notch_bending(r: float, depth: float) -> float:
    """Opposite semicircular edge notches in a flat bar bent in its plane, on the net section (D4)."""
    x = 2.0 * r / depth
    _within("two radii / depth", x, 0.0, 0.6)
    return 3.065 - 6.637 * x + 8.229 * x**2 - 3.636 * x**3


def small_hole(at_centre: float, slope: float, radius: float, upper: bool) -> float:
    """Rim stress (MPa) of a small hole in a wide wall: 3 times the stress at its middle, and 2 times what the gradient
    adds over its radius (Kirsch 1898; D2a). On the *gross* stress `at_centre` and its change `slope` per mm."""
    return 3.0 * at_centre + 2.0 * slope * radius * (1.0 if upper else -1.0)


def _within(what: str, value: float, low: float, high: float) -> None:
    if not low <= value <= high:
        raise OutOfRange(f"{what} = {value:.3g} is outside the published range {low:g} to {high:g}")
