"""What is wrong with a text that is not TOML, in words, with its line and column."""

from __future__ import annotations

import re
import tomllib

from geometry.problem import Problem
from geometry.spec.resolve.values import shown

_PLACE = re.compile(r" \(at (?:line (?P<line>\d+), column (?P<column>\d+)|(?P<end>end of document))\)$")
_BARE = re.compile(r"^\s*(?P<key>[A-Za-z0-9_.-]+)\s*=\s*(?P<text>[^\"'\[{#][^#]*?)\s*(?:#.*)?$")
_NO_VALUE = re.compile(r"^\s*[A-Za-z0-9_.-]+\s*=\s*(#.*)?$")


def not_toml(text: str, name: str, error: tomllib.TOMLDecodeError) -> Problem:
    """The problem of the first place at which `text` stops being TOML."""
    found = _PLACE.search(str(error))
    reason = str(error)[: found.start()] if found else str(error)
    lines = text.splitlines() or [""]
    if found is None or found["end"]:
        return Problem(f"{name}, end of the file", shown(lines[-1].strip()), _in_words(reason), _fix(reason, lines[-1]))
    number, column = int(found["line"]), int(found["column"])
    # tomllib counts lines by the line feed alone, str.splitlines by more characters.
    line = [*text.split("\n"), ""][min(number, text.count("\n") + 1) - 1]
    return Problem(
        f"{name}, line {number}, column {column}", shown(line.strip()), _in_words(reason), _fix(reason, line)
    )


def _in_words(reason: str) -> str:
    words = {
        "Cannot overwrite a value": "each name once in a table",
        "Cannot declare": "each table once",
        "Expected '=' after a key in a key/value pair": "name = value",
        "Invalid value": "text in quotes, a number, a list in [ ] or a table in { }",
        "Invalid statement": "name = value, or [table]",
        "Unclosed array": "a closing ] for every [",
        "Unclosed inline table": "a closing } for every {, on the same line",
        "Unterminated string": "a closing quote on the same line",
        "Illegal character": "a closing quote on the same line",
        "Expected ']' at the end of a table declaration": "[table]",
        "Expected newline or end of document after a statement": "one statement on a line",
    }
    found = next((meaning for start, meaning in words.items() if reason.startswith(start)), "")
    return f"TOML: {found or reason[:1].lower() + reason[1:]}"


def _fix(reason: str, line: str) -> str:
    if reason.startswith(("Cannot overwrite", "Cannot declare")):
        return "Give the second one another name"
    if _NO_VALUE.match(line):
        return "Give a value behind the ="
    if (bare := _BARE.match(line)) and reason.startswith(("Invalid value", "Expected newline", "Invalid statement")):
        return f'Put text in quotes: {bare["key"]} = "{bare["text"].strip()}"'
    return ""
