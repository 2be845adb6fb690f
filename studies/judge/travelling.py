"""The positions of a travelling load together: envelopes of each model's figures, and what is kept of each position.

A position is a case like any other to both models and to the judge; here the greatest and least value of each figure
over the positions are picked out, from either model's own values.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence

from fem.figure import FigureKey
from fem.solid import SolidResult
from geometry.part import Case, Part, StripLoad
from studies.check.result import Pair
from studies.check.studied import Peak, TravelEnvelope, TravelSummary
from studies.check.words import JudgementWord

WORST_FIRST: tuple[JudgementWord, ...] = ("suspicious", "explained", "agrees", "load check", "no beam value")


def travel_cases(part: Part) -> dict[str, list[Case]]:
    """The cases that stand for positions, by the declared case."""
    found: dict[str, list[Case]] = {}
    for case in part.cases:
        if case.travel is not None:
            found.setdefault(case.travel.case, []).append(case)
    return found


def summaries(part: Part, solid: SolidResult) -> tuple[TravelSummary, ...]:
    """What travels, where, and the position of the largest converged stress of the solid (the first of equal ones)."""
    strips = {load.name: load for load in part.loads if isinstance(load, StripLoad)}
    stress = {s.case: s.established for s in solid.case_stress}
    found = []
    for declared, cases in travel_cases(part).items():
        at = {case.name: case.travel.position for case in cases if case.travel}
        first = cases[0]
        assert first.travel is not None
        strip = next(strips[name] for name in first.factors if name in strips)
        governing = max(cases, key=lambda case: float(f"{stress.get(case.name, 0.0):.3e}"))
        axles = tuple(x - first.travel.position for x in strip.centres)
        found.append(TravelSummary(declared, first.travel.load, strip.on, tuple(at.values()), axles, strip.length,
                                   at[governing.name]))
    return tuple(found)


def envelopes(part: Part, pairs: Sequence[Pair]) -> tuple[TravelEnvelope, ...]:
    """One row for each figure of each declared case with a travelling load."""
    positions = {case.name: case.travel for case in part.cases if case.travel}
    groups: dict[FigureKey, list[tuple[float, Pair]]] = {}
    for pair in pairs:
        travel = positions.get(pair.key.case)
        if travel is not None:
            groups.setdefault(pair.key._replace(case=travel.case), []).append((travel.position, pair))
    return tuple(_row(key, found) for key, found in groups.items())


def _row(key: FigureKey, found: Sequence[tuple[float, Pair]]) -> TravelEnvelope:
    words = Counter(pair.judgement for _, pair in found)
    word = next(w for w in WORST_FIRST if words[w])
    worst_at, _ = max(((x, pair) for x, pair in found if pair.judgement == word), key=lambda item: _use(item[1]))
    solid = [(pair.solid, x, pair.beam) for x, pair in found if pair.solid is not None]
    beam = [(pair.beam, x, pair.solid) for x, pair in found if pair.beam is not None]
    scale = max(pair.scale for _, pair in found)
    return TravelEnvelope(key, found[0][1].unit, _peak(solid, 1.0), _peak(solid, -1.0), _peak(beam, 1.0),
                          _peak(beam, -1.0), scale, word, worst_at, {str(w): count for w, count in words.items()})


def _peak(values: Sequence[tuple[float, float, float | None]], sign: float) -> Peak | None:
    """The greatest (or, with sign -1, least) value; sizes count to four digits, the first position of equal ones."""
    if not values:
        return None
    value, at, other = max(values, key=lambda item: sign * float(f"{item[0]:.3e}"))
    return Peak(value, at, other)


def _use(pair: Pair) -> float:
    """How much of its band a pair uses."""
    if pair.difference is None:
        return 0.0
    rest = abs(pair.difference - sum(cause.predicted for cause in pair.causes))
    return rest / pair.band if pair.band > 0.0 else rest


def kept(part: Part, pairs: Sequence[Pair]) -> tuple[Pair, ...]:
    """The pairs that a result holds: of the positions the suspicious ones, and of each declared case and quantity the
    explained one that uses most of its band."""
    positions: Mapping[str, str] = {case.name: case.travel.case for case in part.cases if case.travel}
    worst: dict[tuple[str, str], Pair] = {}
    for pair in pairs:
        if pair.judgement == "explained" and pair.key.case in positions:
            kind = (positions[pair.key.case], pair.key.quantity)
            if kind not in worst or _use(pair) > _use(worst[kind]):
                worst[kind] = pair
    chosen = {pair.key for pair in worst.values()}
    return tuple(p for p in pairs if p.key.case not in positions or p.judgement == "suspicious" or p.key in chosen)
