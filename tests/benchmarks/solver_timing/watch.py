"""Wall seconds inside a running program: named functions are wrapped, and each is charged for its own time only.

So what is timed is the program as it runs for its users, not a copy of its steps.
"""

from __future__ import annotations

import functools
import importlib
import sys
import threading
import time
from collections.abc import Callable, Collection, Mapping, Sequence
from typing import Any

Bytes = Callable[..., float]


class Watch:
    """Context in which functions are timed.

    Parameters
    ----------
    stages
        Stage -> functions, as ``module:function``, ``module:Class`` (its making) or ``module:Class.method``. A function
        that is called from another watched one is taken out of that one's time. Calls from other threads pass.
    moved
        Function -> bytes that a call with these arguments moves at least.
    whole
        Stages that count what other watched functions take within them, and the bytes that they move.

    Attributes
    ----------
    seconds, processor, calls, bytes
        By stage: wall seconds, processor seconds of all threads, calls, least bytes.
    missing
        Functions that are not there (any more).
    """

    def __init__(
        self,
        stages: Mapping[str, Sequence[str]],
        moved: Mapping[str, Bytes] | None = None,
        whole: Collection[str] = (),
    ) -> None:
        self.seconds = dict.fromkeys(stages, 0.0)
        self.processor = dict.fromkeys(stages, 0.0)
        self.calls = dict.fromkeys(stages, 0)
        self.bytes = dict.fromkeys(stages, 0.0)
        self._whole, self._within = whole, ""
        self.missing: list[str] = []
        self._inside = [(0.0, 0.0)]
        self._thread = threading.get_ident()
        self._put_back: list[tuple[Any, str, Any]] = []
        self._places = [(stage, name, (moved or {}).get(name)) for stage, names in stages.items() for name in names]

    def __enter__(self) -> Watch:
        for stage, name, moved in self._places:
            module_name, _, path = name.partition(":")
            try:
                owner: Any = importlib.import_module(module_name)
                *classes, last = path.split(".")
                for inner in classes:
                    owner = getattr(owner, inner)
                found = getattr(owner, last)
            except (ImportError, AttributeError):
                self.missing.append(name)
                continue
            if isinstance(found, type):
                self._replace(found, "__init__", self._wrapped(stage, found.__init__, moved))
                continue
            timed = self._wrapped(stage, found, moved)
            self._replace(owner, last, timed)
            if not classes:  # other modules took it by name
                for other in list(sys.modules.values()):
                    if getattr(other, "__name__", "").startswith("fem.") and getattr(other, last, None) is found:
                        self._replace(other, last, timed)
        return self

    def __exit__(self, *unused: object) -> None:
        for owner, name, old in reversed(self._put_back):
            setattr(owner, name, old)
        self._put_back.clear()

    def _replace(self, owner: Any, name: str, new: Any) -> None:
        self._put_back.append((owner, name, owner.__dict__[name]))
        setattr(owner, name, new)

    def _wrapped(self, stage: str, work: Callable[..., Any], moved: Bytes | None) -> Callable[..., Any]:
        @functools.wraps(work)
        def timed(*args: Any, **words: Any) -> Any:
            if threading.get_ident() != self._thread:
                return work(*args, **words)
            if self._within:
                if moved is not None:
                    self.bytes[self._within] += moved(*args, **words)
                return work(*args, **words)
            self._within = stage if stage in self._whole else ""
            self._inside.append((0.0, 0.0))
            wall, processor = time.perf_counter(), time.process_time()
            try:
                return work(*args, **words)
            finally:
                wall, processor = time.perf_counter() - wall, time.process_time() - processor
                self._within = ""
                inner, outer = self._inside.pop(), self._inside.pop()
                self._inside.append((outer[0] + wall, outer[1] + processor))
                self.seconds[stage] += wall - inner[0]
                self.processor[stage] += processor - inner[1]
                self.calls[stage] += 1
                if moved is not None:
                    self.bytes[stage] += moved(*args, **words)

        return timed
