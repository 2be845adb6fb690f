"""The kept figures of a variant, by name.

==========================  ==================================================================================
``mass``                    t, at most material where the plan has tolerances
``deflection``              largest size of a section's mean displacement, mm; ``rotation``: the same in rad
``stress``                  largest established von Mises stress of the solid, MPa (the beam has none)
``yield_factor``            least factor against first yield there
``nominal_stress``          largest size of the longitudinal stress at the outer fibres, MPa
``notch_stress``            largest size at the rims of cuts and shoulders, MPa; ``stress@CUT``: at one of them
``reaction``                largest size of the force at a support, N; ``reaction@SUPPORT``: at one of them
``frequency``               lowest natural frequency, Hz; ``frequency_2`` the second one, and so on
``buckling_factor``         least positive one
``denting``                 largest local deformation of a loaded region, mm (the beam has none)
``strain_energy``           largest of the cases, N mm
``displacement_z@arm.end``  any quantity of both models with its component at a place, in base units; without the
                            component the size of the vector. ``rotation_y``, ``reaction_force_x@wall``,
                            ``reaction_moment_z@wall``, ``section_force_Vz@arm@120``, ``section_moment_My`` ...
==========================  ==================================================================================

Each is the largest size over the cases, with its sign; `` in CASE`` after the name keeps it to one case (of a
travelling load: of all its positions). The beam's value is the beam's own largest, wherever it is.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, field
from typing import Any, NamedTuple

from fem.beam import BeamResult
from fem.figure import Figure, FigureKey
from fem.solid import SolidResult
from geometry.part import Part
from studies.check.words import JudgementWord
from studies.judge import Judgement
from studies.vary.outcome import Kept

XYZ = ("x", "y", "z")
COMPONENTS: dict[str, tuple[str, ...]] = {
    "displacement": XYZ, "rotation": XYZ, "reaction_force": XYZ, "reaction_moment": XYZ,
    "section_force": ("N", "Vy", "Vz"), "section_moment": ("T", "My", "Mz"),
}
SIZES = ("displacement", "rotation", "reaction_force", "reaction_moment")
"""Quantities that have a size."""
SAME = {"deflection": "displacement", "reaction": "reaction_force"}
SOLID_ONLY = ("stress", "yield_factor", "denting")
SCALARS = ("nominal_stress", "notch_stress", "strain_energy")
_NAME = re.compile(r"(?P<what>[a-z_]+?)(?:_(?P<part>[0-9]+|[xyzNT]|Vy|Vz|My|Mz))?(?:@(?P<at>.+?))?"
                   r"(?: in (?P<case>.+))?")
_WORST_FIRST: tuple[JudgementWord, ...] = ("suspicious", "explained", "agrees", "load check", "no beam value")


class Name(NamedTuple):
    """A figure's name in its parts; empty where there is none."""

    what: str
    component: str
    at: str
    case: str


def parse(name: str) -> Name | None:
    """Take a name apart; None where it is no name of a figure."""
    found = _NAME.fullmatch(name)
    if found is None:
        return None
    what, component, at, case = (found[part] or "" for part in ("what", "part", "at", "case"))
    known = SAME.get(what, what)
    if what in ("frequency", "buckling_factor"):
        fits = not at and (not component or (component.isdigit() and int(component) > 0)) and not (
            what == "buckling_factor" and component) and not (what == "frequency" and case)
    elif known in COMPONENTS:
        fits = component in COMPONENTS[known] or (not component and known in SIZES)
    elif what == "stress":
        fits = not component
    else:
        fits = not component and (what in SCALARS or (not at and what in (*SOLID_ONLY, "mass"))) and not (
            what == "mass" and case)
    return Name(what, component, at, case) if fits else None


def headline(part: Part) -> tuple[str, ...]:
    """The figures that are kept where the plan does not say."""
    names = ["mass", "deflection", "rotation", "stress"]
    names += ["yield_factor"] if part.material.yield_strength is not None else []
    names += ["reaction"] if part.supports else []
    names += ["frequency"] if part.vibration is not None else []
    return (*names, *(["buckling_factor"] if part.buckling else []))


