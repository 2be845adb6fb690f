"""`CheckResult`: everything one checked run found. It *is* ``result.json``.

Layout of ``result.json`` (version ``haunch-result/2``): one JSON object whose members are the attributes
of `CheckResult` by name, nested objects being the attributes of the dataclasses below by name. Tuples are
arrays, mappings are objects, "no value" is ``null``; there is no NaN and no infinity. A `FigureKey` is an
object ``{case, place, quantity, component, axes}``. Every value is in the unit that stands beside it
(N, mm, MPa, t, s, rad, K, Hz); section forces act on the face with outward normal +x. See `CheckResult.to_json`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from fem.figure import Figure, FigureKey
from studies.check.studied import ModePair, SolverSummary, TravelEnvelope, TravelSummary
from studies.check.words import JudgementWord, LimitWord

FORMAT = "haunch-result/2"
"""2: modes, travelling loads with their envelopes, and the solver. See `studies.check.upgrade` for older files."""


class Cause(NamedTuple):
    """A reason from the spec why the two models differ, and the signed difference it predicts.

    `predicted` is in the unit of the pair, solid minus beam.
    """

    text: str
    predicted: float


class Reason(NamedTuple):
    """A reason why the two models may differ either way, and how much of the band it makes (unit of the pair)."""

    text: str
    size: float


@dataclass(frozen=True, slots=True)
class Pair:
    """One figure from both models.

    Attributes
    ----------
    solid, beam
        The two values; None where that model has none.
    difference
        solid - beam, in `unit`; None when one of them is missing.
    scale
        What `difference` and `band` are measured against (largest value of its kind in the case), in `unit`.
    band
        Allowed remainder after the causes, in `unit`: the sum of `reasons`.
    causes
        Why a difference is expected, with its predicted signed size.
    look_at
        Where the likely slip is, for a suspicious pair.
    reasons
        What the band is made of.
    """

    key: FigureKey
    solid: float | None
    beam: float | None
    unit: str
    difference: float | None
    scale: float
    band: float
    causes: tuple[Cause, ...]
    judgement: JudgementWord
    look_at: str = ""
    reasons: tuple[Reason, ...] = ()


@dataclass(frozen=True, slots=True)
class LimitVerdict:
    """One limit of the spec, held against its worst case.

    `found` is None when it could not be established; `reason` then says why.
    """

    name: str
    quantity: str
    given: float
    found: float | None
    unit: str
    case: str
    place: str
    verdict: LimitWord
    reason: str = ""


@dataclass(frozen=True, slots=True)
class IndependentCheck:
    """A check that needs only one model, or that holds it against something else (balance, volume, slices)."""

    name: str
    value: float
    allowed: float
    ok: bool
    text: str


@dataclass(frozen=True, slots=True)
class PeakPlace:
    """A place where the solid model's von Mises stress has a local maximum.

    Attributes
    ----------
    kind
        ``surface``, ``support``, ``load`` or ``sharp`` (a re-entrant corner).
    point
        Global, mm.
    stress, error
        Von Mises stress and its stated error (None: not stated), MPa.
    has_limit
        False where the stress has no converged value (a sharp corner, the rim of a support); `text` says why.
    """

    case: str
    place: str
    kind: str
    point: tuple[float, float, float]
    stress: float
    error: float | None
    has_limit: bool
    text: str = ""


@dataclass(frozen=True, slots=True)
class CaseStress:
    """Largest von Mises stress of the solid (MPa) and factor against first yield in one case.

    `established` looks only where the stress has a converged value, `everywhere` at all places. The factors
    are None where the material has no yield strength or there is no stress.
    """

    case: str
    established: float
    everywhere: float
    yield_factor_established: float | None
    yield_factor_everywhere: float | None


@dataclass(frozen=True, slots=True)
class Denting:
    """Largest displacement (mm) of a loaded region relative to the section behind it: local, not of the beam."""

    case: str
    region: str
    value: float


@dataclass(frozen=True, slots=True)
class Stage:
    """One stage of the run and the wall-clock seconds that it took."""

    name: str
    seconds: float


@dataclass(frozen=True, slots=True)
class MeshSummary:
    """The mesh in numbers; replaying `recipe` gives it again."""

    nodes: int
    tets: int
    unknowns: int
    least_quality: float
    volume: float
    """mm^3"""
    recipe: Mapping[str, Any] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class CheckResult:
    """One checked run.

    Attributes
    ----------
    title, spec_text, parameters
        From the part; the text is the spec as it was written; `parameters` in N, mm, MPa, t, s, rad, K.
    spec_name
        File name of the spec, without folders.
    accuracy
        Requested relative accuracy. Requested only: the run does not verify it.
    material
        Name and numbers of the material.
    cases
        Factor of each load, by case as declared.
    solid_figures, beam_figures
        Every figure of each model in the cases whose loads stand still.
    pairs, limits, checks, peaks, cautions
        What the judge made of them. `cautions` are sentences. Of the positions of a travelling load (cases such as
        ``crossing@350``) there are the suspicious pairs, and of each kind of figure the explained one that uses most
        of its band; peaks, denting and stress at the position that governs.
    case_stress, denting
        What only the solid model gives.
    started
        UTC, ISO 8601, seconds.
    notes
        What the beam model does not give, and why. Sentences.
    files
        Names of the files of the run folder.
    modes
        Natural vibrations and buckling shapes.
    travels, envelopes
        The declared cases with a travelling load, and the extremes of each of their figures over the positions.
    solver
        Of the solid model; None in files of runs before it was told.
    """

    title: str
    spec_name: str
    spec_text: str
    parameters: Mapping[str, float]
    accuracy: float
    material: Mapping[str, Any]
    cases: Mapping[str, Mapping[str, float]]
    solid_figures: tuple[Figure, ...]
    beam_figures: tuple[Figure, ...]
    pairs: tuple[Pair, ...]
    limits: tuple[LimitVerdict, ...]
    checks: tuple[IndependentCheck, ...]
    peaks: tuple[PeakPlace, ...]
    case_stress: tuple[CaseStress, ...]
    denting: tuple[Denting, ...]
    cautions: tuple[str, ...]
    mesh: MeshSummary
    stages: tuple[Stage, ...]
    versions: Mapping[str, str]
    started: str
    notes: tuple[str, ...] = ()
    files: tuple[str, ...] = ()
    modes: tuple[ModePair, ...] = ()
    travels: tuple[TravelSummary, ...] = ()
    envelopes: tuple[TravelEnvelope, ...] = ()
    solver: SolverSummary | None = None
    format: str = FORMAT

    @property
    def judgement(self) -> JudgementWord:
        """The worst word of the pairs and checks: ``suspicious``, ``explained`` or ``agrees``."""
        words = {pair.judgement for pair in self.pairs} | {row.judgement for row in self.envelopes}
        if "suspicious" in words or not all(check.ok for check in self.checks):
            return "suspicious"
        return "explained" if "explained" in words else "agrees"

    @property
    def fine(self) -> bool:
        """True when nothing is suspicious and every limit is met."""
        return self.judgement != "suspicious" and all(limit.verdict == "met" for limit in self.limits)

    def to_json(self) -> str:
        """JSON text, keys in the order of the attributes. Raises `RunError` (write) on NaN or infinity."""
        from studies.check.codec import dumps

        return dumps(self)

    @classmethod
    def from_json(cls, text: str) -> CheckResult:
        """Read what `to_json` wrote. Raises `ResultFormatError` on another or newer version, or a wrong layout."""
        from studies.check.codec import loads

        return loads(text)
