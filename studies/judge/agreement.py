"""The join of the two models' figures, and a judgement on each pair."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence

import numpy as np

from fem.figure import Figure, FigureKey
from geometry.part import TemperatureLoad
from studies.check.result import Cause, Pair, Reason
from studies.check.words import JudgementWord
from studies.judge.bands import CaseFacts, Share, reasons
from studies.judge.context import Context

Table = Mapping[FigureKey, Figure]

SMALL_STRESS = 1e-3
"""Of the stress of wholly denied expansion: stresses and forces this small are nothing (judgement, no source)."""

BULGE = 0.15
"""Movement of a section that a gripped, heated face a few depths away makes, over free strain times the section's
larger side; a bar 20 by 12 gripped at both ends has 0.12 (measured)."""


def table(figures: Iterable[Figure]) -> dict[FigureKey, Figure]:
    """Figures by key. Raises ValueError when one key stands twice."""
    found: dict[FigureKey, Figure] = {}
    for figure in figures:
        if figure.key in found:
            raise ValueError(f"two figures have the key {figure.key}")
        found[figure.key] = figure
    return found


def by_case(figures: Table) -> dict[str, dict[FigureKey, Figure]]:
    """The figures of each case."""
    found: dict[str, dict[FigureKey, Figure]] = {}
    for key, figure in figures.items():
        found.setdefault(key.case, {})[key] = figure
    return found


def station_of(ctx: Context, place: str) -> float | None:
    """Distance of a place from the member's start (mm), None where it is not a station."""
    name = ctx.member.name
    if place.startswith(f"{name}@"):
        return float(place.split("@", 1)[1])
    if place in (f"{name}.start", f"{name}.end"):
        return 0.0 if place.endswith("start") else ctx.length
    for p in ctx.part.places:
        if p.name == place:
            return p.at
    return None


class Scales:
    """Largest value of each kind in each case, over both models: what differences are measured against."""

    def __init__(self, ctx: Context, solid: Table, beam: Table) -> None:
        self._largest: dict[tuple[str, str], float] = {}
        for figures in (solid, beam):
            for vector in _vectors(figures):
                key, size = vector
                self._largest[key] = max(self._largest.get(key, 0.0), size)
        self._span = max(ctx.size)
        self._length = ctx.length
        self._heated(ctx)
        self._travelled(ctx)
        self._notched(ctx, beam)

    def _at_least(self, case: str, quantity: str, size: float) -> None:
        self._largest[case, quantity] = max(self._largest.get((case, quantity), 0.0), size)

    def _heated(self, ctx: Context) -> None:
        """Where a part may expand as it likes all forces are zero: what is left of them is rounding, and measured
        against a thousandth of what denied expansion would give."""
        for case in ctx.part.cases:
            stress = SMALL_STRESS * ctx.part.material.E * free_strain(ctx, case.name)
            force = stress * ctx.size[0] * ctx.size[1]
            for quantity, size in (("nominal_stress", stress), ("notch_stress", stress), ("section_force", force),
                                   ("reaction_force", force)):
                if size > 0.0:
                    self._at_least(case.name, quantity, size)
            if stress > 0.0:
                volume = ctx.size[0] * ctx.size[1] * ctx.length
                energy = stress**2 / (2.0 * ctx.part.material.E) * volume
                self._at_least(case.name, "strain_energy", energy)

    def _travelled(self, ctx: Context) -> None:
        """Beside a support the energy of bending vanishes and leaves what is local to the strip: the energy of a
        position is measured against that of the worst one."""
        positions = [case for case in ctx.part.cases if case.travel is not None]
        worst: dict[str, float] = {}
        for case in positions:
            assert case.travel is not None
            own = self._largest.get((case.name, "strain_energy"), 0.0)
            worst[case.travel.case] = max(worst.get(case.travel.case, 0.0), own)
        for case in positions:
            assert case.travel is not None
            self._at_least(case.name, "strain_energy", worst[case.travel.case])

    def _notched(self, ctx: Context, beam: Table) -> None:
        """A notch at the neutral axis has next to no stress: it is measured against the beam's stress at the outer
        fibres of the stations next to a cut or step."""
        nominal = [(key, station_of(ctx, key.place), abs(figure.value)) for key, figure in beam.items()
                   if key.quantity == "nominal_stress"]
        stations = {at for _, at, _ in nominal if at is not None}
        if stations:
            middles = [0.5 * (zone.start + zone.end) for zone in ctx.cut_zones + ctx.step_zones]
            near = {min(stations, key=lambda at, x=x: abs(at - x)) for x in middles}  # type: ignore[misc]
            for key, at, size in nominal:
                if at in near:
                    self._at_least(key.case, "notch_stress", size)

    def __call__(self, key: FigureKey) -> float:
        own = self._largest.get((key.case, key.quantity), 0.0)
        # A moment or rotation that ought to be zero is measured against what the forces or displacements
        # of the case would make of it over a short arm, so that rounding is not called a difference.
        match key.quantity:
            case "section_moment":
                return max(own, 0.1 * self._span * self._largest.get((key.case, "section_force"), 0.0))
            case "section_force":
                return max(own, self._largest.get((key.case, "section_moment"), 0.0) / self._length)
            case "reaction_moment":
                return max(own, 0.1 * self._span * self._largest.get((key.case, "reaction_force"), 0.0))
            case "reaction_force":
                return max(own, self._largest.get((key.case, "reaction_moment"), 0.0) / self._length)
            case "rotation":
                return max(own, self._largest.get((key.case, "displacement"), 0.0) / self._length)
            case "centre_of_mass":
                return self._length
            case _:
                return own


