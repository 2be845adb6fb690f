"""``summary.md``: what a person reads first of a run folder."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Sequence

from studies.check.result import CheckResult, Pair, PeakPlace
from studies.judge.envelope import Extreme, envelope
from studies.report.tables import (
    Tally,
    headlines,
    marked,
    name_of,
    number,
    readable,
    remainder,
    shown_unit,
    suspicious,
    tallies,
    verdict,
)

SCOPE = (
    "Linear elastic material, small displacements, perfect geometry: no yielding, no buckling, no large rotation.",
    "No fatigue, no contact, no bolt or weld strength, no residual stress.",
    "The two models share the spec: a wrong load, support or dimension in it goes unseen. Local codes and a "
    "licensed engineer's judgement decide; this run is evidence for them, not a substitute.",
)
"""What no run covers, said in every summary and in the help of the command."""

CONVENTIONS = (
    "Displacements and rotations: section means, global axes. Reactions: what the support exerts on the part, "
    "moments about the centroid of the support's region, global axes. Section forces: on the face with outward "
    "normal +x, about the declared member line, member axes, moments right-handed (My positive: tension at +z; Mz "
    "positive: tension at -y). Stress: along the member, tension positive. Difference: solid less beam."
)

MOST_ROWS = 20


def summary(result: CheckResult) -> str:
    """Markdown text of the whole run."""
    parts = [
        [f"# {result.title or result.spec_name}", "", verdict(result)],
        _asked(result), _limits(result), _envelope(result), *(_case(result, case) for case in result.cases),
        _whole_part(result),
        _suspicious(result), _notes(result), _checks(result), _cautions(result), _run(result),
    ]
    return "\n".join(line for part in parts for line in [*part, ""]).rstrip() + "\n"


def table(head: Sequence[str], rows: Iterable[Sequence[str]]) -> list[str]:
    """Lines of a Markdown table."""
    lines = [head, ["---"] * len(head), *rows]
    return ["| " + " | ".join(cell.replace("|", "\\|").replace("\n", " ") for cell in line) + " |" for line in lines]


def _asked(result: CheckResult) -> list[str]:
    material = result.material
    strength = material.get("yield_strength")
    lines = ["## What was asked", "",
             f"- Spec: `{result.spec_name}` (its text is in `result.json`)",
             f"- Material: {material['name']}, E {material['E']:g} MPa, Poisson's ratio {material['nu']:g}, "
             + (f"yield {strength:g} MPa ({material['kind']}; {material['source']})" if strength
                else "no yield strength given"),
             f"- Accuracy {100 * result.accuracy:g} %: requested, not verified"]
    declared = _declared_parameters(result)
    if declared:
        lines.append("- Parameters: " + ", ".join(f"{name} = {text}" for name, text in declared.items()))
    for case, factors in result.cases.items():
        lines.append(f"- Case {case}: " + (", ".join(f"{f:g} x {load}" for load, f in factors.items()) or "no load"))
    return lines


def _declared_parameters(result: CheckResult) -> dict[str, str]:
    """Parameters as they were written; the resolved numbers when the text is not at hand."""
    try:
        declared = tomllib.loads(result.spec_text).get("parameters", {})
    except (tomllib.TOMLDecodeError, RecursionError):
        declared = {}
    return {name: str(declared.get(name, f"{value:.6g} (N, mm, s)")) for name, value in result.parameters.items()}


def _limits(result: CheckResult) -> list[str]:
    if not result.limits:
        return ["## Limits", "", "None were set."]
    rows = [(limit.name, limit.quantity.replace("_", " "), readable(limit.given, limit.unit),
             readable(limit.found, limit.unit), limit.case or "-", limit.place or "-", marked(limit.verdict),
             limit.reason) for limit in result.limits]
    return ["## Limits", "", *table(["limit", "quantity", "given", "found", "case", "place", "verdict", "why"], rows)]


def _envelope(result: CheckResult) -> list[str]:
    """Greatest and least figures over the cases, with the case that governs."""
    if len(result.cases) < 2:
        return []
    found = envelope(result.solid_figures, result.beam_figures)
    largest: dict[str, float] = {}
    for row in found:
        largest[row.quantity] = max(largest.get(row.quantity, 0.0), abs(row.value))

    def shown(value: float | None, row: Extreme) -> str:
        # rounding beside the largest of its kind is nothing, and is written as nothing
        tiny = value is not None and abs(value) < 1e-6 * largest[row.quantity]
        return "0" if tiny else number(value, row.unit)

    rows = [(f"{row.quantity.replace('_', ' ')} {row.component}", row.which, shown_unit(row.unit),
             shown(row.value, row), shown(row.beam, row), row.case, row.place) for row in found]
    return ["## Envelope over the cases", "",
            *table(["figure", "", "unit", "solid", "beam there", "governing case", "place"], rows)]


def _pair_row(pair: Pair) -> tuple[str, ...]:
    causes = "; ".join(f"{cause.text} ({readable(cause.predicted, pair.unit)})" for cause in pair.causes)
    return (name_of(pair.key), shown_unit(pair.unit), number(pair.solid, pair.unit), number(pair.beam, pair.unit),
            number(pair.difference, pair.unit), number(pair.band, pair.unit) if pair.difference is not None else "-",
            marked(pair.judgement), causes)


PAIR_HEAD = ("figure", "unit", "solid", "beam", "difference", "allowed beyond causes", "judgement", "causes")


def _case(result: CheckResult, case: str) -> list[str]:
    lines = [f"## Case {case}", "", *table(PAIR_HEAD, map(_pair_row, headlines(result, case))), "",
             "Every figure of the case, by kind; the worst is the one that uses most of its allowance:", ""]
    lines += table(["kind", "figures", "judgement", "worst", "its remainder", "allowed"],
                   [_tally_row(tally) for tally in tallies(result, case)])
    return [*lines, *_allowances(result, case), "", *_peaks(result, case)]


def _allowances(result: CheckResult, case: str) -> list[str]:
    """What the allowances are made of, as shares of the scale; each set once with the kinds of figure it serves."""
    sets: dict[str, dict[str, None]] = {}
    for pair in result.pairs:
        reasons = "; ".join(f"{r.text} {100 * r.size / pair.scale:.2g} %" for r in pair.reasons if pair.scale > 0)
        if pair.key.case == case and reasons:
            sets.setdefault(reasons, {})[pair.key.quantity.replace("_", " ")] = None
    lines = [f"- {', '.join(kinds)}: {reasons}" for reasons, kinds in sets.items()]
    return ["", "What the allowances are made of:", "", *lines] if lines else []


def _tally_row(tally: Tally) -> tuple[str, ...]:
    words = ", ".join(f"{count} {word}" for word, count in tally.words.items())
    if tally.worst is None:
        return tally.quantity.replace("_", " "), str(tally.count), f"{marked(tally.word)} ({words})", "-", "-", "-"
    worst = tally.worst
    return (tally.quantity.replace("_", " "), str(tally.count), f"{marked(tally.word)} ({words})", name_of(worst.key),
            readable(remainder(worst), worst.unit), readable(worst.band, worst.unit))


def _peaks(result: CheckResult, case: str) -> list[str]:
    peaks = [peak for peak in result.peaks if peak.case == case]
    if not peaks:
        return ["No peak places."]
    rows = [(str(i), _where(peak), f"{peak.stress:.4g}", "-" if peak.error is None else f"{peak.error:.2g}",
             "yes" if peak.has_limit else f"no: {peak.text}") for i, peak in enumerate(peaks, start=1)]
    lines = ["Peak places of the solid model (von Mises):", "",
             *table(["no.", "where (x, y, z)", "von Mises (MPa)", "stated error (MPa)", "has a converged value"],
                    rows)]
    stress = next((c for c in result.case_stress if c.case == case), None)
    if stress is not None:
        factor = stress.yield_factor_established
        lines += ["", f"Largest von Mises stress away from places without a converged value: "
                      f"{stress.established:.4g} MPa" + (f", yield factor {factor:.3g}" if factor else "") + "."]
    dents = [f"{d.value:.3g} mm at {d.region}" for d in result.denting if d.case == case]
    return lines + (["", "Local denting of loaded faces, not part of the section means: " + ", ".join(dents) + "."]
                    if dents else [])


def _where(peak: PeakPlace) -> str:
    spot = f"({', '.join(f'{x:.4g}' for x in peak.point)}) mm"
    return peak.place if spot in peak.place else f"{peak.place} {spot}".strip()


def _whole_part(result: CheckResult) -> list[str]:
    return ["## Whole part", "", *table(PAIR_HEAD, map(_pair_row, headlines(result, "")))]


def _suspicious(result: CheckResult) -> list[str]:
    pairs = suspicious(result)
    if not pairs:
        return ["## Suspicious", "", "Nothing."]
    rows = [(pair.key.case or "-", name_of(pair.key), readable(pair.solid, pair.unit), readable(pair.beam, pair.unit),
             readable(remainder(pair), pair.unit), readable(pair.band, pair.unit), pair.look_at)
            for pair in pairs[:MOST_ROWS]]
    lines = ["## Suspicious", "", *table(["case", "figure", "solid", "beam", "remainder", "allowed", "look at"], rows)]
    more = len(pairs) - MOST_ROWS
    return [*lines, "", f"{more} more in `result.json`."] if more > 0 else lines


def _checks(result: CheckResult) -> list[str]:
    rows = [(check.name, f"{check.value:.3g}", f"{check.allowed:.3g}", "= ok" if check.ok else "! failed", check.text)
            for check in result.checks]
    return ["## Independent checks", "", *table(["check", "value", "allowed", "verdict", "what it holds"], rows)]


def _notes(result: CheckResult) -> list[str]:
    """What the beam model leaves out, so that nobody takes a missing figure for agreement."""
    return ["## Not in the beam model", "", *(f"- {text}" for text in result.notes or ("Nothing was left out.",))]


def _cautions(result: CheckResult) -> list[str]:
    return ["## Cautions", "", *(f"- {text}" for text in (*result.cautions, *SCOPE)), "", CONVENTIONS]


def _run(result: CheckResult) -> list[str]:
    mesh = result.mesh
    times = ", ".join(f"{stage.name} {stage.seconds:.2f} s" for stage in result.stages)
    return ["## The run", "",
            f"- Started {result.started}; {times}",
            f"- Mesh: {mesh.tets} tetrahedra of second order, {mesh.nodes} nodes, least quality "
            f"{mesh.least_quality:.3g}, volume {mesh.volume:.6g} mm^3 (recipe in `result.json`)",
            "- Versions: " + ", ".join(f"{name} {text}" for name, text in result.versions.items()),
            "- Files: " + ", ".join(f"`{name}`" for name in result.files)]
