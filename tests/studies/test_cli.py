"""The command line: words, exit statuses, and never a traceback."""

from __future__ import annotations

import dataclasses
import io
import json
import os
import subprocess
import sys
import time
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

import studies.check.run as run
from geometry.problem import MeshError, Problem, SpecError
from studies.check.stages import Clock
from studies.cli import main
from studies.cli.parser import make_parser


@pytest.fixture
def answer(monkeypatch: pytest.MonkeyPatch, helpers: ModuleType) -> Any:
    """Lets a test say what `check` returns or raises."""
    models = helpers.make_models()
    result = run.make_result(models, helpers.make_judgement(models), "arm.toml", "2026-12-01T12:00:00Z", Clock())

    def set_answer(outcome: Any = None, **changes: Any) -> None:
        def check(*_: Any, **__: Any) -> Any:
            if isinstance(outcome, BaseException):
                raise outcome
            return dataclasses.replace(result, **changes)

        monkeypatch.setattr(run, "check", check)

    set_answer.result = result  # type: ignore[attr-defined]
    return set_answer


def test_help_is_quick_and_complete() -> None:
    started = time.perf_counter()
    done = subprocess.run([sys.executable, "-X", "importtime", "-m", "studies.cli", "--help"], capture_output=True,
                          text=True, timeout=30, check=True, env={**os.environ, "COLUMNS": "120"})
    wall = time.perf_counter() - started
    for text in ("check", "show", "schema", "reference", "materials", "exit status", "130", "buckling", "fatigue",
                 "contact", "licensed"):
        assert text in done.stdout
    loaded = {line.rsplit("|", 1)[-1].strip() for line in done.stderr.splitlines()}
    assert not loaded & {"numpy", "pydantic", "rich", "matplotlib", "cadquery", "gmsh", "skfem", "scipy"}
    assert wall < 5  # the import check above is what keeps it under 0.4 s; a loaded machine cannot be timed


def test_a_fine_run_is_0(answer: Any, capsys: pytest.CaptureFixture[str]) -> None:
    answer()
    assert main(["check", "arm.toml"]) == 0
    out = capsys.readouterr().out
    assert "= agrees" in out and "displacement z at arm.end" in out and "not verified" in out and "arm.run" in out


@pytest.mark.parametrize("verdict", ["missed", "not established"])
def test_a_limit_that_is_not_met_is_1(answer: Any, verdict: str, capsys: pytest.CaptureFixture[str]) -> None:
    limit = dataclasses.replace(answer.result.limits[0], verdict=verdict, reason="because [of] it")
    answer(limits=(limit,))
    assert main(["check", "arm.toml"]) == 1
    assert verdict in capsys.readouterr().out


def test_a_suspicious_figure_is_1_and_says_where_to_look(answer: Any, capsys: pytest.CaptureFixture[str]) -> None:
    pair = dataclasses.replace(answer.result.pairs[-1], judgement="suspicious", look_at="look at the density")
    answer(pairs=(pair,))
    assert main(["check", "arm.toml"]) == 1
    assert "look at the density" in capsys.readouterr().out


def test_a_failed_check_is_1(answer: Any) -> None:
    answer(checks=(dataclasses.replace(answer.result.checks[0], ok=False),))
    assert main(["check", "arm.toml"]) == 1


def test_a_wrong_spec_is_2_with_every_mistake(answer: Any, capsys: pytest.CaptureFixture[str]) -> None:
    answer(SpecError([Problem("members.a", "6", "a length", "Write 6 mm"), Problem("members.b", "x", "y")]))
    assert main(["check", "arm.toml"]) == 2
    told = capsys.readouterr().err
    assert "2 mistakes in arm.toml" in told and "Write 6 mm" in told and "members.b" in told


def test_a_failed_stage_is_3(answer: Any, capsys: pytest.CaptureFixture[str]) -> None:
    answer(MeshError("no attempt worked"))
    assert main(["check", "arm.toml"]) == 3
    assert "meshing failed: no attempt worked" in capsys.readouterr().err


def test_ctrl_c_is_130(answer: Any, capsys: pytest.CaptureFixture[str]) -> None:
    answer(KeyboardInterrupt())
    assert main(["check", "arm.toml"]) == 130
    assert "nothing was written" in capsys.readouterr().err


