"""One run judged: pairs, limits, independent checks, peak places and cautions."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from fem.beam import BeamResult
from fem.beam.slices import sections_at
from fem.figure import FigureKey, Quantity
from fem.solid import PeakPlace as SolidPeak
from fem.solid import SolidResult
from geometry.named_solid import NamedSolid
from geometry.part import Part
from mesher.named_mesh import NamedMesh
from studies.check.result import Cause, IndependentCheck, LimitVerdict, Pair, PeakPlace
from studies.check.studied import ModePair, TravelEnvelope, TravelSummary
from studies.judge.agreement import Table, by_case, pair_figures, table
from studies.judge.bands import OPEN_SHAPES, CaseFacts
from studies.judge.context import Context
from studies.judge.independent import independent_checks
from studies.judge.limits import Evidence, verdicts
from studies.judge.mode_cautions import mode_cautions
from studies.judge.modes import judge_modes
from studies.judge.travelling import envelopes, kept, summaries

WIDE_BAND = 0.10
"""Share of the largest displacement; a band beyond it is said in so many words."""


@dataclass(frozen=True, slots=True)
class Judgement:
    """What the judge made of one run. See `studies.check.result` for the records."""

    pairs: tuple[Pair, ...]
    limits: tuple[LimitVerdict, ...]
    checks: tuple[IndependentCheck, ...]
    peaks: tuple[PeakPlace, ...]
    cautions: tuple[str, ...]
    modes: tuple[ModePair, ...] = ()
    travels: tuple[TravelSummary, ...] = ()
    envelopes: tuple[TravelEnvelope, ...] = ()


def judge(part: Part, named: NamedSolid, mesh: NamedMesh, solid: SolidResult, beam: BeamResult) -> Judgement:
    """Compare every figure that both models give, and hold limits and independent checks.

    Neither model is changed by the other; a band never moves its centre (see `studies.judge.bands`).
    """
    ctx = Context(part, mesh)
    solid_table, beam_table = table(solid.figures), table(beam.figures)
    split = [by_case(solid_table), by_case(beam_table)]
    facts = {c.name: case_facts(ctx, named, beam, [figures.get(c.name, {}) for figures in split], c.name)
             for c in part.cases}
    thin = named.least_wall < 0.2 * min(ctx.size)
    values, modes = judge_modes(ctx, solid, beam, facts, (thin, thin and ctx.member.section.shape in OPEN_SHAPES))
    pairs = pair_figures(ctx, solid_table, beam_table, facts, signed_causes(beam, beam_table)) + values
    evidence = Evidence(ctx, solid, solid_table, beam_table, pairs)
    properties = sections_at(ctx.member, named.slices[:, 0])
    checks = independent_checks(ctx, named, solid, properties)
    return Judgement(kept(part, pairs), verdicts(evidence), checks, peak_places(ctx, named, solid),
                     (*cautions(ctx, solid, facts, pairs), *mode_cautions(part, solid)),
                     modes, summaries(part, solid), envelopes(part, pairs))


def case_facts(ctx: Context, named: NamedSolid, beam: BeamResult, models: Sequence[Table], case: str) -> CaseFacts:
    """What one case adds to the facts about the part (see `CaseFacts`).

    The twist is the smaller of the two models': a spurious twist in one of them must not widen the band by which it
    is judged.
    """
    thin = named.least_wall < 0.2 * min(ctx.size)
    return CaseFacts(
        shear_share=abs(beam.shear_share.get(case, 0.0)),
        twist_share=min(_twist_share(ctx, figures, case) for figures in models),
        open_thin=thin and ctx.member.section.shape in OPEN_SHAPES,
        thin_walled=thin,
        acting=frozenset(name for c in ctx.part.cases if c.name == case for name, f in c.factors.items() if f),
        flat_share=min(_flat_share(ctx, figures, case) for figures in models),
    )


def _flat_share(ctx: Context, figures: Table, case: str) -> float:
    """Largest displacement along the section's lesser side over the largest displacement."""
    moved = np.array(_vectors(figures, case, "displacement")).reshape(-1, 3) @ ctx.axes.T
    largest = float(np.linalg.norm(moved, axis=1).max(initial=0.0))
    across = moved[:, 1 + int(np.argmin(ctx.size))]
    return float(np.abs(across).max(initial=0.0)) / largest if largest > 0 else 0.0


