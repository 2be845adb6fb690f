"""The page of a study: one HTML file with everything in it, for a browser without a network."""

from __future__ import annotations

import base64
import hashlib
import json
import re
from collections.abc import Mapping
from functools import cache
from importlib.resources import files
from typing import Any

import numpy as np

from studies.report.study.answer import Answer, aim_text, answer
from studies.report.study.counts import count
from studies.report.study.data import Row, StudyData
from studies.report.study.effects import Effects, effects
from studies.report.study.pack import DIGITS, figure_units, pack
from studies.report.study.ranking import Ranking, at_most, finished, governing, level, levels, rank
from studies.report.study.readings import method, picture_key, reading
from studies.report.study.words import (
    capital,
    clock,
    counted,
    factor_of,
    figure_words,
    held_text,
    margin_text,
    percent,
    value_text,
)
from studies.report.summary import CONVENTIONS, SCOPE
from studies.report.tables import MARKS, digits, marked, readable, shown_unit
from studies.vary.outcome import Outcome

SCRIPTS = ("base.js", "ranking.js", "variant.js", "tradeoff.js", "effects.js", "parallel.js", "start.js")
ROWS = 25
"""Rows of the ranking on one sheet of it."""
NEAREST = 10


def study_page(data: StudyData, pictures: Mapping[str, bytes] | None = None) -> str:
    """HTML of the whole page.

    Parameters
    ----------
    data
        The study.
    pictures
        Caption -> PNG of the variant that the page speaks of first; they are kept inside the page.
    """
    ranking = rank(data)
    counts = count(data)
    top = answer(data, ranking, counts)
    found = all_effects(data)
    packed = pack(data, ranking)
    packed["top"] = next((i for i, row in enumerate(data.rows) if row is top.row), -1)
    units = figure_units(data)
    packed["effects"] = [_packed_effects(effect, factor_of(units.get(name, data.aim_unit)))
                         for name, effect in found.items()]
    packed["rows"] = ROWS
    head = _head(data)
    own = "\n".join(_file(name) for name in SCRIPTS)
    plotly = _plotly()
    return _environment().get_template("page.html.jinja").render(
        data=data, ranking=ranking, counts=counts, top=top, top_values=_values(data, top.row),
        top_figures=_figures(top.row), pictures=_inline(pictures or {}),
        ranked=[_ranked(data, row, head) for row in ranking.meeting[:ROWS]], nearest=_nearest(data, ranking),
        head=head, effects=_effect_rows(data, found), method=_method(data, found),
        key=picture_key(effect.kind for effect in found.values()), scope=SCOPE,
        conventions=CONVENTIONS, json=_safe_json(packed), plotly=plotly, script=own, style=_file("page.css"),
        hashes=" ".join(f"'sha256-{_sha(text)}'" for text in (plotly, own)), compact=len(head) > 13,
    )


def top_of(data: StudyData) -> Answer:
    """What the page says first."""
    return answer(data, rank(data), count(data))


def all_effects(data: StudyData) -> dict[str, Effects]:
    """Effects on every kept figure; on the aim too, where it is a formula."""
    rows = finished(data.rows)
    columns, ordered = [], []
    for axis in data.axes:
        if axis.numeric:
            columns.append(np.array([row.numbers.get(axis.name, np.nan) for row in rows], dtype=float))
        else:
            order = {text: i for i, text in enumerate(levels(data, axis.name))}
            columns.append(np.array([order[level(row, axis.name)] for row in rows], dtype=float))
        ordered.append(axis.numeric)
    units = figure_units(data)
    figures = {name: [_solid(row, name) for row in rows] for name in units}
    if data.aim not in units and rows:
        figures = {"aim": [row.aim for row in rows], **figures}
    return {name: effects(columns, ordered, np.array([np.nan if v is None else v for v in values], dtype=float),
                          data.sampling) for name, values in figures.items()}


def _solid(row: Row, name: str) -> float | None:
    kept = row.outcome.figures.get(name) if row.outcome is not None else None
    return kept.solid if kept is not None else None


def _packed_effects(found: Effects, factor: float) -> dict[str, Any]:
    return {"kind": found.kind, "factor": factor, "each": [
        {"share": e.share, "rank": e.rank, "at": e.centres, "mean": e.means, "low": e.lows, "high": e.highs}
        for e in found.each]}


def _effect_rows(data: StudyData, found: Mapping[str, Effects]) -> list[dict[str, Any]]:
    units = figure_units(data)
    rows = []
    for name, effect in found.items():
        unit = units.get(name, data.aim_unit)
        cells = []
        for each in effect.each:
            share = each.share
            text = percent(share) if share is not None else "-" if each.rank is None else f"{each.rank:+.2f}"
            cells.append({"text": text, "give": percent(each.give) if each.give else "",
                          "bar": round(100 * min(1.0, share if share is not None else abs(each.rank or 0.0)))})
        rows.append({"name": "aim" if name == "aim" else figure_words(name), "unit": shown_unit(unit), "cells": cells,
                     "together": percent(effect.together) if effect.together is not None else "-",
                     "reading": reading(data, name, unit, effect)})
    return rows


def _method(data: StudyData, found: Mapping[str, Effects]) -> str:
    return method(data, [effect.kind for effect in found.values()],
                  max((effect.count for effect in found.values()), default=0))


