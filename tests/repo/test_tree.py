"""The tree holds what a reader expects: a fixed top level, proper packages, no trace of a machine or a registry."""

from __future__ import annotations

import re
import shutil
import subprocess
import tomllib
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
PACKAGES = ("geometry", "mesher", "fem", "studies")
TOP = {
    "README.md",
    "DEVELOPERS.md",
    "CHANGELOG.md",
    "LICENSE",
    "pyproject.toml",
    "requirements.txt",
    "start",
    *PACKAGES,
    "tests",
}
TEXT = {".md", ".py", ".toml", ".txt", ".json", ".html", ".css", ".js", ".jinja", ".svg", ""}

# Built from pieces, so that this file does not hold what it looks for.
FORBIDDEN = {
    "a folder of one machine": re.compile("|".join((r"/ho" r"me/\w", r"/wo" r"rk/", r"/ro" r"ot/", r"/Us" r"ers/\w"))),
    "the host of a registry": re.compile("|".join((r"pypi" r"\.org", r"python" r"hosted", r"deb\.deb" r"ian\.org"))),
    "an index in a command": re.compile(r"--(?:extra-)?index" r"-url|--find" r"-links"),
    "a mark of a merge": re.compile(r"^(?:<{7}|>{7}) ", re.MULTILINE),
}


def tracked() -> list[Path]:
    """Files that git tracks or would track; the tree itself where there is no git (a source archive)."""
    if shutil.which("git") and (ROOT / ".git").exists():
        listing = subprocess.run(
            ["git", "ls-files", "-z", "--cached", "--others", "--exclude-standard"],
            cwd=ROOT,
            capture_output=True,
            text=True,
            timeout=60,
            check=True,
        ).stdout
        return [ROOT / name for name in sorted(set(listing.split("\0"))) if name and (ROOT / name).is_file()]
    hidden = {".venv", "__pycache__", "runs", "build", "dist"}
    return [p for p in sorted(ROOT.rglob("*")) if p.is_file() and not hidden & set(p.relative_to(ROOT).parts)]


def test_the_top_level_holds_nothing_else() -> None:
    names = {p.relative_to(ROOT).parts[0] for p in tracked()}
    assert {n for n in names if not n.startswith(".") and not n.endswith(".egg-info")} == TOP


@pytest.mark.parametrize("what", FORBIDDEN)
def test_no_file_names(what: str) -> None:
    found = [
        f"{path.relative_to(ROOT)}: {match.group()}"
        for path in tracked()
        if path.suffix in TEXT and (match := FORBIDDEN[what].search(path.read_text(encoding="utf-8")))
    ]
    assert found == [], what


def test_every_folder_of_code_is_a_package() -> None:
    """Without `__init__.py`, Python would look for further halves of the package everywhere on its path."""
    folders = {p.parent for name in PACKAGES for p in (ROOT / name).rglob("*.py")}
    packages = folders | {g for f in folders for g in f.parents if ROOT in g.parents}
    assert sorted(str(f.relative_to(ROOT)) for f in packages if not (f / "__init__.py").exists()) == []


def test_the_lock_holds_every_dependency_with_a_hash() -> None:
    project = tomllib.loads((ROOT / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    lock = (ROOT / "requirements.txt").read_text(encoding="utf-8")
    locked = re.findall(r"^([a-z0-9-]+)==(\S+)[^\n]*\\\n    --hash=sha256:[0-9a-f]{64}", lock, re.MULTILINE)
    names = {name for name, _ in locked}
    wanted = [*project["dependencies"], *project["optional-dependencies"]["test"]]
    assert [w for w in wanted if re.split(r"[^A-Za-z0-9-]", w)[0] not in names] == []
    assert len(names) == len(re.findall(r"^[a-z].*==", lock, re.MULTILINE)), "an entry without a hash"


def test_the_lock_names_no_source() -> None:
    lock = (ROOT / "requirements.txt").read_text(encoding="utf-8")
    assert "://" not in lock and not re.search(r"^-", lock, re.MULTILINE)