def not_there(part: Part, names: Sequence[str]) -> list[tuple[str, str]]:
    """Names of figures that the part does not have, each with what it may be instead."""
    places = set(_places(part))
    cases = {c.travel.case if c.travel else c.name for c in part.cases}
    wrong = []
    for name in names:
        parsed = parse(name)
        if parsed is None:
            wrong.append((name, "mass, deflection, rotation, stress, yield_factor, nominal_stress, notch_stress, "
                                "reaction, frequency, frequency_2, buckling_factor, denting, strain_energy, "
                                "displacement_z@PLACE, reaction_force_x@SUPPORT, section_moment_My@PLACE ..."))
        elif parsed.case and parsed.case not in cases:
            wrong.append((name, f"a case of the part: {', '.join(sorted(cases))}"))
        elif parsed.at and "@" not in parsed.at and parsed.at not in places:
            wrong.append((name, f"a place, support or cut of the part: {', '.join(sorted(places))}"))
        elif parsed.what == "frequency" and part.vibration is None:
            wrong.append((name, "natural frequencies only of a part that asks for them: [vibration]"))
        elif parsed.what == "frequency" and part.vibration and int(parsed.component or 1) > part.vibration.modes:
            wrong.append((name, f"at most frequency_{part.vibration.modes}: the part asks for no more modes"))
        elif parsed.what == "buckling_factor" and not part.buckling:
            wrong.append((name, "buckling factors only of a part that asks for them: [buckling]"))
        elif parsed.what == "yield_factor" and part.material.yield_strength is None:
            wrong.append((name, f"the material {part.material.name} has no yield strength"))
    return wrong


def _places(part: Part) -> Iterator[str]:
    for member in part.members:
        for end in ("start", "end"):
            yield from (f"{member.name}.{end}", end)
        for cut in member.cuts:
            yield from (cut.name, f"{member.name}.{cut.name}")
        for station in member.stations:
            yield from (f"step@{station.at:.6g}", f"{member.name}.step@{station.at:.6g}")
    yield from (place.name for place in part.places)
    yield from (support.name for support in part.supports)


def _size(kept: Kept | None) -> Kept | None:
    """Without the sign: of two rims or fibres that are stressed alike, which one is the larger by a hair changes from
    variant to variant, and a figure that jumps from tension to compression says nothing over a study."""
    if kept is None:
        return None
    return kept._replace(solid=kept.solid and abs(kept.solid), beam=kept.beam and abs(kept.beam))


