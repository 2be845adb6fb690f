"""Preloaded by a Dask worker: its host evaluates bars by hand."""

from studies.vary.work import Host

assert Host.__init__.__kwdefaults__.keys() == {"models", "cad", "mesh"}
Host.__init__.__kwdefaults__.update(models="bar_models", cad="bar_kernel", mesh="bar_kernel")
