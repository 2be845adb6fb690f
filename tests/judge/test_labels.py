"""Peak places are named by what is there, and what the beam leaves out is said."""

from __future__ import annotations

import dataclasses

from bar import mesh, sound

from geometry.named_solid import SizeHint
from studies.judge import judge
from studies.judge.context import Context
from studies.judge.whole_run import cautions, peak_places


def test_a_peak_is_named_by_its_feature_and_side() -> None:
    part, named, _, solid, _ = sound()
    upper = next(p for p in solid.peaks if p.position[2] > 5 and p.faces)
    hint = SizeHint("fillet", "root fillet", (upper.faces[0],), 2.0, 5.0)
    named = dataclasses.replace(named, hints=(hint,))
    place = peak_places(Context(part, mesh()), named, solid)[solid.peaks.index(upper)]
    assert place.place.startswith("root fillet, upper")


def test_a_wall_is_no_feature() -> None:
    part, named, _, solid, _ = sound()
    hint = SizeHint("wall", "web", tuple(range(10)), 0.0, 5.0)
    places = peak_places(Context(part, mesh()), dataclasses.replace(named, hints=(hint,)), solid)
    assert not any("web" in place.place for place in places)
    assert all("arm." in place.place for place in places)  # the faces that meet there instead


def test_a_wide_band_is_said() -> None:
    part, named, m, solid, beam = sound()
    ctx = Context(part, mesh())
    pairs = judge(part, named, m, solid, beam).pairs
    assert not any("weak witness" in text for text in cautions(ctx, solid, {}, pairs))
    wide = [dataclasses.replace(p, band=0.2 * p.scale) for p in pairs]
    assert any("weak witness" in text and "20 %" in text for text in cautions(ctx, solid, {}, wide))
