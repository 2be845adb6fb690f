"""Natural frequencies and buckling factors of both models, side by side.

The beam knows only shapes in which every section keeps its own. Which of the solid's shapes are such, and which of the
beam's they are, is told by the motion of the sections; only then are two values compared.
"""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Iterator, Mapping, Sequence
from typing import Literal

import numpy as np

from fem.beam import BeamResult
from fem.beam.modes.buckling import LARGEST_FACTOR
from fem.beam.result import Cause as Predicted
from fem.figure import FigureKey, Quantity
from fem.mode import Mode
from fem.solid import SolidResult
from studies.check.result import Cause, Pair, Reason
from studies.check.studied import ModePair
from studies.check.words import JudgementWord
from studies.judge.bands import CaseFacts
from studies.judge.context import Context
from studies.judge.mode_bands import WARPING_HELD, ModeFacts, flat_of, mode_reasons, motions, twist_of, waves_of
from studies.judge.mode_pairs import Match, match

Study = Literal["vibration", "buckling"]

ALIKE = 0.8
"""Least correlation of two shapes whose values are compared: a little under the 0.9 that common practice in modal
testing calls well correlated (no source)."""

WALLS = 0.7
"""Share of a shape that rigid sections explain, below which walls move so much by themselves that beam theory says
nothing (set by trial)."""

NONSENSE = 0.3
"""Root mean square of the strain at a factor from which either model may have left it out as no buckling (they do from
about 1 on, each by its own measure; the margin is set by trial)."""

OUTSIDE = "outside the beam model: a wall moves or buckles by itself"


def judge_modes(ctx: Context, solid: SolidResult, beam: BeamResult, facts: Mapping[str, CaseFacts],
                thin: tuple[bool, bool]) -> tuple[tuple[Pair, ...], tuple[ModePair, ...]]:
    """The pairs of values and what is known of their shapes, vibration first, then the buckling studies as declared.

    `thin`: whether the part is thin-walled, and open besides (`CaseFacts`).
    """
    found: list[tuple[Pair, ModePair]] = []
    if ctx.part.vibration is not None:
        lists = _Lists(ctx, "vibration", "", solid.vibration, beam.vibration, beam.causes, thin)
        found += lists.judged()
    for study in ctx.part.buckling:
        ours, theirs = ([m for m in modes if m.case == study.case] for modes in (solid.buckling, beam.buckling))
        acting = facts[study.case].acting if study.case in facts else frozenset[str]()
        strain = 0.0 if study.fixed else _strain(ctx, solid, study.case)
        lists = _Lists(ctx, "buckling", study.case, ours, theirs, beam.causes, thin, acting, strain)
        found += ((pair, dataclasses.replace(mode, fixed=study.fixed)) for pair, mode in lists.judged())
    return tuple(pair for pair, _ in found), tuple(mode for _, mode in found)


def _strain(ctx: Context, solid: SolidResult, case: str) -> float:
    """Root mean square of the strain in a case, from the strain energy of the solid."""
    energy = next((f.value for f in solid.figures if f.key.case == case and f.key.quantity == "strain_energy"), 0.0)
    return math.sqrt(max(2.0 * energy / (ctx.part.material.E * ctx.mesh.volume), 0.0))


