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

__all__ = [
    "CaseStress", "Cause", "CheckResult", "Denting", "IndependentCheck", "LimitVerdict", "MeshSummary", "Pair",
    "PeakPlace", "Stage",
]  # fmt: skip
