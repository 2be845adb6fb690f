"""A run folder is whole or not there, and a finished one is not overwritten unasked."""

from __future__ import annotations

from pathlib import Path

import pytest

from geometry.problem import RunError
from studies.check.folder import refuse_existing, run_folder


def write(out: Path, text: str, replace: bool = False) -> None:
    with run_folder(out, replace) as room:
        (room / "result.json").write_text(text)


def test_the_folder_appears_whole(tmp_path: Path) -> None:
    out = tmp_path / "arm.run"
    with run_folder(out, False) as room:
        (room / "result.json").write_text("1")
        assert not out.exists()
    assert [p.name for p in tmp_path.iterdir()] == ["arm.run"]
    assert (out / "result.json").read_text() == "1"


@pytest.mark.parametrize("fault", [ValueError("x"), KeyboardInterrupt()])
@pytest.mark.parametrize("before", [False, True])
def test_a_failure_leaves_what_was_there_before(tmp_path: Path, fault: BaseException, before: bool) -> None:
    out = tmp_path / "arm.run"
    if before:
        write(out, "old")
    with pytest.raises(type(fault)):
        with run_folder(out, True) as room:
            (room / "result.json").write_text("new")
            raise fault
    assert [p.name for p in tmp_path.iterdir()] == (["arm.run"] if before else [])
    assert not before or (out / "result.json").read_text() == "old"


def test_a_finished_run_is_refused_with_three_ways_out(tmp_path: Path) -> None:
    out = tmp_path / "arm.run"
    write(out, "old")
    (tmp_path / "arm-2.run").mkdir()
    with pytest.raises(RunError) as caught:
        write(out, "new")
    text = str(caught.value)
    assert caught.value.stage == "write"
    assert "1. " in text and f"--out {tmp_path / 'arm-3.run'}" in text and "2. " in text and "--replace" in text
    assert (out / "result.json").read_text() == "old"
    assert sorted(p.name for p in tmp_path.iterdir()) == ["arm-2.run", "arm.run"]


def test_replace_replaces(tmp_path: Path) -> None:
    out = tmp_path / "arm.run"
    write(out, "old")
    (out / "extra.txt").write_text("old")
    write(out, "new", replace=True)
    assert [p.name for p in out.iterdir()] == ["result.json"] and (out / "result.json").read_text() == "new"
    assert [p.name for p in tmp_path.iterdir()] == ["arm.run"]


def test_a_folder_that_is_no_run_is_never_replaced(tmp_path: Path) -> None:
    out = tmp_path / "photos"
    out.mkdir()
    (out / "cat.png").write_text("x")
    with pytest.raises(RunError, match="not a run folder"):
        write(out, "new", replace=True)
    file = tmp_path / "file"
    file.write_text("x")
    with pytest.raises(RunError, match="not a run folder"):
        refuse_existing(file, True)
    assert (out / "cat.png").exists() and file.read_text() == "x"


def test_a_missing_parent_is_said_at_once(tmp_path: Path) -> None:
    with pytest.raises(RunError, match="does not exist"):
        refuse_existing(tmp_path / "no" / "arm.run", False)


def test_a_parent_that_is_a_file_or_cannot_be_written_is_told_before_the_work(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tmp_path / "f").touch()
    with pytest.raises(RunError, match="f is a file, not a folder"):
        refuse_existing(tmp_path / "f" / "arm.run", False)

    def refuse(**_: object) -> str:
        raise OSError(30, "Read-only file system")

    monkeypatch.setattr("tempfile.mkdtemp", refuse)
    with pytest.raises(RunError, match="cannot write in .*Read-only file system"):
        refuse_existing(tmp_path / "arm.run", False)


def test_asking_leaves_nothing_behind(tmp_path: Path) -> None:
    refuse_existing(tmp_path / ("a" * 240), False)
    assert list(tmp_path.iterdir()) == []
