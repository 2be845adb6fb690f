"""`CheckResult` round trip: nothing lost, nothing guessed."""

from __future__ import annotations

import dataclasses
import json
from pathlib import Path

import pytest

from fem.figure import Figure, FigureKey
from geometry.problem import RunError
from studies.check.codec import ResultFormatError
from studies.check.result import (
    CaseStress,
    Cause,
    CheckResult,
    Denting,
    IndependentCheck,
    LimitVerdict,
    MeshSummary,
    Pair,
    PeakPlace,
    Stage,
)
from studies.check.studied import ModePair, Peak, SolverSummary, TravelEnvelope, TravelSummary

KEY = FigureKey("carrying", "arm.end", "displacement", "z")


def sample(**changes: object) -> CheckResult:
    """A result in which every member differs from its default and no two numbers are equal."""
    figure = Figure(KEY, -0.1 - 0.2, "mm", 1e-3, "net")
    result = CheckResult(
        title="Arm µ", spec_name="arm.toml", spec_text='title = "x"\n', parameters={"reach": 360.0}, accuracy=0.021,
        material={"name": "steel", "E": 210000.5, "nu": 0.3, "yield_strength": None},
        cases={"carrying": {"camera": 1.25}},
        solid_figures=(figure,), beam_figures=(dataclasses.replace(figure, value=-0.31, error=None, note=""),),
        pairs=(Pair(KEY, -0.3, -0.31, "mm", 0.01, 0.32, 0.005, (Cause("hole", 0.007),), "explained", "hole1"),
               Pair(KEY._replace(place="", quantity="mass", axes="member"), 1.5, None, "t", None, 1.6, 0.1, (),
                    "no beam value")),
        limits=(LimitVerdict("deflection", "deflection", 0.5, None, "mm", "carrying", "arm.end",
                             "not established", "no such place"),),
        checks=(IndependentCheck("balance", 1e-9, 1e-6, True, "forces"),),
        peaks=(PeakPlace("carrying", "arm.hole1", "surface", (1.0, 2.0, 3.0), 55.0, None, False, "rim"),),
        case_stress=(CaseStress("carrying", 55.5, 77.7, 6.4, None),), denting=(Denting("carrying", "arm.end", 3e-3),),
        cautions=("linear only",), mesh=MeshSummary(9, 2, 27, 0.35, 12.5, {"size": 2.0, "tries": ["a", 1]}),
        stages=(Stage("solid", 0.75),), versions={"numpy": "2.4"}, started="2026-12-01T11:30:00Z",
        files=("summary.md",),
        modes=(ModePair(FigureKey("", "", "natural_frequency", "mode 1"), 41.5, 42.5, "Hz", "bending about y",
                        "bending", 0.98, 0.97, (0.1, 0.2, 0.61, 0.4, 0.5, 0.6), 1e-7, "agrees"),
               ModePair(FigureKey("parked", "", "buckling_factor", "beam mode 2"), None, -3.5, "1", "", "torsion",
                        None, None, (), None, "no beam value", ("self_weight",))),
        travels=(TravelSummary("crossing", "trolley", "rail.top", (30.0, 70.0), (0.0, 180.0), 40.0, 70.0),),
        envelopes=(TravelEnvelope(KEY._replace(case="crossing"), "mm", Peak(0.25, 30.0, 0.26), Peak(-0.45, 70.0, None),
                                  None, None, 0.46, "suspicious", 30.0, {"agrees": 1, "suspicious": 1}),),
        solver=SolverSummary("multigrid", "many unknowns", 3e-9, 4e-6),
    )
    return dataclasses.replace(result, **changes)  # type: ignore[arg-type]


def test_round_trip_loses_nothing() -> None:
    result = sample()
    text = result.to_json()
    assert CheckResult.from_json(text) == result
    assert CheckResult.from_json(text).to_json() == text


def test_every_attribute_is_in_the_text_and_is_read_back() -> None:
    """Take away any one member, at any depth of records: reading must fail, not fall back on a default."""
    raw = json.loads(sample().to_json())
    assert set(raw) == {f.name for f in dataclasses.fields(CheckResult)}
    free = {"parameters", "material", "cases", "versions", "recipe", "words"}  # mappings by the user's own names

    def records(node: object) -> list[dict[str, object]]:
        if isinstance(node, dict):
            inner = [r for name, item in node.items() if name not in free for r in records(item)]
            return [node, *inner]
        return [r for item in node for r in records(item)] if isinstance(node, list) else []

    for record in records(raw):
        for name in list(record):
            item = record.pop(name)
            with pytest.raises(ResultFormatError):
                CheckResult.from_json(json.dumps(raw))
            record[name] = item
    assert CheckResult.from_json(json.dumps(raw)) == sample()


def test_files_of_every_older_layout_are_read() -> None:
    """``old/result-1.json`` was written by the version before modes and travelling loads."""
    old = CheckResult.from_json((Path(__file__).parent / "old" / "result-1.json").read_text(encoding="utf-8"))
    now = sample(modes=(), travels=(), envelopes=(), solver=None)
    assert old == now
    assert CheckResult.from_json(old.to_json()) == now


@pytest.mark.parametrize("version", ["haunch-result/3", "haunch-result/10"])
def test_a_newer_version_is_refused_by_name(version: str) -> None:
    raw = json.loads(sample().to_json()) | {"format": version}
    with pytest.raises(ResultFormatError, match="newer"):
        CheckResult.from_json(json.dumps(raw))


@pytest.mark.parametrize("text", ["", "[]", "{}", '{"format": 1}', "[" * 100_000, '{"format": "haunch-result/1"}',
                                  '{"format": "haunch-result/0"}', '{"format": "haunch-result/2"}',
                                  '{"format": "other/1"}', '{"format": NaN}'])
def test_anything_else_is_refused_without_a_traceback_of_another_kind(text: str) -> None:
    with pytest.raises(ResultFormatError):
        CheckResult.from_json(text)


def test_a_wrong_type_is_refused_with_its_path() -> None:
    raw = json.loads(sample().to_json())
    raw["pairs"][0]["solid"] = "0.3"
    with pytest.raises(ResultFormatError, match=r"result\.pairs\[0\]\.solid"):
        CheckResult.from_json(json.dumps(raw))


@pytest.mark.parametrize("value", [float("nan"), float("inf")])
def test_nan_never_reaches_the_file(value: float) -> None:
    with pytest.raises(RunError, match=r"result\.accuracy is") as caught:
        sample(accuracy=value).to_json()
    assert caught.value.stage == "write"


def test_numpy_scalars_become_plain_numbers() -> None:
    import numpy as np

    result = sample(accuracy=np.float64(0.02), checks=(IndependentCheck("b", np.float32(0.5), 1.0, np.True_, "t"),))  # type: ignore[arg-type]
    back = CheckResult.from_json(result.to_json())
    assert back.accuracy == 0.02 and back.checks[0].ok is True


def test_the_worst_word_decides() -> None:
    still = {"envelopes": ()}
    assert sample(**still).judgement == "explained" and not sample(**still).fine
    assert sample(limits=(), **still).fine
    assert sample().judgement == "suspicious"  # one position of a travelling load was
    assert sample(checks=(IndependentCheck("b", 2.0, 1.0, False, "t"),)).judgement == "suspicious"
    assert sample(pairs=(), **still).judgement == "agrees"
