"""Imports run one way: the linter's contracts hold, and each of them notices the slip it is there for."""

from __future__ import annotations

import shutil
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
PACKAGES = ("geometry", "mesher", "fem", "studies")

# (file that is spoilt, line put at its end, import that the linter must name)
SLIPS = (
    ("geometry/part.py", "import mesher.named_mesh", "geometry.part -> mesher.named_mesh"),
    ("mesher/named_mesh.py", "import fem.figure", "mesher.named_mesh -> fem.figure"),
    ("fem/figure.py", "import studies", "fem.figure -> studies"),
    ("fem/beam/section/properties.py", "import fem.solid", "fem.beam.section.properties -> fem.solid"),
    ("fem/solid/__init__.py", "import fem.beam.section", "fem.solid -> fem.beam.section"),
    ("fem/beam/section/properties.py", "import geometry.solid", "fem.beam.section.properties -> geometry.solid"),
    ("geometry/spec/__init__.py", "def load():\n    import cadquery", "geometry.spec -> cadquery"),
    ("mesher/named_mesh.py", "import cadquery", "mesher.named_mesh -> cadquery"),
    ("fem/figure.py", "import gmsh", "fem.figure -> gmsh"),
    ("mesher/named_mesh.py", "import pyamg", "mesher.named_mesh -> pyamg"),
)


def lint(folder: Path) -> subprocess.CompletedProcess[str]:
    """Run import-linter on the packages in `folder`, which holds a `pyproject.toml`."""
    return subprocess.run(
        [sys.executable, "-c", "from importlinter.cli import lint_imports_command as c; c()", "--no-cache"],
        cwd=folder,
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
    )


def contracts(output: str, end: str) -> list[str]:
    return [line for line in output.splitlines() if line.endswith(end)]


def test_all_contracts_hold() -> None:
    outcome = lint(ROOT)
    assert outcome.returncode == 0, outcome.stdout + outcome.stderr
    assert len(contracts(outcome.stdout, "KEPT")) == 7


@pytest.fixture(scope="module")
def spoilt(tmp_path_factory: pytest.TempPathFactory) -> str:
    """What the linter says about a copy of the packages with every slip in it."""
    folder = tmp_path_factory.mktemp("packages")
    for package in PACKAGES:
        shutil.copytree(ROOT / package, folder / package, ignore=shutil.ignore_patterns("__pycache__", "examples"))
        (folder / package / "__init__.py").touch()  # else Python would look for a second half of it elsewhere
    shutil.copy(ROOT / "pyproject.toml", folder)
    for name, line, _ in SLIPS:
        with (folder / name).open("a", encoding="utf-8") as file:
            file.write(f"\n{line}\n")
    outcome = lint(folder)
    assert outcome.returncode == 1, outcome.stdout + outcome.stderr
    return outcome.stdout


@pytest.mark.parametrize("arrow", [arrow for _, _, arrow in SLIPS])
def test_a_slip_is_noticed(spoilt: str, arrow: str) -> None:
    assert f"{arrow} (l." in spoilt


def test_every_contract_is_broken_by_the_slips(spoilt: str) -> None:
    assert contracts(spoilt, "KEPT") == []
    assert len(contracts(spoilt, "BROKEN")) == 7


def test_reading_a_spec_loads_neither_kernel() -> None:
    """Static contracts do not see what is imported by name at run time, so the loaded modules are looked at too."""
    code = "import sys, geometry.spec; print(sorted({'cadquery', 'OCP', 'gmsh', 'skfem'} & set(sys.modules)), end='')"
    outcome = subprocess.run(
        [sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, timeout=60, check=True
    )
    assert outcome.stdout == "[]"
