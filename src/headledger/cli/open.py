"""``headledger open``: the screen."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

import click

from headledger.cli.exit_codes import ExitCode

if TYPE_CHECKING:
    from pathlib import Path

    from headledger.tui.ending import Ending


@click.command("open", short_help="Look at JOB on the screen of the terminal.")
@click.argument("job", required=False)
@click.option("--answer", "answers", metavar="TEXT", multiple=True, help="What was found on site; as for `check`.")
def open_job(job: str | None, answers: tuple[str, ...]) -> int:
    """Look at JOB on the screen of the terminal; without JOB, at the folder you are in."""
    from headledger.cli.samples import job_folder

    folder = job_folder(job) if job is not None else _folder_here()
    if not (sys.stdin.isatty() and sys.stdout.isatty()):
        raise click.UsageError("`open` needs a terminal; `headledger check JOB` prints the same findings as text.")
    from headledger.tui.app import HeadledgerApp

    app = HeadledgerApp(folder, answers=answers)
    app.run()
    return ExitCode.FAULT if app.return_code else status_of(app.ending)


def status_of(ending: Ending) -> ExitCode:
    """The exit status for what was on the screen last; what a shown result says, the screen has said."""
    return {
        "found": ExitCode.SOUND,
        "stopped": ExitCode.INTERRUPTED,
        "refused": ExitCode.UNUSABLE,
        "nothing to check": ExitCode.NOTHING_CHECKED,
        "fault": ExitCode.FAULT,
    }[ending.value]


def _folder_here() -> Path:
    from pathlib import Path

    from headledger.cli.samples import JOB_FILE, sample_names

    here = Path.cwd()
    if (here / JOB_FILE).is_file():
        return here
    raise click.UsageError(
        f"There is no {JOB_FILE} in this folder; name a job folder, or one of the samples: {', '.join(sample_names())}."
    )
