"""Checks that lean on one model only, or hold it against something that neither model made."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np
from numpy.typing import NDArray

from fem.solid import SolidResult
from geometry.named_solid import NamedSolid
from studies.check.result import IndependentCheck
from studies.judge.context import Context

Array = NDArray[np.float64]

SLICE_TOLERANCE = 2e-3
"""CAD slices against the beam's sections: areas and second moments relative, centroids over the size.
Both sides are exact for lines and arcs; inclined root fillets of a taper differ in the fourth digit."""


def independent_checks(ctx: Context, solid: NamedSolid, result: SolidResult,
                       properties: Array) -> tuple[IndependentCheck, ...]:
    """All of them. `properties`: (n, 7) of the beam at the stations of ``solid.slices``, same columns."""
    return (*_from_solver(ctx, result), *_geometry(ctx, solid), *slice_checks(ctx, solid.slices, properties),
            *_plausible(ctx, result))


def _from_solver(ctx: Context, result: SolidResult) -> Iterator[IndependentCheck]:
    """The solid model's own checks; of the positions of a travelling load the one that uses most of what is allowed."""
    declared = {name: name.partition("@")[0] for case in ctx.part.cases if case.travel
                for name in (case.name, *(load for load in case.factors if load.startswith(f"{case.travel.load}@")))}
    worst: dict[str, tuple[float, IndependentCheck]] = {}
    for check in result.checks:
        words = check.name.split(" ")
        plain = " ".join(_declared(word, declared) for word in words)
        note = check.note
        if plain != check.name:
            at = next(word.partition("@")[2].rstrip(":") for word in words if "@" in word)
            note = ", ".join(filter(None, (f"worst of the positions, {at} mm", note)))
        use = check.value / check.allowed if check.allowed else check.value
        use = np.inf if not check.ok else use
        if plain not in worst or use > worst[plain][0]:
            worst[plain] = (use, IndependentCheck(plain, check.value, check.allowed, check.ok, note))
    yield from (check for _, check in worst.values())


def _declared(word: str, names: Mapping[str, str]) -> str:
    """A word of a check's name without the position it names."""
    bare = word.rstrip(":")
    return names[bare] + word[len(bare):] if bare in names else word


def _geometry(ctx: Context, solid: NamedSolid) -> Iterator[IndependentCheck]:
    mesh = ctx.mesh
    gap = abs(mesh.volume / solid.volume - 1.0)
    yield IndependentCheck("mesh volume against solid", gap, 2e-3, gap <= 2e-3, "relative")
    estimate = abs(solid.volume / solid.volume_estimate - 1.0)
    yield IndependentCheck("solid volume against integrated sections", estimate, 0.02, estimate <= 0.02,
                           "relative; the estimate takes each cut as the tool's volume within its wall")


def slice_checks(ctx: Context, slices: Array, properties: Array) -> Iterator[IndependentCheck]:
    """Largest difference between plane cuts of the CAD solid and the beam's own sections.

    Parameters
    ----------
    slices, properties
        (n, 7): x, A, yc, zc, Iyy, Izz, Iyz (member axes from the line; second moments about the section's
        own centroid), mm.
    """
    if len(slices) < 5:
        yield IndependentCheck("slices of the solid", float(len(slices)), 5.0, False, "at least five are needed")
        return
    size = max(ctx.size)
    largest = np.max(np.abs(properties[:, 4:6]), axis=1)
    gaps = {
        "area": np.abs(properties[:, 1] / slices[:, 1] - 1.0),
        "centroid": np.hypot(properties[:, 2] - slices[:, 2], properties[:, 3] - slices[:, 3]) / size,
        "second moment about y": np.abs(properties[:, 4] / slices[:, 4] - 1.0),
        "second moment about z": np.abs(properties[:, 5] / slices[:, 5] - 1.0),
        "product of inertia": np.abs(properties[:, 6] - slices[:, 6]) / largest,
    }
    for name, gap in gaps.items():
        worst = int(np.argmax(gap))
        value = float(gap[worst])
        yield IndependentCheck(f"slices of the solid against the beam: {name}", value, SLICE_TOLERANCE,
                               value <= SLICE_TOLERANCE,
                               f"worst of {len(gap)} stations at {slices[worst, 0]:.4g} mm")


def _plausible(ctx: Context, result: SolidResult) -> Iterator[IndependentCheck]:
    largest = float(np.linalg.norm(result.u, axis=1).max()) if result.u.size else 0.0
    least = min(ctx.size)
    held_axial = largest / least
    yield IndependentCheck("largest displacement over depth", held_axial, 0.5, held_axial <= 0.5,
                           "beyond half the depth the axial pull of the deflected shape may matter")
    strength = ctx.part.material.yield_strength
    if strength:
        stress = max((s.established for s in result.case_stress), default=0.0)
        use = stress / strength
        yield IndependentCheck("highest established stress over yield", use, 1.0, use <= 1.0,
                               "beyond yield a linear solution is only a sign of it")
