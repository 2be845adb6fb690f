"""A driver in a process of its own: writes variants into a record, each told on a line when `Record.add` has returned.

``writing.py RECORD FIRST LAST [SECONDS_BETWEEN]``; a line ``open`` comes first. With LAST 0 it holds the record and
waits; ``fork`` for FIRST then leaves a child behind that outlives it.
"""

from __future__ import annotations

import os
import sys
import time
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent))


def main(path: str, first: str, last: str, between: str = "0") -> None:
    from small_study import P, outcome, variant

    from studies.record import Record

    way = Record.resume if Path(path).exists() else Record.create
    with way(path, P()) as record:
        print("open", flush=True)
        if last == "0":
            if first == "fork" and os.fork() == 0:
                until = time.monotonic() + 60
                while time.monotonic() < until and not Path(path).with_suffix(".stop").exists():
                    time.sleep(0.02)
                os._exit(0)
            time.sleep(20)
        for number in range(int(first), int(last) + 1):
            record.add(variant(number), outcome(number))
            print(number, flush=True)
            time.sleep(float(between))


if __name__ == "__main__":
    main(*sys.argv[1:])
