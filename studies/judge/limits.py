"""The limits of the spec, each held against its worst case and place.

Values are the solid model's, except the `nominal` basis, which is the beam's. A limit whose governing
figure is suspicious, or has no converged value, is *not established*: it cannot pass.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from fem.figure import Figure, FigureKey, Quantity
from fem.mode import OTHER_SIGN, Mode, none_of_other_sign
from fem.solid import SolidResult
from geometry.part import Limit
from studies.check.result import LimitVerdict, Pair
from studies.check.words import LimitWord
from studies.judge.agreement import Table
from studies.judge.context import Context, Zone
from studies.judge.edge_stress import axle_near, extrapolated

UNITS = {
    "deflection": "mm", "displacement": "mm", "relative_displacement": "mm", "rotation": "rad", "stress": "MPa",
    "yield_factor": "1", "mass": "t", "reaction": "N",
    "frequency": "Hz", "buckling_factor": "1",
}


LEAST = ("yield_factor", "frequency", "buckling_factor")
"""What must not be less than its limit."""

MODES = ("frequency", "buckling_factor")


@dataclass(frozen=True)
class Found:
    """A value with where and when it was found; `doubt` says why it is not established."""

    value: float
    case: str
    place: str
    doubt: str = ""


@dataclass(frozen=True)
class Evidence:
    """Everything that limits are held against."""

    ctx: Context
    solid: SolidResult
    solid_table: Table
    beam_table: Table
    pairs: Sequence[Pair]

    def cases(self, limit: Limit) -> tuple[str, ...]:
        return limit.cases or tuple(c.name for c in self.ctx.part.cases)

    @cached_property
    def _suspects(self) -> dict[str, list[Pair]]:
        found: dict[str, list[Pair]] = {}
        for pair in self.pairs:
            if pair.judgement == "suspicious":
                found.setdefault(pair.key.case, []).append(pair)
        return found

    def suspicious(self, case: str, quantities: tuple[str, ...], place: str) -> bool:
        """True when a pair of such a quantity was judged suspicious at the place (empty: anywhere)."""
        return any(p.key.quantity in quantities and place in ("", p.key.place) for p in self._suspects.get(case, ()))

    @cached_property
    def nominal(self) -> dict[str, list[Figure]]:
        """The beam's nominal stresses, by case."""
        found: dict[str, list[Figure]] = {}
        for key, figure in self.beam_table.items():
            if key.quantity == "nominal_stress":
                found.setdefault(key.case, []).append(figure)
        return found

    @cached_property
    def places(self) -> dict[str, list[str]]:
        """Places of the solid's displacements and rotations, by quantity."""
        found: dict[str, set[str]] = {}
        for key in self.solid_table:
            found.setdefault(key.quantity, set()).add(key.place)
        return {quantity: sorted(names) for quantity, names in found.items()}


def verdicts(evidence: Evidence) -> tuple[LimitVerdict, ...]:
    """One verdict for each limit, in the order of the spec."""
    return tuple(_verdict(evidence, limit) for limit in evidence.ctx.part.limits)


def _verdict(evidence: Evidence, limit: Limit) -> LimitVerdict:
    least = limit.quantity in LEAST
    found = list(_candidates(evidence, limit))
    unit = UNITS[limit.quantity]
    if not found:
        what = "no mode was found" if limit.quantity in MODES else "no figure of this kind was found there"
        return LimitVerdict(limit.name, limit.quantity, limit.value, None, unit, "", limit.at, "not established", what)
    worst = min(found, key=lambda f: f.value) if least else max(found, key=lambda f: abs(f.value))
    doubts = [f for f in found if f.doubt]
    met = worst.value >= limit.value if least else abs(worst.value) <= limit.value
    word: LimitWord = "met" if met else "missed"
    reason = ""
    if met and doubts:
        word, reason = "not established", doubts[0].doubt
    basis = f" ({limit.basis} basis)" if limit.quantity in ("stress", "yield_factor") else ""
    value = worst.value if np.isfinite(worst.value) else None
    # Positions of a travelling load that mirror each other are equal but for rounding: the first is named.
    named = next(f for f in found if f"{f.value:.3e}" == f"{worst.value:.3e}")
    return LimitVerdict(limit.name, limit.quantity + basis, limit.value, value, unit, named.case, named.place, word,
                        reason)


