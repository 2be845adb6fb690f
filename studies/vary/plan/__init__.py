"""Plans: which variants of a part there are.

`read_plan`, `plan_from_text` and `plan_from_data` give a `Plan`, or raise `SpecError` with every mistake at once, in
the plan and in its part. `Plan.count` says how many points there are without making them; `Plan.points`,
`Plan.variants` and `Plan.variant` make them one by one. Nothing here loads a CAD or mesh kernel.
"""

from typing import Any

from studies.vary.plan.aim import Aim
from studies.vary.plan.kept import Keep, KeptFigure
from studies.vary.plan.plan import LeftOut, Plan, Run
from studies.vary.plan.read import MOST_POINTS, plan_from_data, plan_from_text, read_plan
from studies.vary.plan.sampling import Sampling
from studies.vary.plan.varied import Varied

__all__ = ["MOST_POINTS", "Aim", "Keep", "KeptFigure", "LeftOut", "Plan", "Run", "Sampling", "Varied",
           "plan_from_data", "plan_from_text", "plan_reference", "plan_schema", "read_plan"]


def plan_schema() -> dict[str, Any]:
    """JSON schema of the TOML file of a plan, for editors."""
    from studies.vary.plan.reference import plan_schema as made

    return made()


def plan_reference() -> str:
    """The reference of the plan, as Markdown."""
    from studies.vary.plan.reference import plan_reference as made

    return made()
