"""What the words of every command are made with."""

from __future__ import annotations

import argparse
from collections.abc import Callable

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
