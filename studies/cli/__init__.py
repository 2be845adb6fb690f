"""The command line: ``haunch check``, ``show``, ``schema``, ``reference``, ``materials``.

`main` is the entry point. Only what a command needs is imported, and only when it runs.
"""

from studies.cli.main import main

__all__ = ["main"]
