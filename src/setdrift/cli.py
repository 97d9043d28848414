"""The `setdrift` command."""

from __future__ import annotations

import argparse
import datetime as dt
import os
import sys
from collections.abc import Sequence
from pathlib import Path

from setdrift import __version__
from setdrift.errors import SetdriftError

# Everything else is imported where it is used, so that `setdrift --help` answers at once.

FAILED, MISUSED = 1, 2


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command.

    Parameters
    ----------
    arguments : sequence of str, optional
        Words after the command's name; those of the process when left out.

    Returns
    -------
    int
        0 where all went well, 1 where the work failed, 2 where the words were wrong.
    """
    chosen = _parser().parse_args(arguments)
    try:
        chosen.action(chosen)
        sys.stdout.flush()
    except BrokenPipeError:
        # a reader such as `head` has seen enough; what is still buffered must not fail once more at exit
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except SetdriftError as error:
        print(f"setdrift: {error}", file=sys.stderr)
        return FAILED
    except KeyboardInterrupt:
        print("setdrift: stopped from the keyboard; run the same command to go on", file=sys.stderr)
        return FAILED
    return 0


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="setdrift",
        description="Daily surface currents and eddies from along-track satellite sea level.",
        epilog="The whole chain is run by: snakemake --cores 2 --configfile CONFIG",
    )
    parser.add_argument("--version", action="version", version=f"setdrift {__version__}")
    commands = parser.add_subparsers(required=True, metavar="COMMAND")

    check = commands.add_parser("check", help="check a configuration and say what it asks for")
    check.add_argument("config", type=Path, help="configuration file")
    check.set_defaults(action=_check)

    look = commands.add_parser("look-at", help="say what would be read from one along-track file, and how")
    look.add_argument("file", type=Path, help="along-track file or Zarr store")
    look.add_argument("--config", type=Path, help="configuration file whose rules are used; with --altimeter")
    look.add_argument("--altimeter", help="name of the altimeter in that configuration")
    look.set_defaults(action=_look)

    job = commands.add_parser("job", help="run one rule of the workflow (the workflow calls this)")
    job.add_argument("rule", help="name of the rule")
    job.add_argument("config", type=Path, help="configuration file")
    job.add_argument("--block", help="first day of the block of days, YYYY-MM-DD")
    job.add_argument("--log", type=Path, help="file that the job's lines are added to")
    job.set_defaults(action=_job)

    verify = commands.add_parser("verify", help="compare the published maps and currents with a known truth")
    verify.add_argument("config", type=Path, help="configuration file")
    verify.add_argument("--truth", type=Path, required=True, help="gridded file with the true fields, by standard name")
    verify.set_defaults(action=_verify)

    compare = commands.add_parser("compare-altimeters", help="report biases and errors of passes, from crossovers")
    compare.add_argument("config", type=Path, help="configuration file")
    compare.add_argument("--from", dest="first", type=_day, metavar="DAY", help="first day to use")
    compare.add_argument("--to", dest="last", type=_day, metavar="DAY", help="last day to use")
    compare.add_argument("--truth", type=Path, help="NetCDF file with the true bias (m) by altimeter")
    compare.set_defaults(action=_compare_altimeters)

    prepare = commands.add_parser("prepare", help="compile the fast loops now, so that no first run seems to hang")
    prepare.set_defaults(action=_prepare)
    return parser


def _day(text: str) -> dt.date:
    try:
        return dt.date.fromisoformat(text)
    except ValueError as error:
        raise argparse.ArgumentTypeError(f"{text!r} is not a day; write it as YYYY-MM-DD") from error


def _check(chosen: argparse.Namespace) -> None:
    from setdrift.data.configuration import load_configuration
    from setdrift.data.grids import analysis_grid, working_grid

    configuration = load_configuration(chosen.config)
    rows, columns = analysis_grid(configuration).shape
    working_rows, working_columns = working_grid(configuration).shape
    print(f"{chosen.config} is sound")
    print(f"  analysis    {configuration.analysis}, {configuration.period.start} to {configuration.period.end}")
    print(f"  grid        {rows} x {columns} points, worked on as {working_rows} x {working_columns}")
    for name, altimeter in configuration.altimeters.items():
        print(f"  altimeter   {name}: {configuration.resolve(altimeter.files)}")
    print(f"  products    {configuration.products}")
    print(f"next: snakemake --cores 2 --configfile {chosen.config}")


def _look(chosen: argparse.Namespace) -> None:
    from setdrift.data.configuration import load_configuration
    from setdrift.operations.look import look_lines

    configuration = load_configuration(chosen.config) if chosen.config else None
    for line in look_lines(chosen.file, configuration, chosen.altimeter):
        print(line)


def _job(chosen: argparse.Namespace) -> None:
    from setdrift.data.configuration import load_configuration
    from setdrift.data.days import Block
    from setdrift.operations.jobs import RULES, Job, run_job

    if chosen.rule not in RULES:
        raise SetdriftError(f"job {chosen.rule}", "is not a rule", f"choose one of {', '.join(RULES)}")
    configuration = load_configuration(chosen.config)
    block = None
    if chosen.block is not None:
        try:
            block = Block.named(chosen.block, configuration.block_days)
        except ValueError as error:
            what = "is not the first day of a block"
            remedy = f"write it as YYYY-MM-DD ({error})"
            raise SetdriftError(f"--block {chosen.block}", what, remedy) from error
    run_job(Job(configuration, chosen.rule, block), chosen.log, lambda line: print(line, flush=True))


def _verify(chosen: argparse.Namespace) -> None:
    from setdrift.data.configuration import load_configuration
    from setdrift.operations.verification import verification_lines

    for line in verification_lines(load_configuration(chosen.config), chosen.truth):
        print(line)


def _compare_altimeters(chosen: argparse.Namespace) -> None:
    from setdrift.data.configuration import load_configuration
    from setdrift.operations.altimeter_comparison import comparison_lines

    for line in comparison_lines(load_configuration(chosen.config), chosen.first, chosen.last, chosen.truth):
        print(line)


def _prepare(_: argparse.Namespace) -> None:
    from setdrift.operations.preparation import compile_kernels

    compile_kernels(lambda line: print(line, flush=True))


if __name__ == "__main__":
    sys.exit(main())
