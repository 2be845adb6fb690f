"""``haunch vary``: what it prints, when it is silent, and its exit status. Small processes do the work."""

from __future__ import annotations

import os
import re
import sys
from pathlib import Path
from typing import Any

import pytest

from studies.cli import main
from studies.record import Record

PLAN = """
title = "Bars"
part = "bar.toml"
[vary]
depth = { from = "36 mm", to = "46 mm", steps = 5 }
width = ["18 mm", "22 mm"]
[aim]
least = "mass"
[keep]
runs = { best = 1, worst = 0, suspicious = 0 }
"""


@pytest.fixture
def room(small, tmp_path, monkeypatch) -> Path:
    (tmp_path / "bar.toml").write_text(small.SPEC.read_text())
    (tmp_path / "bars.toml").write_text(PLAN)
    monkeypatch.chdir(tmp_path)
    monkeypatch.setattr("studies.vary.run.local.LocalBackend",
                        lambda workers, memory: small.SmallBackend(tmp_path, workers))
    for name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
        monkeypatch.setenv(name, "1")
    return tmp_path


def test_says_what_to_choose_and_what_went_wrong(small, room, capsys):
    small.faults(room, n3="fails", n4="fails", n5="spec", n6="fails once")
    assert main(["vary", "bars.toml", "--workers", "2"]) == 1  # some failed
    said = capsys.readouterr().out
    assert "the best that meet every limit: least mass" in said and "limit left" in " ".join(said.split())
    best = next(line.split() for line in said.splitlines() if re.match(r"\s+\d+ +\d\d mm", line))
    assert best[1:6] == ["42", "mm", "18", "mm", "0.756"]  # 42 x 18 x 1e-6 t, in kg
    assert "! 1 suspicious; the commonest reasons:\n        1  displacement z at bar.end in case tip_force" in said
    assert "x 3 failed:\n        2  mesh: no attempt gave a mesh (variant 3, 4)" in said
    assert "        1  spec: no attempt gave a mesh (variant 5)" in said
    assert "3 on a safer mesh" in said
    assert "haunch again bars.study 3" in said and "haunch vary bars.toml --record bars.study --again failed" in said
    assert "The report: haunch report bars.study" in said and "whole run kept in" in said
    assert "variant 3 failed (mesh: no attempt gave a mesh); it is tried once more on a safer mesh" in said
    small.faults(room)
    assert main(["vary", "bars.toml", "--again", "failed"]) == 0
    said = capsys.readouterr().out
    assert "3 variants in" in said and "9 of 12 points from before" in said and "failed:" not in said


def test_says_so_when_no_variant_is_fine(room, capsys):
    (room / "bars.toml").write_text(PLAN.replace('"46 mm", steps = 5', '"40 mm", steps = 2'))
    assert main(["vary", "bars.toml"]) == 0  # 40 x 22 has 2.84 mm of 3 mm
    (room / "bars.toml").write_text(PLAN.replace('"46 mm", steps = 5', '"38 mm", steps = 1'))
    assert main(["vary", "bars.toml", "--record", "thin.study"]) == 1
    said = capsys.readouterr().out.split("No variant meets every limit")[1]
    # 4e6 / (22 x 38^3) = 3.3135 mm of 3 mm: 10.45 % missed
    assert re.search(r"The nearest is variant \d \(depth = 38 mm, width = 22 mm\): agrees", said)
    assert "is missed by 10.4 %" in said or "is missed by 10.5 %" in said


def test_quiet_prints_nothing_and_the_log_has_it_all(room, capsys):
    assert main(["vary", "bars.toml", "--quiet", "--log", "night.log"]) == 0
    assert capsys.readouterr() == ("", "")
    assert (room / "night.log").read_text().count(" every limit met") + (room / "night.log").read_text().count(
        " missed") == 12


def test_lines_of_counts_where_there_is_no_terminal(room, capsys, monkeypatch):
    monkeypatch.setattr("studies.cli.vary_screen.PLAIN_SECONDS", 0.0)
    main(["vary", "bars.toml"])
    said = capsys.readouterr().out
    assert re.search(r"^\d+ of 12 done, = \d+ agrees.* a minute, \d+ s left$", said, re.MULTILINE)
    assert "\x1b" not in said


def test_moving_line_in_a_terminal(small, room):
    """In a pseudo-terminal of its own."""
    leader, follower = os.openpty()

    def work() -> tuple[str, int]:
        os.dup2(follower, 1)
        sys.stdout = open(1, "w", closefd=False)  # noqa: SIM115 - until the end
        return "", main(["vary", "bars.toml"])

    one = small.Driver(room, prepare=lambda: os.environ.update(TERM="xterm", COLUMNS="120"), work=work)
    os.close(follower)
    said = b""
    while piece := _read(leader):
        said += piece
    assert one.said() == "" and one.returncode == 0 and b"\x1b[" in said and "━".encode() in said
    assert b"12 of 12 done" in said and b"= 11 agrees" in said


