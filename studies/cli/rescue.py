"""``haunch rescue``."""

from __future__ import annotations

import argparse

from studies.cli.arguments import Commands, command


def register(commands: Commands[argparse.ArgumentParser]) -> None:
    """Add the command."""
    rescue = command(commands, "rescue", "save what is whole in a damaged record into a new one", _rescue)
    rescue.add_argument("record", metavar="RECORD", help="the damaged file; it is left as it is")
    rescue.add_argument("new", metavar="NEW", help="file to write; `haunch vary PLAN --record NEW` goes on with it")


def _rescue(options: argparse.Namespace) -> int:
    from studies.record import rescue

    saved = rescue(options.record, options.new)
    lost = f"; {saved.spoiled} had been changed and are left behind" if saved.spoiled else ""
    print(f"{saved.variants} variants are in {options.new}{lost}. What is missing is computed again by\n"
          f"  haunch vary PLAN.toml --record {options.new}")
    return 0
