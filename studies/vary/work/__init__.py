"""One variant at a time, evaluated in child processes that may crash, hang, eat the memory or be killed.

`Host` is the caller's side. For each variant, or group of variants of one shape, it starts a job: a copy of a template
process that has both models and the solver's kernels loaded (`studies.vary.work.variant_job`). The job in turn has the
solid built and meshed by copies of the host's own CAD and mesh templates, which it is lent. Whatever happens, the host
is left, and with it the study.
"""

from studies.vary.work.host import Host
from studies.vary.work.order import Ended, Order

__all__ = ["Ended", "Host", "Order"]
