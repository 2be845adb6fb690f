"""What is loaded when: little at first, the rest while the kernels work; and compiling is told before it begins."""

from __future__ import annotations

import signal
import subprocess
import sys
import threading
import time
from pathlib import Path
from types import ModuleType

import pytest

import studies.check.run as run
from geometry.budget import available_threads
from geometry.problem import SpecError
from studies.check.stages import Clock, Event

CHAIN = """
import sys
sys.modules["gmsh"] = sys.modules["OCP"] = sys.modules["cadquery"] = None  # importing one is an error
from studies.check.run import check
heard = []
check(sys.argv[1], sys.argv[2], listener=heard.append, pictures=False)
print(",".join(e.stage for e in heard if e.kind == "end"))
"""


def _loaded(code: str) -> set[str]:
    done = subprocess.run([sys.executable, "-c", f"import sys\n{code}\nprint(' '.join(sys.modules))"],
                          capture_output=True, text=True, timeout=120, check=True)
    return set(done.stdout.split())


@pytest.mark.parametrize("code", ["import studies.cli.parser", "import geometry", "import geometry.process",
                                  "import mesher, mesher.child"])
def test_little_is_loaded_at_first(code: str) -> None:
    heavy = {"gmsh", "OCP", "cadquery", "skfem", "scipy", "numba", "pydantic", "rich", "matplotlib", "meshio"}
    assert not _loaded(code) & heavy


def test_a_check_reaches_its_first_stage_without_solvers_and_pictures() -> None:
    loaded = _loaded("import studies.check.run, studies.cli.screen, geometry.spec, mesher.child")
    assert not loaded & {"gmsh", "OCP", "cadquery", "skfem", "numba", "matplotlib", "scipy.sparse.linalg", "meshio",
                         "pypardiso", "pyamg"}


def test_the_whole_chain_runs_without_a_kernel_in_this_process(tmp_path: Path) -> None:
    """The process that checks must never load the CAD kernel or the mesh kernel: here it cannot."""
    part = Path(run.__file__).parents[1] / "examples" / "cantilever.toml"
    done = subprocess.run([sys.executable, "-c", CHAIN, str(part), str(tmp_path / "c.run")], capture_output=True,
                          text=True, timeout=300, check=False)
    assert done.returncode == 0, done.stderr[-2000:]
    assert set(done.stdout.strip().split(",")) == {"spec", "solid", "mesh", "beam", "solve", "compare", "write"}
    assert (tmp_path / "c.run" / "result.json").is_file()


