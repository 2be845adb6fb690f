"""One checked run, its models fabricated: stages, files, failures."""

from __future__ import annotations

import dataclasses
import subprocess
import sys
from pathlib import Path
from types import ModuleType, SimpleNamespace
from typing import Any

import pytest

import studies.check.run as run
from geometry.budget import Budget
from geometry.problem import MeshError, RunError, SpecError
from studies.check.result import CheckResult
from studies.check.solid_child import SolidChild
from studies.check.stages import STAGES, Clock, Event
from studies.report import frame


@pytest.fixture
def fabricated(monkeypatch: pytest.MonkeyPatch, helpers: ModuleType) -> SimpleNamespace:
    """Models and judgement that `check` will find instead of the real ones."""
    state = SimpleNamespace(models=helpers.make_models(), fault=None)
    monkeypatch.setattr(frame, "PIXELS", 500)
    monkeypatch.setattr(frame, "DPI", 60)

    def build_models(part: Any, budget: Budget, clock: Clock, solver: str = "auto") -> Any:
        for name in ("solid", "mesh", "beam", "solve"):
            with clock.stage(name):
                if state.fault is not None and state.fault[0] == name:
                    raise state.fault[1]
        return state.models

    monkeypatch.setattr(run, "build_models", build_models)
    monkeypatch.setattr(run, "_compare", lambda models, name, started, clock: run.make_result(
        models, helpers.make_judgement(models), name, started, clock))
    monkeypatch.setattr("studies.check.fields.write_fields", lambda path, mesh, solid: path.write_bytes(b"vtu"))
    return state


def test_a_run_writes_everything_it_names(fabricated: SimpleNamespace, tmp_path: Path) -> None:
    heard: list[Event] = []
    result = run.check(fabricated.models.part, tmp_path / "arm.run", listener=heard.append)
    assert [event.stage for event in heard if event.kind == "end"] == list(STAGES)
    assert [stage.name for stage in result.stages] == list(STAGES)
    written = CheckResult.from_json((tmp_path / "arm.run" / "result.json").read_text(encoding="utf-8"))
    assert sorted(written.files) == sorted(p.name for p in (tmp_path / "arm.run").iterdir())
    assert {"summary.md", "result.json", "part.step", "solid.vtu", "part.png", "mesh.png", "deflected-carrying.png",
            "stress-carrying.png", "diagrams-carrying.png"} == set(written.files)
    assert written.judgement == "agrees" and written.fine and written.accuracy == 0.02
    assert written.pairs == result.pairs and written.spec_text == fabricated.models.part.source_text
    for picture in (tmp_path / "arm.run").glob("*.png"):
        assert picture.read_bytes()[:8] == b"\x89PNG\r\n\x1a\n" and picture.stat().st_size > 5_000
    summary = (tmp_path / "arm.run" / "summary.md").read_text(encoding="utf-8")
    for text in ("# Test cantilever", "requested, not verified", "| deflection |", "carrying", "Cautions",
                 "Peak places"):
        assert text in summary
    assert str(tmp_path) not in summary + written.to_json()


def test_without_pictures_there_are_none(fabricated: SimpleNamespace, tmp_path: Path) -> None:
    run.check(fabricated.models.part, tmp_path / "arm.run", pictures=False)
    assert sorted(p.name for p in (tmp_path / "arm.run").iterdir()) == ["part.step", "result.json", "solid.vtu",
                                                                       "summary.md"]


@pytest.mark.parametrize(("stage", "fault", "text"), [
    ("mesh", MeshError("no attempt worked"), "no attempt worked"),
    ("solve", ZeroDivisionError("x"), "ZeroDivisionError"),
    ("solid", MemoryError(), "memory"),
])
def test_a_failed_stage_is_named_and_nothing_is_written(fabricated: SimpleNamespace, tmp_path: Path, stage: str,
                                                        fault: Exception, text: str) -> None:
    fabricated.fault = (stage, fault)
    with pytest.raises(RunError, match=text) as caught:
        run.check(fabricated.models.part, tmp_path / "arm.run")
    assert caught.value.stage == stage
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("fault", [KeyboardInterrupt, ValueError])
def test_a_stop_while_writing_leaves_nothing(fabricated: SimpleNamespace, tmp_path: Path,
                                             monkeypatch: pytest.MonkeyPatch, fault: type[BaseException]) -> None:
    def stop(*_: object) -> str:
        assert list(tmp_path.iterdir())  # the temporary folder is there
        raise fault

    monkeypatch.setattr("studies.report.summary.summary", stop)
    with pytest.raises(KeyboardInterrupt if fault is KeyboardInterrupt else RunError):
        run.check(fabricated.models.part, tmp_path / "arm.run", pictures=False)
    assert list(tmp_path.iterdir()) == []


