"""Dense products work in one thread while a check runs, and as before after it."""

from __future__ import annotations

import scipy.linalg
from threadpoolctl import threadpool_info, threadpool_limits

from studies.check.threads import dense_products_in_one_thread


def _threads() -> set[int]:
    assert scipy.linalg is not None
    return {library["num_threads"] for library in threadpool_info() if library["internal_api"] == "openblas"}


def test_dense_products_have_one_thread_inside_and_their_own_outside() -> None:
    with threadpool_limits(2):
        with dense_products_in_one_thread():
            assert _threads() == {1}
        assert _threads() == {2}
