"""`CheckResult` to JSON text and back, losing nothing and guessing nothing.

The type annotations are the layout: a member that is missing, unknown or of another type is an error
that names its path. Python's shortest decimal text of a float is exact, so numbers come back bit for bit.
"""

from __future__ import annotations

import dataclasses
import json
import math
import re
import types
import typing
from collections.abc import Mapping
from functools import cache
from typing import Any

from geometry.problem import HaunchError, RunError
from studies.check.result import FORMAT, CheckResult
from studies.check.upgrade import upgraded


class ResultFormatError(HaunchError):
    """A result file that this version cannot read."""


def dumps(result: CheckResult) -> str:
    """JSON text of `result`, a line for each member, and for each item of a list.

    Raises `RunError` (stage ``write``) that names the member that is not finite.
    """
    members = _encode(result, "result").items()
    return "{\n" + ",\n".join(f" {_TEXT(name)}: {_lines(value)}" for name, value in members) + "\n}\n"


# Without indents: the library writes those in Python, ten times as slowly.
_TEXT = json.JSONEncoder(ensure_ascii=False, allow_nan=False).encode


def _lines(value: Any) -> str:
    if not isinstance(value, list) or not value:
        return _TEXT(value)
    return "[\n  " + ",\n  ".join(map(_TEXT, value)) + "\n ]"


def loads(text: str) -> CheckResult:
    """The result in `text`. Raises `ResultFormatError`."""
    try:
        raw = json.loads(text, parse_constant=_refuse_constant)
    except (ValueError, RecursionError) as error:
        raise ResultFormatError(f"result.json is not readable JSON ({error}); run `haunch check` again") from error
    _check_version(raw)
    result = _decode(CheckResult, upgraded(raw), "result")
    assert isinstance(result, CheckResult)
    return result


def _refuse_constant(word: str) -> float:
    raise ValueError(f"{word} is not a number that a result may hold")


def _check_version(raw: Any) -> None:
    given = raw.get("format") if isinstance(raw, dict) else None
    match = re.fullmatch(r"haunch-result/([1-9]\d*)", given) if isinstance(given, str) else None
    if match is None:
        raise ResultFormatError(f"not a Haunch result: its format is {given!r}, expected {FORMAT!r}")
    ours = int(FORMAT.rpartition("/")[2])
    if int(match[1]) > ours:
        raise ResultFormatError(f"this result was written by a newer Haunch ({given}; this one reads up to {FORMAT}): "
                                "update Haunch, or run the spec again with this one")


def _encode(value: Any, path: str) -> Any:
    if dataclasses.is_dataclass(value) and not isinstance(value, type):
        return {f.name: _encode(getattr(value, f.name), f"{path}.{f.name}") for f in dataclasses.fields(value)}
    if isinstance(value, tuple) and hasattr(value, "_fields"):
        return {name: _encode(item, f"{path}.{name}") for name, item in zip(value._fields, value, strict=True)}
    if isinstance(value, Mapping):
        return {str(name): _encode(item, f"{path}.{name}") for name, item in value.items()}
    if isinstance(value, list | tuple):
        return [_encode(item, f"{path}[{i}]") for i, item in enumerate(value)]
    if value is None or isinstance(value, bool | str):
        return str(value) if isinstance(value, str) else value
    return _encode_number(value, path)


def _encode_number(value: Any, path: str) -> int | float:
    if hasattr(value, "item") and getattr(value, "ndim", 0) == 0:  # NumPy scalar
        value = value.item()
    if isinstance(value, int):  # bool too, from a NumPy bool
        return value
    if not isinstance(value, float):
        raise RunError("write", f"{path} is a {type(value).__name__}, which result.json cannot hold")
    if not math.isfinite(value):
        raise RunError("write", f"{path} is {value}: a result holds finite numbers only; "
                                "the stage that made it is at fault, please report the spec")
    return value


@cache
def _hints(kind: type) -> dict[str, Any]:
    return typing.get_type_hints(kind)


def _decode(kind: Any, raw: Any, path: str) -> Any:
    """`raw` as a `kind`; every branch raises `ResultFormatError` when it does not fit."""
    origin = typing.get_origin(kind)
    if kind is Any:
        return raw
    if origin in (types.UnionType, typing.Union):
        return _decode_union(typing.get_args(kind), raw, path)
    if origin is typing.Literal:
        return _expect(raw in typing.get_args(kind), raw, path, f"one of {', '.join(typing.get_args(kind))}")
    if origin is tuple:
        return _decode_tuple(typing.get_args(kind), raw, path)
    if origin is not None:  # Mapping
        _expect(isinstance(raw, dict), raw, path, "an object")
        return {name: _decode(typing.get_args(kind)[1], item, f"{path}.{name}") for name, item in raw.items()}
    if dataclasses.is_dataclass(kind) or hasattr(kind, "_fields"):
        return _decode_record(kind, raw, path)
    if kind is float:
        _expect(isinstance(raw, int | float) and not isinstance(raw, bool), raw, path, "a number")
        return float(raw)
    if kind is type(None):
        return _expect(raw is None, raw, path, "null")
    right = isinstance(raw, kind) and not (kind is int and isinstance(raw, bool))
    return _expect(right, raw, path, f"a {kind.__name__}")


def _decode_union(kinds: tuple[Any, ...], raw: Any, path: str) -> Any:
    if raw is None:
        return _decode(type(None), raw, path)
    return _decode(next(kind for kind in kinds if kind is not type(None)), raw, path)


def _decode_tuple(kinds: tuple[Any, ...], raw: Any, path: str) -> tuple[Any, ...]:
    _expect(isinstance(raw, list), raw, path, "an array")
    if kinds[-1] is Ellipsis:
        return tuple(_decode(kinds[0], item, f"{path}[{i}]") for i, item in enumerate(raw))
    _expect(len(raw) == len(kinds), raw, path, f"an array of {len(kinds)}")
    return tuple(_decode(kind, item, f"{path}[{i}]") for i, (kind, item) in enumerate(zip(kinds, raw, strict=True)))


def _decode_record(kind: type, raw: Any, path: str) -> Any:
    _expect(isinstance(raw, dict), raw, path, "an object")
    hints = _hints(kind)
    _expect(raw.keys() == hints.keys(), sorted(raw), path, f"exactly the members {', '.join(hints)}")
    return kind(**{name: _decode(hint, raw[name], f"{path}.{name}") for name, hint in hints.items()})


def _expect(right: bool, raw: Any, path: str, allowed: str) -> Any:
    if not right:
        raise ResultFormatError(f"{path}: given {str(raw)[:80]!r}; allowed: {allowed}")
    return raw
