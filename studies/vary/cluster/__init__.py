"""A study on several machines."""

from __future__ import annotations

import sys
from collections.abc import Callable
from importlib.util import find_spec

from geometry.problem import HaunchError
from studies.vary.cluster.address import Tls, read_address
from studies.vary.run.backend import Backend

__all__ = ["Tls", "cluster"]


def cluster(on: str, tls: Tls | None = None, *, workers: int = 0, memory: int = 0
            ) -> Callable[[Callable[[str], None]], Backend]:
    """What makes the backend, once there is something to evaluate; nothing is connected before. It takes a function
    that is told, in the driver's thread, which workers come, go and are refused.

    Parameters
    ----------
    on
        ``tcp://HOST:PORT`` or ``tls://HOST:PORT`` of a scheduler.
    tls
        Files for TLS; None: Dask's own configuration.
    workers, memory
        For the run folders that are kept, which are made on this machine.

    Raises
    ------
    SpecError
        The address or the files for TLS are wrong.
    HaunchError
        The package dask.distributed is missing.
    """
    tls = tls or Tls()
    address = read_address(on, tls)
    if not _is_installed("distributed"):
        raise HaunchError("a study on a cluster needs the package dask.distributed, which is not installed (Haunch's "
                          f"extra `cluster`): {sys.executable} -m pip install 'distributed>=2025.1'")

    def make(tell: Callable[[str], None]) -> Backend:
        from studies.vary.cluster.backend import ClusterBackend

        return ClusterBackend(address, tls, workers, memory, tell)

    return make


def _is_installed(package: str) -> bool:
    try:
        return find_spec(package) is not None
    except ImportError:
        return False
