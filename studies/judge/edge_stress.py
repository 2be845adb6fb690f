"""Stress of the outer fibres extrapolated to a held edge, where the local stress has no converged value.

The solid's longitudinal stress is taken one to two section depths away from the edge, where the edge is no
longer felt (Saint-Venant). There it is fitted by a plane over the section whose coefficients vary linearly
along the member, and the fit is evaluated at the edge. This is the structural-stress extrapolation that is
common practice for welds (no source), with the section's depth in place of the plate's thickness.
"""

from __future__ import annotations

import numpy as np

from fem.solid import SolidResult
from studies.judge.context import Array, Context, Zone

WORST_FIT = 0.10
"""Root mean square remainder over the largest fitted stress, beyond which the section is not plane."""


def extrapolated(ctx: Context, solid: SolidResult, case: str, zone: Zone) -> tuple[float, str]:
    """Largest size of the longitudinal stress at the edges of a held stretch (MPa), and why it is no good.

    The text is empty when the value stands; then at least one side of the stretch has free length enough.
    """
    found, reasons = [], []
    for edge, side in ((zone.start, -1.0), (zone.end, 1.0)):
        room = edge if side < 0 else ctx.length - edge
        if room < 1e-6 * ctx.length:
            continue  # the stretch begins or ends with the member
        value, why_not = _one_side(ctx, solid, case, edge, side, room)
        found.append(value)
        if why_not:
            reasons.append(f"{why_not} (towards {zone.what})")
    if not found:
        return 0.0, f"{zone.what} covers the whole member"
    return max(found), "; ".join(reasons)


def axle_near(ctx: Context, case: str, zone: Zone) -> bool:
    """True when an axle of a travelling load stands so near a held stretch that the stress between it and two section
    depths away does not vary linearly."""
    reach = 2.0 * ctx.reach_of_disturbance
    return any(strip.gap(zone) < reach for strip in ctx.strip_zones(case))


def _one_side(ctx: Context, solid: SolidResult, case: str, edge: float, side: float,
              room: float) -> tuple[float, str]:
    reach = ctx.reach_of_disturbance
    if room < 2.0 * reach:
        return _load_free_tail(ctx, solid, case, edge, side, room)
    points = ctx.local(solid.mesh.nodes)
    away = side * (points[:, 0] - edge)
    window = (away >= reach) & (away <= 2.0 * reach)
    stress = longitudinal(ctx, solid.stress[solid.cases.index(case)][:, window])
    section = np.column_stack([np.ones(int(window.sum())), points[window, 1], points[window, 2]])
    matrix = np.hstack([section, section * away[window, None]])
    if len(stress) < 30:
        return 0.0, "too few mesh nodes between one and two depths from the edge"
    scale = np.maximum(np.abs(matrix).max(axis=0), 1e-30)
    coefficients = np.linalg.lstsq(matrix / scale, stress, rcond=None)[0] / scale
    remainder = float(np.sqrt(np.mean((matrix @ coefficients - stress) ** 2)))
    at_edge = points[np.abs(points[:, 0] - edge) < max(0.05 * reach, 1e-6 * ctx.length)]
    if not len(at_edge):
        at_edge = points[window]
    value = float(np.abs(np.column_stack([np.ones(len(at_edge)), at_edge[:, 1:]]) @ coefficients[:3]).max())
    largest = max(value, float(np.abs(stress).max()))
    if largest > 0 and remainder > WORST_FIT * largest:
        return value, (f"the stress one to two depths away is not that of a plane section (remainder "
                       f"{100 * remainder / largest:.0f} %): a cut, a step or a bending wall is too near; "
                       f'use basis = "nominal" or a local model')
    return value, ""


def _load_free_tail(ctx: Context, solid: SolidResult, case: str, edge: float, side: float,
                    room: float) -> tuple[float, str]:
    """A short tail beyond a support: fine when nothing loads it, else there is no room to extrapolate."""
    tail = (edge - room, edge) if side < 0 else (edge, edge + room)
    loaded = [z.what for z in ctx.loaded_zones + ctx.strip_zones(case) if tail[0] <= 0.5 * (z.start + z.end) <= tail[1]]
    if loaded:
        return 0.0, (f"only {room:.4g} mm of free length carry {', '.join(loaded)}: no undisturbed stretch from "
                     f'which to extrapolate; use basis = "nominal"')
    return 0.0, ""


def longitudinal(ctx: Context, stress: Array) -> Array:
    """(n,) stress along the member from (6, n) global components xx, yy, zz, xy, yz, zx."""
    x = ctx.x_axis
    xx, yy, zz, xy, yz, zx = stress
    return (x[0] ** 2 * xx + x[1] ** 2 * yy + x[2] ** 2 * zz
            + 2.0 * (x[0] * x[1] * xy + x[1] * x[2] * yz + x[2] * x[0] * zx))
