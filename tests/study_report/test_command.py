"""``haunch report`` on real records, made from a real plan with outcomes of a formula."""

from __future__ import annotations

import json
import re
import shutil
import stat
from collections.abc import Callable
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

from studies.cli.main import main
from studies.record import Record
from studies.report.study.gather import chosen_pictures, study_data
from studies.vary.outcome import Outcome
from studies.vary.plan import plan_from_text
from studies.vary.run.keeping import new_run

EXAMPLE = Path(__file__).parents[2] / "studies" / "examples" / "camera_arm.toml"

PLAN = """
title = "Camera arm: depths"
part = "camera_arm.toml"

[vary]
root_depth = ["51 mm", "60 mm", "72 mm"]
tip_depth = ["3.4 cm", "3.6 cm", "3.9 cm"]
material = ["EN AW-6082 T6", "EN AW-6061 T6"]

[constraints]
slope = "tip_depth <= root_depth - 13 mm"

[aim]
least = "AIM"
"""


@pytest.fixture
def record(tmp_path: Path, samples: ModuleType) -> Callable[..., Path]:
    """Writes a record with an outcome for every variant but those of `waiting`; `failing` ones failed."""
    shutil.copy(EXAMPLE, tmp_path)

    def write(aim: str = "mass", waiting: tuple[int, ...] = (), failing: tuple[int, ...] = (), **more: Any) -> Path:
        plan = plan_from_text(PLAN.replace("AIM", aim), tmp_path, "depths.toml")
        path = tmp_path / "depths.study"
        with Record.create(path, plan) as writer:
            variants = list(plan.variants())
            writer.set_points(variants)
            writer.set_left_out((left.number, left.values, left.reason) for left in plan.left_out())
            for variant in variants:
                if variant.number in waiting:
                    continue
                found = samples.arm(variant.numbers["root_depth"], variant.numbers["tip_depth"], 6.0)
                outcome = samples.outcome(variant.key, found, {"deflection": 0.25}, **more)
                if variant.number in failing:
                    outcome = Outcome(variant.key, "failed", stage="mesh", reason="the mesher crashed (signal 11)")
                writer.add(variant, outcome)
                if variant.number == 9:
                    folder = new_run(path, variant)
                    folder.mkdir(parents=True)
                    for name in ("part.png", "stress-carrying.png", "summary.md"):
                        (folder / name).write_bytes(b"\x89PNG")
        return path

    return write


def packed(page: Path) -> dict[str, Any]:
    found = re.search(r'<script type="application/json" id="study">(.*?)</script>', page.read_text("utf-8"), re.S)
    assert found is not None
    return json.loads(found[1])


