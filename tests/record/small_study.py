"""Plans, variants and outcomes of a small study, made without any model; loads little, for programs that are killed."""

from __future__ import annotations

import hashlib
import os
import resource
import sys
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field

from studies.vary.outcome import Held, Kept, Outcome
from studies.vary.variant import Variant


@dataclass(frozen=True)
class V:
    label: str
    unit: str


@dataclass(frozen=True)
class P:
    title: str = "Arm: which depth"
    name: str = "arm.toml"
    text: str = "[vary]\nroot_depth = 1\n"
    part_text: str = "title = 'arm'\n"
    key: str = "a" * 64
    varied: Mapping[str, V] = field(
        default_factory=lambda: {"root_depth": V("root depth", "mm"), "hold": V("hold", "")})


def key_of(number: int) -> str:
    return hashlib.sha256(str(number).encode()).hexdigest()


def variant(number: int) -> Variant:
    depth = 40.0 + number / 3
    return Variant(number=number, values={"root_depth": f"{depth!r} mm", "hold": "all"}, numbers={"root_depth": depth},
                   data={"title": "arm", "members": {"arm": {"depth": f"{depth!r} mm"}}}, key=key_of(number),
                   shape_key=key_of(number // 2))


def outcome(number: int) -> Outcome:
    """A function of the number alone, so that a reader can say what must be there."""
    if number % 7 == 0:
        return Outcome(key=key_of(number), status="failed", stage="mesh", reason=f"no mesh at {number}")
    return Outcome(
        key=key_of(number), status="finished", judgement="agrees" if number % 2 else "suspicious", fine=number % 2 == 1,
        figures={"mass": Kept(1e-3 * number / 3, 1e-3 * number / 3.1, "t", "agrees"),
                 "deflection": Kept(1.0 / number, None, "mm", "no beam value")},
        limits=(Held("tip", "deflection", 0.5, 1.0 / number, "mm", "met", 1 - 2.0 / number),),
        suspicions=() if number % 2 else ("deflection at tip",), unknowns=60000 + number,
        mesh={"size": [1.0, 2.0]}, seconds={"wall": 1.5, "solve": 1.0}, peak_memory=100.5, worker="1")


NOBODY = 65534


def in_child(function: Callable[[], object], ordinary: bool = False, largest_file: int = 0) -> str:
    """What `function` gives in a forked child, as text; of an error its kind and message.

    With `ordinary` root's right to write everywhere is given up; `largest_file` limits the size of files in bytes.
    """
    get, put = os.pipe()
    sys.stdout.flush()
    if (child := os.fork()) == 0:
        try:
            if ordinary and os.getuid() == 0:
                os.setgroups([])
                os.setgid(NOBODY)
                os.setuid(NOBODY)
            if largest_file:
                resource.setrlimit(resource.RLIMIT_FSIZE, (largest_file, largest_file))
            told = str(function())
        except BaseException as error:  # noqa: BLE001 - all of them go to the parent
            told = f"{type(error).__name__}: {error}"
        os.write(put, told.encode()[:60000])
        os._exit(0)
    os.close(put)
    with os.fdopen(get, "rb") as pipe:
        told = pipe.read().decode()
    os.waitpid(child, 0)
    return told
