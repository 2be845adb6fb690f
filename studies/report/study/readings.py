"""What the effects say, in sentences."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from studies.report.study.data import Axis, StudyData
from studies.report.study.effects import LEAST_SAMPLED, Effect, Effects
from studies.report.study.ranking import levels
from studies.report.study.words import figure_words, listed, percent
from studies.report.tables import digits, readable

HARDLY = 0.02
"""Share below which a value hardly matters."""
NOT_CREDITED = 0.05
"""Share that belongs to no value, because points are missing, from which on it is told."""


def reading(data: StudyData, name: str, unit: str, found: Effects) -> str:
    """Two or three sentences on one figure: what moves it most, what hardly does, what comes from values together."""
    figure = figure_words(name) if name != "aim" else "the aim"
    if found.kind == "none":
        return f"{figure.capitalize()} is the same in all of them." if found.count > 1 else \
            "There is nothing to compare with fewer than two variants."
    order = sorted(range(len(found.each)), key=lambda i: -_size(found.each[i]))
    most = order[0]
    if _size(found.each[most]) == 0:
        return f"Nothing that was varied moves {figure}."
    sentences = [f"{data.axes[most].name} moves {figure} most ({_how_much(found, found.each[most])}): "
                 f"{_way(data, data.axes[most], found.each[most], unit)}."]
    then = [i for i in order[1:] if _size(found.each[i]) >= HARDLY]
    if then:
        sentences.append("Then " + "; ".join(
            f"{data.axes[i].name} ({_how_much(found, found.each[i])}; {_way(data, data.axes[i], found.each[i], unit)})"
            for i in then) + ".")
    hardly = [data.axes[i].name for i in order[1:] if _size(found.each[i]) < HARDLY]
    if hardly:
        sentences.append(f"{listed(hardly)} hardly {'moves' if len(hardly) == 1 else 'move'} it.")
    return " ".join(sentences + _rest(found))


def _size(effect: Effect) -> float:
    return effect.share if effect.share is not None else abs(effect.rank or 0.0)


def _how_much(found: Effects, effect: Effect) -> str:
    if found.kind == "correlation" or effect.share is None:
        return "its order is not known" if effect.rank is None else f"rank correlation {effect.rank:.2f}"
    share = percent(effect.share)
    if found.kind == "swing":
        return f"by {share} of its value at the base"
    return f"{share} of its variance" + (f", give or take {percent(effect.give)}" if effect.give else "")


def _way(data: StudyData, axis: Axis, effect: Effect, unit: str) -> str:
    """Which way the figure goes along a value, by its means."""
    means = effect.means
    if len(means) < 2:
        return f"{readable(means[0], unit)} throughout" if means else "no values"
    first, last = means[0], means[-1]
    rising = all(b >= a for a, b in zip(means, means[1:], strict=False))
    falling = all(b <= a for a, b in zip(means, means[1:], strict=False))
    if axis.numeric and (rising or falling):
        return f"{'up' if rising else 'down'} from {readable(first, unit)} to {readable(last, unit)} " \
               f"as it goes from {_value(data, axis, effect, 0)} to {_value(data, axis, effect, -1)}"
    least, most = means.index(min(means)), means.index(max(means))
    return f"least at {_value(data, axis, effect, least)} ({readable(means[least], unit)}), largest at " \
           f"{_value(data, axis, effect, most)} ({readable(means[most], unit)})"


def _value(data: StudyData, axis: Axis, effect: Effect, place: int) -> str:
    centre = effect.centres[place]
    if axis.numeric:
        return f"{digits(axis.factor * centre)} {axis.unit}".rstrip()
    return levels(data, axis.name)[round(centre)]


def _rest(found: Effects) -> list[str]:
    rest = []
    if found.together is not None and found.together >= HARDLY:
        about = "About " if found.kind in ("sampled", "curves") else ""
        rest.append(f"{about}{percent(found.together)} comes from values together, from none by itself.")
    if found.shared is not None and abs(found.shared) >= NOT_CREDITED:
        rest.append(f"{percent(abs(found.shared))} cannot be credited to one value: points are missing, and the values "
                    "that are left go together.")
    return rest


def method(data: StudyData, kinds: Sequence[str], count: int) -> str:
    """How the measures were made, for the paragraph above them."""
    unsure = " Variants that failed have no figures and are left out; suspicious ones are in."
    left = " Points left out by constraints make the values depend on each other, which blurs the shares." \
        if data.left_out and {"sampled", "curves"} & set(kinds) else ""
    if "variance" in kinds:
        text = "Shares of the variance over the grid, by an additive model with one constant a level (in a full grid " \
               "the first-order Sobol indices of the levels tried)."
    elif "swing" in kinds:
        text = "Largest less least of the figure while one value changes and all others stay at the base, as a share " \
               "of the figure at the base. Effects of values together cannot be seen in such a plan."
    elif "curves" in kinds and "sampled" in kinds:
        text = "Shares of the variance by an additive model with a cubic curve for each value, for figures of which " \
               "it explains nine tenths; for the others first-order Sobol indices from the points as they are " \
               "(random balance design, bias removed). Give or take: 95 % interval by resampling."
    elif "curves" in kinds:
        text = "Shares of the variance by an additive model with a cubic curve for each value; give or take: 95 % " \
               "interval by resampling."
    elif "sampled" in kinds:
        text = "First-order Sobol indices from the points as they are (random balance design, bias removed; for " \
               "values of few levels the correlation ratio). Give or take: 95 % interval by resampling."
    elif "correlation" in kinds:
        text = f"Spearman's rank correlation only: {count} points are too few for shares of the variance " \
               f"({LEAST_SAMPLED} are needed)."
    else:
        text = "Fewer than two variants to compare, or figures that are all equal."
    chosen = " A search chose the points, most of them where they promised to be best: shares are of those points." \
        if data.sampling == "searched" else ""
    return text + chosen + left + unsure


def picture_key(kinds: Iterable[str]) -> str:
    """What circles and bars are in the pictures below the measures."""
    found = set(kinds)
    line = "the figure while this value alone changes" if "swing" in found else \
        "the fitted curve of this value, the others being even" if "curves" in found else "the mean at that value"
    bars = "" if "swing" in found else " Upright bars: from the least to the largest of all variants there."
    return "In the pictures, the value that moves the figure most comes first, and values that hardly move it are " \
           f"not drawn. Circles and line: {line}.{bars}"
