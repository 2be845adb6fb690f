"""`lightest` on plans: through the driver, into a record; stopped and gone on with; both models once."""

from __future__ import annotations

import importlib.util
import sys
import threading
from pathlib import Path
from types import ModuleType
from typing import Any

import pytest

from geometry.problem import SpecError
from studies.cli.main import main
from studies.lightest.slopes import Slope
from studies.lightest.study import Lightest, lightest, share_used, space_of
from studies.lightest.words import sentence, step_size, told
from studies.record import Record
from studies.vary.outcome import Held

FREE = {"depth": {"from": "30 mm", "to": "60 mm"}, "width": {"from": "10 mm", "to": "40 mm"}}
STEPS = {"depth": {"from": "30 mm", "to": "60 mm", "steps": 15}, "width": ["10 mm", "14 mm"]}
SAMPLED = {"method": "sobol", "points": 8}


@pytest.fixture(scope="module")
def small() -> ModuleType:
    """The study of small processes, of the tests of the driver: 4e6 / (w d^3) mm of deflection, limit 3 mm, suspicious
    below 1.9 mm."""
    name = "studies_run_small"
    if name not in sys.modules:
        path = Path(__file__).parents[1] / "studies_run" / "small.py"
        spec = importlib.util.spec_from_file_location(name, path)
        assert spec is not None and spec.loader is not None
        sys.modules[name] = module = importlib.util.module_from_spec(spec)
        spec.loader.exec_module(module)
    return sys.modules[name]


def run(small: Any, room: Path, plan: Any, **more: Any) -> Lightest:
    return lightest(plan, room / "bars.study", backend=lambda: small.SmallBackend(room), **{"budget": 24, **more})


def test_lightest_bar(small, tmp_path):
    """By hand: of w d^3 >= 4e6/3 the least w d has the least width, 10 mm, and a depth of 51.09 mm."""
    plan = small.make_plan(tmp_path, FREE, sampling=SAMPLED)
    made = run(small, tmp_path, plan)
    assert made.best is not None and made.found is not None and made.outcome is not None
    assert made.best.numbers["width"] == pytest.approx(10.0, abs=0.4)
    assert made.outcome.figures["mass"].solid <= 1.01 * 510.9e-6 and made.outcome.fine
    assert made.evaluated == len(made.found.solved) == len({key for _, key, _, _ in small.started(tmp_path)})
    assert made.run_folder is not None and (made.run_folder / "summary.md").exists()
    assert not made.confirmed  # the small process writes no figures there
    with Record.open(tmp_path / "bars.study") as record:
        assert record.title == "Bars: lightest" and record.progress().finished == made.evaluated
        assert any("lightest: variant" in what for _, what in record.events())
    lines = "\n".join(told(plan, made))
    assert "1 mm more depth buys" in lines and "1 mm more width buys" in lines
    assert " of the deflection limit, and costs" in lines
    assert "NOT confirmed" in lines


def test_stopped_search_goes_on_and_solves_nothing_twice(small, tmp_path):
    whole, part = tmp_path / "whole", tmp_path / "part"
    whole.mkdir(), part.mkdir()
    listed = {"depth": {"from": "40 mm", "to": "60 mm", "steps": 20},
              "width": {"from": "10 mm", "to": "20 mm", "steps": 10}}
    plans = [small.make_plan(room, listed) for room in (whole, part)]
    undisturbed = run(small, whole, plans[0])
    stop = threading.Event()
    first = run(small, part, plans[1], stop=stop, tell=lambda step: step.solved >= 8 and stop.set())
    assert first.interrupted and first.best is None
    begun = [key for _, key, _, _ in small.started(part)]
    second = run(small, part, plans[1])
    assert not second.interrupted and second.found is not None and undisturbed.found is not None
    assert [one.point for one in second.found.solved] == [one.point for one in undisturbed.found.solved]
    then = [key for _, key, _, _ in small.started(part)][len(begun):]
    assert begun and then and not set(begun) & set(then[:-1])  # the last one is the winner's whole run
    tables = []
    for room in (whole, part):
        with Record.open(room / "bars.study") as record:
            tables.append(record.table())
    assert tables[0] == tables[1]
    third = run(small, part, plans[1])
    assert third.evaluated == 0 and third.best == second.best


def test_failed_and_suspicious_variants_are_told(small, tmp_path):
    small.faults(tmp_path, n2="fails", n4="fails")
    plan = small.make_plan(tmp_path, STEPS)
    made = run(small, tmp_path, plan)
    assert made.best is not None and made.best.values == {"depth": "52 mm", "width": "10 mm"}
    assert made.unsound["failed: mesh: no attempt gave a mesh"] == 2
    assert any(why.startswith("suspicious") for why in made.unsound)