def _candidates(evidence: Evidence, limit: Limit) -> Iterator[Found]:
    match limit.quantity:
        case "deflection" | "displacement" | "rotation":
            quantity: Quantity = "rotation" if limit.quantity == "rotation" else "displacement"
            yield from _motion(evidence, limit, quantity)
        case "relative_displacement":
            yield from _relative(evidence, limit)
        case "reaction":
            yield from _reactions(evidence, limit)
        case "mass":
            key = FigureKey("", "", "mass", "")
            if key in evidence.solid_table:
                doubt = "the two models disagree on the mass" if evidence.suspicious("", ("mass",), "") else ""
                yield Found(evidence.solid_table[key].value, "", "", doubt)
        case "stress" | "yield_factor":
            yield from _strength(evidence, limit)
        case "frequency":
            yield from _modes(evidence, "", evidence.solid.vibration)
        case "buckling_factor":
            for case in limit.cases or [study.case for study in evidence.ctx.part.buckling]:
                yield from _buckling(evidence, case, limit)


def _vector(table: Table, case: str, place: str, quantity: Quantity) -> np.ndarray | None:
    keys = [FigureKey(case, place, quantity, c) for c in "xyz"]
    return np.array([table[k].value for k in keys]) if all(k in table for k in keys) else None


def _pick(vector: np.ndarray, component: str) -> float:
    return float(vector["xyz".index(component)]) if component else float(np.linalg.norm(vector))


def _motion(evidence: Evidence, limit: Limit, quantity: Quantity) -> Iterator[Found]:
    for case in evidence.cases(limit):
        for place in evidence.places.get(quantity, []) if not limit.at else [limit.at]:
            vector = _vector(evidence.solid_table, case, place, quantity)
            if vector is not None:
                bad = evidence.suspicious(case, (quantity,), place)
                yield Found(_pick(vector, limit.component), case, place,
                            f"the two models disagree on the {quantity} at {place}" if bad else "")


def _relative(evidence: Evidence, limit: Limit) -> Iterator[Found]:
    for case in evidence.cases(limit):
        a = _vector(evidence.solid_table, case, limit.at, "displacement")
        b = _vector(evidence.solid_table, case, limit.relative_to, "displacement")
        if a is not None and b is not None:
            bad = [p for p in (limit.at, limit.relative_to) if evidence.suspicious(case, ("displacement",), p)]
            yield Found(_pick(a - b, limit.component), case, f"{limit.at} against {limit.relative_to}",
                        f"the two models disagree on the displacement at {bad[0]}" if bad else "")


def _reactions(evidence: Evidence, limit: Limit) -> Iterator[Found]:
    for case in evidence.cases(limit):
        for support in [limit.at] if limit.at else [s.name for s in evidence.ctx.part.supports]:
            vector = _vector(evidence.solid_table, case, support, "reaction_force")
            if vector is not None:
                bad = evidence.suspicious(case, ("reaction_force", "reaction_moment"), support)
                yield Found(_pick(vector, limit.component), case, support,
                            "the two models disagree on this reaction" if bad else "")


def _strength(evidence: Evidence, limit: Limit) -> Iterator[Found]:
    strength = evidence.ctx.part.material.yield_strength
    for case in evidence.cases(limit):
        stresses = {"nominal": _nominal, "edge": _edge, "local": _local}[limit.basis](evidence, case)
        for stress in stresses:
            if limit.quantity == "stress":
                yield stress
            elif strength is not None and stress.value > 0:
                yield Found(strength / stress.value, stress.case, stress.place, stress.doubt)


def _nominal(evidence: Evidence, case: str) -> Iterator[Found]:
    for figure in evidence.nominal.get(case, ()):
        key = figure.key
        bad = evidence.suspicious(case, ("nominal_stress",), key.place)
        yield Found(abs(figure.value), case, f"{key.place} {key.component.partition('@')[2]}",
                    f"the two models disagree on the stress at {key.place}" if bad else "")


