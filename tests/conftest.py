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

LONGEST_FIRST = ("test_slender_parts", "test_mode_rows", "test_loading", "test_eigen_threads", "test_eigen_buckling",
                 "test_mode_faults", "test_study", "test_eigen_vibration", "test_kept", "test_studied",
                 "test_eigen_levers", "test_invariants", "test_buckling", "test_run")
"""Files of few, long tests. Begun last, one of them would run alone while the other process has nothing to do."""


def pytest_collection_modifyitems(items: list) -> None:
    """Put the longest files first; whole files, and the rest as it was."""
    rank = {name: place for place, name in enumerate(LONGEST_FIRST)}
    items.sort(key=lambda item: rank.get(item.path.stem, len(rank)))