@dataclass
class Figures:
    """Both models of one variant, asked for figures by name.

    `mass` holds the masses of both models at most material, where they are not those of the models themselves.
    """

    part: Part
    solid: SolidResult
    beam: BeamResult
    verdict: Judgement
    mass: tuple[float, float] | None = None
    _words: dict[FigureKey, JudgementWord] = field(init=False)
    _positions: dict[str, str] = field(init=False)

    def __post_init__(self) -> None:
        self._positions = {c.name: c.travel.case for c in self.part.cases if c.travel is not None}
        rows: list[Any] = [*self.verdict.envelopes, *self.verdict.pairs]
        self._words = {row.key: row.judgement for row in rows}

    def kept(self, names: Sequence[str]) -> dict[str, Kept]:
        """The figures of these names that the variant has."""
        found = ((name, self.figure(name)) for name in names)
        return {name: kept for name, kept in found if kept is not None}

    def figure(self, text: str) -> Kept | None:
        """One figure; None where the variant has none of that name."""
        name = parse(text)
        if name is None:
            return None
        match name.what:
            case "mass":
                return self._mass()
            case "frequency":
                return self._frequency(int(name.component or 1))
            case "buckling_factor":
                return self._buckling(name.case)
            case "denting":
                values = [d.value for d in self.solid.denting if self._acts(d.case, name)]
                return Kept(max(values, key=abs), None, "mm", "no beam value") if values else None
            case "stress" if name.at:
                return _size(self._largest(name._replace(what="notch_stress")))
            case "notch_stress" | "nominal_stress":
                return _size(self._largest(name))
            case "stress" | "yield_factor":
                return self._strength(name)
            case _:
                return self._largest(name)

    def _acts(self, case: str, name: Name) -> bool:
        return name.case in ("", case, self._positions.get(case))

    def _mass(self) -> Kept:
        key = FigureKey("", "", "mass", "")
        own = next(f.value for f in self.beam.figures if f.key == key)
        solid, beam = self.mass or (self.solid.mass, own)
        return Kept(solid, beam, "t", self._words.get(key, "no beam value"))

    def _frequency(self, number: int) -> Kept | None:
        for mode in self.verdict.modes:
            if mode.key.quantity == "natural_frequency" and mode.key.component == f"mode {number}":
                return Kept(mode.solid, mode.beam, mode.unit, mode.judgement)
        return None

    def _buckling(self, case: str) -> Kept | None:
        modes = [m for m in self.verdict.modes if m.key.quantity == "buckling_factor" and case in ("", m.key.case)]
        positive = [m for m in modes if m.solid is not None and m.solid > 0.0]
        if not modes:
            return None
        if not positive:
            return Kept(None, None, "1", "no beam value")
        least = min(positive, key=lambda m: m.solid or math.inf)
        return Kept(least.solid, least.beam, least.unit, least.judgement)

    def _strength(self, name: Name) -> Kept | None:
        """Of the solid alone; suspicious where a stress of the same case is."""
        found = [s for s in self.solid.case_stress if self._acts(s.case, name)]
        if not found:
            return None
        worst = max(found, key=lambda s: s.established)
        doubtful = any(word == "suspicious" and key.case == worst.case and key.quantity.endswith("_stress")
                       for key, word in self._words.items())
        word: JudgementWord = "suspicious" if doubtful else "no beam value"
        if name.what == "stress":
            return Kept(worst.established, None, "MPa", word)
        factor = worst.yield_factor_established
        return None if factor is None else Kept(factor, None, "1", word)

    def _largest(self, name: Name) -> Kept | None:
        """The largest size over cases, places and (where the name has none) components, of each model by itself."""
        solid, beam = (self._worst(figures, name) for figures in (self.solid.figures, self.beam.figures))
        if solid is None and beam is None:
            return None
        one = solid or beam
        assert one is not None
        word = min((self._word(key) for key in one.keys), key=_WORST_FIRST.index)
        return Kept(solid and solid.value, beam and beam.value, one.unit, word)

    def _word(self, key: FigureKey) -> JudgementWord:
        """Of the pair. Pairs of positions that a result does not hold are not suspicious (`studies.judge.travelling`):
        they have the word of their envelope, or the next better one."""
        if key in self._words:
            return self._words[key]
        word = self._words.get(key._replace(case=self._positions.get(key.case, "")), "no beam value")
        return "explained" if word == "suspicious" else word

    def _worst(self, figures: Sequence[Figure], name: Name) -> _Worst | None:
        quantity = SAME.get(name.what, name.what)
        member = self.part.members[0].name
        places = (name.at, f"{member}.{name.at}", f"{member}@{name.at}")
        rows: dict[tuple[str, ...], list[Figure]] = {}
        for figure in figures:
            key = figure.key
            if key.quantity == quantity and self._acts(key.case, name) and (not name.at or key.place in places):
                if name.component in ("", key.component):
                    slot = (key.case, key.place) if quantity in SIZES else (key.case, key.place, key.component)
                    rows.setdefault(slot, []).append(figure)
        best: _Worst | None = None
        for row in rows.values():
            value = row[0].value if len(row) == 1 else math.hypot(*(figure.value for figure in row))
            if best is None or abs(value) > abs(best.value):
                best = _Worst(value, tuple(figure.key for figure in row), row[0].unit)
        return best


class _Worst(NamedTuple):
    value: float
    keys: tuple[FigureKey, ...]
    unit: str
