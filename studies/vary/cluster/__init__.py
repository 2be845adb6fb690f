"""A study on several machines: ``haunch vary PLAN.toml --on tcp://HOST:8786``.

The scheduler and the workers are those of dask.distributed, an optional extra (``cluster``). The driver, that is the
command above, reads the plan, gives out variants and alone writes the record; every outcome that has reached it is on
its disk. Workers may come at any time, go, or be killed: what a worker had under way is run again elsewhere, on the
same mesh settings, and nothing else is. With no worker left the study waits for one. When the scheduler goes the driver
says so and ends with status 3; the same command goes on, and so does the one without ``--on``, on one machine. The
numbers are those of one machine, bit for bit on processors of one kind.

By hand, on two machines
------------------------
Install the same version of Haunch on both, with the extra ``cluster``, into an environment on each; the scheduler needs
it too. A worker whose version of the results, of Haunch or of a package that numbers depend on differs from the
driver's is refused, with what differs. On the first machine (here ``first``), in three terminals::

    dask scheduler --host first --port 8786
    dask worker tcp://first:8786 --nworkers 1 --nthreads 4
    haunch vary PLAN.toml --on tcp://first:8786

and on the second one as many workers as you like::

    dask worker tcp://first:8786 --nworkers 1 --nthreads 8

``--nthreads`` is how many variants the machine evaluates at a time, each in processes of one thread: one for each core,
and as many as its memory holds (``--memory`` of the study for each). Leave ``--nworkers`` at 1: one worker loads the
kernels once for all of its variants. The machines need no common disk. Run folders that the plan keeps are evaluated on
the driver's machine, by ``--workers`` at a time, for that is where they are wanted.

Whoever reaches the port of a scheduler can run any program as its user, and so can a scheduler on its workers and on
its clients. So without TLS: only in a network in which you trust every machine and user, never on an address that the
internet reaches.

With TLS
--------
Each side shows a certificate that is signed by an authority of your own, and refuses everybody else. Once, on one
machine::

    openssl req -x509 -newkey rsa:3072 -nodes -days 365 -subj "/CN=studies" -keyout ca.key -out ca.pem
    openssl req -newkey rsa:3072 -nodes -subj "/CN=node" -keyout key.pem -out request.pem
    openssl x509 -req -in request.pem -CA ca.pem -CAkey ca.key -CAcreateserial -days 365 -out cert.pem

Copy ``ca.pem``, ``cert.pem`` and ``key.pem`` to every machine, readable by you alone, and keep ``ca.key`` where it is.
Then::

    dask scheduler --host tls://first --port 8786 --tls-ca-file ca.pem --tls-cert cert.pem --tls-key key.pem
    dask worker tls://first:8786 --nworkers 1 --nthreads 8 --tls-ca-file ca.pem --tls-cert cert.pem --tls-key key.pem
    haunch vary PLAN.toml --on tls://first:8786 --tls-ca ca.pem --tls-cert cert.pem --tls-key key.pem

Left out here, the files are those that Dask's own configuration names (``distributed.comm.tls.ca-file``,
``distributed.comm.tls.client.cert`` and ``.key``).

On a batch system
-----------------
Common practice, no source: the scheduler and the driver run on a machine that the compute nodes reach (where long
programs are allowed), or in a job of one core, and each worker is a job. A job script for a queue that takes shell
scripts; its options are those of your own queue::

    #!/bin/sh
    # options of the queue: one node, 16 cores, 40 GB, 8 hours
    . /path/to/haunch/.venv/bin/activate
    export TMPDIR="${TMPDIR:-/tmp}"     # a disk of the node itself
    exec dask worker tcp://first:8786 --nworkers 1 --nthreads 16 --local-directory "$TMPDIR" \\
        --death-timeout 300 --lifetime 465m --no-dashboard

Submit it as often as you want workers; the study starts with the first and takes in the others as the queue starts
them. ``--lifetime`` ends a worker before the queue kills it (not needed: what was under way is run again either way),
``--death-timeout`` ends a job that finds no scheduler; one whose scheduler goes ends by itself. Start the driver with
``--quiet --log FILE``.
"""

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
