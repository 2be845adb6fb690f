"""One checked run, its models fabricated: stages, files, failures."""

from __future__ import annotations

import dataclasses
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from types import ModuleType, SimpleNamespace
from typing import Any

import pytest

import studies.check.run as run
from geometry.budget import Budget
from geometry.problem import MeshError, RunError, SpecError
from geometry.process import Template
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
    monkeypatch.setattr("studies.check.fields.write_fields",
                        lambda path, mesh, solid, cases=None: path.write_bytes(b"vtu"))
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


@pytest.fixture
def cad(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Iterator[Callable[[str], Template]]:
    """Makes templates whose jobs do what a line of Python says, in place of building a solid."""
    made: list[Template] = []

    def make(line: str) -> Template:
        text = f"import os, signal, time\n\ndef prepare():\n    pass\n\ndef serve(order, data):\n    {line}\n"
        (tmp_path / "fake_cad.py").write_text(text)
        monkeypatch.setenv("PYTHONPATH", str(tmp_path))
        made.append(Template("fake_cad"))
        return made[-1]

    yield make
    for template in made:
        template.close()


def test_a_crash_of_the_cad_kernel_is_told_not_suffered(helpers: ModuleType, cad: Callable[[str], Template]) -> None:
    template = cad("os.kill(os.getpid(), signal.SIGSEGV)")
    for _ in range(2):  # and the template is there for the next one
        with SolidChild(helpers.make_part(), Budget(), template) as child:
            with pytest.raises(RunError, match="SIGSEGV") as caught:
                child.result()
        assert caught.value.stage == "solid"


def test_the_solid_can_be_meshed_before_it_is_whole(helpers: ModuleType) -> None:
    with SolidChild(helpers.make_part(), Budget()) as child:
        early, seconds = child.meshable()
        whole, all_seconds = child.result()
    assert 0 < seconds < all_seconds and early.step == b"" and len(whole.step) > 1000 and len(whole.slices) == 9
    assert dataclasses.replace(whole, step=b"", sharp_edges=(), slices=early.slices) == early


def test_a_crash_after_the_solid_can_be_meshed_is_told(helpers: ModuleType, cad: Callable[[str], Template]) -> None:
    template = cad("from studies.check.solid_child import _send; _send(data, ('early', 'a solid', 0.5)); "
                   "os.kill(os.getpid(), signal.SIGSEGV)")
    with SolidChild(helpers.make_part(), Budget(), template) as child:
        assert child.meshable() == ("a solid", 0.5)
        with pytest.raises(RunError, match="SIGSEGV"):
            child.result()


def test_a_cad_process_ended_from_outside_is_no_fault_of_the_part(helpers: ModuleType,
                                                                  cad: Callable[[str], Template]) -> None:
    with SolidChild(helpers.make_part(), Budget(), cad("os.kill(os.getpid(), signal.SIGKILL)")) as child:
        with pytest.raises(RunError, match="SIGKILL.*run again.*--memory") as caught:
            child.result()
    assert caught.value.stage == "solid" and "edge radii" not in str(caught.value)


def test_a_hanging_cad_kernel_is_stopped(helpers: ModuleType, cad: Callable[[str], Template],
                                         monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("studies.check.solid_child.LEAST_SECONDS", 0.5)
    template = cad("time.sleep(60)")
    with SolidChild(helpers.make_part(), Budget(seconds=0.5), template) as child:
        with pytest.raises(RunError, match=r"longer than 0\.5 s and was stopped"):
            child.result()
    assert _children(template) == []


def test_leaving_early_ends_the_cad_process(helpers: ModuleType, cad: Callable[[str], Template]) -> None:
    template = cad("time.sleep(60)")
    with SolidChild(helpers.make_part(), Budget(), template):
        deadline = time.monotonic() + 20.0
        while not (template.pid and _children(template)) and time.monotonic() < deadline:
            time.sleep(0.02)
        assert _children(template) != [], "no job was started: this test shows nothing"
    assert _children(template) == []


def test_a_cad_process_that_cannot_be_started_is_told(helpers: ModuleType) -> None:
    template = Template("no_such_module")
    with SolidChild(helpers.make_part(), Budget(), template) as child:
        with pytest.raises(RunError, match="exit code 1") as caught:
            child.result()
    assert caught.value.stage == "solid"


def _children(template: Template) -> list[str]:
    return Path(f"/proc/{template.pid}/task/{template.pid}/children").read_text().split()


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
    monkeypatch.setattr("studies.check.fields.nodal_fields", lambda *_: {})
    models = helpers.make_models()
    with pytest.raises(RunError, match="No space left") as caught:
        write_fields(tmp_path / "solid.vtu", models.mesh, models.solid)
    assert caught.value.stage == "write"
