"""The engineer's work on a part: one checked run, its judgement, its report, the command line.

Public names: `studies.check.run.check` makes one checked run, `studies.check.CheckResult` is what it gives.
"""
