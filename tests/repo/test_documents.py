"""What the documents promise is there: commands, links, the example, the reference of the spec."""

from __future__ import annotations

import importlib.util
import json
import re
import shlex
import subprocess
import sys
import tomllib
from functools import cache
from itertools import pairwise
from pathlib import Path
from types import ModuleType

import pytest

ROOT = Path(__file__).resolve().parents[2]
DOCUMENTS = ("README.md", "DEVELOPERS.md", "CHANGELOG.md")
README = (ROOT / "README.md").read_text(encoding="utf-8")
START = (ROOT / "start").read_text(encoding="utf-8")
LINK = re.compile(r"(?<!!)\[[^\]]+\]\(([^)\s]+)\)|!\[[^\]]*\]\(([^)\s]+)\)")


def text_of(document: str) -> str:
    return (ROOT / document).read_text(encoding="utf-8")


def blocks(document: str, language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```", text_of(document), re.MULTILINE | re.DOTALL)


def commands(document: str) -> list[list[str]]:
    """Words of each command in the document's shell blocks."""
    lines = "\n".join(blocks(document, "sh")).replace("\\\n", " ").splitlines()
    return [words for line in lines if (words := shlex.split(line, comments=True))]


def start_commands() -> set[str]:
    """Words that `start` has a branch for."""
    branches = re.findall(r"^    ([a-z |]+)\) ", START, re.MULTILINE)
    return {word.strip() for branch in branches for word in branch.split("|")}


def bash(*words: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        ["bash", *words], cwd=ROOT, capture_output=True, text=True, timeout=60, check=False, stdin=subprocess.DEVNULL
    )


def heading_anchors(document: Path) -> set[str]:
    headings = re.findall(r"^#+ (.+)$", document.read_text(encoding="utf-8"), re.MULTILINE)
    return {re.sub(r"[^\w\- ]", "", h.lower()).replace(" ", "-") for h in headings}


def test_the_readme_names_both_commands() -> None:
    assert commands("README.md")[:2] == [["./start", "demo"], ["./start", "test"]]


@pytest.mark.parametrize("document", DOCUMENTS)
def test_commands_exist(document: str) -> None:
    named = re.findall(r"`(?:\./start haunch|haunch) ([a-z]+)", text_of(document))
    for words in commands(document):
        if words[0] == "./start":
            assert words[1] in start_commands(), words
        named += [after for word, after in pairwise(words) if word.endswith("haunch") and not after.startswith("-")]
        for word in words[1:]:
            if re.fullmatch(r"(?:studies|tests|geometry|mesher|fem)/[\w/.]+", word):
                assert (ROOT / word).exists(), words
    assert set(named) <= haunch_commands()


@cache
def haunch_commands() -> set[str]:
    """Commands that the help of Haunch lists."""
    outcome = subprocess.run(
        [sys.executable, "-c", "from studies.cli import main; raise SystemExit(main())", "--help"],
        cwd=ROOT,
        capture_output=True,
        text=True,
        timeout=60,
        check=False,
    )
    assert outcome.returncode == 0, outcome.stderr
    return set(re.findall(r"^    ([a-z]+)(?: |$)", outcome.stdout, re.MULTILINE))


def test_start_explains_itself_and_refuses_what_it_does_not_know() -> None:
    for words in (["--help"], []):
        told = bash("start", *words)
        assert told.returncode == 0
        assert all(f"./start {name}" in told.stdout for name in ("demo", "test", "haunch", "setup"))
    refused = bash("start", "frobnicate")
    assert refused.returncode == 1
    assert "frobnicate" in refused.stderr


def test_start_names_a_demo_that_is_there() -> None:
    found = re.search(r"^demo=\$root/(\S+)$", START, re.MULTILINE)
    assert found and (ROOT / found.group(1)).is_file(), found
    assert f"]({found.group(1)})" in README


@pytest.mark.parametrize("document", DOCUMENTS)
def test_links_resolve(document: str) -> None:
    for target in (a or b for a, b in LINK.findall(text_of(document))):
        if target.startswith(("http://", "https://", "mailto:")):
            continue
        name, _, anchor = target.partition("#")
        file = ROOT / name if name else ROOT / document
        assert file.exists(), target
        assert not anchor or anchor in heading_anchors(file), target


@pytest.mark.parametrize("document", DOCUMENTS)
def test_named_files_and_folders_exist(document: str) -> None:
    named = re.findall(r"`((?:geometry|mesher|fem|studies|tests)/[\w/.]*)`", text_of(document))
    assert [name for name in named if not (ROOT / name).exists()] == []


def test_the_example_in_the_readme_is_the_demo() -> None:
    """Comments apart, the block that the README reads line by line is the file that `./start demo` checks."""
    found = re.search(r"^demo=\$root/(\S+)$", START, re.MULTILINE)
    assert found
    shown = blocks("README.md", "toml")[0]
    assert tomllib.loads(shown) == tomllib.loads((ROOT / found.group(1)).read_text(encoding="utf-8"))


def test_the_example_in_the_readme_is_a_spec() -> None:
    from geometry.spec import part_from_text

    part = part_from_text(blocks("README.md", "toml")[0])
    assert [m.name for m in part.members] == ["arm"]


def reference_writer() -> ModuleType:
    spec = importlib.util.spec_from_file_location("write_reference", ROOT / "tests" / "repo" / "write_reference.py")
    assert spec and spec.loader
    module = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(module)
    return module


def test_the_reference_has_not_drifted() -> None:
    """Write it anew with ``python tests/repo/write_reference.py``."""
    from geometry.spec import spec_reference

    assert reference_writer().with_reference(README, spec_reference()) == README


def test_the_reference_writer_moves_headings_but_not_code() -> None:
    text = "# A\n\n```toml\n# comment\n```\n\n## B"
    assert reference_writer().as_section(text) == "### A\n\n```toml\n# comment\n```\n\n#### B"


@pytest.mark.parametrize("example", sorted((ROOT / "studies" / "examples").rglob("*.toml")), ids=lambda p: p.name)
def test_an_example_names_its_schema(example: Path) -> None:
    """An editor that knows the `#:schema` line then completes and checks the words of the spec."""
    from geometry.spec import json_schema
    from studies.vary.plan import plan_schema

    first = example.read_text(encoding="utf-8").splitlines()[0]
    assert first.startswith("#:schema "), first
    schema = example.parent / first.removeprefix("#:schema ").strip()
    assert schema.is_file(), f"{first}: not there; haunch schema makes it"
    wanted = plan_schema() if example.stem.endswith("_plan") else json_schema()
    assert json.loads(schema.read_text(encoding="utf-8")) == wanted, "drifted; haunch schema makes it anew"
