"""``headledger plan``: what a visit's readings could show, before there are any."""

from __future__ import annotations

import click

from headledger.cli.exit_codes import ExitCode
from headledger.cli.streams import result_stream
from headledger.cli.targets import TO_STDOUT, refuse_bad_json, write_json


@click.command(short_help="Say what JOB's readings could show, before there are any.")
@click.argument("job")
@click.option(
    "--state",
    "states",
    metavar="TEXT",
    multiple=True,
    help='A flow state of the visit, such as "still" or "R1 = 20 m3/h, R3 = 4 m3/h"; may be given often.',
)
@click.option("--json", "json_path", metavar="PATH", help="Write the plan to PATH; - writes it to stdout alone.")
@click.option("--no-color", is_flag=True, help="Print without colour.")
def plan(job: str, states: tuple[str, ...], json_path: str | None, no_color: bool) -> int:
    """Say, before any log of JOB exists, how small a trouble its readings would show, and which gauges could pass.

    Flow states are those of --state, else those of spells.csv, else still, half and full flow. Exit status: 0 every gauge could
    pass; 1 some could not; 2 the job cannot be used.
    """
    from headledger.cli.samples import job_folder

    folder = job_folder(job)
    refuse_bad_json(json_path)
    from headledger.diagnosis.result import Verdict
    from headledger.diagnosis.sight import plan_job
    from headledger.readers.flow_states import parse_states
    from headledger.readers.job import read_job

    described = read_job(folder, logs_needed=False)
    found = plan_job(described, parse_states(states, described))
    if json_path:
        from headledger.sheets.sight_json import plan_to_text

        write_json(lambda ascii_only: plan_to_text(found, ascii_only=ascii_only), json_path)
    if json_path != TO_STDOUT:
        from headledger.sheets.sight_text import write_plan

        with result_stream() as stream:
            write_plan(found, stream, color=not no_color)
    every = all(gauge.verdict is Verdict.PASS for gauge in found.sight.gauges)
    return ExitCode.SOUND if every else ExitCode.TROUBLE
