"""How far a natural frequency or a buckling factor of the two models may honestly differ.

The reasons are those of the displacements (`studies.judge.bands`), read as errors of a stiffness: a buckling factor
goes with the stiffness, a frequency with its root, so that half of each counts. A mode with several waves feels what
happens over a length of the part as if the part were shorter by the number of its waves. As there, sizes are fractions
of the value, they add up, and they come from the part and not from either model's values; the number of waves and the
share of twist are the lesser of the two models', so that neither widens its own band.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from fem.mode import Mode
from geometry.part import RemotePoint
from studies.judge.bands import CaseFacts, Share, cuts, flat_root, steps, taper
from studies.judge.context import Context

Array = NDArray[np.float64]
WARPING_HELD = "warping held at the ends"
"""Not needed where the beam model predicts what it does."""


@dataclass(frozen=True, slots=True)
class ModeFacts:
    """What decides the band of one pair of modes.

    `waves`: half waves along the member, at least 1. `twist`: share of the motion (0 to 1) that is torsion.
    `study`: whose value it is. `acting`: names of the loads of a buckling case.
    `flat`: share of the motion (0 to 1) that is along the lesser side of the section.
    """

    study: Literal["vibration", "buckling"]
    waves: int
    twist: float
    thin_walled: bool
    open_thin: bool
    acting: frozenset[str] = frozenset()
    flat: float = 0.0


def motions(ctx: Context, mode: Mode) -> Array:
    """(stations, 6) displacement and rotation in member axes, mm: rotations times the polar radius of gyration of the
    section's bounding rectangle."""
    axes = ctx.axes
    return np.hstack([mode.displacement @ axes.T, polar_radius(ctx) * (mode.rotation @ axes.T)])


def polar_radius(ctx: Context) -> float:
    """Of the bounding rectangle of the section, mm: the length that makes a rotation comparable to a displacement."""
    return math.hypot(*ctx.size) / math.sqrt(12.0)


def waves_of(motion: Array) -> int:
    """Half waves of the largest of the four motions of the line (x, y, z, twist): changes of sign and one. What moves
    less than a tenth of the largest does not count, such as a short end beyond a support."""
    lines = motion[:, :4]
    line = lines[:, int(np.argmax(np.square(lines).sum(axis=0)))]
    seen = line[np.abs(line) > 0.1 * np.abs(line).max(initial=0.0)]
    return 1 + int(np.count_nonzero(seen[1:] * seen[:-1] < 0.0))


def twist_of(motion: Array) -> float:
    """Share of twist in the square of the motion of the line."""
    sums = np.square(motion[:, :4]).sum(axis=0)
    return float(sums[3] / sums.sum()) if sums.sum() > 0.0 else 0.0


def flat_of(ctx: Context, motion: Array) -> float:
    """Share of what is along the section's lesser side in the square of the motion of the line."""
    sums = np.square(motion[:, :4]).sum(axis=0)
    return float(sums[1 + int(np.argmin(ctx.size))] / sums.sum()) if sums.sum() > 0.0 else 0.0


def mode_reasons(ctx: Context, facts: ModeFacts) -> tuple[Share, ...]:
    """Reasons that widen the band of one pair of modes, as fractions of its value."""
    vibrates = facts.study == "vibration"
    root = 0.5 if vibrates else 1.0
    found = [Share(s.text, root * min(s.fraction, 1.0)) for s in _stiffness(ctx, facts)]
    if vibrates:
        # As the band of the mass itself, whose root counts.
        mass = 1e-3 + 2e-3 * len(ctx.member.edge_radii) + 5e-4 * len(ctx.member.cuts)
        found.append(Share("mass along the member", 0.5 * mass))
    return tuple(found)


