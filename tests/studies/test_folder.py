"""A run folder is whole or not there, and a finished one is not overwritten unasked."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from geometry.problem import RunError
from studies.check.folder import MARK, refuse_existing, remove_stale, run_folder


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


KILLED = """
import os, signal, sys
from pathlib import Path
from studies.check.folder import run_folder
with run_folder(Path(sys.argv[1]), False) as room:
    (room / "part.step").write_text("half")
    if sys.argv[2] == "kill":
        os.kill(os.getpid(), signal.SIGKILL)
    print("writing", flush=True)
    sys.stdin.read()
"""


def child(out: Path, how: str) -> subprocess.Popen[str]:
    return subprocess.Popen([sys.executable, "-c", KILLED, str(out), how], text=True, cwd=Path(__file__).parents[2],
                            stdin=subprocess.PIPE, stdout=subprocess.PIPE)  # fmt: skip


def test_what_a_killed_run_left_is_removed_and_nothing_else(tmp_path: Path) -> None:
    out = tmp_path / "arm.run"
    with child(out, "kill") as killed:
        assert killed.wait(timeout=60) == -9
    left = list(tmp_path.iterdir())
    assert len(left) == 1 and left[0].name.startswith(".arm.run.") and left[0].name.endswith(".partial")
    names = (".arm.run.abcdefgh.partial", ".arm.run.partial", ".leg.run.abcdefgh.partial")
    others = [tmp_path / name for name in names]
    for other in others:
        (other / "run").mkdir(parents=True)
    (others[1] / MARK).touch()
    (others[2] / MARK).touch()
    foreign = tmp_path / ".arm.run.abcdefg2.partial"  # marked, but something of somebody's own lies in it
    foreign.mkdir()
    (foreign / MARK).touch()
    (foreign / "notes.txt").touch()
    assert remove_stale(out) == left
    assert sorted(tmp_path.iterdir()) == sorted([*others, foreign])


def test_a_run_that_is_being_written_is_left_alone(tmp_path: Path) -> None:
    out = tmp_path / "arm.run"
    with child(out, "wait") as other:
        assert other.stdout is not None and other.stdout.readline() == "writing\n"
        assert remove_stale(out) == []
        assert len(list(tmp_path.iterdir())) == 1
        other.communicate("", timeout=60)
    assert [p.name for p in tmp_path.iterdir()] == ["arm.run"]
    assert [p.name for p in out.iterdir()] == ["part.step"]
