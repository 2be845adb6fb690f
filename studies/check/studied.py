"""Records of the parts of a result that only some specs ask for: modes, and envelopes of travelling loads."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from fem.figure import FigureKey
from studies.check.words import JudgementWord


@dataclass(frozen=True, slots=True)
class ModePair:
    """A natural vibration or a buckling shape, as both models see it.

    Attributes
    ----------
    key
        Of the pair in `CheckResult.pairs` that compares its value: quantity ``natural_frequency`` (Hz, no case) or
        ``buckling_factor`` (its case); component ``mode 1`` by the solid's order, ``beam mode 1`` of one that the
        solid does not have.
    solid, beam
        The two values; None where that model has no such shape.
    solid_kind, beam_kind
        What each model calls the shape; empty where it has none.
    correlation
        0 to 1: share of the solid's section motions that the beam's shape (of equal frequencies: their span) holds.
        Known as MAC, modal assurance criterion. None where nothing was paired.
    section_share
        Share of the solid's shape that rigid sections explain: well under 1 where a wall moves by itself.
    mass_share
        Shares of the part's mass along, and of its inertia about, global x, y, z; empty for buckling.
    residual
        Of the solid's eigenvalue problem, relative. None where the solid has no such shape.
    fixed
        Loads of a buckling case that keep their value while the others grow.
    """

    key: FigureKey
    solid: float | None
    beam: float | None
    unit: str
    solid_kind: str
    beam_kind: str
    correlation: float | None
    section_share: float | None
    mass_share: tuple[float, ...]
    residual: float | None
    judgement: JudgementWord
    fixed: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Peak:
    """The greatest or least value of a figure over the positions of a travelling load.

    `at` is the position of the load's first axle, mm from the member's start; `other` the other model's value there
    (None: it has none).
    """

    value: float
    at: float
    other: float | None


@dataclass(frozen=True, slots=True)
class TravelEnvelope:
    """One figure over all positions of a travelling load.

    Attributes
    ----------
    key
        Of the figure; its case is the one declared in the spec (``crossing``).
    solid_greatest, solid_least, beam_greatest, beam_least
        None where that model does not give the figure.
    scale
        The largest value of its kind over the positions: what is next to nothing beside it is nothing.
    judgement, worst_at
        The worst word over the positions (`words`), and the position it was given at: there the remainder is the
        largest part of its band.
    words
        How many positions were given each word.
    """

    key: FigureKey
    unit: str
    solid_greatest: Peak | None
    solid_least: Peak | None
    beam_greatest: Peak | None
    beam_least: Peak | None
    scale: float
    judgement: JudgementWord
    worst_at: float
    words: Mapping[str, int]


@dataclass(frozen=True, slots=True)
class TravelSummary:
    """A declared case with a travelling load: its positions (mm), the strips of an axle, and where it governs.

    `governing` is the position (mm) of the largest converged stress of the solid.
    """

    case: str
    load: str
    on: str
    positions: tuple[float, ...]
    axles: tuple[float, ...]
    contact: float
    governing: float


@dataclass(frozen=True, slots=True)
class SolverSummary:
    """Which solver gave the solid model's displacements, why, and how far it may be trusted.

    `residual` is the true residual over the load, and `gauge` the error with which it gives back a known bending of
    this very mesh; None where the solver did not say.
    """

    name: str
    reason: str
    residual: float | None = None
    gauge: float | None = None
