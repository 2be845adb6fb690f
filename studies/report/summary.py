"""``summary.md``: what a person reads first of a run folder."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable, Sequence

from studies.check.result import CheckResult, Pair, PeakPlace
from studies.check.studied import TravelSummary
from studies.judge.envelope import Extreme, envelope
from studies.report.studied import (
    ENVELOPE_HEAD,
    MODE_HEAD,
    buckling_cases,
    envelope_rows,
    kept_pairs,
    mode_rows,
    travel_sentence,
    travelling_extremes,
)
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
    "Linear elastic material, small displacements, perfect geometry: no yielding, no large rotation; buckling only "
    "where it was asked for, as a factor of the perfect part.",
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

BUCKLING_HEAD = MODE_HEAD[:10] + MODE_HEAD[11:]
SHAPE_NAMES = (
    "Bending about y or z: about the member's own axis. A shape of the solid is named by how its sections move, one of "
    "the beam by where its strain energy is: where bending and twist go together, one and the same shape may have two "
    "names. The correlation decides what is paired, never the name."
)
"""Buckling has no mass."""


def summary(result: CheckResult) -> str:
    """Markdown text of the whole run."""
    parts = [
        [f"# {result.title or result.spec_name}", "", verdict(result)],
        _asked(result), _limits(result), _envelope(result), _frequencies(result), _buckling(result),
        *(_travelling(result, travel) for travel in result.travels),
        *(_case(result, case) for case in still_cases(result)), _whole_part(result),
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
    moving = [travelling_extremes(result, solid) for solid in (True, False)]
    found = envelope((*result.solid_figures, *moving[0]), (*result.beam_figures, *moving[1]))
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


def still_cases(result: CheckResult) -> list[str]:
    """The cases in which nothing travels."""
    travelling = {travel.case for travel in result.travels}
    return [case for case in result.cases if case not in travelling]


def _frequencies(result: CheckResult) -> list[str]:
    rows = mode_rows(result, "natural_frequency")
    if not rows:
        return []
    return ["## Natural frequencies", "", *table(MODE_HEAD, rows), "",
            "Correlation: how alike the motion of the sections is in both models (modal assurance criterion, 1 is the "
            "same). Rigid sections: how much of the solid's shape they explain. Carries: share of the part's mass "
            "along a global axis, or of its inertia about one, that takes part. The load cases do not act.",
            "", SHAPE_NAMES,
            *_mode_allowances(result, "")]


def _buckling(result: CheckResult) -> list[str]:
    lines: list[str] = []
    for case in buckling_cases(result):
        fixed = next(m.fixed for m in result.modes if m.key.case == case)
        factors = ", ".join(f"{f:g} x {load}" for load, f in result.cases.get(case, {}).items() if load not in fixed)
        kept = f" beside {', '.join(fixed)}, which keeps its value" if fixed else ""
        lines += ["", f"### Case {case}", "", f"By which factor {factors} may grow{kept}:", "",
                  *table(BUCKLING_HEAD, [row[:10] + row[11:] for row in mode_rows(result, "buckling_factor", case)]),
                  *_mode_allowances(result, case)]
    return ["## Buckling", *lines, "", SHAPE_NAMES] if lines else []


def _mode_allowances(result: CheckResult, case: str) -> list[str]:
    """What the allowance of the first compared mode is made of; later ones have more waves, and more of the same."""
    kinds = ("natural_frequency", "buckling_factor")
    first = next((p for p in result.pairs if p.key.case == case and p.key.quantity in kinds and p.reasons), None)
    if first is None:
        return []
    reasons = "; ".join(f"{r.text} {100 * r.size / first.scale:.2g} %" for r in first.reasons)
    return ["", f"What the allowance of {first.key.component} is made of: {reasons}."]


def _travelling(result: CheckResult, travel: TravelSummary) -> list[str]:
    """Envelopes over the positions, and what was kept of single positions."""
    lines = [f"## Travelling load: envelopes of case {travel.case}", "", travel_sentence(travel), "",
             *table(ENVELOPE_HEAD, envelope_rows(result, travel)), "",
             "Behind @: the position of the first axle, mm. Every figure at every place is in `result.json`."]
    explained = [pair for pair in kept_pairs(result, travel.case) if pair.judgement == "explained"]
    if explained:
        lines += ["", "Of each kind of figure, the explained one that uses most of its allowance:", "",
                  *table(("position", *PAIR_HEAD), [(pair.key.case.partition("@")[2], *_pair_row(pair))
                                                    for pair in explained])]
    for case in dict.fromkeys(peak.case for peak in result.peaks if peak.case.startswith(f"{travel.case}@")):
        lines += ["", f"At the position {case.partition('@')[2]} mm:", "", *_peaks(result, case)]
    return lines


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
    spot = f"({', '.join(f'{round(x, 6) + 0.0:.4g}' for x in peak.point)}) mm"  # without the rounding of a nought
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


def _solver(result: CheckResult) -> list[str]:
    solver = result.solver
    if solver is None:
        return []
    told = [f"{word} {value:.2g}" for word, value in (("residual over load", solver.residual),
                                                      ("error of a known bending", solver.gauge)) if value is not None]
    reason = f" ({solver.reason.rstrip('.')})" if solver.reason else ""
    return [f"- Solver: {solver.name}{reason}; {', '.join(told) or 'its accuracy was not told'}"]


def _run(result: CheckResult) -> list[str]:
    mesh = result.mesh
    times = ", ".join(f"{stage.name} {stage.seconds:.2f} s" for stage in result.stages)
    return ["## The run", "",
            f"- Started {result.started}; {times}",
            f"- Mesh: {mesh.tets} tetrahedra of second order, {mesh.nodes} nodes, least quality "
            f"{mesh.least_quality:.3g}, volume {mesh.volume:.6g} mm^3 (recipe in `result.json`)",
            *_solver(result),
            "- Versions: " + ", ".join(f"{name} {text}" for name, text in result.versions.items()),
            "- Files: " + ", ".join(f"`{name}`" for name in result.files)]