def _vectors(figures: Table) -> Iterator[tuple[tuple[str, str], float]]:
    """((case, quantity), size) of every vector at every place; scalars and stresses one by one."""
    sums: dict[tuple[str, str, str], float] = {}
    for key, figure in figures.items():
        place = key.place if "stress" not in key.quantity else f"{key.place} {key.component}"
        slot = (key.case, key.quantity, place)
        sums[slot] = sums.get(slot, 0.0) + figure.value**2
    for (case, quantity, _), total in sums.items():
        yield (case, quantity), float(np.sqrt(total))


def not_compared(ctx: Context, key: FigureKey) -> str:
    """Why two figures with this key are not expected to agree at all (empty: they are)."""
    if key.quantity == "strain_energy" and heated_and_gripped(ctx, key.case):
        return "sideways expansion denied where a face is held point by point or rigidly stores energy of its own"
    at = station_of(ctx, key.place)
    if key.quantity == "notch_stress":
        return ", ".join(ctx.pressed(key.place, key.case))
    if at is None:
        return ""
    if key.quantity in ("section_force", "section_moment"):
        inside = ctx.inside(at)
        tiny = 1e-6 * ctx.length
        at_edge = [z.what for z in ctx.held_zones + ctx.loaded_zones
                   if min(abs(z.start - at), abs(z.end - at)) < tiny and tiny < at < ctx.length - tiny]
        return ", ".join((*inside, *at_edge))
    if key.quantity == "nominal_stress":
        return ", ".join(ctx.disturbed_by(at, key.case))
    return ""


def free_strain(ctx: Context, case: str) -> float:
    """Size of the strain of free expansion in a case."""
    factors = next((c.factors for c in ctx.part.cases if c.name == case), {})
    change = sum(factors.get(load.name, 0.0) * load.change
                 for load in ctx.part.loads if isinstance(load, TemperatureLoad))
    return abs(change) * (ctx.part.material.expansion or 0.0)


def heated_and_gripped(ctx: Context, case: str) -> bool:
    """True when a temperature change acts and some support does not let its region grow sideways."""
    return free_strain(ctx, case) > 0.0 and any(s.coupling != "average" for s in ctx.part.supports)


def pair_figures(ctx: Context, solid: Table, beam: Table, facts: Mapping[str, CaseFacts],
                 causes: Mapping[FigureKey, Sequence[tuple[Cause, float]]]) -> tuple[Pair, ...]:
    """Every figure that both models give, in the solid's order, then the beam's that have no partner."""
    judging = Judging(ctx, Scales(ctx, solid, beam), facts)
    pairs = []
    for key, figure in solid.items():
        if key.quantity == "peak_stress":
            continue  # the beam has no such figure; peak places are reported by themselves
        pairs.append(judging.judged(key, figure, beam.get(key), causes.get(key, ())))
    pairs += [Pair(key, None, f.value, f.unit, None, judging.scale(key), 0.0, (), "no beam value",
                   "the solid model gives no such figure here")
              for key, f in beam.items() if key not in solid]
    return tuple(pairs)


