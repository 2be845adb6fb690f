"""One template process serves many jobs: what befalls one of them reaches neither the others nor the meshes."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from fem.solid.shape import TET_EDGES
from geometry.budget import Budget
from geometry.named_solid import NamedSolid
from geometry.problem import MeshError
from geometry.process import Template
from geometry.solid import build_solid
from geometry.spec import read_part
from mesher import mesh_solid
from mesher.child import ChildFailure, mesh_template, run_child
from mesher.named_mesh import NamedMesh

pytestmark = pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")
EXAMPLES = Path(__file__).resolve().parents[2] / "studies" / "examples"
PLAIN = {"task": "outlines", "outlines": []}


def _alive(pid: int) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0] != "Z"
    except OSError:
        return False


def _gone(pid: int, seconds: float = 5.0) -> bool:
    deadline = time.monotonic() + seconds
    while _alive(pid) and time.monotonic() < deadline:
        time.sleep(0.02)
    return not _alive(pid)


@pytest.fixture
def template() -> Iterator[Template]:
    """A template of the test's own."""
    own = Template("mesher._worker")
    yield own
    own.close()


@pytest.mark.parametrize("fault", ["crash", "hang", "memory", "killed", "log"])
def test_a_lost_job_leaves_the_template_ready(template: Template, fault: str) -> None:
    run_child(PLAIN, 20.0, 1000, template=template)
    before = template.pid
    with pytest.raises(ChildFailure):
        run_child({"task": f"fault:{fault}"}, 1.0 if fault == "hang" else 20.0, 300, template=template)
    assert run_child(PLAIN, 20.0, 1000, template=template).answer["version"]
    assert template.pid == before, "the template was started anew: it should have outlived the job"
    children = Path(f"/proc/{before}/task/{before}/children").read_text().split()
    assert children == [], "a job was left behind"


def test_a_template_that_was_killed_is_started_anew(template: Template) -> None:
    run_child(PLAIN, 20.0, 1000, template=template)
    first = template.pid
    assert first is not None
    os.kill(first, signal.SIGKILL)
    assert _gone(first)
    run_child(PLAIN, 20.0, 1000, template=template)
    assert template.pid not in (None, first)


def test_a_template_killed_under_a_job_takes_it_along_and_is_told(template: Template) -> None:
    seen: list[int] = []
    submit = template.submit

    def watched(*args: object, **kinds: object) -> object:
        job = submit(*args, **kinds)  # type: ignore[arg-type]
        seen.append(job.pid)
        assert template.pid is not None
        threading.Timer(0.3, os.kill, (template.pid, signal.SIGKILL)).start()
        return job

    template.submit = watched  # type: ignore[method-assign, assignment]
    with pytest.raises(ChildFailure, match="SIGKILL") as caught:
        run_child({"task": "fault:hang"}, 20.0, 1000, template=template)
    assert caught.value.ending == "killed"
    assert _gone(seen[0])


def test_jobs_run_side_by_side(template: Template) -> None:
    run_child(PLAIN, 20.0, 1000, template=template)
    stop = threading.Event()
    endings: list[str] = []

    def hang() -> None:
        try:
            run_child({"task": "fault:hang"}, 60.0, 1000, stop=stop, template=template)
        except ChildFailure as failure:
            endings.append(failure.ending)

    thread = threading.Thread(target=hang)
    thread.start()
    time.sleep(0.2)
    run_child(PLAIN, 20.0, 1000, template=template)
    assert thread.is_alive()
    stop.set()
    thread.join(5.0)
    assert endings == ["stopped"]


def test_a_stop_while_the_kernel_loads_is_heard(template: Template) -> None:
    stop = threading.Event()
    stop.set()
    with pytest.raises(ChildFailure) as caught:
        run_child({"task": "fault:hang"}, 60.0, 1000, stop=stop, template=template)
    assert caught.value.ending == "stopped"
    run_child(PLAIN, 20.0, 1000, template=template)
    assert template.pid is not None
    deadline = time.monotonic() + 5.0
    children = Path(f"/proc/{template.pid}/task/{template.pid}/children")
    while children.read_text().split() and time.monotonic() < deadline:
        time.sleep(0.02)
    assert children.read_text().split() == [], "the job that nobody waits for is still at work"


