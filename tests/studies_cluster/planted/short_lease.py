"""Preloaded by a Dask worker: it waits for a driver's word for two seconds only."""

from studies.vary.cluster import worker

worker.LEASE = 2.0
