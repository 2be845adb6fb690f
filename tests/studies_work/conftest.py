"""Hosts with planted faults."""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator
from pathlib import Path

import pytest

from studies.vary.work import Host

PLANTED = Path(__file__).parent / "planted"
sys.path.append(str(PLANTED))


@pytest.fixture(scope="session")
def planted_path() -> Iterator[None]:
    """Template processes find the planted modules."""
    before = os.environ.get("PYTHONPATH")
    os.environ["PYTHONPATH"] = os.pathsep.join(p for p in (str(PLANTED), before) if p)
    yield
    if before is None:
        del os.environ["PYTHONPATH"]
    else:
        os.environ["PYTHONPATH"] = before


@pytest.fixture(scope="session")
def host(planted_path: None) -> Iterator[Host]:
    """A host of two workers with the real kernels; titles and lengths plant faults."""
    with Host(2, models="planted_models", cad="planted_cad", mesh="planted_mesh") as host:
        yield host


@pytest.fixture(scope="session")
def toys(planted_path: None) -> Iterator[Host]:
    """A host of two workers without kernels."""
    with Host(2, models="toy_models", cad="toy_kernel", mesh="toy_kernel") as host:
        yield host