def test_the_unforeseen_is_3_one_sentence_and_a_log(answer: Any, capsys: pytest.CaptureFixture[str], tmp_path: Path,
                                                    monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr("tempfile.tempdir", str(tmp_path))
    answer(ZeroDivisionError("deep inside"))
    assert main(["check", "arm.toml"]) == 3
    told = capsys.readouterr().err
    log = next(tmp_path.glob("*.log"))
    assert "Traceback" not in told and str(log) in told and told.count("\n") == 1
    assert "deep inside" in log.read_text() and "Traceback" in log.read_text()


@pytest.mark.parametrize("arguments", [[], ["chekc"], ["check"], ["check", "a.toml", "--threads", "0"],
                                       ["check", "a.toml", "--memory", "much"], ["check", "a.toml", "--repl"]])
def test_a_wrong_command_line_is_2(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    assert main(arguments) == 2
    assert "usage: haunch" in capsys.readouterr().err


def test_a_missing_spec_is_2(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(tmp_path / "no.toml"), "--out", str(tmp_path / "no.run")]) == 2
    assert "no such file" in capsys.readouterr().err


def test_show_prints_a_run_and_refuses_what_is_none(answer: Any, tmp_path: Path,
                                                    capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "result.json").write_text(answer.result.to_json(), encoding="utf-8")
    assert main(["show", str(tmp_path)]) == 0
    assert "Test cantilever" in capsys.readouterr().out
    assert main(["show", str(tmp_path / "nothing")]) == 3
    (tmp_path / "result.json").write_text(json.dumps({"format": "haunch-result/9"}))
    assert main(["show", str(tmp_path)]) == 3
    assert "newer" in capsys.readouterr().err


def test_a_reader_that_has_enough_is_no_fault() -> None:
    command = f"{sys.executable} -m studies.cli materials | head -1"
    done = subprocess.run(["bash", "-c", f"set -o pipefail; {command}"], capture_output=True, text=True, timeout=60,
                          check=False)
    assert "Traceback" not in done.stderr and "haunch:" not in done.stderr


def test_materials_say_their_sources(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["materials"]) == 0
    out = capsys.readouterr().out
    assert "EN AW-6082 T6" in out and "1993-1-1" in out and "from memory" in out


def test_options_reach_the_command() -> None:
    options = make_parser().parse_args(["check", "a.toml", "--out", "b", "--replace", "--no-pictures", "--threads",
                                        "1", "--memory", "1000"])
    assert (options.part, options.out, options.replace, options.pictures, options.threads, options.memory) == \
        ("a.toml", "b", True, False, 1, 1000)


def test_a_terminal_without_the_letters_gets_question_marks(answer: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    out = io.TextIOWrapper(io.BytesIO(), encoding="ascii")
    monkeypatch.setattr(sys, "stdout", out)
    answer(title="Größe")
    assert main(["check", "arm.toml"]) == 0
    out.seek(0)
    assert "Gr??e" in out.read()


@pytest.mark.parametrize(("redirection", "status"), [(">&-", 0), ("> /dev/full", 3)])
def test_output_that_cannot_be_written(redirection: str, status: int) -> None:
    done = subprocess.run(["sh", "-c", f'"{sys.executable}" -m studies.cli reference {redirection}'],
                          capture_output=True, text=True, timeout=60)
    assert done.returncode == status
    assert ("No space left" in done.stderr) == (status == 3) and "unforeseen" not in done.stderr


@pytest.mark.parametrize("name", ["SIGINT", "SIGTERM"])
def test_a_stop_that_lands_in_code_called_back_is_not_lost(name: str) -> None:
    """The compiler of kernels calls Python back through ctypes, where an exception goes no further: without care the
    run goes on, and a traceback is shown."""
    code = """
import ctypes, importlib, os, signal, sys, time

def long_compilation(_):
    ctypes.CFUNCTYPE(None)(lambda: (os.kill(os.getpid(), signal.NAME), time.sleep(0.2)))()
    time.sleep(20)
    return 0

class Parser:
    def parse_args(self, _):
        return type("Options", (), {"run": staticmethod(long_compilation)})

signal.signal(signal.SIGINT, signal.default_int_handler)
module = importlib.import_module("studies.cli.main")
module.make_parser = Parser
sys.exit(module.main([]))
""".replace("NAME", name)
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=60)
    assert (done.returncode, done.stderr) == (130, "haunch: stopped; nothing was written\n")
