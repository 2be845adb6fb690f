"""What crosses between driver and workers: JSON text, and nothing else."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from typing import Any

from studies.vary.outcome import Outcome
from studies.vary.work import Ended, Order

TOPIC = "haunch"
"""Of the events by which a worker tells each end at once. One for all studies: a scheduler keeps the last thousand
events of each topic for as long as it lives."""


def write_group(orders: Sequence[Order], **more: str) -> str:
    """The order of a group, as a worker reads it."""
    return json.dumps({**more, "orders": [order.to_json() for order in orders]})


def read_group(text: str) -> tuple[dict[str, Any], list[Order]]:
    """What `write_group` wrote: everything, and the orders."""
    plain = json.loads(text)
    return plain, [Order.from_json(order) for order in plain["orders"]]


def write_end(end: Outcome | Ended) -> dict[str, Any]:
    """One end as plain data."""
    return {"outcome" if isinstance(end, Outcome) else "ended": end.to_json()}


def read_end(plain: Mapping[str, Any]) -> Outcome | Ended:
    """What `write_end` gave."""
    return Outcome.from_json(plain["outcome"]) if "outcome" in plain else Ended(**plain["ended"])