def _read(leader: int) -> bytes:
    try:
        return os.read(leader, 65536)
    except OSError:  # the other end is closed
        return b""


def test_study_goes_on_when_nobody_reads(small, room):
    reader, writer = os.pipe()
    os.close(reader)

    def work() -> tuple[str, int]:
        os.dup2(writer, 1)
        sys.stdout = open(1, "w", closefd=False)  # noqa: SIM115 - until the end
        return "", main(["vary", "bars.toml"])

    one = small.Driver(room, work=work)
    os.close(writer)
    one.said()
    with Record.open(room / "bars.study") as record:
        assert record.progress().finished == 12
    assert one.returncode == 0


def test_bad_words_are_told(room, capsys):
    def told(*words: str) -> tuple[int, str]:
        status = main(["vary", *words])
        return status, capsys.readouterr().err

    assert told("none.toml")[0] == 2
    (room / "wrong.toml").write_text(PLAN.replace("depth =", "dept ="))
    status, text = told("wrong.toml")
    assert status == 2 and "1 mistake in wrong.toml" in text and "dept" in text
    status, text = told("bars.toml", "--again", "13")
    assert status == 2 and "mistake in the command line" in text and "numbers of points from 1 to 12" in text
    assert told("bars.toml", "--again", "never")[0] == 2
    many = 'width = { from = "18 mm", to = "22 mm", steps = 399 }'
    few = 'width = ["18 mm", "22 mm"]'
    (room / "many.toml").write_text(PLAN.replace("steps = 5", "steps = 399").replace(few, many))
    status, text = told("many.toml")
    assert status == 2 and re.search(r"160.?000", text)


def test_two_drivers_and_foreign_records(small, room, capsys):
    plan = small.make_plan(room)
    with Record.create(room / "held.study", plan):
        assert main(["vary", "bars.toml", "--record", "held.study"]) == 3
    assert "another driver" in capsys.readouterr().err
    (room / "text.study").write_text("no record " * 1000)
    assert main(["vary", "bars.toml", "--record", "text.study"]) == 3
    assert "no record of Haunch" in capsys.readouterr().err
    (room / "other.toml").write_text(PLAN.replace("Bars", "Other"))
    assert main(["vary", "bars.toml", "--quiet"]) == 0
    assert main(["vary", "other.toml", "--record", "bars.study"]) == 3
    assert "--share" in capsys.readouterr().err


@pytest.mark.heavy
def test_export_while_and_after(room, capsys):
    main(["vary", "bars.toml", "--quiet"])
    assert main(["export", "bars.study", "bars.csv"]) == 0
    assert capsys.readouterr().out == "12 of 12 points are in bars.csv\n"
    assert len((room / "bars.csv").read_text().splitlines()) == 13
    assert main(["export", "bars.study", "bars.csv"]) == 3 and "--replace" in capsys.readouterr().err
    assert main(["export", "bars.study", "bars.xlsx"]) == 3 and ".parquet" in capsys.readouterr().err


def test_again_needs_a_variant(room, capsys):
    main(["vary", "bars.toml", "--quiet"])
    assert main(["again", "bars.study", "13", "--out", "x.run"]) == 3
    assert "its numbers go up to 12" in capsys.readouterr().err
    assert main(["again", "none.study", "1"]) == 3


def test_stop_words_hold_the_command(small, room):
    def work() -> tuple[str, int]:
        import studies.vary.run.local as local

        local.LocalBackend = lambda workers, memory: small.SmallBackend(room, 1, 0.1)  # type: ignore[assignment,misc]
        sys.argv = ["haunch", "vary", "bars.toml", "--quiet"]
        return "", main(sys.argv[1:])

    one = small.Driver(room, work=work)
    while not (room / "started").exists():
        pass
    one.kill(15)
    said: Any = one.said()
    assert one.returncode == 130
    assert re.search(r"haunch: stopped \(SIGTERM\): \d+ of 12 points are done and in bars.study; the same command goes "
                     r"on:\n  haunch vary bars.toml --quiet", said)


@pytest.mark.parametrize("warm", [True, False])
def test_kernels_that_have_to_be_compiled_are_told_before(monkeypatch, warm):
    from studies.vary.run.local import compile_kernels

    order: list[str] = []
    monkeypatch.setattr("fem.solid.kernels.cache.is_warm", lambda: warm)
    monkeypatch.setattr("subprocess.run", lambda command, **_: order.append(
        "compiled" if "warm_up" in command[-1] else "something else"))
    compile_kernels(order.append)
    assert order == ([] if warm else ["preparing the solver's kernels: about a minute, once", "compiled"])
