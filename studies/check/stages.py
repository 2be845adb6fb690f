"""The stages of a run: their names, their times, what a listener hears, and how their failures are told."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from typing import Literal

from geometry.problem import HaunchError, RunError
from studies.check.result import Stage

STAGES = ("spec", "solid", "mesh", "beam", "solve", "compare", "write")


@dataclass(frozen=True, slots=True)
class Event:
    """Something a listener may show. `kind`: a stage starts, says something, has to wait for what is not its own work
    (to be shown at once), or ends (`seconds` it took)."""

    stage: str
    kind: Literal["start", "note", "wait", "end"]
    text: str = ""
    seconds: float = 0.0


Listener = Callable[[Event], None]


@dataclass
class Clock:
    """Times the stages and tells the listener."""

    listener: Listener | None = None
    done: list[Stage] = field(default_factory=list)
    lock: threading.Lock = field(default_factory=threading.Lock)
    """One event at a time: stages run side by side."""

    def tell(self, event: Event) -> None:
        """Pass an event on."""
        with self.lock:
            if self.listener is not None:
                self.listener(event)

    def note(self, stage: str, text: str) -> None:
        """Say something about a stage."""
        self.tell(Event(stage, "note", text))

    def finish(self, stage: str, seconds: float, text: str = "") -> None:
        """Record a stage that was timed elsewhere."""
        self.done.append(Stage(stage, seconds))
        self.tell(Event(stage, "end", text, seconds))

    def times(self) -> tuple[Stage, ...]:
        """The finished stages in the order of `STAGES`."""
        return tuple(sorted(self.done, key=lambda stage: STAGES.index(stage.name)))

    @contextmanager
    def stage(self, name: str) -> Iterator[None]:
        """Time one stage; see `blamed_on` for its failures."""
        self.tell(Event(name, "start"))
        started = time.perf_counter()
        with blamed_on(name):
            yield
        self.finish(name, time.perf_counter() - started)


@contextmanager
def blamed_on(stage: str) -> Iterator[None]:
    """Turn any exception that Haunch did not raise on purpose into a `RunError` of that stage, its cause kept."""
    try:
        yield
    except HaunchError:
        raise
    except MemoryError as error:
        raise RunError(stage, "the memory was not enough; allow more, ask for less accuracy, or close other programs"
                       ) from error
    except Exception as error:
        raise RunError(stage, f"a fault of Haunch, not of the spec: {type(error).__name__}: {error}") from error