def test_record_of_vary_is_used_again(small, tmp_path):
    from studies.vary.run import vary

    plan = small.make_plan(tmp_path, STEPS)
    vary(plan, tmp_path / "bars.study", backend=lambda: small.SmallBackend(tmp_path))
    begun = len(small.started(tmp_path))
    made = run(small, tmp_path, plan, share=True)
    assert made.evaluated == 0 and made.best is not None and made.best.values["depth"] == "52 mm"
    assert len(small.started(tmp_path)) == begun + 1  # the whole run alone


def test_what_is_refused(small, tmp_path):
    (tmp_path / "bar.toml").write_text(small.SPEC.read_text().partition("[limits]")[0])
    with pytest.raises(SpecError, match="at least one limit"):
        run(small, tmp_path, small.make_plan(tmp_path))
    assert not (tmp_path / "bars.study").exists()


def test_space_of_a_plan(small, tmp_path):
    plan = small.make_plan(tmp_path, {"depth": {"from": "30 mm", "to": "60 mm"}, "width": ["22 mm", "18 mm"],
                                      "supports.wall.hold": ["all", ["x", "y", "z", "rx"]]}, sampling=SAMPLED)
    depth, width, hold = space_of(plan).dimensions
    assert depth.free and (depth.low, depth.high) == (30.0, 60.0)
    assert width.numbers == (18.0, 22.0) and hold.words == 2


def test_share_of_a_limit():
    most = Held("stress", "stress", 200.0, 150.0, "MPa", "met", 0.25)
    least = Held("frequency", "frequency", 50.0, 40.0, "Hz", "missed", -0.2)
    assert share_used(most) == pytest.approx(0.75) and share_used(least) == pytest.approx(1.25)
    assert share_used(most._replace(found=None, verdict="not established")) is None


def test_words(small, tmp_path):
    """The sentence of the issue, made by hand."""
    assert [step_size(gap) for gap in (0.0, 1.0, 2.0, 0.1, 0.25, 50.0, 300.0)] == [1.0, 1.0, 1.0, 0.1, 0.1, 10.0, 100.0]
    plan = small.make_plan(tmp_path, {"width": ["18 mm", "20 mm"]})
    slope = Slope("width", 20.0, 18.0, "mm", 1.0, (35e-6, None), {"deflection": (-0.04, None), "stress": (-0.02, 0.003),
                                                                   "mass": (0.01, None)}, True)
    assert sentence(plan, slope) == ("1 mm more width buys 4 % of the deflection limit and 2 ± 0.3 % of the stress "
                                     "limit, takes 1 % of the mass limit, and costs 35 g (18 to 20 mm, solved)")
    hold = {"width": ["18 mm"], "supports.wall.hold": ["all", ["x", "y", "z", "rx"]]}
    plan = small.make_plan(tmp_path, hold)
    slope = Slope("supports.wall.hold", 0.0, 1.0, "", 1.0, (0.0, None), {"deflection": (0.5, 0.1)}, False)
    assert sentence(plan, slope) == ("supports.wall.hold x, y, z, rx instead of all takes 50 ± 10 % of the deflection "
                                     "limit, and does not change mass (by the surrogates)")


@pytest.mark.heavy
def test_both_models(tmp_path, capsys):
    """The steel cantilever: least mass under the deflection limit, both models at every solve, by the command."""
    part = Path(__file__).parents[1] / "spec" / "cantilever.toml"
    (tmp_path / "bar.toml").write_text(part.read_text())
    (tmp_path / "bar_plan.toml").write_text(
        'title = "Bar"\npart = "bar.toml"\n[vary]\ndepth = { from = "30 mm", to = "50 mm", step = "1 mm" }\n'
        'width = { stock = "bar", from = "10 mm", to = "30 mm" }\n[aim]\nleast = "mass"\n')
    record = tmp_path / "bar.study"
    assert main(["lightest", str(tmp_path / "bar_plan.toml"), "--record", str(record), "--budget", "30"]) == 0
    said = capsys.readouterr().out
    assert "Confirmed by a whole run" in said and "No neighbour of it" in said and "1 mm more depth buys" in said
    with Record.open(record) as opened:
        rows = [row for row in opened.table() if row["fine"]]
    best = min(rows, key=lambda row: row["mass"])
    # Euler-Bernoulli by hand: 300 N, and the weight, at 800 mm; 3 mm of deflection
    fits = []
    for depth in range(30, 51):
        for width in (10, 12, 14, 15, 16, 18, 20, 22, 25, 28, 30):
            inertia = width * depth**3 / 12.0
            weight = 7.85e-9 * 9806.65 * depth * width
            sag = (300.0 * 800.0**3 / 3.0 + weight * 800.0**4 / 8.0) / (210e3 * inertia)
            if sag <= 3.0:
                fits.append(depth * width)
    assert best["depth"] * best["width"] == pytest.approx(min(fits), rel=0.02)
    assert main(["lightest", str(tmp_path / "bar_plan.toml"), "--record", str(record), "--budget", "30"]) == 0
    assert "0 of them now" in capsys.readouterr().out
