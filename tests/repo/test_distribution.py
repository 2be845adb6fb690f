"""The wheel holds the four packages, whole, with the examples, and nothing else."""

from __future__ import annotations

import shutil
import subprocess
import sys
import zipfile
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
PACKAGES = ("geometry", "mesher", "fem", "studies")


@pytest.fixture(scope="module")
def names(tmp_path_factory: pytest.TempPathFactory) -> set[str]:
    """Names of the files in a wheel that is built from a copy of the tree, without the network."""
    source, wheels = tmp_path_factory.mktemp("source"), tmp_path_factory.mktemp("wheels")
    for name in (*PACKAGES, "tests"):
        shutil.copytree(ROOT / name, source / name, ignore=shutil.ignore_patterns("__pycache__"))
    for name in ("pyproject.toml", "README.md", "LICENSE"):
        shutil.copy(ROOT / name, source)
    code = f"from setuptools import build_meta; print(build_meta.build_wheel({str(wheels)!r}))"
    outcome = subprocess.run(
        [sys.executable, "-c", code], cwd=source, capture_output=True, text=True, timeout=120, check=False
    )
    assert outcome.returncode == 0, outcome.stderr
    (wheel,) = wheels.iterdir()
    return set(zipfile.ZipFile(wheel).namelist())


def test_every_module_and_example_is_in_it(names: set[str]) -> None:
    wanted = {str(p.relative_to(ROOT)) for name in PACKAGES for p in (ROOT / name).rglob("*.py")}
    wanted |= {str(p.relative_to(ROOT)) for p in (ROOT / "studies" / "examples").rglob("*") if p.is_file()}
    assert sorted(w for w in wanted - names if "__pycache__" not in w) == []


def test_nothing_else_is_in_it(names: set[str]) -> None:
    tops = {name.split("/")[0] for name in names}
    assert {t for t in tops if not t.endswith(".dist-info")} == set(PACKAGES)


def test_the_command_is_declared(names: set[str]) -> None:
    assert any(name.endswith(".dist-info/entry_points.txt") for name in names)
    assert any(name.endswith("LICENSE") for name in names)
