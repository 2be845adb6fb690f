"""What the words of every command are made with."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from studies.vary.cluster import Tls

Commands = argparse._SubParsersAction  # of argparse.ArgumentParser; not generic at run time


def command(commands: Commands[argparse.ArgumentParser], name: str, text: str,
            run: Callable[[argparse.Namespace], int]) -> argparse.ArgumentParser:
    """A command of that name; `text` tells what it does, `run` does it and returns the exit status."""
    made = commands.add_parser(name, help=text, description=text[0].upper() + text[1:] + ".", allow_abbrev=False,
                               formatter_class=argparse.RawDescriptionHelpFormatter)
    made.set_defaults(run=run)
    return made


def whole(least: int, most: int) -> Callable[[str], int]:
    """Reads a whole number within bounds."""
    def read(text: str) -> int:
        try:
            value = int(text)
        except ValueError:
            value = least - 1
        if not least <= value <= most:
            raise argparse.ArgumentTypeError(f"given {text!r}; allowed: a whole number from {least} to {most}")
        return value

    return read


def on_a_cluster(parser: argparse.ArgumentParser) -> None:
    """Words of a command that can evaluate on a cluster."""
    parser.add_argument("--on", metavar="ADDRESS",
                        help="evaluate on a cluster: tcp://HOST:PORT of its scheduler, or tls://HOST:PORT")
    for name, text in (("ca", "certificates of those who may sign"), ("cert", "certificate of this side"),
                       ("key", "its private key, where that is not in the file of the certificate")):
        parser.add_argument(f"--tls-{name}", metavar="FILE", default="",
                            help=f"with --on tls://: {text} (PEM); Dask's own configuration if left out")


def tls_of(options: argparse.Namespace) -> Tls | None:
    """The files for TLS that were given."""
    if options.tls_ca or options.tls_cert or options.tls_key:
        from studies.vary.cluster import Tls

        return Tls(options.tls_ca, options.tls_cert, options.tls_key)
    return None
