"""The host's watch over a job: time, memory, crashes, kills from outside, and nothing left behind. Without kernels."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import tempfile
import threading
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import pytest
from work_helpers import PLANTED, alive, bar, children, gone, jobs, toy, until

from geometry.budget import Budget
from geometry.problem import SolidError
from geometry.process import Template, TemplateFailure
from geometry.spec.read import part_from_data
from studies.check.solid_child import SolidChild
from studies.vary.outcome import Outcome
from studies.vary.work import Ended, Host
from studies.vary.work.room import MARK, PREFIX, Room
from studies.vary.work.variant_job import _Told

pytestmark = pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")


def _outcome(end: Outcome | Ended) -> Outcome:
    assert isinstance(end, Outcome), end
    return end


def _left(host: Host) -> list[str]:
    """What stands in the folders of the host's jobs."""
    assert host.folder is not None
    return [str(p) for p in host.folder.rglob("*") if p.name != MARK]


def test_a_variant_is_told_with_its_seconds_and_memory(toys: Host) -> None:
    outcome = _outcome(toys.evaluate(toy(1, "wait")))
    assert (outcome.key, outcome.status) == ("key-1", "finished")
    assert 0.25 < outcome.seconds["wall"] < 10.0 and 1.0 < outcome.peak_memory < 500.0
    assert outcome.worker.endswith(f":{os.getpid()}")


def test_an_endless_variant_is_stopped_at_its_time_and_leaves_nothing(toys: Host) -> None:
    seen: list[int] = []

    def look() -> None:
        until(lambda: len(jobs(toys)) == 2 and len(_left(toys)) >= 3)
        seen.extend(jobs(toys))

    looking = threading.Thread(target=look)
    looking.start()
    began = time.monotonic()
    outcome = _outcome(toys.evaluate(toy(1, "hang", seconds=1.0)))
    looking.join()
    assert (outcome.status, outcome.stage) == ("failed", "solve") and outcome.reason.startswith("time limit: 1 s")
    assert time.monotonic() - began < 6.0
    assert len(seen) == 2, "the variant had a process and its mesher had one"
    assert gone(seen) and _left(toys) == []
    assert _outcome(toys.evaluate(toy(2, "fine"))).status == "finished"


@pytest.mark.parametrize("what", ["hog", "hog in the mesher"])
def test_memory_over_the_limit_ends_the_variant(toys: Host, what: str) -> None:
    outcome = _outcome(toys.evaluate(toy(1, what, memory=200)))
    assert outcome.status == "failed" and outcome.reason.startswith("memory limit: ")
    assert 200.0 < outcome.peak_memory < 500.0
    assert until(lambda: not jobs(toys)) and _left(toys) == []


def test_the_hosts_own_limit_of_memory_binds_too(planted_path: None) -> None:
    with Host(1, memory=150, models="toy_models", cad="toy_kernel", mesh="toy_kernel") as host:
        outcome = _outcome(host.evaluate(toy(1, "hog", memory=4000)))
    assert "150 MiB" in outcome.reason and outcome.peak_memory < 450.0


@pytest.mark.parametrize(("what", "said"), [("crash", "ended by SIGSEGV"), ("leave", "ended with exit status 3")])
def test_a_crash_fails_its_variant_alone(toys: Host, what: str, said: str) -> None:
    orders = [toy(1, "fine", "s"), toy(2, what, "s"), toy(3, "fine", "s"), toy(4, "fine", "s")]
    ends = [_outcome(end) for end in toys.evaluate_group(orders)]
    assert [end.key for end in ends] == ["key-1", "key-2", "key-3", "key-4"]
    assert [end.status for end in ends] == ["finished", "failed", "finished", "finished"]
    assert ends[1].stage == "solve" and ends[1].reason.startswith("crash: ") and said in ends[1].reason


def test_a_crash_over_what_a_group_shares_fails_the_group(toys: Host) -> None:
    orders = [toy(1, "crash", "s", "mesh"), toy(2, "fine", "s"), toy(3, "fine", "t")]
    ends = [_outcome(end) for end in toys.evaluate_group(orders)]
    assert [(end.status, end.stage) for end in ends] == [("failed", "mesh"), ("failed", "mesh"), ("finished", "")]


@pytest.mark.parametrize("which", ["job", "models"])
@pytest.mark.parametrize("name", ["SIGKILL", "SIGTERM"])
def test_what_is_ended_from_outside_has_no_outcome(toys: Host, which: str, name: str) -> None:
    with ThreadPoolExecutor(1) as pool:
        end = pool.submit(toys.evaluate, toy(1, "hang"))
        assert until(lambda: len(jobs(toys)) == 2)
        under_way, models = jobs(toys), toys.templates[0].pid
        assert models is not None
        os.kill(children(models)[0] if which == "job" else models, signal.Signals[name])
        told = end.result(20.0)
    assert isinstance(told, Ended) and (told.key, told.signal) == ("key-1", name)
    assert gone(under_way) and _left(toys) == []
    assert _outcome(toys.evaluate(toy(2, "fine"))).status == "finished"
    assert (toys.templates[0].pid == models) is (which == "job")


def test_the_rest_of_a_group_is_ended_with_its_process(toys: Host) -> None:
    with ThreadPoolExecutor(1) as pool:
        ends = pool.submit(lambda: list(toys.evaluate_group([toy(1, "fine", "s"), toy(2, "hang", "s"),
                                                             toy(3, "fine", "s")])))
        assert until(lambda: len(jobs(toys)) == 2)
        os.kill(children(toys.templates[0].pid)[0], signal.SIGKILL)
        told = ends.result(20.0)
    assert isinstance(told[0], Outcome)
    assert told[1:] == [Ended(f"key-{k}", "SIGKILL", "the solver process") for k in (2, 3)]