def test_both_kernels_begin_to_load_before_the_spec_is_read(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    order: list[str] = []
    monkeypatch.setattr(run, "begin_loading", lambda: order.append("loading"))
    (tmp_path / "bad.toml").write_text("title = 3\n")
    with pytest.raises(SpecError):
        run.check(tmp_path / "bad.toml", tmp_path / "bad.run",
                  listener=lambda event: order.append(f"{event.stage} {event.kind}"))
    assert order == ["loading", "spec start"]


@pytest.mark.parametrize("warm", [False, True])
def test_compiling_is_told_before_it_begins(monkeypatch: pytest.MonkeyPatch, warm: bool) -> None:
    heard: list[Event] = []
    seen_before: list[str] = []

    def warm_up(tell: object) -> None:
        seen_before.extend(event.text for event in heard)

    monkeypatch.setattr("fem.solid.kernels.warm.is_warm", lambda: warm)
    monkeypatch.setattr("fem.solid.kernels.warm.warm_up", warm_up)
    run.prepare_solver(Clock(heard.append))
    told = ["preparing the solver's kernels (once)"]
    assert seen_before == ([] if warm else told)
    assert [event.text for event in heard if event.kind == "wait"] == ([] if warm else told)


def test_the_kernels_are_prepared_while_the_mesh_is_made(monkeypatch: pytest.MonkeyPatch, helpers: ModuleType) -> None:
    """The mesh is held back until the solver has been prepared: were that done after it, this would not end."""
    prepared = threading.Event()
    models = helpers.make_models()

    def build_and_mesh(*_: object) -> object:
        assert prepared.wait(30.0), "the solver was not prepared while the mesh was made"
        return models.named_solid, models.mesh

    monkeypatch.setattr(run, "_build_and_mesh", build_and_mesh)
    monkeypatch.setattr(run, "prepare_solver", lambda clock: prepared.set())
    monkeypatch.setattr("fem.beam.solve_beam", lambda *_, **__: models.beam)
    monkeypatch.setattr("fem.solid.solve_solid", lambda *_, **__: models.solid)
    from geometry.budget import Budget

    made = run.build_models(models.part, Budget(), Clock())
    assert made.mesh is models.mesh


def test_the_plain_screen_shows_a_wait_at_once(capsys: pytest.CaptureFixture[str]) -> None:
    from studies.cli.screen import StageView, make_console

    with StageView(make_console()) as view:
        view(Event("solve", "wait", "preparing the solver's kernels (once)"))
        assert "preparing the solver's kernels (once)" in capsys.readouterr().out


def test_every_core_is_used_unless_told() -> None:
    from studies.cli.parser import make_parser

    threads = make_parser().parse_args(["check", "a.toml"]).threads
    assert threads == available_threads() >= 1
    done = subprocess.run(["taskset", "-c", "0", sys.executable, "-c",
                           "from geometry.budget import available_threads; print(available_threads())"],
                          capture_output=True, text=True, timeout=60, check=False)
    if done.returncode == 0:
        assert done.stdout.strip() == "1"


@pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")
@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGTERM, signal.SIGKILL])
def test_a_check_that_is_stopped_leaves_no_process(tmp_path: Path, number: int) -> None:
    part = Path(run.__file__).parents[1] / "examples" / "cantilever.toml"
    with subprocess.Popen([sys.executable, "-m", "studies.cli", "check", str(part), "--out", str(tmp_path / "c.run")],
                          stdout=subprocess.DEVNULL, stderr=subprocess.PIPE, text=True) as check:
        children = Path(f"/proc/{check.pid}/task/{check.pid}/children")
        deadline = time.monotonic() + 60.0
        while len(found := children.read_text().split()) < 2 and time.monotonic() < deadline:
            time.sleep(0.01)
        assert len(found) == 2, "both kernels should be loading"
        check.send_signal(number)
        _, told = check.communicate(timeout=60)
    if number != signal.SIGKILL:
        assert check.returncode == 130 and "nothing was written" in told and "Traceback" not in told
    deadline = time.monotonic() + 30.0  # after SIGKILL they see it when what they load is loaded
    while any(_works(pid) for pid in found) and time.monotonic() < deadline:
        time.sleep(0.05)
    assert not any(_works(pid) for pid in found)
    assert [p for p in tmp_path.iterdir() if not p.name.endswith(".partial")] == []


def _works(pid: str) -> bool:
    try:
        return Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0] != "Z"
    except OSError:
        return False


@pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")
def test_every_job_of_the_cad_template_gives_the_same_solid() -> None:
    """The first and the second, and one in a fresh template, which has one thread: a copy of more would be unsound."""
    from geometry.budget import Budget
    from geometry.process import Template
    from geometry.spec import read_part
    from studies.check.solid_child import SolidChild, cad_template

    part = read_part(Path(run.__file__).parents[1] / "examples" / "cantilever.toml")
    fresh = Template("studies.check.solid_child")
    solids = []
    for template in (cad_template(), cad_template(), fresh):
        with SolidChild(part, Budget(), template) as child:
            solids.append(child.result()[0])
    assert len(list(Path(f"/proc/{fresh.pid}/task").iterdir())) == 1
    fresh.close()
    assert len({solid.brep for solid in solids}) == len({solid.step for solid in solids}) == 1
