"""Nothing of Dask's own log on the driver's terminal: what matters of it is told in plain words instead."""

from __future__ import annotations

import logging
import warnings

LOGGERS = ("distributed", "tornado", "asyncio", "dask", "bokeh")


def be_quiet() -> None:
    """Silence the loggers of Dask and of what it stands on, in this process. Call it once Dask has been imported, for
    that makes their handlers."""
    from distributed.versions import VersionMismatchWarning

    for name in [*LOGGERS, *logging.root.manager.loggerDict]:
        if name.partition(".")[0] in LOGGERS:
            logger = logging.getLogger(name)
            logger.handlers = [logging.NullHandler()]
            logger.propagate = name not in LOGGERS  # up to the ones above, and no further
    warnings.filterwarnings("ignore", category=VersionMismatchWarning)  # what differs is looked at by worker.report
