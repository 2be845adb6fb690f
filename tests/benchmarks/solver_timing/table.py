"""Rows of the benchmark as Markdown: Haunch's table, the rivals' table, growth, and where the time goes."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

from solver_timing.rivals import NAMES

BEGIN, END = "<!-- solver times: begin -->", "<!-- solver times: end -->"
TIP_ALLOWED, SAMPLE_ALLOWED = 1e-6, 1e-5
"""Most that two answers may differ by, relative: the tip's displacement, and the displacements of a sample of nodes."""
SOLVERS = {"multigrid": "its multigrid solver", "cholesky": "its direct solver"}
COMPARED = {**NAMES, **SOLVERS}
"""Whose answers are held against Haunch's."""
SHARE_SHOWN = 0.03
"""Parts of less than this share of a stage are left out of the profile."""

Row = Mapping[str, Any]


def seconds(value: float | None) -> str:
    """Seconds with three figures; a dash for nothing."""
    return "–" if value is None else f"{value:.0f}" if value >= 100 else f"{value:.3g}"


def thousands(value: float | None) -> str:
    """A whole number with thin spaces; a dash for nothing."""
    return "–" if value is None else f"{value:,.0f}".replace(",", " ")


def markdown(head: Sequence[str], rows: Iterable[Sequence[str]]) -> str:
    """A table whose first column is text and whose others are numbers."""
    lines = [f"| {' | '.join(head)} |", f"|---|{'---:|' * (len(head) - 1)}"]
    return "\n".join([*lines, *(f"| {' | '.join(row)} |" for row in rows)])


def differences(row: Row, rival: str) -> tuple[float, float] | None:
    """(tip, sample): how far another answer is from Haunch's, relative; None when either has none.

    `rival` is one of `NAMES`, or one of Haunch's own solvers where both were tried.
    """
    ours = row["haunch"]["facts"]
    theirs = ours.get(rival, {}) if rival in SOLVERS else row.get(rival, {}).get("facts", {})
    if "tip" not in ours or "tip" not in theirs:
        return None
    tip = max(abs(a - b) for a, b in zip(ours["tip"], theirs["tip"], strict=True)) / max(map(abs, theirs["tip"]))
    pairs = zip(ours["sample"], theirs["sample"], strict=True)
    return tip, max(abs(a - b) for a, b in pairs) / theirs["largest"]


def disagreements(rows: Iterable[Row]) -> list[str]:
    """A sentence for every answer that differs by more than is allowed."""
    told = []
    for row in rows:
        for rival in COMPARED:
            found = differences(row, rival)
            if found and not (found[0] <= TIP_ALLOWED and found[1] <= SAMPLE_ALLOWED):
                told.append(
                    f"{row['shape']}, {thousands(row['unknowns'])} unknowns: Haunch and {COMPARED[rival]} differ by "
                    f"{found[0]:.1e} at the tip (allowed {TIP_ALLOWED:.0e}) and {found[1]:.1e} anywhere "
                    f"(allowed {SAMPLE_ALLOWED:.0e})"
                )
    return told


def haunch_table(rows: Sequence[Row]) -> str:
    """Haunch's own times."""
    head = (
        "shape", "unknowns", "solver", "steps", "assembly", "loads, supports", "set-up", "solve",
        "**all, s**", "processor, s", "with the other solver, s", "MiB", "six cases / one", "six modes, s",
        "to figures, s",
    )  # fmt: skip
    lines = []
    for row in rows:
        facts, failure = row["haunch"]["facts"], row["haunch"]["failure"]
        if "displacements" not in facts:
            lines.append((row["shape"], thousands(row.get("unknowns")), failure or "no answer", *["–"] * 12))
            continue
        stages = facts["stages"]
        assembly = stages["pattern"] + stages["assembly"]
        lines.append((
            row["shape"], thousands(facts["unknowns"]), facts["solver"], str(facts["iterations"] or "–"),
            seconds(assembly), seconds(facts["build"] - assembly), seconds(facts["set_up"]), seconds(facts["solve"]),
            f"**{seconds(facts['displacements'])}**", seconds(facts["processor"]), _other(facts),
            thousands(facts["memory"]), seconds(facts.get("six_over_one")), seconds(facts.get("modes")),
            seconds(sum(facts["after"].values()) if "after" in facts else None),
        ))  # fmt: skip
    return markdown(head, lines)


def _other(facts: Row) -> str:
    """The whole with the solver that was not chosen, where it was tried."""
    found = [facts[name] for name in SOLVERS if name in facts]
    found = [other for other in found if other["name"] != facts["solver"]]
    return seconds(facts["build"] + found[0]["seconds"]) if found else "–"


