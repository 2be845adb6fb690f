"""Words of the command line."""

from __future__ import annotations

import argparse

from geometry.budget import available_threads
from studies.cli import again, export, lightest, report, rescue, vary
from studies.cli.arguments import Commands, command, whole

DESCRIPTION = """\
Check a beam-like part twice: as a solid model (second-order tetrahedra) and as a beam model of the same spec.
Every figure that both give is compared, and the difference is judged against what is expected for this part."""

EPILOG = """\
exit status
  0    fine: nothing is suspicious and every limit is met
  1    something is suspicious, a check failed, or a limit is missed or not established
  2    the spec or the command line is wrong; every mistake is listed
  3    the run failed; nothing was written
  130  stopped by Ctrl-C; nothing was written
  of a study (vary), which writes each variant as it is finished:
  0    every variant is finished, and at least one has nothing suspicious and meets every limit
  1    every variant is done, but some failed, or none is such a one
  3    the study had to stop; what was finished is kept, and the same command goes on
  130  stopped by Ctrl-C, SIGTERM or SIGHUP; likewise

cautions
  Linear elastic material, small displacements, perfect geometry. No yielding, no fatigue, no contact; buckling only
  where the spec asks for it, as a factor of the perfect part.
  The requested accuracy steers the mesh and is not verified. Both models share the spec: a wrong load or support
  in it goes unseen. Local codes and the judgement of a licensed engineer decide."""


class _Version(argparse.Action):
    """Looks the version up only when asked."""

    def __call__(self, parser: argparse.ArgumentParser, *_: object) -> None:
        from importlib.metadata import PackageNotFoundError, version

        try:
            print(f"haunch {version('haunch')}")
        except PackageNotFoundError:
            print("haunch (not installed: run from its folder)")
        parser.exit()


def make_parser() -> argparse.ArgumentParser:
    """The parser; each command leaves its function in ``run``."""
    parser = argparse.ArgumentParser("haunch", description=DESCRIPTION, epilog=EPILOG, allow_abbrev=False,
                                     formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--version", action=_Version, nargs=0, help="print the version and stop")
    commands = parser.add_subparsers(title="commands", metavar="COMMAND", required=True)
    _add_check(commands)
    show = command(commands, "show", "print the tables of a finished run", _show)
    show.add_argument("folder", metavar="RUN_FOLDER", help="folder that `haunch check` wrote")
    for study_command in (vary, lightest, report, again, export, rescue):
        study_command.register(commands)
    schema = command(commands, "schema", "print the JSON Schema of a spec or plan, for editors that complete and check "
                     "TOML", _schema)
    reference = command(commands, "reference", "print every word of a spec or plan with its meaning (Markdown)",
                        _reference)
    for of_words in (schema, reference):
        of_words.add_argument("of", metavar="part|plan", nargs="?", choices=("part", "plan"), default="part",
                              help="of a part (as when left out) or of the plan of a study")
    command(commands, "materials", "print the table of materials with its sources", _materials)
    return parser


def _add_check(commands: Commands[argparse.ArgumentParser]) -> None:
    check = command(commands, "check", "build both models of a part, compare and judge them, write a run folder",
                     _check)
    check.epilog = EPILOG
    check.add_argument("part", metavar="PART.toml", help="the spec (see `haunch reference`)")
    check.add_argument("--out", metavar="DIR", help="run folder to write; PART.run in the current folder if left out")
    check.add_argument("--replace", action="store_true", help="overwrite a finished run of that name")
    check.add_argument("--no-pictures", dest="pictures", action="store_false", help="draw no PNG pictures")
    check.add_argument("--threads", metavar="N", type=whole(1, 1024), default=available_threads(),
                       help="threads to use (one for each core that this process may use: %(default)s)")
    check.add_argument("--memory", metavar="MiB", type=whole(256, 10**8), default=4096,
                       help="memory that meshing and solving may take (4096)")
    check.add_argument("--solver", choices=("auto", "cholesky", "multigrid"), default="auto",
                       help="of the solid model's equations: auto goes by size and shape of the part, and the result "
                            "says what was chosen and why (auto)")


def _check(options: argparse.Namespace) -> int:
    from studies.cli.check import run_check

    return run_check(options.part, options.out, options.replace, options.pictures, options.threads, options.memory,
                     options.solver)


def _show(options: argparse.Namespace) -> int:
    from studies.cli.show import run_show

    return run_show(options.folder)


def _schema(options: argparse.Namespace) -> int:
    import json

    if options.of == "plan":
        from studies.vary.plan import plan_schema as schema
    else:
        from geometry.spec import json_schema as schema
    print(json.dumps(schema(), indent=2))
    return 0


def _reference(options: argparse.Namespace) -> int:
    if options.of == "plan":
        from studies.vary.plan import plan_reference as reference
    else:
        from geometry.spec import spec_reference as reference
    print(reference())
    return 0


def _materials(_: argparse.Namespace) -> int:
    from studies.cli.materials import run_materials

    return run_materials()
