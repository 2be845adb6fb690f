"""What is tried again, and when a variant has failed for good.

Ended from outside (by hand, by the system short of memory, with a machine that was switched off): again, on the same
mesh settings, for nothing is known to be wrong with the variant and its numbers must not depend on the accident. Failed
by a fault of its own: once more on a safer mesh, and the record says so.
"""

from __future__ import annotations

import dataclasses
import time
from dataclasses import dataclass

from studies.vary.outcome import Outcome
from studies.vary.variant import Variant

MOST_ENDINGS = 5
"""Endings of one variant in a row, with no other variant finished in between, after which it has failed."""

SHARES = 2
"""Endings after which a variant is tried without company: what ends a whole group may be one of it alone."""

FIRST_WAIT, LONGEST_WAIT = 0.1, 10.0
"""Seconds before a variant that was ended is tried again; four times as long after each further ending in a row."""


@dataclass(slots=True)
class Ticket:
    """One variant on its way through the attempts.

    Attributes
    ----------
    first
        The failed outcome of the first attempt; the next one is on a safer mesh.
    endings
        How often it was ended from outside in a row, nothing else finished meanwhile.
    not_before
        Time (``time.monotonic``) of the next attempt.
    run_folder
        Where its whole run is to be kept; empty when it is not.
    recorded
        Its outcome is in the record already: it is evaluated for the run folder alone.
    """

    variant: Variant
    run_folder: str = ""
    recorded: bool = False
    first: Outcome | None = None
    endings: int = 0
    not_before: float = 0.0
    all_endings: int = 0
    _finished_then: int = -1

    @property
    def safer(self) -> bool:
        return self.first is not None

    @property
    def alone(self) -> bool:
        """It shares neither solid nor mesh with others in this attempt."""
        return self.safer or self.endings >= SHARES


class Attempts:
    """Decides after each attempt: an outcome to be recorded, or None and the ticket is for another attempt."""

    def __init__(self, safer_mesh: bool) -> None:
        self._safer_mesh = safer_mesh
        self._finished = 0

    def finished(self, ticket: Ticket, outcome: Outcome) -> Outcome | None:
        """The attempt gave an outcome of its own."""
        if outcome.status == "finished":
            self._finished += 1
        elif ticket.first is None and self._safer_mesh and outcome.stage != "spec":
            ticket.first, ticket.endings = outcome, 0
            return None
        if ticket.first is not None:
            return dataclasses.replace(outcome, safer_mesh=True, first_reason=told(ticket.first))
        return outcome

    def ended(self, ticket: Ticket, signal: str) -> Outcome | None:
        """The attempt was ended from outside by `signal`."""
        ticket.endings = ticket.endings + 1 if ticket._finished_then == self._finished else 1
        ticket.all_endings += 1
        ticket._finished_then = self._finished
        if ticket.endings < MOST_ENDINGS:
            ticket.not_before = time.monotonic() + min(FIRST_WAIT * 4 ** (ticket.endings - 1), LONGEST_WAIT)
            return None
        reason = (f"ended from outside ({signal}) {ticket.endings} times in a row while nothing else finished: by "
                  "hand, or by the system short of memory. Nothing is known to be wrong with the variant: free memory "
                  "or use fewer workers, and run it again")
        first = "" if ticket.first is None else told(ticket.first)
        return Outcome(ticket.variant.key, "failed", stage="ended", reason=reason, safer_mesh=ticket.safer,
                       first_reason=first)


def told(outcome: Outcome) -> str:
    """``mesh: no attempt gave a mesh``: where and why an outcome failed, in one line."""
    return f"{outcome.stage}: {outcome.reason}" if outcome.stage else outcome.reason
