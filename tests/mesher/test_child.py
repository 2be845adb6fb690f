"""The child process is bounded in time and memory and tells how it ended."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from pathlib import Path

import pytest

from mesher.child import ChildFailure, run_child


def _alive(pid: int) -> bool:
    try:
        state = Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0]
    except OSError:
        return False
    return state != "Z"


def test_a_hanging_child_is_killed_at_its_limit() -> None:
    started = time.monotonic()
    with pytest.raises(ChildFailure, match="time limit of 1 s") as caught:
        run_child({"task": "fault:hang"}, seconds=1.0, memory=1000)
    assert caught.value.ending == "time"
    assert time.monotonic() - started < 5.0


def test_what_a_hanging_child_started_is_killed_too(tmp_path: Path) -> None:
    marker = f"{600.0 + os.getpid() / 1e6:.6f}"
    with pytest.raises(ChildFailure) as caught:
        run_child({"task": "fault:hang with grandchild", "sleep": marker}, seconds=2.5, memory=1000)
    assert caught.value.ending == "time"
    assert "grandchild " in caught.value.log, "the grandchild was not started: this test shows nothing"
    pid = int(caught.value.log.split("grandchild ")[1].split()[0])
    deadline = time.monotonic() + 3.0
    while _alive(pid) and time.monotonic() < deadline:
        time.sleep(0.02)
    assert not _alive(pid)


def test_a_crash_is_told_with_its_signal() -> None:
    with pytest.raises(ChildFailure, match="SIGABRT") as caught:
        run_child({"task": "fault:crash"}, seconds=20.0, memory=1000)
    assert caught.value.ending == "crash"


def test_a_child_ended_from_outside_is_not_called_a_crash() -> None:
    with pytest.raises(ChildFailure, match=r"from outside \(SIGKILL\).*run again.*--memory \(now 1000 MiB\)") as caught:
        run_child({"task": "fault:killed"}, seconds=20.0, memory=1000)
    assert caught.value.ending == "killed"


def test_a_child_that_eats_memory_is_stopped_at_its_limit() -> None:
    with pytest.raises(ChildFailure, match="memory limit") as caught:
        run_child({"task": "fault:memory"}, seconds=20.0, memory=200)
    assert caught.value.ending == "memory"


def test_the_address_limit_holds_where_memory_cannot_be_watched(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("mesher.child._resident", lambda job: 0.0)
    with pytest.raises(ChildFailure) as caught:
        run_child({"task": "fault:memory"}, seconds=30.0, memory=50)
    assert caught.value.ending == "memory"


def test_an_exception_comes_back_with_its_kind_and_the_log() -> None:
    with pytest.raises(ChildFailure, match="provoked") as caught:
        run_child({"task": "fault:log"}, seconds=20.0, memory=1000)
    assert (caught.value.ending, caught.value.kind) == ("refused", "RuntimeError")
    assert "the kernel said so" in caught.value.log


def test_an_unknown_task_is_refused() -> None:
    with pytest.raises(ChildFailure, match="unknown task 'dance'"):
        run_child({"task": "dance"}, seconds=20.0, memory=1000)


@pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")
def test_the_child_dies_with_its_parent() -> None:
    code = (
        "import mesher.child as c\n"
        "watch = c._watch\n"
        "def told(job, *rest):\n"
        "    print(job.pid, flush=True); return watch(job, *rest)\n"
        "c._watch = told\n"
        "c.run_child({'task': 'fault:hang'}, 60.0, 1000)\n"
    )
    with subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True) as parent:
        assert parent.stdout is not None
        child = int(parent.stdout.readline())
        time.sleep(1.0)
        assert _alive(child), "the child ended too early: this test shows nothing"
        parent.kill()
    deadline = time.monotonic() + 5.0
    while _alive(child) and time.monotonic() < deadline:
        time.sleep(0.02)
    assert not _alive(child)