def _head(data: StudyData) -> list[dict[str, Any]]:
    """Columns of the ranking: key for the script, words, unit, and whether it holds numbers."""
    units = figure_units(data)

    def column(key: str, words: str, unit: str = "", number: bool = False) -> dict[str, Any]:
        return {"key": key, "words": words, "unit": unit, "number": number}

    figures = [column(f"figure:{name}", figure_words(name), shown_unit(unit), True) for name, unit in units.items()]
    if data.aim not in units:
        figures.insert(0, column("aim", "aim", shown_unit(data.aim_unit), True))
    return [
        column("number", "variant"),
        *(column(f"axis:{axis.name}", axis.name, axis.unit * axis.numeric, axis.numeric) for axis in data.axes),
        *figures[:1], column("left", "least left", "%", True), column("governs", "governs"),
        column("verdict", "limits"), column("word", "judgement"), *figures[1:],
    ]


def _ranked(data: StudyData, row: Row, head: list[dict[str, Any]]) -> list[dict[str, Any]]:
    """One row of the ranking, as the script writes it too."""
    outcome = row.outcome
    assert outcome is not None
    axes = {axis.name: axis for axis in data.axes}
    held = governing(outcome)
    fixed = {
        "number": str(row.number), "aim": _cell(row.aim, data.aim_unit),
        "left": _cell(None if held is None or held.margin is None else 100 * held.margin, ""),
        "governs": held.name if held is not None else "-",
        "verdict": marked("met") if outcome.limits else "none set",
        "word": marked("suspicious" if outcome.suspicions else outcome.judgement or "agrees"),
    }

    def text(key: str) -> str:
        kind, _, name = key.partition(":")
        if kind == "axis":
            shown = value_text(axes[name], row)
            return shown.removesuffix(f" {axes[name].unit}") if axes[name].numeric else shown
        if kind == "figure":
            kept = outcome.figures.get(name)
            return "-" if kept is None else _cell(kept.solid, kept.unit)
        return fixed[kind]

    return [{"text": text(column["key"]), "number": column["number"]} for column in head]


def _cell(value: float | None, unit: str) -> str:
    """As the script writes it, from the digits that it is given."""
    return "-" if value is None else digits(float(f"{factor_of(unit) * value:.{DIGITS}g}"))


def _nearest(data: StudyData, ranking: Ranking) -> list[dict[str, str]]:
    if ranking.meeting:
        return []
    return [{"number": str(row.number), "point": ", ".join(_value_pairs(data, row)), "aim": aim_text(data, row),
             "limit": "; ".join(_unmet(row.outcome)), "word": marked(row.outcome.judgement)}
            for row in ranking.misses[:NEAREST] if row.outcome is not None and row.outcome.judgement]


def _unmet(outcome: Outcome) -> list[str]:
    """Every limit that is not met, the worst first: ``deflection 0.118 mm, at most 0.1 mm allowed: missed by 18 %``."""
    rows = sorted((held for held in outcome.limits if held.verdict != "met"),
                  key=lambda held: 0.0 if held.margin is None else held.margin)
    return [f"{held.name} {held_text(held, at_most(held))}: "
            + (margin_text(held) if held.verdict == "missed" else f"not established, {held.reason}") for held in rows]


def _value_pairs(data: StudyData, row: Row) -> list[str]:
    return [f"{axis.name} {value_text(axis, row)}" for axis in data.axes]


def _values(data: StudyData, row: Row | None) -> list[tuple[str, str]]:
    return [(axis.name, value_text(axis, row)) for axis in data.axes] if row is not None else []


def _figures(row: Row | None) -> list[tuple[str, str, str, str]]:
    if row is None or row.outcome is None:
        return []
    return [(figure_words(name), readable(kept.solid, kept.unit), readable(kept.beam, kept.unit),
             marked(kept.judgement)) for name, kept in row.outcome.figures.items()]


def _inline(pictures: Mapping[str, bytes]) -> list[tuple[str, str]]:
    return [(caption, f"data:image/png;base64,{base64.b64encode(png).decode()}") for caption, png in pictures.items()]


def breakable(text: str) -> str:
    """A name of several words with places where a line may end: after dots and underscores."""
    from markupsafe import Markup, escape

    return Markup(re.sub(r"([._])", r"\1<wbr>", str(escape(text))))


def _safe_json(packed: Mapping[str, Any]) -> str:
    """JSON that cannot end its own script element, whatever the texts hold."""
    text = json.dumps(packed, ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    for sign in "<>&\u2028\u2029":
        text = text.replace(sign, f"\\u{ord(sign):04x}")
    return text


def _sha(text: str) -> str:
    return base64.b64encode(hashlib.sha256(text.encode()).digest()).decode()


@cache
def _plotly() -> str:
    from plotly.offline import get_plotlyjs

    # Line ends as a browser reads them: the hash in the page's policy is over those.
    return str(get_plotlyjs()).replace("\r\n", "\n").replace("\r", "\n")


def _file(name: str) -> str:
    return files("studies.report.study").joinpath("page", name).read_text(encoding="utf-8")


def _environment() -> Any:
    from jinja2 import Environment, FunctionLoader, StrictUndefined

    environment = Environment(autoescape=True, undefined=StrictUndefined, loader=FunctionLoader(_file),
                              trim_blocks=True, lstrip_blocks=True)
    environment.filters |= {"breakable": breakable, "clock": clock, "figure": figure_words, "capital": capital}
    environment.globals |= {"marked": marked, "marks": MARKS, "counted": counted, "factor": factor_of}
    return environment
