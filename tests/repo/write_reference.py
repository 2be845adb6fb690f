"""Writes the spec's reference into README.md, between its two marks.

A script: ``python tests/repo/write_reference.py``. Headings of the reference are moved below the README's own section.
"""

from __future__ import annotations

import re
from pathlib import Path

README = Path(__file__).resolve().parents[2] / "README.md"
BEGIN, END = "<!-- reference: begin -->", "<!-- reference: end -->"
FENCE = re.compile(r"^(```.*?^```)$", re.MULTILINE | re.DOTALL)


def as_section(reference: str) -> str:
    """The reference with its highest heading at the third level; code blocks are left alone."""
    pieces = FENCE.split(reference.strip())
    levels = [len(m) for piece in pieces[::2] for m in re.findall(r"^(#+) ", piece, re.MULTILINE)]
    deeper = "#" * max(0, 3 - min(levels, default=3))
    pieces[::2] = [re.sub(r"^(#+ )", rf"{deeper}\1", piece, flags=re.MULTILINE) for piece in pieces[::2]]
    return "".join(pieces)


def with_reference(readme: str, reference: str) -> str:
    """The README's text with the reference between its marks."""
    before, rest = readme.split(BEGIN)
    _, after = rest.split(END)
    return f"{before}{BEGIN}\n\n{as_section(reference)}\n\n{END}{after}"


if __name__ == "__main__":
    from geometry.spec import spec_reference

    README.write_text(with_reference(README.read_text(encoding="utf-8"), spec_reference()), encoding="utf-8")
    print(f"wrote the reference into {README.name}")
