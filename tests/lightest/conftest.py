"""Makes `problems` importable by the tests of this folder alone."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

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
