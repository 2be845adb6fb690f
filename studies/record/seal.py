"""A short checksum of each row, so that damage shows before a wrong figure is read."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Sequence
from typing import Any

BYTES = 8


def seal(*rows: Sequence[Any]) -> bytes:
    """Checksum of rows of the database as they are read back from it (numbers, text, blobs, None).

    JSON, since it writes a number and a text in one way on every machine; a blob by its own checksum.
    """
    plain = [[hashlib.blake2b(cell, digest_size=16).hexdigest() if isinstance(cell, bytes) else cell for cell in row]
             for row in rows]
    return hashlib.blake2b(json.dumps(plain, separators=(",", ":")).encode("ascii"), digest_size=BYTES).digest()


def choice(given: Any, found: float | None) -> float | str | None:
    """What the table shows of a chosen value: its number in base units, else itself; a list as JSON."""
    if found is not None or given is None:
        return found
    return text(given) if isinstance(given, str) else json.dumps(given, separators=(",", ":"))


def number(value: float | None) -> float | None:
    """A number as SQLite gives it back: it has no NaN and no negative zero."""
    return None if value is None or value != value else float(value) + 0.0


def text(value: object) -> str:
    """Text that can be stored: what is no Unicode (a name of a file, say) is spelled out."""
    return str(value).encode("utf-8", "backslashreplace").decode("utf-8")