def _stiffness(ctx: Context, facts: ModeFacts) -> Iterator[Share]:
    still = CaseFacts(0.0, facts.twist, facts.open_thin, facts.thin_walled, facts.acting)
    # A value at rest (Rayleigh): its error is of the order of the energy's, a quarter of the accuracy as for
    # displacements; more waves need as many more elements.
    yield Share("discretisation of the solid", 0.25 * ctx.part.accuracy * facts.waves)
    if not _free(ctx, facts):
        yield from _held_ends(ctx, facts)
    yield Share("definition of the shear area", 0.10 * shear_share(ctx, facts) * (1.0 - facts.twist))
    yield from _section_shape(ctx, facts)
    flat = 0.0 if facts.thin_walled or _free(ctx, facts) else flat_root(ctx, facts.waves) * facts.flat
    if flat > 0.0:
        yield Share("a wide, thin section held at its face bends as a plate there", flat)
    # The curvature where a cut or step is may be twice that of the mean.
    yield from (Share(s.text, 2.0 * s.fraction) for s in cuts(ctx, still))
    yield from taper(ctx, still)
    yield from (Share(s.text, 2.0 * s.fraction * facts.waves) for s in steps(ctx, still))
    yield from _torsion(ctx, facts)
    yield from _carried(ctx, facts) if facts.study == "vibration" else _entering(ctx, facts)


def _free(ctx: Context, facts: ModeFacts) -> bool:
    vibration = ctx.part.vibration
    return facts.study == "vibration" and vibration is not None and vibration.free


def _held_ends(ctx: Context, facts: ModeFacts) -> Iterator[Share]:
    # The sizes of `bands.end_effects`, where a tip deflection goes with L^3; a frequency's square goes with L^4.
    power = 4.0 / 3.0 if facts.study == "vibration" else 1.0
    for support, zone in zip(ctx.part.supports, ctx.held_zones, strict=True):
        short = zone.end - zone.start < 0.05 * ctx.length
        at_end = zone.start < 1e-6 * ctx.length or zone.end > (1 - 1e-6) * ctx.length
        factor = 0.06 if short and at_end else 0.2
        if facts.thin_walled:
            factor = max(factor, 0.5 if support.coupling == "average" else 0.12)
        yield Share(f"end effect at {zone.what}", power * factor * facts.waves / ctx.slenderness)


def shear_share(ctx: Context, facts: ModeFacts) -> float:
    """Share of shear in the flexibility of a bending mode: p / (1 + p), p = E / (G kappa) (pi r / l)^2 with the half
    wave l, r of the bounding rectangle, kappa 0.85 (solid rectangle, Cowper 1966) or 0.4 (thin walls: the web of an I
    or box is about that share of its area)."""
    r = max(ctx.size) / math.sqrt(12.0)
    kappa = 0.4 if facts.thin_walled else 0.85
    p = 2.0 * (1.0 + ctx.part.material.nu) / kappa * (math.pi * r * facts.waves / ctx.length) ** 2
    return p / (1.0 + p)


def _section_shape(ctx: Context, facts: ModeFacts) -> Iterator[Share]:
    # Where the half wave nears the width, a wide section bends as a plate, nu^2 / (1 - nu^2) = 10 % stiffer; thin walls
    # lag behind in shear and bend (set by trial).
    short = (facts.waves / ctx.slenderness) ** 2
    yield Share("sections change their shape in short waves", min((1.0 if facts.thin_walled else 0.1) * short, 0.5))


def _torsion(ctx: Context, facts: ModeFacts) -> Iterator[Share]:
    if facts.twist > 0.01:
        size = 0.05 if facts.open_thin else 0.02  # as for displacements, set by trial
        yield Share("torsion constant and restrained warping", size * facts.twist)
        if not facts.open_thin:
            # A solid or closed section cannot warp at a clamped end, over about a third of its size: stiffer there.
            yield Share(WARPING_HELD, 0.3 * facts.waves * facts.twist / ctx.slenderness)


def _carried(ctx: Context, facts: ModeFacts) -> Iterator[Share]:
    """The part gives way where what it carries is fixed to it."""
    for load in ctx.part.loads:
        if isinstance(load, RemotePoint) and load.mass > 0.0:
            zone = ctx.zone(load.on, f"mass {load.name}")
            at_end = zone.end - zone.start < 1e-6 * ctx.length
            factor = 0.06 if at_end and load.coupling == "rigid" else 0.2
            if facts.thin_walled:
                factor = max(factor, 0.15)
            yield Share(f"local give at {zone.what}", factor * facts.waves / ctx.slenderness)


def _entering(ctx: Context, facts: ModeFacts) -> Iterator[Share]:
    """A load is a stress of beam theory only a depth away from where it enters."""
    for name, zone in ctx.load_zones.items():
        if name in facts.acting:
            yield Share(f"stress where {zone.what} enters", 0.06 * facts.waves / ctx.slenderness)
