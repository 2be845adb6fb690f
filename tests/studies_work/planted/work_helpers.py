"""The small bar that the tests vary, orders for it, and a look at the processes of a host."""

from __future__ import annotations

import copy
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

from studies.vary.variant import Variant
from studies.vary.work import Host, Order

PLANTED = Path(__file__).parent
BAR: dict[str, Any] = {
    "title": "bar", "material": "S235", "accuracy": 0.2, "parameters": {"length": "60 mm"},
    "members": {"bar": {"from": ["0 mm", "0 mm", "0 mm"], "to": ["length", "0 mm", "0 mm"],
                        "section": {"shape": "rectangle", "depth": "12 mm", "width": "10 mm"}}},
    "supports": {"wall": {"on": "bar.start", "hold": "all"}},
    "loads": {"tip": {"on": "bar.end", "force": ["0 N", "0 N", "-100 N"]}},
    "cases": {"loaded": {"tip": 1.0}},
    "limits": {"deflection": "0.05 mm", "mass": "100 g", "yield_factor": 1.2},
}


def bar(**changes: Any) -> dict[str, Any]:
    """The bar's tables with others in place of them; ``tip`` is the force down, ``length`` in mm."""
    data = copy.deepcopy(BAR)
    if "tip" in changes:
        data["loads"]["tip"]["force"][2] = f"{-changes.pop('tip')} N"
    if "length" in changes:
        data["parameters"]["length"] = f"{changes.pop('length')} mm"
    return {**data, **changes}


def order_of(number: int, data: dict[str, Any], shape: str = "", fullest: dict[str, Any] | None = None,
             **settings: Any) -> Order:
    """An order of one variant; each has a shape of its own unless one is given."""
    variant = Variant(number, {}, {}, data, f"key-{number}", shape or f"shape-{number}", fullest)
    return Order(variant, **settings)


def toy(number: int, do: str, shape: str = "", stage: str = "solve", **settings: Any) -> Order:
    """An order for a host of toys."""
    variant = Variant(number, {"do": do, "stage": stage}, {}, {}, f"key-{number}", shape or f"shape-{number}")
    return Order(variant, **{"seconds": 30.0, "memory": 2000, **settings})


def alive(pid: int) -> bool:
    """Whether a process is there and no zombie."""
    try:
        return Path(f"/proc/{pid}/stat").read_text().rsplit(")", 1)[1].split()[0] != "Z"
    except OSError:
        return False


def gone(pids: list[int], seconds: float = 10.0) -> bool:
    """Wait until none of the processes is there."""
    return until(lambda: not any(map(alive, pids)), seconds)


def until(met: Callable[[], Any], seconds: float = 20.0) -> bool:
    """Wait until something is so."""
    deadline = time.monotonic() + seconds
    while not met():
        if time.monotonic() > deadline:
            return False
        time.sleep(0.01)
    return True


def children(pid: int | None) -> list[int]:
    """Processes that one process has started."""
    try:
        return [int(p) for p in Path(f"/proc/{pid}/task/{pid}/children").read_text().split()]
    except OSError:
        return []


def jobs(host: Host) -> list[int]:
    """Every job of a host's templates."""
    return [pid for template in host.templates for pid in children(template.pid)]