def _twist_share(ctx: Context, figures: Table, case: str) -> float:
    moved = [f.value for k, f in figures.items() if k.case == case and k.quantity == "displacement"]
    turned = [abs(float(np.dot(v, ctx.x_axis))) for v in _vectors(figures, case, "rotation")]
    largest = max(map(abs, moved), default=0.0)
    twist = 0.5 * max(ctx.size) * max(turned, default=0.0)
    return min(twist / largest, 1.0) if largest > 0 else 0.0


def _vectors(figures: Table, case: str, quantity: Quantity) -> list[np.ndarray]:
    places = {k.place for k in figures if k.case == case and k.quantity == quantity}
    keys = ([FigureKey(case, p, quantity, c) for c in "xyz"] for p in places)
    return [np.array([figures[k].value for k in row]) for row in keys]


def signed_causes(beam: BeamResult, figures: Table) -> dict[FigureKey, list[tuple[Cause, float]]]:
    """The beam's predicted differences (solid minus beam) with what they leave open, by figure."""
    found: dict[FigureKey, list[tuple[Cause, float]]] = {}
    kinds: dict[tuple[str, ...], list[FigureKey]] = {}
    for key in figures:
        for kind in ((key.case, key.quantity), (key.case, ""), ("", key.quantity), ("", ""),
                     (key.case, key.place, key.quantity, key.component)):
            kinds.setdefault(kind, []).append(key)
    for cause in beam.causes:
        wanted = (cause.case, cause.place, cause.quantity, cause.component)
        for key in kinds.get(wanted if all(wanted) else (cause.case, cause.quantity), []):
            has = (key.case, key.place, key.quantity, key.component)
            if all(w in ("", h) for w, h in zip(wanted, has, strict=True)):
                found.setdefault(key, []).append((Cause(cause.text, cause.difference), cause.band))
    return found


def peak_places(ctx: Context, named: NamedSolid, solid: SolidResult) -> tuple[PeakPlace, ...]:
    """Highest stresses of the solid with what is there."""
    found = []
    for peak in solid.peaks:
        kind = "surface" if peak.converged else ("sharp" if "corner" in peak.reason else "support")
        error = float(solid.stress_error[solid.cases.index(peak.case), peak.node])
        found.append(PeakPlace(peak.case, what_is_there(ctx, named, peak), kind, peak.position, peak.value,
                               error if peak.converged else None, peak.converged, peak.reason))
    return tuple(found)


def what_is_there(ctx: Context, named: NamedSolid, peak: SolidPeak) -> str:
    """The feature or face at a peak and its side, in a person's words: ``root fillet, lower side``."""
    features = [hint.label for hint in named.hints if hint.kind != "wall" and set(hint.faces) & set(peak.faces)]
    words = list(dict.fromkeys(features)) or list(peak.regions) or ["outer surface"]
    _, y, z = ctx.local(np.array(peak.position)[:, None])[0]
    width, depth = ctx.size
    sides = [name for name, far in (("upper", z > 0.05 * depth), ("lower", z < -0.05 * depth),
                                    ("right", y > 0.05 * width), ("left", y < -0.05 * width)) if far]
    return " / ".join(words) + (f", {' '.join(sides)} side" if sides else "")


def cautions(ctx: Context, solid: SolidResult, facts: dict[str, CaseFacts],
             pairs: Sequence[Pair]) -> tuple[str, ...]:
    """Sentences that this part earns; those that stand under every result are the report's."""
    found = [f"Accuracy {100 * ctx.part.accuracy:g} %: requested, not verified."]
    widest = max((p.band / p.scale for p in pairs if p.key.quantity == "displacement" and p.scale > 0), default=0.0)
    if widest > WIDE_BAND:
        found.append(f"The beam is a weak witness for this part: a displacement may differ by {100 * widest:.0f} % of "
                     "the largest one before it is called suspicious, so agreement says little. See what the "
                     "allowances are made of.")
    if ctx.slenderness < 5:
        found.append(f"Length over depth is {ctx.slenderness:.2g}: stubby, so the beam model is a rough guide.")
    largest = float(np.linalg.norm(solid.u, axis=1).max()) if solid.u.size else 0.0
    dents = [d for d in solid.denting if d.value > 1e-6 * largest]  # less is rounding of a rigid face
    if dents:
        worst = max(dents, key=lambda d: d.value)
        found.append(f"Denting of the loaded face {worst.region}: up to {worst.value:.3g} mm beyond the section's own "
                     f"motion (case {worst.case}); the beam cannot show it.")
    if any(f.open_thin and f.twist_share > 0.2 for f in facts.values()):
        found.append("A thin open section in torsion: the result depends on whether the ends can warp.")
    return tuple(found)
