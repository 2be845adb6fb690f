"""Bars, and clusters of the machine that the tests run on."""

from __future__ import annotations

import importlib.util
import sys
from collections.abc import Iterator
from pathlib import Path
from types import ModuleType

import pytest

if importlib.util.find_spec("distributed") is None:
    pytest.skip("the extra `cluster` is not installed", allow_module_level=True)
sys.path.append(str(Path(__file__).parent))
import small_cluster


@pytest.fixture(scope="session")
def small() -> ModuleType:
    """Plans of bars: ``small.py`` of the driver's tests."""
    name = "studies_cluster_small"
    if name not in sys.modules:
        spec = importlib.util.spec_from_file_location(name, Path(__file__).parents[1] / "studies_run" / "small.py")
        assert spec is not None and spec.loader is not None
        sys.modules[name] = module = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(module)
    return sys.modules[name]


@pytest.fixture(scope="module")
def bare(tmp_path_factory: pytest.TempPathFactory) -> Iterator[small_cluster.Cluster]:
    """A scheduler whose workers are the tests' own affair."""
    with small_cluster.Cluster(tmp_path_factory.mktemp("cluster")) as cluster:
        yield cluster
