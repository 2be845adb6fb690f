"""Variants with the real kernels: numbers against formulas and a checked run, faults of each kernel, kills from
outside, groups, workers, safer mesh and run folders."""

from __future__ import annotations

import dataclasses
import os
import signal
import sys
import tomllib
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import pytest
from planted_mesh import CRASHES, CRASHES_ONCE, FULL, WAITS
from work_helpers import bar, children, gone, jobs, order_of, until

from geometry.spec import part_from_text
from geometry.spec.read import part_from_data
from mesher.attempts import CHAIN
from studies.check.result import CheckResult
from studies.vary.outcome import Outcome
from studies.vary.work import Ended, Host, Order

pytestmark = pytest.mark.skipif(sys.platform != "linux", reason="looks into /proc")
E_STEEL, REACH, DEPTH, WIDTH = 210000.0, 60.0, 12.0, 10.0


def _outcome(end: Outcome | Ended) -> Outcome:
    assert isinstance(end, Outcome), end
    return end


def _finished(end: Outcome | Ended) -> Outcome:
    outcome = _outcome(end)
    assert outcome.status == "finished", f"{outcome.stage}: {outcome.reason}"
    return outcome


def _numbers(outcome: Outcome) -> dict[str, Any]:
    """What a table of a study is made of: all but times, memory and the worker's name."""
    plain = outcome.to_json()
    for name in ("seconds", "peak_memory", "worker"):
        del plain[name]
    return plain


@pytest.fixture(scope="module")
def plain(host: Host) -> Outcome:
    return _finished(host.evaluate(order_of(1, bar())))


def test_figures_are_those_of_the_cantilever(plain: Outcome) -> None:
    """Deflection F L^3/(3 E I) + F L/(kappa G A) of a cantilever (Timoshenko), weight and reaction by statics."""
    inertia, area, shear = WIDTH * DEPTH**3 / 12, WIDTH * DEPTH, E_STEEL / 2.6 * 5 / 6
    exact = 100.0 * REACH**3 / (3 * E_STEEL * inertia) + 100.0 * REACH / (shear * area)
    assert plain.figures["deflection"].beam == pytest.approx(exact, rel=0.01)
    assert plain.figures["deflection"].solid == pytest.approx(exact, rel=0.03)
    assert plain.figures["mass"].solid == pytest.approx(7.85e-9 * REACH * area, rel=1e-9)
    assert plain.figures["reaction"].solid == pytest.approx(100.0, rel=1e-6)
    assert plain.figures["deflection"].judgement in ("agrees", "explained") and plain.fine
    limits = {limit.name: limit for limit in plain.limits}
    assert limits["deflection"].margin == pytest.approx(1.0 - plain.figures["deflection"].solid / 0.05)
    assert limits["mass"].margin == pytest.approx(1.0 - 7.85e-9 * REACH * area / 1e-4)
    assert limits["yield_factor"].found is not None
    assert limits["yield_factor"].margin == pytest.approx(limits["yield_factor"].found / 1.2 - 1.0)
    assert set(plain.seconds) == {"spec", "solid", "mesh", "beam", "solve", "compare", "wall"}
    assert plain.seconds["solid"] > 0.02 and plain.seconds["mesh"] > 0.05, "the kernels' own seconds count"
    assert 100.0 < plain.peak_memory < 2000.0 and plain.unknowns == 3 * plain.mesh["nodes"]


def test_a_variant_with_its_run_folder_is_a_checked_run(host: Host, plain: Outcome, tmp_path: Path) -> None:
    """The very figures of the outcome stand in a whole run folder, and its spec is that of the variant."""
    out = tmp_path / "kept" / "one"
    data = bar()
    outcome = _finished(host.evaluate(order_of(1, data, run_folder=str(out), pictures=False)))
    assert _numbers(outcome) == _numbers(plain)
    result = CheckResult.from_json((out / "result.json").read_text())
    values = {figure.key: figure.value for figure in result.solid_figures}
    assert result.judgement == outcome.judgement and result.mesh.unknowns == outcome.unknowns
    assert next(v for k, v in values.items() if k.quantity == "mass") == outcome.figures["mass"].solid
    assert {p.name for p in out.iterdir()} >= {"result.json", "summary.md", "part.step", "solid.vtu"}
    assert tomllib.loads(result.spec_text) == data
    again, whole = part_from_text(result.spec_text), part_from_data(data)
    assert dataclasses.replace(again, source_text="") == dataclasses.replace(whole, source_text="")
    assert list(out.parent.iterdir()) == [out], "nothing but the run stays beside it"


