"""Natural frequencies and buckling factors of both models, side by side.

The beam knows only shapes in which every section keeps its own. Which of the solid's shapes are such, and which of the
beam's they are, is told by the motion of the sections; only then are two values compared.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator, Mapping, Sequence
from typing import Literal

import numpy as np

from fem.beam import BeamResult
from fem.figure import FigureKey
from fem.mode import Mode
from fem.solid import SolidResult
from studies.check.result import Pair, Reason
from studies.check.studied import ModePair
from studies.check.words import JudgementWord
from studies.judge.bands import CaseFacts
from studies.judge.context import Context
from studies.judge.mode_bands import ModeFacts, mode_reasons, motions, twist_of, waves_of
from studies.judge.mode_pairs import Match, match

Study = Literal["vibration", "buckling"]

ALIKE = 0.8
"""Least correlation of two shapes whose values are compared: a little under the 0.9 that common practice in modal
testing calls well correlated (no source)."""

WALLS = 0.7
"""Share of a shape that rigid sections explain, below which walls move so much by themselves that beam theory says
nothing (set by trial)."""

OUTSIDE = "outside the beam model: a wall moves or buckles by itself"


def judge_modes(ctx: Context, solid: SolidResult, beam: BeamResult, facts: Mapping[str, CaseFacts],
                thin: tuple[bool, bool]) -> tuple[tuple[Pair, ...], tuple[ModePair, ...]]:
    """The pairs of values and what is known of their shapes, vibration first, then the buckling studies as declared.

    `thin`: whether the part is thin-walled, and open besides (`CaseFacts`).
    """
    found: list[tuple[Pair, ModePair]] = []
    if ctx.part.vibration is not None:
        found += _study(ctx, "vibration", "", solid.vibration, beam.vibration, thin, frozenset())
    for study in ctx.part.buckling:
        ours, theirs = ([m for m in modes if m.case == study.case] for modes in (solid.buckling, beam.buckling))
        acting = facts[study.case].acting if study.case in facts else frozenset[str]()
        found += ((pair, dataclasses.replace(mode, fixed=study.fixed))
                  for pair, mode in _study(ctx, "buckling", study.case, ours, theirs, thin, acting))
    return tuple(pair for pair, _ in found), tuple(mode for _, mode in found)


def _study(ctx: Context, study: Study, case: str, solid: Sequence[Mode], beam: Sequence[Mode],
           thin: tuple[bool, bool], acting: frozenset[str]) -> Iterator[tuple[Pair, ModePair]]:
    """Everything about one list of modes of each model."""
    moves = [np.array([motions(ctx, m) for m in modes]) for modes in (solid, beam)]
    values = [[m.value for m in modes] for modes in (solid, beam)]
    for found in match(moves[0], moves[1], values[0], values[1]):
        ours = solid[found.solid] if found.solid is not None else None
        theirs = beam[found.beam] if found.beam is not None else None
        shapes = [moves[k][index] for k, index in enumerate((found.solid, found.beam)) if index is not None]
        facts = ModeFacts(study, min(map(waves_of, shapes)), min(map(twist_of, shapes)), *thin, acting)
        ends = [max(map(abs, v), default=0.0) for v in values]
        yield _one(ctx, _key(study, case, found), found, ours, theirs, facts, ends)


def _key(study: Study, case: str, found: Match) -> FigureKey:
    number = f"mode {found.solid + 1}" if found.solid is not None else f"beam mode {(found.beam or 0) + 1}"
    return FigureKey(case, "", "natural_frequency" if study == "vibration" else "buckling_factor", number)


def _one(ctx: Context, key: FigureKey, found: Match, solid: Mode | None, beam: Mode | None, facts: ModeFacts,
         ends: Sequence[float]) -> tuple[Pair, ModePair]:
    unit = "Hz" if facts.study == "vibration" else "1"
    ours, theirs = (mode.value if mode is not None else None for mode in (solid, beam))
    scale = max(abs(v) for v in (ours, theirs) if v is not None)
    shares = mode_reasons(ctx, facts)
    word, look = _word(found, solid, beam, sum(s.fraction for s in shares), ends)
    compared = word in ("agrees", "suspicious") and ours is not None and theirs is not None
    why = tuple(Reason(s.text, s.fraction * scale) for s in shares) if compared else ()
    difference = ours - theirs if ours is not None and theirs is not None else None
    pair = Pair(key, ours, theirs, unit, difference, scale, sum(r.size for r in why), (), word, look, why)
    shares_of_mass = tuple(map(float, solid.mass_share)) if solid is not None and facts.study == "vibration" else ()
    mode = ModePair(key, ours, theirs, unit, solid.kind if solid else "", beam.kind if beam else "", found.correlation,
                    solid.section_share if solid else None, shares_of_mass, solid.residual if solid else None, word)
    return pair, mode


def _word(found: Match, solid: Mode | None, beam: Mode | None, band: float,
          ends: Sequence[float]) -> tuple[JudgementWord, str]:
    """The judgement, and why or where to look. `ends`: largest size of the values in either list."""
    if solid is None:
        assert beam is not None
        if ends[0] == 0.0:
            return "suspicious", "the solid model gave no mode at all; look at: supports, the loads of the case"
        if abs(beam.value) >= ends[0] * (1.0 - band):
            return "no beam value", "the list of the solid model ends before it"
        return "suspicious", (f"the solid model has no such shape ({beam.kind}); look at: supports, density or loads, "
                              "the section's dimensions")
    walls = solid.kind == "local" or solid.section_share < WALLS
    if beam is None:
        if walls:
            return "no beam value", OUTSIDE
        if abs(solid.value) >= ends[1] * (1.0 - band):
            return "no beam value", f"the beam model gives {'none' if ends[1] == 0.0 else 'no more'}"
        return "suspicious", (f"the beam model has no such shape ({solid.kind}); look at: supports, the carried "
                              "masses, a part that is weak between two cuts")
    if walls:
        return "no beam value", f"{OUTSIDE} (rigid sections explain {100 * solid.section_share:.0f} % of the shape)"
    assert found.correlation is not None
    if found.correlation < ALIKE:
        return "suspicious", (f"the shapes are alike to {found.correlation:.2f} only ({solid.kind} and {beam.kind}); "
                              "look at: supports, the carried masses, the section's shear centre")
    if abs(solid.value - beam.value) <= (band + 1e-9) * max(abs(solid.value), abs(beam.value)):
        return "agrees", ""
    hint = "supports (held more or less than meant?), density and carried masses" if beam.case == "" else \
        "supports (held more or less than meant?), the load and where it acts"
    return "suspicious", f"solid is {solid.value / beam.value:.3g} times the beam; look at: {hint}, section dimensions"
