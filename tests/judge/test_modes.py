"""Modes: which shape is which, how far two values may differ, what is outside the beam, limits and cautions."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Sequence

import numpy as np
import pytest
from bar import LENGTH, bar, mesh, sound
from solid_help import box_mesh, box_part

from fem.figure import FigureKey
from fem.mode import SHAPE_STATIONS, Mode, none_of_other_sign
from fem.solid import Check
from geometry.part import Buckling, Case, Limit, Part, RegionLoad, RemotePoint, Support, Vibration
from studies.check.result import LimitVerdict
from studies.judge import Judgement, judge
from studies.judge.bands import CaseFacts, reasons
from studies.judge.context import Context
from studies.judge.mode_bands import ModeFacts, mode_reasons, motions, twist_of, waves_of
from studies.judge.mode_pairs import Match, correlations, match

X = np.linspace(0.0, LENGTH, SHAPE_STATIONS)
ROOTS = (1.8751041, 4.6940911, 7.8547574)
"""beta L of the clamped-free beam (Blevins, Formulas for Natural Frequency and Mode Shape; from memory)."""
PUSH = RegionLoad("push", "arm.end", force=(-1000.0, 0.0, 0.0))
STUDIES = {"vibration": Vibration(4), "buckling": (Buckling("pressed"),)}


def shape(root: float, turn: float = 0.0) -> tuple[np.ndarray, np.ndarray]:
    """Displacement and rotation (stations, 3) of a clamped-free mode that moves along z, turned about x."""
    b = root / LENGTH
    s = (math.sinh(root) - math.sin(root)) / (math.cosh(root) + math.cos(root))
    w = np.cosh(b * X) - np.cos(b * X) - s * (np.sinh(b * X) - np.sin(b * X))
    slope = b * (np.sinh(b * X) + np.sin(b * X) - s * (np.cosh(b * X) - np.cos(b * X)))
    u, r, size = np.zeros((len(X), 3)), np.zeros((len(X), 3)), np.abs(w).max()
    u[:, 2], r[:, 1] = w / size, -slope / size
    c, sn = math.cos(turn), math.sin(turn)
    rotation = np.array([[1, 0, 0], [0, c, -sn], [0, sn, c]])
    return u @ rotation.T, r @ rotation.T


def bending(value: float, root: float = ROOTS[0], turn: float = 0.0, **more: object) -> Mode:
    kind = "bending about y" if turn == 0.0 else "bending about z"
    return Mode(value, *shape(root, turn), kind, **more)  # type: ignore[arg-type]


def torsion(value: float, **more: object) -> Mode:
    r = np.zeros((len(X), 3))
    r[:, 0] = np.sin(0.5 * math.pi * X / LENGTH) / 11.2
    return Mode(value, np.zeros((len(X), 3)), r, "torsion", **more)  # type: ignore[arg-type]


def wall(value: float, **more: object) -> Mode:
    """A wall that bulges: next to no motion of the sections, of a shape that no beam has."""
    u = np.zeros((len(X), 3))
    u[:, 1] = 0.02 * np.sin(9 * math.pi * X / LENGTH)
    given = {"section_share": 0.05, **more}
    return Mode(value, u, np.zeros((len(X), 3)), "local", **given)  # type: ignore[arg-type]


def paired(solid: Sequence[Mode], beam: Sequence[Mode]) -> list[Match]:
    ctx = Context(bar(), mesh())
    moves = [np.array([motions(ctx, m) for m in modes]) for modes in (solid, beam)]
    return match(*moves, [m.value for m in solid], [m.value for m in beam])


def judged(solid: Sequence[Mode] = (), beam: Sequence[Mode] = (), limits: Sequence[Limit] = (),
           checks: Sequence[Check] = (), **more: object) -> Judgement:
    """The sound bar with these modes; those with a case are buckling factors."""
    part, named, m, solved, lines = sound()
    part = dataclasses.replace(part, **{**STUDIES, **more}, limits=tuple(limits))  # type: ignore[arg-type]
    lists = [([x for x in modes if not x.case], [x for x in modes if x.case]) for modes in (solid, beam)]
    (sv, sb), (bv, bb) = ((tuple(v), tuple(b)) for v, b in lists)
    solved = dataclasses.replace(solved, vibration=sv, buckling=sb, checks=(*solved.checks, *checks))
    return judge(part, named, m, solved,
                 dataclasses.replace(lines, vibration=bv, buckling=bb))


def words(judgement: Judgement) -> dict[str, str]:
    return {m.key.component: m.judgement for m in judgement.modes}


PAIRED = [bending(100.0), bending(200.0, turn=math.pi / 2), bending(620.0, ROOTS[1])]


def test_the_shapes_decide_and_not_the_order() -> None:
    swapped = [bending(198.0, turn=math.pi / 2), bending(201.0), bending(640.0, ROOTS[1])]
    beam = [bending(199.0), bending(205.0, turn=math.pi / 2), bending(633.0, ROOTS[1])]
    assert [(m.solid, m.beam) for m in paired(swapped, beam)] == [(0, 1), (1, 0), (2, 2)]
    assert all(m.correlation == pytest.approx(1.0) for m in paired(swapped, beam))


def test_clamped_free_shapes_are_uncorrelated() -> None:
    """Modes of a uniform beam are orthogonal in its mass; 41 trapezoids and the rotations leave a little."""
    ctx = Context(bar(), mesh())
    shapes = np.array([motions(ctx, bending(1.0, root)) for root in ROOTS])
    assert correlations(shapes, shapes) == pytest.approx(np.eye(3), abs=1e-3)


@pytest.mark.parametrize("turn", [0.3, math.pi / 4, 1.2])
def test_equal_frequencies_are_compared_as_a_pair(turn: float) -> None:
    """The two modes of a square section may stand anywhere in their plane; turned ones are still the same pair."""
    beam = [bending(100.0), bending(100.0, turn=math.pi / 2)]
    solid = [bending(100.1, turn=turn), bending(100.3, turn=turn + math.pi / 2)]
    found = paired(solid, beam)
    assert sorted((m.solid, m.beam) for m in found) in ([(0, 0), (1, 1)], [(0, 1), (1, 0)])
    assert all(m.correlation == pytest.approx(1.0) for m in found)
    # Where the frequencies of both are apart, the same turned shapes are not the same.
    apart = paired([solid[0], dataclasses.replace(solid[1], value=150.3)],
                   [bending(100.0), bending(150.0, turn=math.pi / 2)])
    larger = max(math.cos(turn) ** 2, math.sin(turn) ** 2)
    assert [m.correlation for m in apart] == pytest.approx([larger, larger], rel=1e-6)


def test_one_good_pair_is_not_given_up_for_two_poor_ones() -> None:
    """The second shape of each model is more like the other's first than like the other's second."""

    def mixed(root: float) -> Mode:
        (u, turn), (v, twist) = shape(ROOTS[0]), shape(root)
        return dataclasses.replace(bending(300.0), displacement=0.78 * u + 0.62 * v,
                                   rotation=0.78 * turn + 0.62 * twist)

    found = paired([bending(100.0), mixed(ROOTS[1])], [bending(100.0), mixed(ROOTS[2])])
    assert (found[0].solid, found[0].beam) == (0, 0)


def test_factors_of_opposite_sign_are_never_paired() -> None:
    found = paired([bending(-3.0, case="pressed")], [bending(3.0, case="pressed")])
    assert [(m.solid, m.beam) for m in found] == [(0, None), (None, 0)]


def test_waves_and_twist_are_counted() -> None:
    ctx = Context(bar(), mesh())
    assert [waves_of(motions(ctx, bending(1.0, root))) for root in ROOTS] == [1, 2, 3]
    assert twist_of(motions(ctx, torsion(1.0))) == pytest.approx(1.0)
    assert twist_of(motions(ctx, bending(1.0))) == pytest.approx(0.0)


def test_what_agrees_what_does_not() -> None:
    fine = [dataclasses.replace(m, value=m.value * 1.002) for m in PAIRED]
    assert set(words(judged(fine, PAIRED)).values()) == {"agrees"}
    # 5 % in the modulus of one model is 2.5 % in a frequency: seen in a compact slender bar
    off = [dataclasses.replace(m, value=m.value * 1.025) for m in PAIRED]
    found = judged(off, PAIRED)
    assert words(found)["mode 1"] == "suspicious"
    pair = next(p for p in found.pairs if p.key.component == "mode 1")
    assert "supports" in pair.look_at and pair.unit == "Hz" and pair.key.quantity == "natural_frequency"
    assert pair.band == pytest.approx(sum(r.size for r in pair.reasons)) and pair.band < 0.02 * pair.scale


def test_a_band_is_half_as_wide_for_a_frequency_and_grows_with_the_waves() -> None:
    ctx = Context(bar(), mesh())

    def band(study: str, waves: int, **more: object) -> float:
        facts = {"twist": 0.0, "thin_walled": False, "open_thin": False, **more}
        return sum(s.fraction for s in mode_reasons(ctx, ModeFacts(study, waves, **facts)))  # type: ignore[arg-type]

    assert band("vibration", 1) < 0.8 * band("buckling", 1)
    assert band("vibration", 1) < band("vibration", 2) < band("vibration", 4)
    assert band("vibration", 1) < band("vibration", 1, twist=1.0)
    assert band("vibration", 1) < band("vibration", 1, thin_walled=True)
    held = mode_reasons(ctx, ModeFacts("vibration", 1, 0.0, False, False))
    free = Context(bar(), mesh())
    free = dataclasses.replace(free, part=dataclasses.replace(free.part, vibration=Vibration(free=True)))
    assert any("end effect" in s.text for s in held)
    assert not any("end effect" in s.text for s in mode_reasons(free, ModeFacts("vibration", 1, 0.0, False, False)))


def test_a_wall_that_moves_by_itself_is_outside_the_beam() -> None:
    found = judged([wall(80.0), *PAIRED], PAIRED)
    assert words(found) == {"mode 1": "no beam value", "mode 2": "agrees", "mode 3": "agrees", "mode 4": "agrees"}
    pair = next(p for p in found.pairs if p.key.component == "mode 1")
    assert pair.look_at == "outside the beam model: a wall moves or buckles by itself"
    assert any("lowest natural frequency, 80 Hz, is that of a wall" in text for text in found.cautions)
    assert not any("is that of a wall" in text for text in judged(PAIRED, PAIRED).cautions)


def test_a_shape_that_one_model_lacks_is_suspicious_within_its_list_only() -> None:
    lacking = judged([PAIRED[0], PAIRED[2]], PAIRED)
    assert words(lacking)["beam mode 2"] == "suspicious"
    beyond = judged(PAIRED[:2], PAIRED)  # its list may just end before it
    assert words(beyond)["beam mode 3"] == "no beam value"
    assert words(judged(PAIRED, PAIRED[:2]))["mode 3"] == "no beam value"
    assert words(judged(PAIRED, [PAIRED[0], PAIRED[2]]))["mode 2"] == "suspicious"


def test_shapes_that_are_half_alike_are_suspicious() -> None:
    bent = shape(ROOTS[0])[0] + 0.75 * shape(ROOTS[1])[0], shape(ROOTS[0])[1] + 0.75 * shape(ROOTS[1])[1]
    found = judged([dataclasses.replace(PAIRED[0], displacement=bent[0], rotation=bent[1])], [PAIRED[0]])
    assert words(found) == {"mode 1": "suspicious"}
    assert 0.5 < (found.modes[0].correlation or 0.0) < 0.8


def _verdict(limit: Limit, solid: Sequence[Mode], beam: Sequence[Mode] | None = None) -> LimitVerdict:
    (verdict,) = judged(solid, solid if beam is None else beam, [limit]).limits
    return verdict


def test_a_limit_on_the_frequency_goes_by_the_lowest() -> None:
    met, missed = (_verdict(Limit("f", "frequency", hertz), PAIRED) for hertz in (99.0, 101.0))
    assert (met.verdict, missed.verdict, met.found, met.unit) == ("met", "missed", 100.0, "Hz")
    assert met.place == "mode 1, bending about y"
    none = _verdict(Limit("f", "frequency", 1.0), [])
    assert (none.verdict, none.found, none.reason) == ("not established", None, "no mode was found")
    off = _verdict(Limit("f", "frequency", 50.0), [bending(120.0)], [bending(100.0)])
    assert (off.verdict, off.reason) == ("not established", "the two models disagree on mode 1")
    lacking = _verdict(Limit("f", "frequency", 50.0), PAIRED[1:], PAIRED)  # the lowest may have been missed
    assert lacking.verdict == "not established"


def test_a_limit_on_the_buckling_factor_goes_by_the_least_positive_one() -> None:
    modes = [bending(-1.2, case="pressed"), bending(4.0, ROOTS[1], case="pressed")]
    verdict = _verdict(Limit("b", "buckling_factor", 3.0), modes)
    assert (verdict.verdict, verdict.found, verdict.case) == ("met", 4.0, "pressed")
    negative = _verdict(Limit("b", "buckling_factor", 3.0), modes[:1])
    assert (negative.verdict, negative.found) == ("not established", None)
    assert "none of its 1 factors is positive" in negative.reason and "more modes" not in negative.reason


def test_of_equal_values_but_for_rounding_the_first_is_named_and_the_worst_decides() -> None:
    modes = [bending(100.0 + 1e-9), bending(100.0 - 1e-9, turn=math.pi / 2)]
    verdict = _verdict(Limit("f", "frequency", 100.0), modes)
    assert (verdict.place, verdict.verdict) == ("mode 1, bending about y", "missed")


@pytest.mark.parametrize(("limit", "word", "said"), [(120.0, "met", ""), (121.0, "not established", "beyond 120")])
def test_where_no_factor_is_positive_the_reach_of_the_search_decides(limit: float, word: str, said: str) -> None:
    looked = Check(none_of_other_sign("pressed"), 0.0, 0.0, True)
    modes = [bending(-1.2, case="pressed")]
    (verdict,) = judged(modes, modes, [Limit("b", "buckling_factor", limit)], [looked]).limits
    assert (verdict.verdict, verdict.found) == (word, None)
    assert said in verdict.reason and "up to 120" in verdict.place


@pytest.mark.parametrize(("factor", "said"), [
    (0.8, "buckles under case pressed"), (2.0, "by about 1 / (1 - 1 / 2) = 2 times"), (5.0, ""),
    (-2.0, "loads reversed, 2 times as large"),
])
def test_buckling_warns(factor: float, said: str) -> None:
    cautions = judged([bending(factor, case="pressed")], [bending(factor, case="pressed")]).cautions
    warnings = [text for text in cautions if "factor" in text and "perfect, elastic part" not in text]
    assert len(warnings) == (1 if said else 0) and said in "".join(warnings)
    assert any("a code of practice" in text for text in cautions)  # always


def test_a_column_of_both_models_is_told_apart_by_a_fault() -> None:
    """The judge on real lists: Euler's column, once sound, once with 4 % more stiffness in the beam."""
    part = _column()
    assert part.buckling
    euler = math.pi**2 * part.material.E * (20.0 * 10.0**3 / 12.0) / (4.0 * LENGTH**2) / 1000.0
    solid = [bending(euler * 0.999, turn=math.pi / 2, case="pressed")]
    assert words(judged(solid, [bending(euler, turn=math.pi / 2, case="pressed")])) == {"mode 1": "agrees"}
    stiff = [bending(1.04 * euler, turn=math.pi / 2, case="pressed")]
    assert words(judged(solid, stiff)) == {"mode 1": "suspicious"}