def test_a_record_becomes_a_page(record: Callable[..., Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch,
                                 capsys: pytest.CaptureFixture[str]) -> None:
    path = record(waiting=(17,), failing=(1,))
    before = path.read_bytes()
    monkeypatch.chdir(tmp_path)
    assert main(["report", str(path)]) == 0
    told = capsys.readouterr().out.splitlines()
    assert re.match(r"Variant \d+ is the lightest of the \d+ variants that meet every limit: 0\.\d+ kg\.", told[0])
    assert told[1] == "1 of 16 points has not run yet. What is said here may change."
    assert told[-1] == "The page is depths.html: open it in a browser."
    text = (tmp_path / "depths.html").read_text("utf-8")
    assert "the mesher crashed (signal 11)" in text
    assert "tip_depth &lt;= root_depth - 13 mm: 39 mm is not &lt;= 38 mm" in text
    study = packed(tmp_path / "depths.html")
    assert [axis["name"] for axis in study["axes"]] == ["root_depth", "tip_depth", "material"]
    assert [axis["unit"] for axis in study["axes"]] == ["mm", "cm", ""]
    assert study["axes"][1]["values"][0] == pytest.approx(3.4)
    assert study["axes"][2]["levels"] == ["EN AW-6082 T6", "EN AW-6061 T6"]
    assert len(study["number"]) == 16  # 18 points, of which two break the constraint
    assert path.read_bytes() == before


def test_the_page_is_not_overwritten_unasked(record: Callable[..., Path], tmp_path: Path,
                                             capsys: pytest.CaptureFixture[str]) -> None:
    path, page = record(), tmp_path / "there.html"
    page.write_text("mine")
    assert main(["report", str(path), "--out", str(page)]) == 3
    assert "exists already; choose another name, or give --replace" in capsys.readouterr().err
    assert page.read_text() == "mine"
    assert main(["report", str(path), "--out", str(page), "--replace"]) == 0
    assert page.read_text("utf-8").startswith("<!DOCTYPE html>")
    assert stat.S_IMODE(page.stat().st_mode) & 0o444 == 0o444
    assert not list(tmp_path.glob(".there*"))


def test_a_page_that_cannot_be_written(record: Callable[..., Path], tmp_path: Path,
                                       capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["report", str(record()), "--out", str(tmp_path / "no" / "page.html")]) == 3
    assert "cannot write" in capsys.readouterr().err
    assert main(["report", str(tmp_path / "none.study")]) == 3
    assert "there is no record" in capsys.readouterr().err
    other = tmp_path / "other.study"
    other.write_text("no record at all, but some text that is long enough to be looked at")
    assert main(["report", str(other)]) == 3


def test_kept_runs_are_linked_from_where_the_page_lies(record: Callable[..., Path], tmp_path: Path) -> None:
    path = record()
    out = tmp_path / "pages and more" / "page.html"
    with Record.open(path) as opened:
        data = study_data(opened, out)
    row = next(row for row in data.rows if row.number == 9)
    assert re.fullmatch(r"\.\./depths\.runs/0009-[0-9a-f]{12}/", row.run)
    assert [name.rpartition("/")[2] for name in row.pictures] == ["part.png", "stress-carrying.png"]
    assert (out.parent / row.pictures[0]).resolve().is_file() or not out.parent.exists()
    assert sum(bool(other.run) for other in data.rows) == 1
    assert chosen_pictures(data, 9, path) == {"Variant 9: the part": b"\x89PNG", "Variant 9: its stress": b"\x89PNG"}
    assert chosen_pictures(data, 1, path) == {}


def test_an_aim_that_is_a_formula(record: Callable[..., Path], tmp_path: Path) -> None:
    path = record("2.5 * mass / (1 kg) + tip_depth / (100 mm)")
    with Record.open(path) as opened:
        data = study_data(opened, tmp_path / "page.html")
    row = data.rows[0]
    mass = row.outcome.figures["mass"].solid
    assert row.aim == pytest.approx(2500 * mass + row.numbers["tip_depth"] / 100)
    assert main(["report", str(path), "--out", str(tmp_path / "page.html")]) == 0
    study = packed(tmp_path / "page.html")
    assert study["first"] == "aim" and study["aim"]["values"][0] == pytest.approx(row.aim, rel=1e-6)


def test_a_plan_that_cannot_be_read_again_costs_the_aim_only(record: Callable[..., Path], tmp_path: Path,
                                                              monkeypatch: pytest.MonkeyPatch) -> None:
    path = record()
    with Record.open(path) as opened:
        study = opened.study()
        import dataclasses

        monkeypatch.setattr(Record, "study", lambda self: dataclasses.replace(study, plan_text="[vary]\nno = 1"))
        data = study_data(opened, tmp_path / "page.html")
    assert (data.aim, data.aim_unit, data.sampling) == ("mass", "t", "grid")
    assert data.notes[0].startswith("The plan in the record cannot be read by this version")
    assert [axis.numeric for axis in data.axes] == [True, True, False]


def test_one_of_several_studies(record: Callable[..., Path], tmp_path: Path,
                                capsys: pytest.CaptureFixture[str]) -> None:
    path = record()
    assert main(["report", str(path), "--study", "no such", "--out", str(tmp_path / "x.html")]) == 3
    assert "holds no study 'no such'; it holds: Camera arm: depths" in capsys.readouterr().err
    assert main(["report", str(path), "--study", "Camera arm: depths", "--out", str(tmp_path / "x.html")]) == 0