def rival_table(rows: Sequence[Row]) -> str:
    """Whole times of the rivals, assembly included, beside Haunch's; how far the answers lie apart."""
    head = (
        "shape", "unknowns", "Haunch, s", "scikit-fem's assembly, s",
        *(f"+ {name}, s (MiB)" for name in NAMES.values()), "answers differ by",
    )  # fmt: skip
    lines = []
    for row in rows:
        if "assemble" not in row:
            continue
        assembled = row["assemble"]["facts"].get("assembly")
        found = [max(pair) for rival in NAMES if (pair := differences(row, rival))]
        lines.append((
            row["shape"], thousands(row.get("unknowns")), seconds(row["haunch"]["facts"].get("displacements")),
            row["assemble"]["failure"] or seconds(assembled),
            *(_rival(row.get(rival), assembled) for rival in NAMES),
            f"{max(found):.0e}" if found else "–",
        ))  # fmt: skip
    return markdown(head, lines) if lines else ""


def _rival(outcome: Row | None, assembled: float | None) -> str:
    if outcome is None:
        return "–"
    facts = outcome["facts"]
    if "solve" not in facts:
        return outcome["failure"] or "no answer"
    steps = f", {facts['iterations']} steps" if "iterations" in facts else ""
    return f"{seconds((assembled or 0.0) + facts['solve'])} ({thousands(facts['memory'])}{steps})"


def growth(rows: Sequence[Row]) -> str:
    """Microseconds an unknown of every size of a shape, and how they grow."""
    told = []
    for shape in dict.fromkeys(row["shape"] for row in rows):
        found = [row["haunch"]["facts"] for row in rows if row["shape"] == shape]
        found = [facts for facts in found if "displacements" in facts]
        if len(found) > 1:
            each = [1e6 * facts["displacements"] / facts["unknowns"] for facts in found]
            told.append(f"{shape} {', '.join(f'{v:.1f}' for v in each)} (growth {each[-1] / each[0]:.2f})")
    return f"Time an unknown, µs, from the smallest mesh to the largest: {'; '.join(told)}." if told else ""


def profile(row: Row) -> str:
    """One paragraph: the shares of set-up and solve, and the solve beside what the memory's bandwidth allows."""
    facts = row["haunch"]["facts"]
    if "displacements" not in facts:
        return ""
    texts = [
        f"build {seconds(facts['build'])} s ({_shares(facts['stages'], facts['build'])})",
        f"set-up {seconds(facts['set_up'])} s ({_shares(facts['set_up_parts'], facts['set_up'])})",
        f"solve {seconds(facts['solve'])} s ({_shares(facts['solve_parts'], facts['solve'])})",
    ]
    why = (facts["reason"] or facts["solver"]).rstrip(".")
    text = f"*{row['shape']}, {thousands(facts['unknowns'])} unknowns* ({why}): {'; '.join(texts)}"
    moved = sum(facts["bytes"].values())
    if facts["iterations"] and moved:
        least = moved / facts["triad"]
        text += (
            f". The products of the solve move at least {moved / 1e9:.2f} GB: {seconds(least)} s at the "
            f"{facts['triad'] / 1e9:.1f} GB/s that a triad reaches in the same process, so the solve takes "
            f"{facts['solve'] / least:.1f} times the least time"
        )
    if "modes" in facts:
        text += f". Modes {seconds(facts['modes'])} s ({_shares(facts['modes_parts'], facts['modes'])})"
    if "after" in facts:
        text += f". After the displacements: {', '.join(f'{k} {seconds(v)} s' for k, v in facts['after'].items())}"
    return text + "."


def _shares(parts: Mapping[str, float], whole: float) -> str:
    shown = {name: spent / whole for name, spent in parts.items() if spent >= SHARE_SHOWN * whole}
    rest = 1.0 - sum(shown.values())
    words = [f"{name} {100 * share:.0f} %" for name, share in sorted(shown.items(), key=lambda item: -item[1])]
    return ", ".join([*words, *([f"other {100 * rest:.0f} %"] if rest >= SHARE_SHOWN else [])])


def report(rows: Sequence[Row], about: str, profiled: Callable[[Row], bool] = lambda row: True) -> str:
    """Everything, as it goes into README.md."""
    if not rows:
        return about
    notes = [f"- {text}" for row in rows if profiled(row) and (text := profile(row))]
    pieces = [about, haunch_table(rows), rival_table(rows), growth(rows), "\n".join(notes)]
    pieces += [f"**Answers disagree.** {sentence}." for sentence in disagreements(rows)]
    return "\n\n".join(piece for piece in pieces if piece)


def write_between_marks(readme: Path, text: str) -> None:
    """Put the text between the two marks of the README. Raises `ValueError` when they are not there once each."""
    old = readme.read_text(encoding="utf-8")
    if old.count(BEGIN) != 1 or old.count(END) != 1:
        raise ValueError(f"{readme.name} needs the marks {BEGIN} and {END}, once each")
    before, rest = old.split(BEGIN)
    _, after = rest.split(END)
    readme.write_text(f"{before}{BEGIN}\n\n{text}\n\n{END}{after}", encoding="utf-8")
