"""How far beam and solid may honestly differ: a band made of stated reasons.

Every reason has a size that follows from the part, as a fraction of the scale of the figure (the largest
value of its kind in the case). The fractions add up: the reasons may act alike. They widen the band and
never move its centre; a *signed* expectation is a cause, and is subtracted before the band is applied.

Where a coefficient comes from is said beside it. "Set by trial" means that it was set on the plain parts
of the test suite and awaits the calibration on a large population.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import NamedTuple

from fem.figure import FigureKey
from geometry.part import StripLoad, TemperatureLoad
from studies.judge.context import Context


class Share(NamedTuple):
    """One contribution to a band: why, and how much of the scale."""

    text: str
    fraction: float


OPEN_SHAPES = ("I", "channel", "angle", "tee", "outline")


@dataclass(frozen=True)
class CaseFacts:
    """What one case adds to the facts about the part.

    `flat_share`: share of the largest displacement that is along the lesser side of the section.
    `shear_share`: share of the beam's largest deflection that is shear. `twist_share`: displacement that
    the largest twist gives at the section's edge, over the largest displacement (at most 1). `acting`: names
    of the loads with a factor other than 0.
    """

    shear_share: float
    twist_share: float
    open_thin: bool
    thin_walled: bool
    acting: frozenset[str] = frozenset()
    flat_share: float = 0.0


FLAT = 10.0
"""Width over thickness from which a section held at its face is thought of as a plate (judgement, no source)."""


def flat_root(ctx: Context, waves: float = 1.0) -> float:
    """How much stiffer a wide, thin, massive section is in bending about its thin side where faces that are held point
    by point or rigidly deny it the curvature across: nu^2, the ratio of a plate's to a beam's stiffness less one
    (Timoshenko & Woinowsky-Krieger, Theory of Plates and Shells, cylindrical bending; from memory), over half a width
    from the face, which has 1.5 b / L of a cantilever's give (a strip 200 x 80 x 2 is 4.3 % stiffer)."""
    if max(ctx.size) < FLAT * min(ctx.size):
        return 0.0
    gripped = sum(support.coupling != "average" for support in ctx.part.supports)
    nu = ctx.part.material.nu
    return nu**2 * min(1.0, 1.5 * gripped * waves / ctx.slenderness)


