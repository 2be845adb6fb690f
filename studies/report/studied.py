"""Tables of what only some specs ask for: natural frequencies, buckling factors, envelopes of travelling loads."""

from __future__ import annotations

from fem.figure import Figure
from studies.check.result import CheckResult, Pair
from studies.check.studied import ModePair, Peak, TravelEnvelope, TravelSummary
from studies.report.tables import marked, name_of, number, readable, remainder, shown_unit

Row = tuple[str, ...]

MODE_HEAD = ("mode", "solid", "beam", "difference", "allowed", "judgement", "shape of the solid", "shape of the beam",
             "correlation", "rigid sections", "carries of the mass", "why")
ENVELOPE_HEAD = ("figure", "unit", "solid greatest", "beam greatest", "solid least", "beam least", "judgement",
                 "positions")

LITTLE = 5e-3
"""Share of the largest of its kind below which a figure's envelope is not shown."""


def mode_rows(result: CheckResult, quantity: str, case: str = "") -> list[Row]:
    """One row a mode of a study."""
    pairs = {pair.key: pair for pair in result.pairs}
    modes = [m for m in result.modes if m.key.quantity == quantity and m.key.case == case]
    return [_mode_row(mode, pairs.get(mode.key)) for mode in modes]


def _mode_row(mode: ModePair, pair: Pair | None) -> Row:
    unit = mode.unit
    band = readable(pair.band, unit) if pair is not None and pair.reasons else "-"
    difference = pair.difference if pair is not None else None
    return (mode.key.component.removeprefix("mode "), readable(mode.solid, unit), readable(mode.beam, unit),
            readable(difference, unit), band, marked(mode.judgement), mode.solid_kind or "-", mode.beam_kind or "-",
            "-" if mode.correlation is None else f"{mode.correlation:.3f}",
            "-" if mode.section_share is None else f"{100 * mode.section_share:.0f} %", carried(mode),
            pair.look_at if pair is not None else "")


def carried(mode: ModePair) -> str:
    """The two largest shares of mass or inertia of at least 5 %: ``61 % z, 22 % about y``."""
    names = ("x", "y", "z", "about x", "about y", "about z")
    shares = sorted(zip(mode.mass_share, names, strict=False), key=lambda item: -item[0])
    return ", ".join(f"{100 * share:.0f} % {name}" for share, name in shares[:2] if share >= 0.05) or "-"


def buckling_cases(result: CheckResult) -> list[str]:
    """Cases with a buckling study, in their order."""
    return list(dict.fromkeys(m.key.case for m in result.modes if m.key.quantity == "buckling_factor"))


def envelope_rows(result: CheckResult, travel: TravelSummary) -> list[Row]:
    """The extremes of each kind of figure over places and positions, and every place that is not a station."""
    return [_envelope_row(row) for row in headlines(result, travel.case)]


def headlines(result: CheckResult, case: str) -> list[TravelEnvelope]:
    """Rows that a person asks for first: named places and supports, the station with the greatest and the one with the
    least value of each component; figures that are next to nothing are left out."""
    ours = [row for row in result.envelopes if row.key.case == case]
    shown = [row for row in ours if _size(row) > LITTLE * row.scale]
    named = [row for row in shown if "@" not in row.key.place]
    stations: dict[tuple[str, str], list[TravelEnvelope]] = {}
    for row in shown:
        if "@" in row.key.place:
            stations.setdefault((row.key.quantity, row.key.component), []).append(row)
    for rows in stations.values():
        both = [r for r in rows if r.judgement != "no beam value"] or rows
        chosen = [max(both, key=lambda r: _value(r.solid_greatest, r.beam_greatest)),
                  min(both, key=lambda r: _value(r.solid_least, r.beam_least))]
        named += chosen
    told: dict[tuple[object, ...], TravelEnvelope] = {}  # an end has the values of the station there
    for row in named:
        told.setdefault((row.key.quantity, row.key.component, row.solid_greatest, row.solid_least), row)
    order = list(dict.fromkeys(row.key.quantity for row in ours))
    return sorted(told.values(), key=lambda row: order.index(row.key.quantity))


def _value(first: Peak | None, second: Peak | None) -> float:
    """To four digits, so that rounding does not choose among equal stations."""
    peak = first or second
    return float(f"{peak.value:.3e}") if peak is not None else 0.0


def _size(row: TravelEnvelope) -> float:
    peaks = (row.solid_greatest, row.solid_least, row.beam_greatest, row.beam_least)
    return max(abs(peak.value) for peak in peaks if peak is not None)


def _envelope_row(row: TravelEnvelope) -> Row:
    def shown(peak: Peak | None) -> str:
        return "-" if peak is None else f"{number(peak.value, row.unit)} @ {peak.at:.6g}"

    words = ", ".join(f"{count} {word}" for word, count in row.words.items())
    worst = f"; worst @ {row.worst_at:.6g}" if row.judgement in ("suspicious", "explained") else ""
    return (name_of(row.key), shown_unit(row.unit), shown(row.solid_greatest), shown(row.beam_greatest),
            shown(row.solid_least), shown(row.beam_least), marked(row.judgement), words + worst)


def travelling_extremes(result: CheckResult, solid: bool) -> list[Figure]:
    """The solid's extremes over the positions as figures of the position they occur at, or (`solid` False) the beam's
    values there."""
    found = []
    for row in result.envelopes:
        for peak in (row.solid_greatest, row.solid_least):
            if peak is not None and (value := peak.value if solid else peak.other) is not None:
                found.append(Figure(row.key._replace(case=f"{row.key.case}@{peak.at:.6g}"), value, row.unit))
    return found


def travel_sentence(travel: TravelSummary) -> str:
    """What travels, where."""
    first, last = travel.positions[0], travel.positions[-1]
    axles = "one axle" if len(travel.axles) == 1 else \
        f"{len(travel.axles)} axles at {', '.join(f'{x:.6g}' for x in travel.axles)} mm from the first"
    return (f"Load {travel.load} travels along {travel.on}: {axles}, each on a strip of {travel.contact:.6g} mm; "
            f"{len(travel.positions)} positions of the first axle from {first:.6g} to {last:.6g} mm. The largest "
            f"converged stress is found at {travel.governing:.6g} mm. Between two positions a value may be a little "
            "larger: take more steps where that matters.")


def kept_pairs(result: CheckResult, case: str) -> list[Pair]:
    """Pairs of single positions of a declared case that the result holds, those that use most of their band first."""
    found = [pair for pair in result.pairs if pair.key.case.startswith(f"{case}@")]

    def use(pair: Pair) -> float:
        rest = remainder(pair)
        return -abs(rest) / pair.band if rest is not None and pair.band > 0 else 0.0

    return sorted(found, key=use)