def _column() -> Part:
    return dataclasses.replace(bar(loads=(PUSH,), cases=(Case("pressed", {"push": 1.0}),)),
                               buckling=(Buckling("pressed"),))


def test_a_wide_thin_strip_held_at_its_face_is_given_the_stiffness_of_a_plate_where_it_bends_flat() -> None:
    """200 x 80 x 2: both models' factors were 1716 and 1478 for the third mode, deflections 0.1205 and 0.1257 mm."""
    wall = Support("wall", "arm.start", {"x": 0.0, "y": 0.0, "z": 0.0})
    mean = Support("wall", "arm.start", dict.fromkeys(("x", "y", "z", "rx", "ry", "rz"), 0.0), coupling="average")

    def size(support: Support, thick: float, flat: float) -> tuple[float, float]:
        ctx = Context(box_part(200.0, 80.0, thick, [support], [PUSH]), box_mesh(200.0, 80.0, thick, (4, 2, 1)))
        modes = mode_reasons(ctx, ModeFacts("buckling", 3, 0.0, False, False, flat=flat))
        key = FigureKey("all", "arm.end", "displacement", "z")
        still = reasons(ctx, CaseFacts(0.0, 0.0, False, False, flat_share=flat), key)
        return tuple(sum(s.fraction for s in found if "plate" in s.text) for found in (modes, still))

    assert size(wall, 2.0, 1.0) == pytest.approx((0.09, 0.09 * 1.5 * 0.4))
    assert size(mean, 2.0, 1.0) == size(wall, 20.0, 1.0) == size(wall, 2.0, 0.0) == (0.0, 0.0)


def test_a_carried_mass_widens_the_band_where_it_is_fixed() -> None:
    lamp = RemotePoint("lamp", "arm.end", (500.0, 0.0, 0.0), "average", mass=1e-3)
    part = bar(loads=(PUSH, lamp), cases=(Case("pressed", {"push": 1.0}),))
    texts = [s.text for s in mode_reasons(Context(part, mesh()), ModeFacts("vibration", 1, 0.0, False, False))]
    assert "local give at mass lamp" in texts