def mesh_error(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # Displacements converge with the square of the stress error (Strang & Fix 1973: twice the order), so a
    # quarter of the requested stress accuracy is generous.
    yield Share("discretisation of the solid", 0.25 * ctx.part.accuracy)


def end_effects(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # MacNeal & Harder 1985 (straight cantilever): at L/h = 30 the converged clamped solid is 0.18 % stiffer
    # than the beam, that is 0.053 h/L; the band has 0.06. A thin-walled section adds the shape change of its
    # walls near the end: twice as much when the end face is held point by point or rigidly (example
    # parts: up to 0.04), and much more when only its mean is held, for then the section is free to change its
    # shape there (box rail with slots: 0.5). Away from an end, or on a long face, the part gives way locally.
    for support, zone in zip(ctx.part.supports, ctx.held_zones, strict=True):
        short = zone.end - zone.start < 0.05 * ctx.length
        at_end = zone.start < 1e-6 * ctx.length or zone.end > (1 - 1e-6) * ctx.length
        factor = 0.06 if short and at_end else 0.2
        if facts.thin_walled:
            factor = max(factor, 0.5 if support.coupling == "average" else 0.12)
        yield Share(f"end effect at {zone.what}", factor / ctx.slenderness)


def shear_definition(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # Cowper 1966, Gruttmann & Wagner 2001 and Hutchinson 2001 differ by up to 10 % for one shape.
    yield Share("definition of the shear area", 0.10 * facts.shear_share)


def cuts(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # A cut weakens its own stretch beyond the net section by a part of that stretch's share (set by trial).
    width, depth = ctx.size
    for cut in ctx.member.cuts:
        across = depth if cut.axis == "y" else width
        share = 0.5 * min(cut.length / ctx.length, 1.0) * min(cut.depth / across, 1.0)
        yield Share(f"cut {cut.name} beyond its net section", share)


def cut_flanges(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # A notch that takes off part of a flange or leg moves the shear centre of what is left, which the beam keeps
    # where it was: whatever twists there may be off by the notch's share of the length (set by trial).
    if ctx.member.section.shape in OPEN_SHAPES:
        for cut in ctx.member.cuts:
            if cut.kind == "notch":
                share = min(1.0, 2.0 * cut.length / ctx.length)
                yield Share(f"{cut.name} moves the shear centre", share * facts.twist_share)


def taper(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # Wedge solution of plane elasticity (Timoshenko & Goodier art. 39): the plain formula errs with the
    # square of the half angle. The full slope of the depth is taken.
    stations = ctx.member.stations
    if stations and not ctx.step_zones:
        slope = 0.0
        for name, value in ctx.member.section.dims.items():
            x0, v0 = 0.0, value
            for station in stations:
                if name in station.dims and station.at > x0:
                    slope = max(slope, abs(station.dims[name] - v0) / (station.at - x0))
                    x0, v0 = station.at, station.dims[name]
        if slope > 0:
            yield Share("inclined faces of the taper", slope**2)


def steps(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # Beside a step the wider part is not at once fully engaged, over a length of about half the step's height (set by
    # trial); the height is half the largest change of a dimension.
    for zone, height in zip(ctx.step_zones, ctx.step_heights, strict=True):
        yield Share(f"load path at the {zone.what}", 0.5 * height / ctx.length)


def torsion(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    if facts.twist_share > 0.01:
        size = 0.05 if facts.open_thin else 0.02  # set by trial
        yield Share("torsion constant and restrained warping", size * facts.twist_share)


def local_loads(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # A load on a thin wall bends the wall and distorts the section (set by trial; on an end face, spread over the
    # whole section, less than on a part of a wall).
    if facts.thin_walled:
        for name, zone in ctx.load_zones.items():
            if name in facts.acting:
                at_end = zone.end - zone.start < 1e-6 * ctx.length
                yield Share(f"wall bending under {zone.what}", (0.05 if at_end else 0.15) / ctx.slenderness)
        for load in ctx.part.loads:
            if isinstance(load, StripLoad) and load.name in facts.acting:
                yield Share(f"wall bending under load {load.name}", 0.15 / ctx.slenderness)


def flat_strip(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    size = 0.0 if facts.thin_walled else flat_root(ctx) * facts.flat_share
    if size > 0.0:
        yield Share("a wide, thin section held at its face bends as a plate there", size)


def heat(ctx: Context, facts: CaseFacts) -> Iterator[Share]:
    # A region held point by point cannot grow sideways; over about half a depth the part next to it is strained
    # by the expansion that it is denied (Saint-Venant), of which Poisson's ratio goes into length.
    if any(isinstance(load, TemperatureLoad) and load.name in facts.acting for load in ctx.part.loads):
        for support, zone in zip(ctx.part.supports, ctx.held_zones, strict=True):
            if support.coupling != "average":
                yield Share(f"sideways expansion denied at {zone.what}", 0.5 * ctx.part.material.nu / ctx.slenderness)


DISPLACEMENT: tuple[Callable[[Context, CaseFacts], Iterator[Share]], ...] = (
    mesh_error, end_effects, shear_definition, cuts, cut_flanges, taper, steps, torsion, local_loads, flat_strip, heat,
)


def reasons(ctx: Context, facts: CaseFacts, key: FigureKey) -> Sequence[Share]:
    """Reasons that widen the band of one figure, as fractions of its scale."""
    match key.quantity:
        case "displacement" | "rotation":
            found = [r for rule in DISPLACEMENT for r in rule(ctx, facts)]
        case "strain_energy":
            found = [r for rule in DISPLACEMENT for r in rule(ctx, facts)]
        case "reaction_force" | "reaction_moment" | "section_force" | "section_moment":
            if ctx.determinate:
                # Equilibrium alone decides; the rest is the cut along element faces and rounding.
                return [Share("equilibrium of a determinate part", 2e-3)]
            found = [r for rule in DISPLACEMENT for r in rule(ctx, facts)]
        case "nominal_stress":
            # ASME V&V 10.1 style practice: 2 % one depth from supports, loads and steps, plus the stated accuracy.
            found = [Share("plane sections", 0.02), Share("discretisation of the solid", ctx.part.accuracy),
                     *taper(ctx, facts), *torsion(ctx, facts)]
            if facts.thin_walled:
                found.append(Share("shear lag and wall bending in thin walls", 0.1 / ctx.slenderness))
        case "notch_stress":
            found = [Share("discretisation of the solid", ctx.part.accuracy), Share("nominal stress", 0.02)]
        case "mass" | "centre_of_mass":
            # Beam: integrated areas; rims' radii and cuts in inclined walls are not followed exactly.
            found = [Share("integration along the member", 1e-3)]
            found += [Share(f"edge radius {r.radius:g} mm", 2e-3) for r in ctx.member.edge_radii]
            found += [Share(f"cut {c.name} in a curved or inclined wall", 5e-4) for c in ctx.member.cuts]
        case _:
            found = []
    return found
