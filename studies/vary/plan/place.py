"""Places in the tables of a part: a parameter by its name, or a field by its path.

Paths are written as messages show them: ``members.arm.holes[1].diameter``, the first of several being [1].
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from geometry.spec.model import PartSpec
from geometry.spec.resolve.member import DIMS
from geometry.spec.text.tokens import nearest
from geometry.spec.words.structure import Path, at_path, below, model_of, words_of

_STEP = re.compile(r"[^.\[\]]+|\[[0-9]{1,5}\]")
_PATH = re.compile(r"[^.\[\]]+(?:\[[0-9]{1,5}\])*(?:\.[^.\[\]]+(?:\[[0-9]{1,5}\])*)*")


class NoPlaceError(ValueError):
    """A name or path that the part does not have. Carries the parts of a `Problem`."""

    def __init__(self, allowed: str, fix: str = "") -> None:
        self.allowed, self.fix = allowed, fix
        super().__init__(f"{allowed}. {fix}" if fix else allowed)


def place_of(name: str, data: Mapping[str, Any]) -> Path:
    """Path of a parameter or field of the part `data`; raise `NoPlaceError` when there is none."""
    parameters = data.get("parameters", {})
    if name in parameters:
        return ("parameters", name)
    if not _PATH.fullmatch(name):
        raise NoPlaceError("a parameter of the part, or a path such as members.arm.holes[1].diameter")
    steps: list[str | int] = [int(s[1:-1]) - 1 if s[0] == "[" else s for s in _STEP.findall(name)]
    path = tuple(steps)
    if len(path) == 1 and path[0] not in words_of(PartSpec):
        near = nearest(name, list(parameters))
        raise NoPlaceError(f"a parameter of the part: {', '.join(parameters) or 'none'}; or the path of a field",
                           f"Did you mean {near}?" if near else "")  # fmt: skip
    _walk(path, data)
    return path


def _walk(path: Path, data: Mapping[str, Any]) -> None:
    """Raise `NoPlaceError` at the first step that leads nowhere. The last one may be a word left out so far."""
    value: Any = data
    for k, step in enumerate(path):
        here = at_path(PartSpec, data, path[: k + 1])
        inside = below(value, step) if not (isinstance(step, int) and step < 0) else None
        last = k == len(path) - 1
        missing = inside is None and not (last and isinstance(step, str) and _is_word(path[:k], data, step))
        if here is None or missing:
            known = _known(path[:k], data, value)
            near = nearest(step, known) if isinstance(step, str) else ""
            where = _shown(path[:k])
            if isinstance(value, list):
                known = [f"[{i}]" for i in range(1, len(value) + 1)]
            fix = f"Did you mean {_shown((*path[:k], near))}?" if near else ""
            raise NoPlaceError(f"a field that the part has; {where} has {', '.join(known) or 'none'}", fix)
        value = inside


def _is_word(parent: Path, data: Mapping[str, Any], step: str) -> bool:
    """Whether a word that the part leaves out is a word of its table (and no name that would have to exist)."""
    value: Any = data
    for above in parent:
        value = below(value, above)
    if parent[-1:] == ("taper",) or parent[-2:-1] == ("stations",):
        if step in DIMS.get(str(value_at(data, (*parent[:2], "section", "shape"))), ()):
            return True
    model = model_of(at_path(PartSpec, data, parent) if parent else PartSpec, value)
    return model is not None and step in words_of(model)


def _known(parent: Path, data: Mapping[str, Any], value: Any) -> list[str]:
    model = model_of(at_path(PartSpec, data, parent) if parent else PartSpec, value)
    words = list(words_of(model)) if model else []
    return words or ([str(key) for key in value] if isinstance(value, Mapping) else [])


def _shown(path: Path) -> str:
    from geometry.spec.words.structure import written

    return written(path) if path else "the part"


def value_at(data: Mapping[str, Any], path: Path) -> Any:
    """What the part holds there, or None."""
    value: Any = data
    for step in path:
        value = below(value, step)
    return value


def with_value(data: Mapping[str, Any], path: Path, value: Any) -> dict[str, Any]:
    """The tables with another value at `path`; only what lies on the way is copied."""
    return _put(data, path, value)


def _put(here: Any, path: Path, value: Any) -> Any:
    if not path:
        return value
    step, rest = path[0], path[1:]
    if isinstance(step, int):
        changed = list(here)
        changed[step] = _put(here[step], rest, value)
        return changed
    table = dict(here) if isinstance(here, Mapping) else {}
    table[step] = _put(table.get(step), rest, value)
    return table