def test_a_finished_run_is_refused_before_any_work(fabricated: SimpleNamespace, tmp_path: Path) -> None:
    run.check(fabricated.models.part, tmp_path / "arm.run", pictures=False)
    heard: list[Event] = []
    with pytest.raises(RunError, match="--replace"):
        run.check(fabricated.models.part, tmp_path / "arm.run", listener=heard.append)
    assert heard == []


def test_a_wrong_spec_is_a_spec_error(tmp_path: Path) -> None:
    (tmp_path / "bad.toml").write_text("title = 3\n")
    with pytest.raises(SpecError):
        run.check(tmp_path / "bad.toml", tmp_path / "bad.run")
    assert [p.name for p in tmp_path.iterdir()] == ["bad.toml"]


def test_a_crash_of_the_cad_kernel_is_told_not_suffered(helpers: ModuleType, monkeypatch: pytest.MonkeyPatch) -> None:
    """The child is made to die of a signal; the parent raises a `SolidError` and leaves no process."""
    real = subprocess.Popen

    def popen(command: list[str], **kinds: Any) -> subprocess.Popen[bytes]:
        return real([sys.executable, "-c", "import os, signal; os.kill(os.getpid(), signal.SIGSEGV)"], **kinds)

    monkeypatch.setattr(subprocess, "Popen", popen)
    with SolidChild(helpers.make_part(), Budget()) as child:
        with pytest.raises(RunError, match="SIGSEGV") as caught:
            child.result()
    assert caught.value.stage == "solid"
    assert child._process.poll() is not None


def test_a_cad_process_ended_from_outside_is_no_fault_of_the_part(
    helpers: ModuleType, monkeypatch: pytest.MonkeyPatch
) -> None:
    real = subprocess.Popen

    def popen(command: list[str], **kinds: Any) -> subprocess.Popen[bytes]:
        return real([sys.executable, "-c", "import os, signal; os.kill(os.getpid(), signal.SIGKILL)"], **kinds)

    monkeypatch.setattr(subprocess, "Popen", popen)
    with SolidChild(helpers.make_part(), Budget()) as child:
        with pytest.raises(RunError, match="SIGKILL.*run again.*--memory") as caught:
            child.result()
    assert caught.value.stage == "solid" and "edge radii" not in str(caught.value)


def test_a_hanging_cad_kernel_is_stopped(helpers: ModuleType, monkeypatch: pytest.MonkeyPatch) -> None:
    real = subprocess.Popen

    def popen(command: list[str], **kinds: Any) -> subprocess.Popen[bytes]:
        return real([sys.executable, "-c", "import time; time.sleep(60)"], **kinds)

    monkeypatch.setattr(subprocess, "Popen", popen)
    with SolidChild(helpers.make_part(), Budget()) as child:
        child._deadline = 0.0
        with pytest.raises(RunError, match="was stopped"):
            child.result()
    assert child._process.poll() is not None


def test_the_slower_solver_is_told(helpers: ModuleType) -> None:
    models = helpers.make_models()
    for backend, told in (("cholesky (lu)", True), ("cholesky (pardiso)", False)):
        other = dataclasses.replace(models, solid=dataclasses.replace(models.solid, backend=backend))
        result = run.make_result(other, helpers.make_judgement(models), "arm.toml", "2026-12-01T12:00:00Z", Clock())
        assert any("sparse LU" in caution for caution in result.cautions) is told


def test_a_full_disk_is_blamed_on_writing(helpers: ModuleType, monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    from studies.check.fields import write_fields

    def full(*_: object) -> None:
        raise MeshError("No space left on device")

    monkeypatch.setattr("mesher.write_vtu", full)
    monkeypatch.setattr("studies.check.fields.nodal_fields", lambda _: {})
    models = helpers.make_models()
    with pytest.raises(RunError, match="No space left") as caught:
        write_fields(tmp_path / "solid.vtu", models.mesh, models.solid)
    assert caught.value.stage == "write"
