"""The driver: it takes the variants of a plan, has them evaluated, and writes each outcome into the record.

`vary` runs a plan to its end or until it is stopped; the same call goes on where it stopped. `Backend` is whatever
evaluates: worker threads over child processes on this machine (`studies.vary.run.local`), or a cluster. Only the
driver decides what is tried again (`attempts`), in which order (`schedule`), and when an outcome counts (it is on
disk).
"""

from studies.vary.run.backend import Backend, BackendLost, Hear
from studies.vary.run.keeping import kept_run, runs_folder
from studies.vary.run.progress import Happening, Progress
from studies.vary.run.study import StudyStopped, vary
from studies.vary.run.summary import Ranked, Summary

__all__ = ["Backend", "BackendLost", "Happening", "Hear", "Progress", "Ranked", "StudyStopped", "Summary", "kept_run",
           "runs_folder", "vary"]
