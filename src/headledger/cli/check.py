"""``headledger check``: the batch answer, as text or as a result file."""

from __future__ import annotations

import sys
from typing import TYPE_CHECKING

import click

from headledger.cli.exit_codes import ExitCode
from headledger.cli.streams import ProgressLine, result_stream, say
from headledger.cli.targets import TO_STDOUT, refuse_bad_json, write_json

if TYPE_CHECKING:
    from headledger.diagnosis.result import CheckResult


@click.command()
@click.argument("job")
@click.option("--json", "json_path", metavar="PATH", help="Write the result file to PATH; - writes it to stdout alone.")
@click.option("--no-color", is_flag=True, help="Print without colour.")
@click.option(
    "--answer",
    "answers",
    metavar="TEXT",
    multiple=True,
    help='What was found on site, such as "zero-check PT-7 = 0.01 bar" or "open-strainer STR-1 = yes"; may be given often.',
)
@click.option("--why", is_flag=True, help="Print the numbers behind every finding and every uncertainty too.")
@click.option(
    "--sight", is_flag=True, help="Report also how small a trouble these readings could have shown, and where."
)
@click.option("-q", "--quiet", is_flag=True, help="No report and no progress: the exit status is the answer.")
def check(
    job: str, json_path: str | None, no_color: bool, answers: tuple[str, ...], why: bool, sight: bool, quiet: bool
) -> int:
    """Say which gauges of JOB can be believed.

    Exit status: 0 nothing is wrong; 1 something is; 2 the job or its logs cannot be used; 3 nothing can be checked;
    70 a fault of headledger; 130 interrupted.
    """
    from headledger.cli.samples import job_folder

    folder = job_folder(job)
    refuse_bad_json(json_path)
    from headledger.diagnosis.check import check_folder

    with ProgressLine(sys.stderr, shown=not quiet) as progress:
        result = check_folder(folder, answers=answers, on_progress=progress)
    if json_path:
        from headledger.sheets.to_json import result_to_text

        write_json(lambda ascii_only: result_to_text(result, ascii_only=ascii_only), json_path)
    if not quiet and json_path != TO_STDOUT:
        from headledger.sheets.text import write_report

        with result_stream() as stream:
            write_report(result, stream, color=not no_color, why=why, sight=sight)
    _name_unchecked(result)
    return exit_code_of(result)


def exit_code_of(result: CheckResult) -> ExitCode:
    """The exit status that a result stands for."""
    from headledger.sheets.outcome import Outcome, outcome_of

    return {
        Outcome.SOUND: ExitCode.SOUND,
        Outcome.TROUBLE: ExitCode.TROUBLE,
        Outcome.NOTHING_CHECKED: ExitCode.NOTHING_CHECKED,
    }[outcome_of(result)]


def _name_unchecked(result: CheckResult) -> None:
    tags = [gauge.tag for gauge in result.gauges if gauge.verdict.value == "unchecked"]
    if tags:
        say(f"Not checked, for want of a reading or of anything else that determines it: {', '.join(tags)}.")
