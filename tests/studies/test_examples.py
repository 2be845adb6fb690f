"""Every example is read, fits the committed schema and, in the heavy suite, runs clean."""

from __future__ import annotations

import json
import tomllib
from pathlib import Path

import pytest

from geometry.part import (
    BearingLoad,
    BodyLoad,
    LineLoad,
    Pressure,
    RegionLoad,
    RemotePoint,
    StripLoad,
    TemperatureLoad,
)
from geometry.spec import json_schema, read_part
from studies.cli import main

FOLDER = Path(__file__).resolve().parents[2] / "studies" / "examples"
EXAMPLES = sorted(path for path in FOLDER.glob("*.toml") if not path.stem.endswith("_plan"))


def test_the_committed_schema_is_what_the_command_prints() -> None:
    """When this fails: ``haunch schema > studies/examples/part.schema.json``."""
    assert json.loads((FOLDER / "part.schema.json").read_text(encoding="utf-8")) == json_schema()


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_an_example_is_read_and_fits_the_schema(path: Path) -> None:
    import jsonschema

    text = path.read_text(encoding="utf-8")
    assert text.startswith("#:schema part.schema.json\n")
    part = read_part(path)
    assert part.title and part.limits and part.parameters
    schema = json.loads((FOLDER / "part.schema.json").read_text(encoding="utf-8"))
    validator = jsonschema.Draft202012Validator(schema)
    assert [error.message for error in validator.iter_errors(tomllib.loads(text))] == []


def test_the_examples_cover_shapes_features_loads_and_limits() -> None:
    parts = [read_part(path) for path in EXAMPLES]
    members = [part.members[0] for part in parts]
    assert {member.section.shape for member in members} >= {"rectangle", "round", "tube", "box", "I", "channel",
                                                            "angle", "tee"}
    assert {cut.kind for member in members for cut in member.cuts} == {"hole", "slot", "opening", "notch"}
    assert {type(load) for part in parts for load in part.loads} >= {
        RegionLoad, Pressure, BearingLoad, LineLoad, RemotePoint, BodyLoad, TemperatureLoad, StripLoad}
    assert {limit.quantity for part in parts for limit in part.limits} == {
        "deflection", "displacement", "relative_displacement", "rotation", "stress", "yield_factor", "mass",
        "reaction", "frequency", "buckling_factor"}
    assert any(part.vibration for part in parts) and any(part.buckling for part in parts)
    assert any(station.shoulder_fillet for member in members for station in member.stations)


@pytest.mark.heavy
@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_an_example_runs_clean(path: Path, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    status = main(["check", str(path), "--out", str(tmp_path / "it.run"), "--no-pictures"])
    assert status == 0, capsys.readouterr().out
