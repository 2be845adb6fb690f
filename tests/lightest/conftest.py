"""The problems, and searches of them that several tests look at."""

from __future__ import annotations

import importlib.util
import sys
from collections.abc import Callable
from functools import cache
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest


@pytest.fixture(scope="session")
def problems() -> ModuleType:
    """The problems of ``problems.py``."""
    name = "lightest_problems"
    if name not in sys.modules:
        spec = importlib.util.spec_from_file_location(name, Path(__file__).with_name("problems.py"))
        assert spec is not None and spec.loader is not None
        sys.modules[name] = module = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(module)
    return sys.modules[name]


@pytest.fixture(scope="session")
def searched(problems: ModuleType) -> Callable[[str, int], tuple[Any, Any, Any]]:
    """(problem, evaluator, found) of a search of a named problem with a seed; each is made once."""

    @cache
    def make(name: str, seed: int) -> tuple[Any, Any, Any]:
        from studies.lightest import search

        problem = problems.PROBLEMS[name]()
        evaluator = problem.evaluator()
        found = search(problem.space, evaluator, 60, seed)
        assert len(evaluator.solves) == len(found.solved) <= 60
        return problem, evaluator, found

    return make
