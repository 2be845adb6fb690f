"""The small study, for every test of the record."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType, SimpleNamespace

import pytest


def _loaded(name: str) -> ModuleType:
    """A module beside this file: no folder of tests is imported by name."""
    found = importlib.util.spec_from_file_location(f"record_{name}", Path(__file__).parent / f"{name}.py")
    sys.modules[found.name] = module = importlib.util.module_from_spec(found)
    found.loader.exec_module(module)
    return module


@pytest.fixture
def study() -> SimpleNamespace:
    made = _loaded("small_study")
    return SimpleNamespace(plan=made.P, variant=made.variant, outcome=made.outcome, key_of=made.key_of,
                           in_child=made.in_child)
