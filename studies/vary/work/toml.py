"""Plain tables as TOML text."""

from __future__ import annotations

import json
import re
from collections.abc import Iterator, Mapping
from typing import Any

_BARE = re.compile(r"[A-Za-z0-9_-]+")


def dumps(data: Mapping[str, Any]) -> str:
    """TOML text that reads back as `data` (text, numbers, truth values, lists and tables of them; None is left out)."""
    return "\n".join(_table(data, ())).strip() + "\n"


def _table(data: Mapping[str, Any], path: tuple[str, ...]) -> Iterator[str]:
    plain = {name: value for name, value in data.items() if value is not None and not _is_table(value)}
    if path and (plain or not data):
        yield f"\n[{'.'.join(map(_key, path))}]"
    yield from (f"{_key(name)} = {_value(value)}" for name, value in plain.items())
    for name, value in data.items():
        if _is_table(value):
            yield from _table(value, (*path, name))


def _is_table(value: Any) -> bool:
    return isinstance(value, Mapping)


def _key(name: str) -> str:
    return name if _BARE.fullmatch(name) else _text(name)


def _text(text: str) -> str:
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")


def _value(value: Any) -> str:
    match value:
        case bool():
            return "true" if value else "false"
        case str():
            return _text(value)
        case int():
            return str(value)
        case float():
            return repr(value)
        case Mapping():
            inner = (f"{_key(name)} = {_value(item)}" for name, item in value.items() if item is not None)
            return "{ " + ", ".join(inner) + " }"
        case _:
            return "[" + ", ".join(map(_value, value)) + "]"
