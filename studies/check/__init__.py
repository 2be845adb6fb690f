"""One checked run: both models of one part, compared and written to a run folder.

Public names: `CheckResult` and the records it is made of. `studies.check.run.check` makes one; it is not
imported here because it loads both models.
"""

from studies.check.result import (
    CaseStress,
    Cause,
    CheckResult,
    Denting,
    IndependentCheck,
    LimitVerdict,
    MeshSummary,
    Pair,
    PeakPlace,
    Stage,
)
from studies.check.studied import ModePair, Peak, SolverSummary, TravelEnvelope, TravelSummary

__all__ = [
    "CaseStress", "Cause", "CheckResult", "Denting", "IndependentCheck", "LimitVerdict", "MeshSummary", "ModePair",
    "Pair", "Peak", "PeakPlace", "SolverSummary", "Stage", "TravelEnvelope", "TravelSummary",
]  # fmt: skip
