"""What became of one variant."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal, NamedTuple

from studies.check.words import JudgementWord, LimitWord

Status = Literal["finished", "failed"]


class Kept(NamedTuple):
    """One kept figure: the solid model's value, the beam model's beside it, in `unit` (None: it has none)."""

    solid: float | None
    beam: float | None
    unit: str
    judgement: JudgementWord


class Held(NamedTuple):
    """One limit held against the variant; `margin` is how much of the limit is left, as a share (negative: missed)."""

    name: str
    quantity: str
    given: float
    found: float | None
    unit: str
    verdict: LimitWord
    margin: float | None
    reason: str = ""


@dataclass(frozen=True, slots=True)
class Outcome:
    """One evaluated variant. JSON throughout.

    Attributes
    ----------
    key
        Of the variant.
    status
        ``finished``, or ``failed`` by a fault of its own; `stage` and `reason` then say where and why. A variant whose
        process was ended from outside has no outcome: it is run again.
    judgement
        Worst word of the run; empty when it failed.
    fine
        Nothing suspicious and every limit met.
    figures
        Kept figures by name (see the plan's ``keep``): ``mass``, ``deflection``, ``stress``, ``frequency`` ...
    limits
        Every limit of the part and of the plan.
    suspicions
        Why it is suspicious: the quantity and place of each such pair, checks that failed.
    safer_mesh
        The first attempt failed by itself, and this is the second one, on a safer mesh; `first_reason` says why.
    seconds
        Processor seconds of each stage: solid, mesh, beam, solve, compare, write; and ``wall``. Not part of the table
        that is compared between runs.
    """

    key: str
    status: Status
    judgement: JudgementWord | Literal[""] = ""
    fine: bool = False
    figures: Mapping[str, Kept] = field(default_factory=dict)
    limits: tuple[Held, ...] = ()
    suspicions: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    stage: str = ""
    reason: str = ""
    safer_mesh: bool = False
    first_reason: str = ""
    unknowns: int = 0
    mesh: Mapping[str, Any] = field(default_factory=dict)
    seconds: Mapping[str, float] = field(default_factory=dict)
    peak_memory: float = 0.0
    """MiB."""
    worker: str = ""

    def to_json(self) -> dict[str, Any]:
        """Plain data, for the record and for other machines."""
        import dataclasses

        plain = {name: getattr(self, name) for name in (f.name for f in dataclasses.fields(self))}
        plain["figures"] = {name: list(kept) for name, kept in self.figures.items()}
        plain["limits"] = [list(held) for held in self.limits]
        return plain

    @classmethod
    def from_json(cls, plain: Mapping[str, Any]) -> Outcome:
        """Read what `to_json` gave."""
        return cls(**{**plain, "figures": {name: Kept(*kept) for name, kept in plain["figures"].items()},
                      "limits": tuple(Held(*held) for held in plain["limits"]),
                      "suspicions": tuple(plain["suspicions"]), "cautions": tuple(plain["cautions"])})