def _local(evidence: Evidence, case: str) -> Iterator[Found]:
    for peak in evidence.solid.peaks:
        if peak.case == case:
            doubt = "" if peak.converged else f"highest stress at a place with no converged value: {peak.reason}"
            yield Found(peak.value, case, place_text(peak.regions, peak.position), doubt)


def _edge(evidence: Evidence, case: str) -> Iterator[Found]:
    stress = {s.case: s for s in evidence.solid.case_stress}[case]
    bad = evidence.suspicious(case, ("nominal_stress", "notch_stress"), "")
    doubt = "the two models disagree on a stress of this case" if bad else ""
    best = [p for p in evidence.solid.peaks if p.case == case and p.converged]
    where = place_text(best[0].regions, best[0].position) if best else "away from held edges"
    yield Found(stress.established, case, where, doubt)
    for zone in evidence.ctx.held_zones:
        if axle_near(evidence.ctx, case, zone):
            yield from _beside(evidence, case, zone, doubt)
            continue
        value, why_not = extrapolated(evidence.ctx, evidence.solid, case, zone)
        where = f"outer fibre, extrapolated to {zone.what}"
        yield Found(value, case, where, why_not or doubt)


def _beside(evidence: Evidence, case: str, zone: Zone, doubt: str) -> Iterator[Found]:
    """The beam's nominal stress at the stations about a held stretch, where an axle leaves no room to extrapolate."""
    step = evidence.ctx.length / 20.0 * (1.0 + 1e-6)
    near = [f for f in evidence.nominal.get(case, ()) if zone.distance(float(f.key.place.partition("@")[2])) <= step]
    if not near:
        yield Found(0.0, case, zone.what, f"an axle stands too near {zone.what} to extrapolate to its edge")
    for figure in near:
        yield Found(abs(figure.value), case, f"{figure.key.place} {figure.key.component.partition('@')[2]}, beam "
                    f"formula (an axle stands near {zone.what})", doubt)


def _modes(evidence: Evidence, case: str, modes: Sequence[Mode]) -> Iterator[Found]:
    """The values of the solid's modes; the place names the shape."""
    suspects = {p.key.component for p in evidence.pairs if p.judgement == "suspicious" and p.key.case == case
                and p.key.quantity in ("natural_frequency", "buckling_factor")}
    # A shape of the beam that the solid lacks may be the lowest of all, missed: nothing is established then.
    missed = [name for name in sorted(suspects) if name.startswith("beam")]
    for number, mode in enumerate(modes, 1):
        doubt = f"the two models disagree on mode {number}" if f"mode {number}" in suspects else ""
        doubt = f"the solid model has no shape like {missed[0]}" if missed else doubt
        yield Found(mode.value, case, f"mode {number}, {mode.kind}", doubt)


def _buckling(evidence: Evidence, case: str, limit: Limit) -> Iterator[Found]:
    """The positive factors; where there is none, how far the solid model has looked for one decides."""
    found = list(_modes(evidence, case, [m for m in evidence.solid.buckling if m.case == case]))
    positive = [one for one in found if one.value > 0.0]
    yield from positive
    if found and not positive:
        looked = any(check.name == none_of_other_sign(case) for check in evidence.solid.checks)
        reach = OTHER_SIGN * min(abs(one.value) for one in found) if looked else 0.0
        doubt = "" if limit.value <= reach else f"case {case}: none of its {len(found)} factors is positive"
        if doubt and looked:
            doubt += f", and none was looked for beyond {reach:.4g}"
        doubt = next((one.doubt for one in found if one.doubt), doubt)
        yield Found(np.inf, case, f"no positive factor up to {reach:.4g}" if looked else "", doubt)


def place_text(regions: Sequence[str], position: Sequence[float]) -> str:
    """Regions that meet at a point and its coordinates, for a person."""
    spot = ", ".join(f"{round(c, 6) + 0.0:.4g}" for c in position)
    return f"{' / '.join(regions)} ({spot}) mm" if regions else f"({spot}) mm"