@dataclasses.dataclass(frozen=True)
class _Lists:
    """The modes of one study in both models. `strain`: of the loads with factor 1, 0 where it is not known."""

    ctx: Context
    study: Study
    case: str
    solid: Sequence[Mode]
    beam: Sequence[Mode]
    causes: Sequence[Predicted]
    thin: tuple[bool, bool]
    acting: frozenset[str] = frozenset()
    strain: float = 0.0

    def judged(self) -> Iterator[tuple[Pair, ModePair]]:
        """Everything about the two lists."""
        moves = [np.array([motions(self.ctx, m) for m in modes]) for modes in (self.solid, self.beam)]
        values = [[m.value for m in modes] for modes in (self.solid, self.beam)]
        for found in match(moves[0], moves[1], values[0], values[1]):
            shapes = [moves[k][index] for k, index in enumerate((found.solid, found.beam)) if index is not None]
            facts = ModeFacts(self.study, min(map(waves_of, shapes)), min(map(twist_of, shapes)), *self.thin,
                              self.acting, min(flat_of(self.ctx, shape) for shape in shapes))
            yield self._one(found, facts)

    def _predicted(self, number: int | None) -> list[Predicted]:
        """What the beam model predicts for one of its modes."""
        if number is None:
            return []
        wanted = (self.case, _quantity(self.study), f"mode {number + 1}")
        return [c for c in self.causes if (c.case, c.quantity, c.component) == wanted]

    def _one(self, found: Match, facts: ModeFacts) -> tuple[Pair, ModePair]:
        key = _key(self.study, self.case, found)
        solid = self.solid[found.solid] if found.solid is not None else None
        beam = self.beam[found.beam] if found.beam is not None else None
        ours, theirs = (m.value if m is not None else None for m in (solid, beam))
        unit = "Hz" if self.study == "vibration" else ""
        scale = max(abs(v) for v in (ours, theirs) if v is not None)
        causes = self._predicted(found.beam)
        expected = sum(c.difference for c in causes)
        warping = any("warping" in c.text for c in causes)
        why = tuple(Reason(s.text, s.fraction * scale) for s in mode_reasons(self.ctx, facts)
                    if not (warping and s.text == WARPING_HELD))
        band = sum(r.size for r in why)
        why += tuple(Reason(f"what is left open by: {c.text}", c.band) for c in causes if c.band > 0.0)
        word, look = self._word(found, band, expected, sum(c.band for c in causes))
        difference = None
        if ours is not None and theirs is not None:
            difference = ours - theirs
        if word not in ("agrees", "explained", "suspicious") or difference is None:
            why, causes = (), []
        signed = tuple(Cause(c.text, c.difference) for c in causes if c.difference)
        pair = Pair(key, ours, theirs, unit, difference, scale, sum(r.size for r in why), signed, word, look, why)
        shares = tuple(map(float, solid.mass_share)) if solid is not None and self.study == "vibration" else ()
        mode = ModePair(key, ours, theirs, unit, solid.kind if solid else "", beam.kind if beam else "",
                        found.correlation, solid.section_share if solid else None, shares,
                        solid.residual if solid else None, word)
        return pair, mode

    def _word(self, found: Match, band: float, expected: float, left_open: float) -> tuple[JudgementWord, str]:
        """The judgement, and why or where to look. `band`, what is `expected` and what this leaves open: in the unit
        of the values. What a cause leaves open counts only together with what it predicts."""
        if found.solid is None:
            assert found.beam is not None
            return self._beam_alone(self.beam[found.beam], band + left_open, expected)
        solid = self.solid[found.solid]
        walls = solid.kind == "local" or solid.section_share < WALLS
        if walls:
            more = f" (rigid sections explain {100 * solid.section_share:.0f} % of the shape)"
            return "no beam value", OUTSIDE + (more if found.beam is not None else "")
        if found.beam is None:
            return self._solid_alone(solid, band)
        beam = self.beam[found.beam]
        assert found.correlation is not None
        if found.correlation < ALIKE:
            return "suspicious", (f"the shapes are alike to {found.correlation:.2f} only ({solid.kind} and "
                                  f"{beam.kind}); look at: supports, the carried masses, the section's shear centre")
        difference, allowed = solid.value - beam.value, band + 1e-9 * abs(beam.value)
        if abs(difference) <= allowed:
            return "agrees", ""
        if expected and abs(difference - expected) <= allowed + left_open:
            return "explained", ""
        hint = "supports (held more or less than meant?), density and carried masses" if beam.case == "" else \
            "supports (held more or less than meant?), the load and where it acts"
        return "suspicious", (f"solid is {solid.value / beam.value:.3g} times the beam; look at: {hint}, "
                              "section dimensions")

    def _nonsense(self, value: float) -> str:
        strain = abs(value) * self.strain
        if strain <= NONSENSE:
            return ""
        return f"no buckling: the strain at that factor would be {100 * strain:.0f} %"

    def _beam_alone(self, beam: Mode, band: float, expected: float) -> tuple[JudgementWord, str]:
        nonsense = self._nonsense(beam.value)
        if nonsense:
            return "no beam value", nonsense
        end = max((abs(m.value) for m in self.solid), default=0.0)
        if end == 0.0:
            return "suspicious", "the solid model gave no mode at all; look at: supports, the loads of the case"
        if abs(beam.value + expected) >= end - band:
            return "no beam value", "the list of the solid model ends before it"
        return "suspicious", (f"the solid model has no such shape ({beam.kind}); look at: supports, density or loads, "
                              "the section's dimensions")

    def _solid_alone(self, solid: Mode, band: float) -> tuple[JudgementWord, str]:
        nonsense = self._nonsense(solid.value)
        if nonsense:
            return "no beam value", nonsense
        if self.study == "buckling" and abs(solid.value) > LARGEST_FACTOR:
            return "no beam value", f"the beam model leaves factors beyond {LARGEST_FACTOR:g} out"
        end = max((abs(m.value) for m in self.beam), default=0.0)
        if abs(solid.value) >= end - band:
            return "no beam value", f"the beam model gives {'none' if end == 0.0 else 'no more'}"
        return "suspicious", (f"the beam model has no such shape ({solid.kind}); look at: supports, the carried "
                              "masses, a part that is weak between two cuts")


def _quantity(study: Study) -> Quantity:
    return "natural_frequency" if study == "vibration" else "buckling_factor"


def _key(study: Study, case: str, found: Match) -> FigureKey:
    number = f"mode {found.solid + 1}" if found.solid is not None else f"beam mode {(found.beam or 0) + 1}"
    return FigureKey(case, "", _quantity(study), number)
