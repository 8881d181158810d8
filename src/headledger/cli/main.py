"""The entry point: the group of commands, and what becomes of every kind of error."""

from __future__ import annotations

import os
from collections.abc import Sequence

import click

from headledger import __version__
from headledger.cli.check import check
from headledger.cli.exit_codes import ExitCode
from headledger.cli.expect import expect
from headledger.cli.open import open_job
from headledger.cli.plan import plan
from headledger.cli.sheet import sheet
from headledger.cli.streams import prepare_streams, say
from headledger.errors import HeadledgerError, JobError, NothingToCheckError


@click.group(context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, message="headledger %(version)s")
def commands() -> None:
    """Which pressure gauges on a liquid piping system can be believed, and why.

    A job is a folder: stations, runs, gauges, and a log of what the gauges said. JOB is its path, or the name of a
    sample.
    """


commands.add_command(open_job)
commands.add_command(check)
commands.add_command(plan)
commands.add_command(sheet)
commands.add_command(expect)


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command.

    Parameters
    ----------
    argv : sequence of str, optional
        Arguments without the program's name; those of the process where none are given.

    Returns
    -------
    int
        An `ExitCode`.
    """
    prepare_streams()
    # matrices here are small: threads of the algebra library would only get in one another's way
    for name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
        os.environ.setdefault(name, "1")
    try:
        status = commands.main(args=argv, prog_name="headledger", standalone_mode=False)
    except click.ClickException as error:
        error.show()
        return ExitCode.UNUSABLE
    except (click.Abort, KeyboardInterrupt):
        say("headledger: interrupted.")
        return ExitCode.INTERRUPTED
    except JobError as error:
        for problem in error.problems:
            say(str(problem))
        return ExitCode.UNUSABLE
    except NothingToCheckError as error:
        say(str(error))
        return ExitCode.NOTHING_CHECKED
    except HeadledgerError as error:
        say(str(error))
        return ExitCode.UNUSABLE
    except Exception as error:
        return _own_fault(error)
    return int(status or ExitCode.SOUND)


def _own_fault(error: Exception) -> ExitCode:
    """Say that the program is at fault, where, and how to report it."""
    from headledger.faults import TRACEBACK_VARIABLE, fault_lines

    if os.environ.get(TRACEBACK_VARIABLE):
        import traceback

        traceback.print_exception(error)
    for line in fault_lines(error):
        say(line)
    return ExitCode.FAULT
