"""Settings for every test: one thread, no display, the same examples of Hypothesis on every machine.

Thread variables are read when numpy and the solvers are imported, so they are set before any of them.
"""

import os

for _name in ("OMP_NUM_THREADS", "MKL_NUM_THREADS", "OPENBLAS_NUM_THREADS", "NUMBA_NUM_THREADS"):
    os.environ.setdefault(_name, "1")
os.environ.setdefault("MPLBACKEND", "Agg")

from hypothesis import settings

settings.register_profile("haunch", deadline=None, derandomize=True, max_examples=50, database=None)
settings.load_profile("haunch")
