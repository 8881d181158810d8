"""``headledger sheet``: what is signed and filed."""

from __future__ import annotations

import re
import sys
from pathlib import Path
from typing import TYPE_CHECKING

import click

from headledger.cli.exit_codes import ExitCode
from headledger.cli.streams import ProgressLine, say
from headledger.cli.targets import refuse_bad_target

if TYPE_CHECKING:
    from headledger.diagnosis.result import CheckResult


@click.command(short_help="Print JOB's sheets: a summary and a page a gauge, as PDF.")
@click.argument("job")
@click.option("-o", "--output", metavar="PATH", help="The PDF; by default JOB-sheet.pdf in the folder you are in.")
@click.option("--csv", "csv_path", metavar="PATH", help="Write the same figures as a table, one row a gauge and spell.")
@click.option(
    "--paper", type=click.Choice(["a4", "letter"]), default="a4", show_default=True, help="Size of the paper."
)
@click.option("-q", "--quiet", is_flag=True, help="No progress.")
def sheet(job: str, output: str | None, csv_path: str | None, paper: str, quiet: bool) -> int:
    """Print the sheets of JOB as PDF: a page that sums up, and a page for each gauge to be signed.

    They are headed as a field check against computed pressure, and are no calibration certificates. A file of that name is
    replaced. The same job gives the same file, byte for byte.
    """
    from headledger.cli.samples import job_folder

    folder = job_folder(job)
    target = Path(output) if output else Path(f"{safe_name(folder.resolve().name)}-sheet.pdf")
    refuse_bad_target(str(target), "--output")
    refuse_bad_target(csv_path, "--csv")
    from headledger.diagnosis.check import check_folder
    from headledger.sheets.pdf import sheets_to_pdf
    from headledger.sheets.pdf_paper import Paper

    with ProgressLine(sys.stderr, shown=not quiet) as progress:
        result = check_folder(folder, on_progress=progress)
        progress("drawing the sheets", 0.95)
        pages = sheets_to_pdf(result, paper=Paper(paper))
    _write(target, pages)
    if csv_path:
        from headledger.sheets.spreadsheet import result_to_csv

        _write(Path(csv_path), result_to_csv(result).encode("utf-8-sig", "backslashreplace"))
    _name_files(result, target, csv_path, quiet)
    return ExitCode.SOUND


def safe_name(name: str) -> str:
    """A file name that every system takes, as like the given one as can be."""
    return re.sub(r"[^\w.-]+", "-", name).strip("-. ") or "job"


def _write(path: Path, data: bytes) -> None:
    from headledger.records.files import write_whole

    try:
        write_whole(path, data)
    except OSError as error:
        raise click.FileError(str(path), hint=error.strerror or str(error)) from error


def _name_files(result: CheckResult, target: Path, csv_path: str | None, quiet: bool) -> None:
    if quiet:
        return
    count = len(result.gauges)
    say(f"{target}: the summary and {count} {'gauge' if count == 1 else 'gauges'}.")
    if csv_path:
        say(f"{csv_path}: the same figures as a table.")