def test_a_wrong_spec_is_told(host: Host) -> None:
    outcome = _outcome(host.evaluate(order_of(1, bar(material="cheese"))))
    assert (outcome.status, outcome.stage) == ("failed", "spec") and "cheese" in outcome.reason


def test_a_run_folder_that_cannot_be_written_fails_the_stage_write(host: Host, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("in the way")
    outcome = _outcome(host.evaluate(order_of(1, bar(), run_folder=str(tmp_path / "file"), pictures=False)))
    assert (outcome.status, outcome.stage) == ("failed", "write")
    assert (tmp_path / "file").read_text() == "in the way"


def test_a_full_disk_is_no_fault_of_the_variant(host: Host) -> None:
    assert host.evaluate(order_of(1, bar(length=FULL))) == Ended("key-1", "disk full", "the temporary files")


@pytest.mark.parametrize(("title", "length", "stage", "said"), [
    ("crash in solid", 60, "solid", "the CAD kernel crashed (signal SIGABRT)"),
    ("bar", CRASHES, "mesh", "none of the 6 meshing attempts succeeded"),
    ("crash in solve", 60, "solve", "ended by SIGSEGV"),
    ("fault in solve", 60, "solve", "ZeroDivisionError: planted"),
    pytest.param("crash in beam", 60, "beam", "ended by SIGSEGV", marks=pytest.mark.heavy),
    pytest.param("crash in compare", 60, "compare", "ended by SIGSEGV", marks=pytest.mark.heavy),
    pytest.param("memory in solve", 60, "solve", "the memory was not enough", marks=pytest.mark.heavy),
])
def test_a_fault_of_each_kernel_fails_the_variant_alone(host: Host, title: str, length: float, stage: str, said: str
                                                        ) -> None:
    outcome = _outcome(host.evaluate(order_of(1, bar(title=title, length=length))))
    assert (outcome.status, outcome.stage) == ("failed", stage) and said in outcome.reason
    assert until(lambda: not jobs(host))


@pytest.mark.parametrize(("title", "length", "stage"), [
    ("bar", WAITS, "mesh"),
    pytest.param("wait in solid", 60, "solid", marks=pytest.mark.heavy),
    pytest.param("wait in solve", 60, "solve", marks=pytest.mark.heavy),
])
def test_an_endless_kernel_is_stopped_at_the_variants_time(host: Host, title: str, length: float, stage: str) -> None:
    outcome = _outcome(host.evaluate(order_of(1, bar(title=title, length=length), seconds=1.5)))
    assert (outcome.status, outcome.stage) == ("failed", stage) and outcome.reason.startswith("time limit: ")
    assert until(lambda: not jobs(host))


@pytest.mark.parametrize(("title", "length", "which", "what"), [
    ("wait in solid", 60, 1, "the CAD process"), ("bar", WAITS, 2, "the mesh process"),
    pytest.param("wait in solve", 60, 0, "the solver process", marks=pytest.mark.heavy),
])
@pytest.mark.parametrize("whole", [False, pytest.param(True, marks=pytest.mark.heavy)])
def test_a_kernel_ended_from_outside_is_no_fault(host: Host, title: str, length: float, which: int, what: str,
                                                 whole: bool) -> None:
    """Of the job or of its template: no outcome, and no other attempt with other settings."""
    template = host.templates[which]
    with ThreadPoolExecutor(1) as pool:
        end = pool.submit(host.evaluate, order_of(1, bar(title=title, length=length)))
        assert until(lambda: len(children(template.pid)) == 1)
        if which == 2:
            assert until(lambda: len(jobs(host)) == 2)
        victims = jobs(host)
        assert template.pid is not None
        os.kill(template.pid if whole else children(template.pid)[0], signal.SIGKILL)
        assert end.result(30.0) == Ended("key-1", "SIGKILL", what)
    assert gone(victims)


@pytest.mark.heavy
def test_the_mesh_is_the_same_after_a_kill(host: Host, plain: Outcome) -> None:
    assert _numbers(_finished(host.evaluate(order_of(1, bar())))) == _numbers(plain)


@pytest.mark.heavy
def test_a_crash_of_one_attempt_is_in_the_outcome(host: Host) -> None:
    outcome = _finished(host.evaluate(order_of(1, bar(length=CRASHES_ONCE))))
    assert outcome.mesh["attempt"] == CHAIN[1].name
    assert len(outcome.mesh["failed"]) == 1 and "SIGSEGV" in outcome.mesh["failed"][0]


def test_a_safer_mesh_is_finer_and_made_otherwise(host: Host, plain: Outcome) -> None:
    outcome = _finished(host.evaluate(order_of(1, bar(), safer=True)))
    assert outcome.safer_mesh and outcome.mesh["attempt"] == "frontal surface, Delaunay volume, sizes x 0.8"
    assert outcome.unknowns > plain.unknowns
    assert outcome.figures["deflection"].solid == pytest.approx(plain.figures["deflection"].solid, rel=0.02)


def _family() -> list[Order]:
    """A shape with another load, then with another support and material, and modes; another shape under its key."""
    held = {"wall": {"on": "bar.start", "hold": "all", "coupling": "average"}}
    tables = [bar(), bar(tip=250), bar(supports=held, vibration={"modes": 1}, material="EN AW-6061 T6")]
    other = bar(length=70)
    other["members"]["bar"]["section"]["depth"] = "14 mm"
    return [order_of(k, data, "one") for k, data in enumerate([*tables, other], 1)]


@pytest.fixture(scope="module")
def singles(host: Host) -> list[dict[str, Any]]:
    """The family, each evaluated by itself, one at a time."""
    return [_numbers(_finished(host.evaluate(order))) for order in _family()]


def test_a_group_has_the_numbers_of_single_evaluations(host: Host, singles: list[dict[str, Any]]) -> None:
    group = [_finished(end) for end in host.evaluate_group(_family())]
    assert [_numbers(one) for one in group] == singles
    assert len({str(one["figures"]) for one in singles}) == len(singles), "they are different variants"
    assert ["mesh" in one.seconds for one in group] == [True, False, False, True]


@pytest.mark.heavy
def test_numbers_do_not_depend_on_workers_or_order(host: Host, singles: list[dict[str, Any]]) -> None:
    with ThreadPoolExecutor(2) as pool:
        side_by_side = [_numbers(_finished(end)) for end in pool.map(host.evaluate, reversed(_family()))]
    assert side_by_side[::-1] == singles


def test_mass_at_most_material(host: Host) -> None:
    """Strength of the thin bar, mass and its limit of the thick one: 12 and 14 mm deep."""
    thick = bar()
    thick["members"]["bar"]["section"]["depth"] = "14 mm"
    thick["limits"] = {"mass": "60 g"}
    thin = bar(limits={"mass": "60 g", "deflection": "0.05 mm"})
    alone, both = (_finished(host.evaluate(order_of(1, thin, fullest=fullest))) for fullest in (None, thick))
    most = 7.85e-9 * REACH * 14.0 * WIDTH
    assert both.figures["mass"].solid == pytest.approx(most, rel=1e-9)
    assert both.figures["mass"].beam == pytest.approx(most, rel=1e-9)
    assert both.figures["deflection"] == alone.figures["deflection"]
    words = [{limit.name: limit.verdict for limit in outcome.limits} for outcome in (alone, both)]
    assert words == [{"mass": "met", "deflection": "met"}, {"mass": "missed", "deflection": "met"}]
    assert alone.fine and not both.fine
