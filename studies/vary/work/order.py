"""What is asked of a worker, and the answer that is no outcome."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from studies.vary.variant import Variant


@dataclass(frozen=True, slots=True)
class Order:
    """One variant to be evaluated. JSON throughout (`to_json`).

    Attributes
    ----------
    keep
        Names of the figures to keep (`studies.vary.work.figures`); empty: the headline ones that the part has.
    seconds
        Wall-clock limit for the variant, all its processes together.
    memory
        MiB that the processes of the variant may hold, and the budget of mesh and solver.
    safer
        Mesh by the attempts for a variant that has failed once: finer, and with the algorithms that are slower.
    run_folder
        Where the whole run folder is written; None: it is not.
    pictures
        Draw its pictures.
    spec_name
        File name of the part's spec, for the run folder.
    """

    variant: Variant
    keep: tuple[str, ...] = ()
    seconds: float = 300.0
    memory: int = 2048
    safer: bool = False
    run_folder: str | None = None
    pictures: bool = True
    spec_name: str = "part.toml"

    def to_json(self) -> dict[str, Any]:
        """Plain data."""
        plain = {field.name: getattr(self, field.name) for field in dataclasses.fields(self)}
        return {**plain, "keep": list(self.keep), "variant": dataclasses.asdict(self.variant)}

    @classmethod
    def from_json(cls, plain: Mapping[str, Any]) -> Order:
        """Read what `to_json` gave."""
        return cls(**{**plain, "keep": tuple(plain["keep"]), "variant": Variant(**plain["variant"])})

    def shares_with(self, other: Order) -> bool:
        """Whether both are evaluated on one solid and one mesh."""
        mine = (self.variant.shape_key, self.safer, self.memory, self.seconds)
        return mine == (other.variant.shape_key, other.safer, other.memory, other.seconds)


@dataclass(frozen=True, slots=True)
class Ended:
    """The variant's process was ended from outside, or the host was closed: nothing is known about the variant, and it
    is to be run again on the same settings.

    Attributes
    ----------
    key
        Of the variant.
    signal
        ``SIGKILL`` and the like; ``closed`` when the host was closed; ``disk full``; ``not started`` where the system
        gave no process.
    what
        Which process it was, or what else.
    """

    key: str
    signal: str
    what: str = ""

    def to_json(self) -> dict[str, Any]:
        """Plain data."""
        return dataclasses.asdict(self)
