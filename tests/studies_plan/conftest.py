"""Plans on the demo part, from a few lines of text."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from geometry.problem import Problem, SpecError
from studies.vary.plan import Plan, plan_from_text

EXAMPLES = Path(__file__).parents[2] / "studies" / "examples"
HEAD = 'part = "camera_arm.toml"\n'


@pytest.fixture(scope="session")
def examples() -> Path:
    """Folder of the demo parts."""
    return EXAMPLES


@pytest.fixture
def plan() -> Callable[..., Plan]:
    """The plan on the camera arm that a text describes."""
    return lambda text, **more: plan_from_text(HEAD + text, EXAMPLES, "arm_plan.toml", **more)


@pytest.fixture
def problems(plan: Callable[..., Plan]) -> Callable[..., tuple[Problem, ...]]:
    """What is found wrong with a plan on the camera arm."""

    def found(text: str, **more: object) -> tuple[Problem, ...]:
        try:
            plan(text, **more)
        except SpecError as error:
            return error.problems
        return ()

    return found