class Judging:
    """Judges pair by pair. What pairs have in common (a case with hundreds of positions) is worked out once."""

    def __init__(self, ctx: Context, scales: Scales, facts: Mapping[str, CaseFacts]) -> None:
        self.ctx, self._scales, self._facts = ctx, scales, facts
        self._shares: dict[tuple[str, str], tuple[Share, ...]] = {}
        self._reasons: dict[tuple[str, str], tuple[Reason, ...]] = {}
        self._scale: dict[tuple[str, str], float] = {}
        self._disturbed: dict[tuple[str, str, str], str] = {}

    def scale(self, key: FigureKey) -> float:
        """What a figure of this case and quantity is measured against."""
        kind = (key.case, key.quantity)
        if kind not in self._scale:
            self._scale[kind] = self._scales(key)
        return self._scale[kind]

    def _why(self, key: FigureKey, beam: Figure) -> tuple[Reason, ...]:
        """What the band of a figure is made of, but for its causes."""
        kind, scale = (key.case, key.quantity), self.scale(key)
        if kind not in self._shares:
            facts = self._facts.get(key.case, CaseFacts(0.0, 0.0, False, False))
            self._shares[kind] = tuple(reasons(self.ctx, facts, key))
            self._reasons[kind] = tuple(Reason(s.text, s.fraction * scale) for s in self._shares[kind])
            if key.quantity in ("displacement", "rotation") and heated_and_gripped(self.ctx, key.case):
                arm = max(self.ctx.size) if key.quantity == "displacement" else 1.0
                self._reasons[kind] += (Reason("sideways expansion denied where a face is held bulges the part",
                                               BULGE * free_strain(self.ctx, key.case) * arm),)
        why = self._reasons[kind]
        if key.quantity == "notch_stress" and beam.error is not None:
            fit = abs(beam.error) if scale > 0 else 0.0
            why = (*why, Reason(f"fit of the stress concentration factor ({beam.note})", fit))
        return why

    def _not_compared(self, key: FigureKey) -> str:
        at = (key.case, key.place, key.quantity)
        if at not in self._disturbed:
            self._disturbed[at] = not_compared(self.ctx, key)
        return self._disturbed[at]

    def judged(self, key: FigureKey, solid: Figure, beam: Figure | None,
               causes: Sequence[tuple[Cause, float]]) -> Pair:
        """The pair of a solid's figure with the beam's of the same key, if there is one."""
        scale = self.scale(key)
        if beam is None:
            return Pair(key, solid.value, None, solid.unit, None, scale, 0.0, (), "no beam value", solid.note)
        difference = solid.value - beam.value
        disturbed = self._not_compared(key)
        if disturbed:
            return Pair(key, solid.value, beam.value, solid.unit, difference, scale, 0.0, (), "no beam value",
                        f"not comparable here: {disturbed}")
        why = self._why(key, beam)
        if causes:
            why += tuple(Reason(f"what is left open by: {cause.text}", left) for cause, left in causes if left > 0)
        signed = tuple(cause for cause, _ in causes if cause.predicted)
        band = sum(r.size for r in why)
        word = _word(self.ctx, key, difference, band, sum(c.predicted for c in signed), scale)
        look = look_at(key, solid.value, beam.value, self.ctx) if word == "suspicious" else ""
        return Pair(key, solid.value, beam.value, solid.unit, difference, scale, band, signed, word, look, why)


def _word(ctx: Context, key: FigureKey, difference: float, band: float, predicted: float,
          scale: float) -> JudgementWord:
    rounding = 1e-9 * scale
    if abs(difference) <= band + rounding:
        balance = key.quantity in ("section_force", "section_moment", "reaction_force", "reaction_moment")
        return "load check" if balance and ctx.determinate else "agrees"
    if predicted and abs(difference - predicted) <= band + rounding:
        return "explained"
    return "suspicious"


def look_at(key: FigureKey, solid: float, beam: float, ctx: Context) -> str:
    """One sentence: what was seen, and where such a difference usually comes from."""
    seen = f"solid is {solid / beam:.3g} times the beam" if beam else "beam has none of it"
    hints = {
        "displacement": "supports (held more or less than meant?), section turned, length or load in another unit",
        "rotation": "supports, the load's arm, the section's torsion stiffness",
        "reaction_force": "a load that acts in one model only, or a support that holds more than meant",
        "reaction_moment": "the point where a load acts; an arm in another unit",
        "section_force": "a load that acts in one model only, or a wrong direction",
        "section_moment": "the point where a load acts, and its arm",
        "nominal_stress": "section dimensions (turned by 90 degrees?), a cut near this station, a thin wall that bends",
        "notch_stress": "the cut's size and place, another feature near it, the mesh at its edge",
        "strain_energy": "loads and supports as a whole",
        "mass": "dimensions or density; a cut that one model lacks",
        "centre_of_mass": "placement of the section on the line, direction of the taper",
    }
    return f"{seen}; look at: {hints.get(key.quantity, 'the spec')}"
