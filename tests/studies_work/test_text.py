"""Plain data in transit: orders, outcomes and ends as JSON, messages in pieces, tables as TOML."""

from __future__ import annotations

import json
import socket
import tomllib
from pathlib import Path
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from work_helpers import bar, order_of

from geometry.spec import part_from_text, read_part
from studies.vary.work import Order, frames
from studies.vary.work.toml import dumps

FOLDER = Path(__file__).resolve().parents[2] / "studies" / "examples"
EXAMPLES = sorted(path for path in FOLDER.glob("*.toml") if "members" in tomllib.loads(path.read_text()))
TEXT = st.text(st.characters(exclude_categories=["Cs"]), max_size=12)
LEAVES = TEXT | st.integers(-(2**60), 2**60) | st.floats(allow_nan=False) | st.booleans()
VALUES = st.recursive(LEAVES, lambda inner: st.lists(inner, max_size=3) | st.dictionaries(TEXT, inner, max_size=3))


@given(st.dictionaries(TEXT, VALUES, max_size=4))
def test_tables_read_back_from_toml(data: dict[str, Any]) -> None:
    assert tomllib.loads(dumps(data)) == data


@pytest.mark.parametrize("path", EXAMPLES, ids=lambda path: path.stem)
def test_a_spec_written_again_is_the_same_part(path: Path) -> None:
    again = part_from_text(dumps(tomllib.loads(path.read_text())))
    part = read_part(path)
    assert {**vars_of(again), "source_text": ""} == {**vars_of(part), "source_text": ""}


def vars_of(part: Any) -> dict[str, Any]:
    """The fields of a part."""
    return {name: getattr(part, name) for name in part.__dataclass_fields__}


def test_an_order_comes_back_from_json() -> None:
    order = order_of(3, bar(), fullest=bar(tip=1), keep=("mass", "deflection"), safer=True, run_folder="x/y",
                     seconds=7.5)
    assert Order.from_json(json.loads(json.dumps(order.to_json()))) == order


def test_what_shares_a_mesh() -> None:
    one, other = order_of(1, bar(), "s"), order_of(2, bar(tip=5), "s")
    assert one.shares_with(other)
    for changed in (order_of(2, bar(), "t"), order_of(2, bar(), "s", safer=True), order_of(2, bar(), "s", memory=1000)):
        assert not one.shares_with(changed)


def test_messages_arrive_whole_however_they_are_cut() -> None:
    messages = [{"a": "é" * 5000}, [1, 2.5, None], {}]
    ours, theirs = socket.socketpair()
    with ours, theirs:
        for message in messages:
            frames.send(ours, message)
        assert frames.receive(theirs) == messages[0]
        for message in messages[1:]:
            frames.send(ours, message)
        ours.shutdown(socket.SHUT_WR)
        rest = b""
        while piece := theirs.recv(4096):
            rest += piece
    for size in (1, 7, len(rest)):
        inbox = frames.Inbox()
        got = [m for k in range(0, len(rest), size) for m in inbox.take(rest[k:k + size])]
        assert got == [*messages[1:], *messages[1:]]
    with pytest.raises(EOFError):
        gone, left = socket.socketpair()
        gone.close()
        with left:
            frames.receive(left)
