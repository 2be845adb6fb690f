"""Child processes for the kernels: loaded once, one fresh process for every job, bounded and told how they ended.

A kernel (CAD or mesh) takes up to two seconds to load, can crash, hang or eat the memory, and keeps state. So it is
loaded in a *template* process that never does a caller's job itself; it copies itself (fork) for each job. A job
therefore starts from the same untouched state whether it is the first or the hundredth, and whatever happens to it is
lost with its process alone.

`Template` and `Job` are the caller's side, `geometry.process.template` is what runs in the template. A job that needs
jobs of another kernel is lent the template of its caller (`LentTemplate`). This package knows no kernel.
"""

from geometry.process.job import Job, TemplateFailure
from geometry.process.lent import LentTemplate
from geometry.process.owner import Template, share_lent, shared_template

__all__ = ["Job", "LentTemplate", "Template", "TemplateFailure", "share_lent", "shared_template"]
