"""`[vary]`: what a plan varies, read against the part."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from pydantic import ValidationError

from geometry.spec.model import PartSpec
from geometry.spec.resolve.values import shown
from geometry.spec.text.tokens import with_article
from geometry.spec.text.units import Dimension, name_of
from geometry.spec.words.fields import OfKind
from geometry.spec.words.structure import Path, alternatives, at_path, described, model_of
from studies.vary.plan.place import value_at, with_value
from studies.vary.plan.reading import Reading, usual_unit
from studies.vary.plan.stock import Stock
from studies.vary.plan.varied import IDENTIFIER, SAME, Varied, quantity_of, unit_in
from studies.vary.plan.words import VariedSpec

MOST_VALUES = 100_000


def read_varied(
    reading: Reading, name: str, spec: list[Any] | VariedSpec, stocks: Mapping[str, Stock]
) -> Varied | None:
    """One entry of ``[vary]``, or None after keeping problems."""
    where = f"vary.{name}"
    table = VariedSpec(values=spec or None) if isinstance(spec, list) else spec
    if isinstance(spec, list) and not spec:
        reading.problem(where, "an empty list", "at least one value")
        return None
    if table.path and not _own_name(reading, where, name):
        return None
    path = reading.place(f"{where}.path" if table.path else where, table.path or name)
    if path is None or not _one_form(reading, where, table):
        return None
    mark = reading.mark(path)
    if mark is None and path[0] == "parameters":
        reading.problem(where, shown(value_at(reading.data, path)), "a parameter of a kind that has a name",
                        "Vary what it is made of")  # fmt: skip
        return None
    if mark is None:
        return _words(reading, where, name, path, table)
    return _quantities(reading, where, name, path, table, mark, stocks)


def _own_name(reading: Reading, where: str, name: str) -> bool:
    if not IDENTIFIER.fullmatch(name):
        reading.problem(where, shown(name), "a name of letters, digits and _ for the path")
        return False
    if name in reading.scope:
        reading.problem(where, shown(name), "a name of its own for the path", f"The part has a parameter {name}")
        return False
    return True


def _one_form(reading: Reading, where: str, table: VariedSpec) -> bool:
    """Whether it is a list, a range or a stock list, and only one of them."""
    ranged = [w for w, v in (("from", table.low), ("to", table.high)) if v is not None]
    stepped = [w for w, v in (("steps", table.steps), ("step", table.step)) if v is not None]
    forms = '["48 mm", "54 mm"], { from = "48 mm", to = "72 mm", steps = 4 } or { stock = "plate" }'
    given = ", ".join([*(["values"] if table.values else []), *ranged, *stepped, *(["stock"] if table.stock else [])])
    if table.values and (ranged or stepped or table.stock):
        reading.problem(where, given, "values, or a range, or a stock list", "Leave out all but one")
    elif table.stock and stepped:
        reading.problem(where, given, "stock with from and to", f"Leave {' and '.join(stepped)} out")
    elif len(stepped) == 2:
        reading.problem(where, given, "steps (how many) or step (how large)", "Leave one of them out")
    elif not table.values and not table.stock and len(ranged) < 2:
        reading.problem(where, given or "nothing", forms, f"Give {'to' if ranged == ['from'] else 'from'}")
    else:
        return True
    return False


def _words(reading: Reading, where: str, name: str, path: Path, table: VariedSpec) -> Varied | None:
    """Values that are no quantities: words, lists, tables."""
    if not table.values:
        allowed = described(at_path(PartSpec, reading.data, path))
        reading.problem(where, "a range or stock list", f"a list of values, each {allowed or 'as in the part'}")
        return None
    before = len(reading.problems)
    for i, value in enumerate(table.values, 1):
        _try_word(reading, f"{where}[{i}]", path, value)
        if value in table.values[: i - 1]:
            reading.problem(f"{where}[{i}]", shown(value), "each value once")
    base = _base(reading, path)
    if len(reading.problems) > before:
        return None
    return Varied(name, path, "word", "", "", tuple(table.values), (), None, None, base, None, listed=True)


def _try_word(reading: Reading, where: str, path: Path, value: Any) -> None:
    """Keep a problem when the part cannot hold `value` at `path`."""
    changed = with_value(reading.data, path, value)
    try:
        PartSpec.model_validate(changed)
    except ValidationError:
        allowed = described(at_path(PartSpec, changed, path)) or "what the part may hold there"
        reading.problem(where, shown(value), allowed)


def _quantities(
    reading: Reading, where: str, name: str, path: Path, table: VariedSpec, mark: OfKind, stocks: Mapping[str, Stock]
) -> Varied | None:
    """Values that are quantities."""
    before = len(reading.problems)
    kind, written = mark.kind, unit_in(table.values[0] if table.values else table.low, "")
    whole = int in alternatives(at_path(PartSpec, reading.data, path)) and path[0] != "parameters"
    base = quantity_of(_base(reading, path), reading.scope)
    draft = Varied(name, path, kind.word, kind.unit, written or usual_unit(mark.word), (), (), None, None,
                   _base(reading, path), base.value if base else None, listed=True, whole=whole)  # fmt: skip
    if table.values:
        values, listed = _numbers(reading, where, table.values, mark), True
    elif table.stock:
        values, listed = _from_stock(reading, where, table, mark, stocks), True
    else:
        values, listed = _range(reading, where, table, mark, draft), False
    if len(reading.problems) > before or not values:
        return None
    texts: tuple[Any, ...] = tuple(v for v, _ in values)
    numbers: tuple[float, ...] = tuple(n for _, n in values)
    low, high = min(numbers), max(numbers)
    if not listed and table.steps is None and table.step is None:
        texts, numbers = (), ()
    return Varied(**{**vars(draft), "values": texts, "numbers": numbers, "low": low, "high": high, "listed": listed})


def _numbers(reading: Reading, where: str, values: list[Any], mark: OfKind) -> list[tuple[Any, float]]:
    found: list[tuple[Any, float]] = []
    for i, value in enumerate(values, 1):
        number = reading.number(f"{where}[{i}]", value, mark)
        if number is None:
            continue
        same = next((v for v, n in found if math.isclose(n, number, rel_tol=SAME)), None)
        if same is not None:
            reading.problem(f"{where}[{i}]", shown(value), f"each value once: {shown(same)} is the same")
        found.append((value, number))
    return found


def _from_stock(
    reading: Reading, where: str, table: VariedSpec, mark: OfKind, stocks: Mapping[str, Stock]
) -> list[tuple[Any, float]]:
    assert table.stock is not None
    if table.stock not in stocks:
        reading.unknown(f"{where}.stock", table.stock, stocks, "a stock list")
        return []
    kinds = {quantity.dimension for size in stocks[table.stock].sizes if (quantity := quantity_of(size, {}))}
    if len(kinds) == 1 and mark.kind.dimension not in kinds:
        reading.problem(f"{where}.stock", f"{table.stock}, a list of sizes that are each {_named(kinds)}",
                        f"a list in which each is {with_article(mark.word)}")  # fmt: skip
        return []
    sizes = _numbers(reading, f"stock.{table.stock}", list(stocks[table.stock].sizes), mark)
    low = reading.number(f"{where}.from", table.low, mark) if table.low is not None else -math.inf
    high = reading.number(f"{where}.to", table.high, mark) if table.high is not None else math.inf
    if low is None or high is None:
        return []
    inside = sorted(((v, n) for v, n in sizes if low * (1 - SAME) <= n <= high * (1 + SAME)), key=lambda pair: pair[1])
    if sizes and not inside:
        reach = f"{shown(sizes[0][0])} to {shown(sizes[-1][0])}"
        reading.problem(where, "no size in the range", f"sizes of the stock list {table.stock}, {reach}")
    return inside


def _named(kinds: set[Dimension]) -> str:
    return with_article(name_of(next(iter(kinds))))


def _range(reading: Reading, where: str, table: VariedSpec, mark: OfKind, draft: Varied) -> list[tuple[Any, float]]:
    """The steps of a range; of one without steps both ends."""
    low, high = (reading.number(f"{where}.{w}", v, mark) for w, v in (("from", table.low), ("to", table.high)))
    if low is None or high is None:
        return []
    if not high > low:
        given = f"from {shown(table.low)} to {shown(table.high)}"
        fix = "Exchange them" if high < low else "For one value put it in the part, or under [base]"
        reading.problem(where, given, "a range from a smaller to a greater value", fix)
        return []
    steps = _steps(reading, where, table, mark, low, high)
    if steps is None:
        return []
    if draft.whole and any((low + (high - low) * k / steps) % 1.0 for k in range(steps + 1)):
        reading.problem(where, f"{steps} steps", "steps that fall on whole numbers")
        return []
    texts = [draft.written(low + (high - low) * k / steps) for k in range(steps + 1)]
    texts[0], texts[-1] = (end if isinstance(end, str) else text
                           for end, text in ((table.low, texts[0]), (table.high, texts[-1])))  # fmt: skip
    numbers = [reading.number(where, text, mark) for text in texts]
    return [(text, number) for text, number in zip(texts, numbers, strict=True) if number is not None]


def _steps(reading: Reading, where: str, table: VariedSpec, mark: OfKind, low: float, high: float) -> int | None:
    if table.step is None:
        steps = 1 if table.steps is None else table.steps
        if not 1 <= steps < MOST_VALUES:
            reading.problem(f"{where}.steps", str(steps), f"a whole number from 1 to {MOST_VALUES - 1}",
                            "One step gives both ends" if steps < 1 else "")  # fmt: skip
            return None
        return steps
    step = reading.number(f"{where}.step", table.step, mark)
    if step is None:
        return None
    if not step > 0.0 or (high - low) / step >= MOST_VALUES:
        allowed = f"{with_article(mark.word)} that makes 1 to {MOST_VALUES} steps"
        reading.problem(f"{where}.step", shown(table.step), allowed)
        return None
    whole = (high - low) / step
    if abs(whole - round(whole)) > 1e-6 or round(whole) < 1:
        allowed = f"a size that divides the range evenly: {whole:.4g} steps here"
        reading.problem(f"{where}.step", shown(table.step), allowed)
        return None
    return round(whole)


def _base(reading: Reading, path: Path) -> Any:
    """What the part holds there; where it is left out, the word's default."""
    value = value_at(reading.data, path)
    if value is not None or not isinstance(path[-1], str):
        return value
    parent = value_at(reading.data, path[:-1]) if len(path) > 1 else reading.data
    model = model_of(at_path(PartSpec, reading.data, path[:-1]) if len(path) > 1 else PartSpec, parent)
    if model is None:
        return None
    info = next((i for n, i in model.model_fields.items() if path[-1] in (n, i.alias)), None)
    default = info.default if info is not None and not info.is_required() else None
    return default if isinstance(default, str | int | float) else None
