"""What a summary, the terminal and the pictures say about modes and travelling loads."""

from __future__ import annotations

import dataclasses
from pathlib import Path
from types import ModuleType
from typing import Any

import numpy as np
import pytest

from fem.figure import FigureKey
from studies.check.result import CheckResult, Pair, Reason
from studies.check.studied import ModePair, Peak, SolverSummary, TravelEnvelope, TravelSummary
from studies.report.envelope_diagrams import curve, envelope_diagrams
from studies.report.mode_pictures import mode_picture, said
from studies.report.studied import carried, envelope_rows, headlines
from studies.report.summary import summary
from studies.report.tables import counts, verdict

FREQUENCY = FigureKey("", "", "natural_frequency", "mode 1")
FACTOR = FigureKey("carrying", "", "buckling_factor", "mode 1")
TRAVEL = TravelSummary("crossing", "trolley", "arm.top", (20.0, 60.0, 100.0), (0.0, 30.0), 10.0, 60.0)


def mode(key: FigureKey, solid: float | None, beam: float | None, unit: str, **more: Any) -> ModePair:
    given = {"solid_kind": "bending about y", "beam_kind": "bending about y", "correlation": 0.987654,
             "section_share": 0.9, "mass_share": (), "residual": 1e-7, "judgement": "agrees", **more}
    return ModePair(key, solid, beam, unit, **given)


def row(place: str, component: str, greatest: float, least: float, word: str = "agrees", **more: Any
        ) -> TravelEnvelope:
    key = FigureKey("crossing", place, more.pop("quantity", "section_moment"), component, "member")
    peaks = [Peak(greatest, 20.0, greatest), Peak(least, 100.0, least)]
    words = more.pop("words", {word: 3})
    return TravelEnvelope(key, "N mm", *peaks, *peaks, 5000.0, word, 60.0, words)  # type: ignore[arg-type]


@pytest.fixture
def result(helpers: ModuleType) -> CheckResult:
    import studies.check.run as run
    from studies.check.stages import Clock

    models = helpers.make_models()
    made = run.make_result(models, helpers.make_judgement(models), "arm.toml", "t", Clock())
    pair = Pair(FREQUENCY, 41.5, 42.0, "Hz", -0.5, 42.0, 0.84, (), "agrees", "", (Reason("end effect", 0.84),))
    rows = (row("arm@0", "My", 900.0, -100.0), row("arm@10", "My", 2000.0, -50.0),
            row("arm@20", "My", 10.0, -3000.0, "suspicious", words={"agrees": 2, "suspicious": 1}),
            row("arm@20", "T", 1.0, -2.0))
    return dataclasses.replace(
        made, pairs=(*made.pairs, pair), cases={**made.cases, "crossing": {"trolley": 1.0}},
        modes=(mode(FREQUENCY, 41.5, 42.0, "Hz", mass_share=(0.01, 0.02, 0.613, 0.0, 0.22, 0.04)),
               mode(FACTOR, 3.5, 3.55, "1", fixed=("self_weight",))),
        travels=(TRAVEL,), envelopes=rows, solver=SolverSummary("multigrid", "Many unknowns.", 2.5e-9, 3e-6))


def test_the_summary_has_its_sections(result: CheckResult) -> None:
    lines = summary(result).splitlines()
    for heading in ("## Natural frequencies", "## Buckling", "### Case carrying",
                    "## Travelling load: envelopes of case crossing"):
        assert heading in lines
    frequency = next(line for line in lines if line.startswith("| 1 | 41.5 Hz"))
    assert frequency == ("| 1 | 41.5 Hz | 42 Hz | -0.5 Hz | 0.84 Hz | = agrees | bending about y | bending about y | "
                         "0.988 | 90 % | 61 % z, 22 % about y |  |")
    assert "What the allowance of mode 1 is made of: end effect 2 %." in lines
    factor = next(line for line in lines if line.startswith("| 1 | 3.5 | 3.55"))
    assert factor.count("|") == frequency.count("|") - 1  # buckling has no mass
    assert any("1 x tip may grow beside self_weight, which keeps its value:" in line for line in lines)
    assert any(line.startswith("- Solver: multigrid (Many unknowns); residual over load 2.5e-09, error of a known "
                               "bending 3e-06") for line in lines)
    assert not any(line.startswith("## Case crossing") for line in lines)


def test_a_run_without_studies_says_nothing_of_them(helpers: ModuleType) -> None:
    import studies.check.run as run
    from studies.check.stages import Clock

    models = helpers.make_models()
    text = summary(run.make_result(models, helpers.make_judgement(models), "arm.toml", "t", Clock()))
    assert not any(word in text for word in ("## Natural", "## Buckling", "## Travelling"))


