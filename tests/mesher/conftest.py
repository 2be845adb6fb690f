"""Solids and meshes shared by the mesher's tests; each is made once."""

from __future__ import annotations

import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import pytest

from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from mesher import NamedMesh, mesh_solid


@pytest.fixture(scope="session")
def solids() -> ModuleType:
    """The module `solids.py` beside this file (it loads CadQuery)."""
    spec = importlib.util.spec_from_file_location("mesher_test_solids", Path(__file__).parent / "solids.py")
    assert spec is not None and spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="session")
def budget() -> Budget:
    return Budget(threads=1, memory=4096, seconds=60.0)


@pytest.fixture(scope="session")
def bar(solids: ModuleType) -> NamedSolid:
    return solids.bar()


@pytest.fixture(scope="session")
def bar_mesh(bar: NamedSolid, budget: Budget) -> NamedMesh:
    return mesh_solid(bar, 0.05, budget)


@pytest.fixture(scope="session")
def plate(solids: ModuleType) -> NamedSolid:
    return solids.plate_with_hole()


@pytest.fixture(scope="session")
def plate_mesh(plate: NamedSolid, budget: Budget) -> NamedMesh:
    return mesh_solid(plate, 0.05, budget)


@pytest.fixture(scope="session")
def rod_mesh(solids: ModuleType, budget: Budget) -> NamedMesh:
    return mesh_solid(solids.round_bar(length=60.0), 0.05, budget)