def test_the_template_has_one_thread(template: Template) -> None:
    """A copy of a process with more threads would be unsound."""
    run_child(PLAIN, 20.0, 1000, template=template)
    assert len(os.listdir(f"/proc/{template.pid}/task")) == 1


def test_a_used_template_and_a_fresh_one_give_the_same_mesh(template: Template, plate: NamedSolid, budget: Budget,
                                                            monkeypatch: pytest.MonkeyPatch) -> None:
    first = mesh_solid(plate, 0.05, budget)  # the shared one has done jobs of other tests
    again = mesh_solid(plate, 0.05, budget, recipe=first.recipe)
    monkeypatch.setattr("mesher.child.mesh_template", lambda: template)
    fresh = mesh_solid(plate, 0.05, budget, recipe=first.recipe)
    assert first.recipe["mesh"] == again.recipe["mesh"] == fresh.recipe["mesh"]


def test_a_mesh_with_moved_curved_nodes_is_made_again_bit_by_bit(budget: Budget) -> None:
    """The kernel's improvement of curved elements adds up in an order that differs from run to run: the nodes that it
    moves are put on a grid."""
    solid = build_solid(read_part(EXAMPLES / "tool_hanger.toml"))
    meshes = [mesh_solid(solid, 0.1, budget) for _ in range(3)]
    assert len({mesh.recipe["mesh"] for mesh in meshes}) == 1
    moved = _moved_within(meshes[0])
    assert moved.size > 100
    on_grid = meshes[0].nodes[:, moved] * 2.0**24  # a grid of 1e-9 of this part's size is no finer than 2^-24 mm
    assert np.array_equal(on_grid, np.round(on_grid))


def _moved_within(mesh: NamedMesh) -> np.ndarray:
    """Nodes of inner edges that are not in the middle of their edge."""
    ends = TET_EDGES
    middle = (mesh.nodes[:, mesh.tets[ends[:, 0]]] + mesh.nodes[:, mesh.tets[ends[:, 1]]]) / 2
    off = np.linalg.norm(mesh.nodes[:, mesh.tets[4:]] - middle, axis=0) > 1e-3
    return np.setdiff1d(np.unique(mesh.tets[4:][off]), mesh.boundary)


def test_a_stopped_mesh_is_told(plate: NamedSolid, budget: Budget) -> None:
    stop = threading.Event()
    threading.Timer(0.05, stop.set).start()
    with pytest.raises(MeshError, match="stopped on request"):
        mesh_solid(plate, 0.005, budget, stop=stop)


@pytest.mark.parametrize("signal_number", [signal.SIGKILL, signal.SIGINT])
def test_the_template_ends_with_its_owner(signal_number: int) -> None:
    code = ("import time, mesher.child as c\n"
            "c.run_child({'task': 'outlines', 'outlines': []}, 60.0, 1000)\n"
            "print(c.mesh_template().pid, flush=True); time.sleep(60)\n")
    with subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.DEVNULL,
                          text=True) as owner:
        assert owner.stdout is not None
        pid = int(owner.stdout.readline())
        assert _alive(pid)
        owner.send_signal(signal_number)
    assert _gone(pid)


def test_a_copy_of_the_owner_leaves_the_template_alone() -> None:
    """A forked worker of the caller's makes its own template, and its end does not end the first one."""
    run_child(PLAIN, 20.0, 1000)
    shared = mesh_template()
    pid = os.fork()
    if pid == 0:
        ok = shared.pid is None
        os._exit(0 if ok else 1)
    assert os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1]) == 0
    before = shared.pid
    run_child(PLAIN, 20.0, 1000)
    assert shared.pid == before is not None