def test_the_table_of_envelopes_shows_the_extremes_and_where_they_occur(result: CheckResult) -> None:
    shown = [(r.key.place, r.key.component) for r in headlines(result, "crossing")]
    assert shown == [("arm@10", "My"), ("arm@20", "My")]  # greatest, least; the torque is next to nothing
    rows = envelope_rows(result, TRAVEL)
    assert rows[0][2:6] == ("2 @ 20", "2 @ 20", "-0.05 @ 100", "-0.05 @ 100")
    assert rows[1][6:] == ("! suspicious", "2 agrees, 1 suspicious; worst @ 60")


def test_an_end_and_the_station_there_are_shown_once(result: CheckResult) -> None:
    same = row("arm.end", "y", 2.0, -1.0, quantity="rotation"), row("arm@200", "y", 2.0, -1.0, quantity="rotation")
    both = dataclasses.replace(result, envelopes=tuple(dataclasses.replace(r, scale=2.0) for r in same))
    assert [r.key.place for r in headlines(both, "crossing")] == ["arm.end"]


def test_every_position_is_counted_once(result: CheckResult) -> None:
    """The pairs kept of single positions are in the envelopes' words already."""
    before = counts(dataclasses.replace(result, envelopes=()))
    kept = dataclasses.replace(result.pairs[0], key=result.pairs[0].key._replace(case="crossing@60"))
    assert counts(dataclasses.replace(result, pairs=(*result.pairs, kept))) - before == {"agrees": 11, "suspicious": 1}
    assert result.judgement == "suspicious" and "1 are suspicious" in verdict(result)


def test_the_terminal_shows_the_same_tables(result: CheckResult, capsys: pytest.CaptureFixture[str]) -> None:
    from studies.cli.screen import make_console, print_result

    print_result(make_console(), result)
    told = capsys.readouterr().out
    for text in ("natural frequencies", "41.5 Hz", "buckling factors, case carrying", "trolley travels, 3 positions",
                 "2 @ 20", "Solver: multigrid (Many unknowns)."):
        assert text in told, text


def test_what_a_mode_carries() -> None:
    shares = (0.04, 0.5, 0.3, 0.6, 0.0, 0.0)
    assert carried(mode(FREQUENCY, 1.0, 1.0, "Hz", mass_share=shares)) == "60 % about x, 50 % y"
    assert carried(mode(FACTOR, 1.0, 1.0, "1")) == "-"


def test_curves_of_an_envelope_come_in_order() -> None:
    rows = [row("arm@20", "My", 3.0, -3.0), row("arm@5", "My", 1.0, -1.0), row("arm@10", "My", 2.0, -2.0)]
    x, value = curve(rows, "solid_greatest")
    assert x.tolist() == [5.0, 10.0, 20.0] and value.tolist() == [1.0, 2.0, 3.0]
    assert curve(rows, "beam_least")[1].tolist() == [-1.0, -2.0, -3.0]


def test_pictures_of_modes_and_envelopes_are_drawn(helpers: ModuleType, result: CheckResult, tmp_path: Path) -> None:
    from matplotlib.image import imread

    part, mesh = helpers.make_part(), helpers.make_mesh()
    shape = np.zeros((3, mesh.nodes.shape[1]))
    shape[2] = (mesh.nodes[0] / helpers.L) ** 2
    modes = [mode(FREQUENCY._replace(component=f"mode {k}"), 40.0 * k, 41.0 * k, "Hz") for k in (1, 2)]
    mode_picture(tmp_path / "modes.png", part, mesh, "natural vibrations", modes, np.array([shape] * 2))
    envelope_diagrams(tmp_path / "envelopes.png", "t", "arm", TRAVEL, result.envelopes)
    for name in ("modes.png", "envelopes.png"):
        pixels = imread(tmp_path / name)[:, :, :3]
        assert len(np.unique(pixels.reshape(-1, 3), axis=0)) > 50, name
    assert said(modes[1]) == "2: 80 Hz\nbending about y\nbeam 82 Hz, agrees"
    assert said(mode(FACTOR, 3.5, None, "1")) == "1: factor 3.5\nbending about y\nno beam value"


def test_fields_hold_the_shapes_and_only_the_cases_asked_for(helpers: ModuleType) -> None:
    from fem.mode import Mode
    from studies.check.fields import nodal_fields

    solid = helpers.make_models().solid
    still = np.zeros((41, 3))
    shapes = np.arange(3.0 * solid.mesh.nodes.shape[1]).reshape(1, 3, -1)
    studied = dataclasses.replace(solid, vibration=(Mode(41.5, still, still, "torsion"),), vibration_shapes=shapes,
                                  buckling=(Mode(-2.5, still, still, "local", case="carrying"),),
                                  buckling_shapes=2 * shapes)
    fields = nodal_fields(studied, ())
    assert sorted(fields) == ["carrying buckling 1, factor -2.5", "vibration 1, 41.5 Hz"]
    assert fields["vibration 1, 41.5 Hz"] == pytest.approx(shapes[0].T)
    assert "carrying displacement (mm)" in nodal_fields(studied)