def test_closing_ends_all_work_at_once(planted_path: None) -> None:
    with Host(1, models="toy_models", cad="toy_kernel", mesh="toy_kernel") as host:
        with ThreadPoolExecutor(2) as pool:
            ends = [pool.submit(host.evaluate, toy(k, "hang")) for k in (1, 2)]
            assert until(lambda: len(jobs(host)) == 2)
            everything = [*jobs(host), *(t.pid or 0 for t in host.templates)]
            folder, began = host.folder, time.monotonic()
            host.close()
            assert [end.result(10.0) for end in ends] == [Ended(f"key-{k}", "closed") for k in (1, 2)]
        assert time.monotonic() - began < 5.0
        assert gone(everything) and folder is not None and not folder.exists()
        assert host.evaluate(toy(3, "fine")) == Ended("key-3", "closed"), "a closed host starts nothing"


def test_a_lent_template_that_has_gone_starts_nothing_and_keeps_nobody_waiting(planted_path: None, tmp_path: Path
                                                                                ) -> None:
    template = Template("toy_kernel")
    control, _ = template.lend()
    lent = _Told("toy_kernel", control, "client", lambda message: None)
    order = {"folder": str(tmp_path), "done": True}
    with lent.submit(order) as job:
        assert job.wait(20.0) == 0 and lent.ended() == ""
    assert template.pid is not None
    os.kill(template.pid, signal.SIGKILL)
    assert until(lambda: lent.ended() == "lost")
    with pytest.raises(TemplateFailure):
        lent.submit(order)
    began = time.monotonic()
    with SolidChild(part_from_data(bar()), Budget(), lent) as child, pytest.raises(SolidError, match="from outside"):
        child.result()
    assert time.monotonic() - began < 2.0
    control.close()
    template.close()


def test_no_more_jobs_than_workers(toys: Host) -> None:
    most = 0
    with ThreadPoolExecutor(6) as pool:
        ends = [pool.submit(toys.evaluate, toy(k, "wait")) for k in range(6)]
        while not all(end.done() for end in ends):
            most = max(most, len(children(toys.templates[0].pid)))
            time.sleep(0.005)
    assert most == 2
    assert all(isinstance(end.result(), Outcome) for end in ends)


def test_a_template_that_cannot_be_loaded_fails_the_variant(planted_path: None) -> None:
    with Host(1, models="no_such_module", cad="toy_kernel", mesh="toy_kernel") as host:
        outcome = _outcome(host.evaluate(toy(1, "fine")))
    assert outcome.status == "failed" and outcome.reason.startswith("crash: ") and "exit status 1" in outcome.reason


_LONELY = """
import sys, threading
sys.path[:0] = [{planted!r}]
from work_helpers import jobs, toy, until
from studies.vary.work import Host
host = Host(2, models="toy_models", cad="toy_kernel", mesh="toy_kernel").__enter__()
for k in (1, 2):
    threading.Thread(target=host.evaluate, args=(toy(k, "hang"),), daemon=True).start()
until(lambda: len(jobs(host)) == 4)
print(*jobs(host), *(t.pid for t in host.templates), flush=True)
threading.Event().wait()
"""


@pytest.mark.parametrize("name", ["SIGKILL", "SIGTERM"])
def test_everything_dies_with_the_host(planted_path: None, tmp_path: Path, name: str) -> None:
    code = _LONELY.format(planted=str(PLANTED))
    with subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True,
                          env={**os.environ, "TMPDIR": str(tmp_path)}) as host:
        assert host.stdout is not None
        others = [int(pid) for pid in host.stdout.readline().split()]
        assert len(others) == 7 and all(map(alive, others))
        assert len(list(tmp_path.rglob("*-*"))) >= 5, "the jobs keep files in the host's folder"
        host.send_signal(signal.Signals[name])
    assert gone(others), "processes were left behind"
    assert until(lambda: not list(tmp_path.iterdir()), 5.0), "files were left behind"


def test_folders_of_hosts_that_have_gone_are_removed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(tempfile, "tempdir", str(tmp_path))
    living = Room()
    dead, foreign = tmp_path / f"{PREFIX}dead", tmp_path / "haunch-other"
    for folder in (dead, foreign):
        (folder / "job-1").mkdir(parents=True)
        (folder / MARK).touch()
    Room().close()
    assert sorted(p.name for p in tmp_path.iterdir()) == sorted([living.path.name, foreign.name])
    living.close()
    assert [p.name for p in tmp_path.iterdir()] == [foreign.name]


def test_nothing_piles_up_over_many_variants(toys: Host) -> None:
    """Open files and children of the host and of its templates are as many after thirty variants as after three."""
    def held() -> list[int]:
        pids = [os.getpid(), *(template.pid or 0 for template in toys.templates)]
        return [len(os.listdir(f"/proc/{pid}/fd")) for pid in pids] + [len(children(pid)) for pid in pids[1:]]

    def run(count: int) -> None:
        ends = [toys.evaluate(toy(k, ("fine", "crash", "hang")[k % 3], seconds=0.1)) for k in range(count)]
        assert all(isinstance(end, Outcome) for end in ends)
        assert until(lambda: not jobs(toys))

    run(3)
    before = held()
    run(30)
    assert held() == before and _left(toys) == []
