"""The text report: a check's result for a terminal, a pipe, a serial console or a screen reader."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from datetime import tzinfo
from functools import partial
from typing import TextIO
from zoneinfo import ZoneInfo

from rich.console import Console
from rich.table import Table
from rich.text import Text

from headledger.diagnosis.result import CauseFound, CheckResult, GaugeFound, Verdict
from headledger.diagnosis.wording import budget_sentence
from headledger.sheets.columns import error_columns, flows_line
from headledger.sheets.headline import cause_label, check_worth, headline, told_causes
from headledger.sheets.marks import CAUTIONS, by_trouble, verdict_label
from headledger.sheets.numbers import clock_range, percent
from headledger.sheets.plain import bulleted, hanging, plain_table, print_report, print_section
from headledger.sheets.sight_text import print_sight
from headledger.sheets.why import RESIDUAL_HEAD, finding_title, moved, with_evidence

_STYLES = {
    Verdict.FAIL: "bold red",
    Verdict.UNRESOLVED: "bold yellow",
    Verdict.UNCHECKED: "dim",
    Verdict.PASS: "blue",
}
_MOST_REJECTS = 10
_MOST_REMARKS = 20


def write_report(
    result: CheckResult,
    stream: TextIO,
    *,
    width: int | None = None,
    color: bool = True,
    why: bool = False,
    sight: bool = False,
) -> None:
    """Write the report.

    Parameters
    ----------
    result : CheckResult
    stream : TextIO
    width : int, optional
        Columns; the terminal's, or 80 where there is none.
    color : bool
        False prints no colour even on a terminal; a stream that is no terminal never gets any.
    why : bool
        Print the numbers behind every finding and every gauge's uncertainty too.
    sight : bool
        Whether to say also how small a trouble these readings could have shown.
    """
    print_report(partial(_print_report, result, why=why, with_sight=sight), stream, width=width, color=color)


def _print_report(result: CheckResult, console: Console, *, why: bool, with_sight: bool) -> None:
    zone = ZoneInfo(result.job.timezone)
    console.print(Text(result.job.title, style="bold"))
    if result.job.site_name:
        console.print(Text(result.job.site_name))
    print_section(console, "", [_headline_table(result)])
    print_section(console, f"Spells (times in {result.job.timezone})", [_spell_table(result, zone)])
    print_section(console, "Gauges", [_gauge_table(by_trouble(result.gauges))])
    print_section(console, "Why", _why_lines(result.gauges))
    print_section(console, "Findings", _finding_lines(result.causes))
    if why:
        for cause in with_evidence(result.causes):
            print_section(console, f"Behind {finding_title(cause)}", _evidence_parts(result, cause))
        print_section(console, "Where each gauge's uncertainty comes from", _budget_lines(result.gauges))
    print_section(console, "Next checks", _check_lines(result))
    if with_sight and result.sight is not None:
        print_sight(result.job, result.sight, console)
    print_section(console, "Not used from the logs", _reject_lines(result))
    print_section(console, "Taken as given", _remark_lines(result.remarks))
    print_section(console, "Caution", bulleted(CAUTIONS))


def _headline_table(result: CheckResult) -> Table:
    grid = Table.grid(padding=(0, 2, 0, 0))
    grid.add_column(no_wrap=True)
    grid.add_column(overflow="fold")
    for answer in headline(result):
        grid.add_row(Text(answer.question, style="bold"), Text("\n".join(answer.lines)))
    return grid


def _spell_table(result: CheckResult, zone: tzinfo) -> Table:
    table = plain_table("No.", "Kind", "From – until", "Rows", "Flow", right=frozenset({"No.", "Rows"}))
    for spell in result.spells:
        table.add_row(
            str(spell.id),
            spell.kind.value,
            Text(clock_range(spell.start_s, spell.end_s, zone)),
            str(spell.samples),
            Text(flows_line(spell, result.job.display.flow)),
        )
    return table


def _gauge_table(gauges: Iterable[GaugeFound]) -> Table:
    right = frozenset({"Error", "± u95", "Tolerance", "Outside"})
    table = plain_table("Verdict", "Gauge", "Station", "Error", "± u95", "Tolerance", "Unit", "Outside", right=right)
    for gauge in gauges:
        error, doubt, tolerance = error_columns(gauge)
        table.add_row(
            Text(verdict_label(gauge.verdict), style=_STYLES[gauge.verdict], no_wrap=True),
            Text(gauge.tag),
            Text(gauge.station),
            error,
            doubt,
            tolerance,
            Text(gauge.unit.text),
            percent(gauge.outside_probability),
        )
    return table


def _why_lines(gauges: Iterable[GaugeFound]) -> Iterator[Table]:
    for gauge in by_trouble(gauges):
        if gauge.why and gauge.verdict is not Verdict.PASS:
            yield hanging("-", Text(gauge.why))


def _finding_lines(causes: Iterable[CauseFound]) -> Iterator[Table]:
    told, rest = told_causes(causes)
    for cause in told:
        body = Text("\n".join([cause_label(cause) + (" (accepted)" if cause.accepted else ""), cause.says]))
        yield hanging(Text(percent(cause.probability).rjust(6), style="bold"), body, label_width=6)
    if rest:
        yield hanging("", Text(rest), label_width=6)


def _evidence_parts(result: CheckResult, cause: CauseFound) -> Iterator[Table | Text]:
    if cause.evidence is None:
        return
    for against in cause.evidence.against:
        yield hanging("-", Text(against.says))
    yield hanging("-", Text(cause.evidence.says))
    told = moved(result, cause)
    if told.rows:
        table = plain_table(*RESIDUAL_HEAD, right=frozenset({"Spell", "No cause", "With it", "± u95"}))
        for row in told.rows:
            table.add_row(*(Text(cell, no_wrap=True) for cell in row))
        yield table
    if told.rest:
        yield Text(told.rest)


def _budget_lines(gauges: Iterable[GaugeFound]) -> Iterator[Table]:
    for gauge in by_trouble(gauges):
        if gauge.budget:
            yield hanging("-", Text(budget_sentence(gauge.tag, gauge.budget)))


def _check_lines(result: CheckResult) -> Iterator[Table | Text]:
    for text in result.answers:
        yield hanging("-", Text(f"Taken into account: {text}"))
    for check in result.next_checks:
        yield hanging("-", Text(f"{check.says}\n{check_worth(check)}"))


def _reject_lines(result: CheckResult) -> Iterator[Table | Text]:
    if not result.reject_count:
        return
    by_why: dict[str, int] = {}
    for reject in result.rejects:
        by_why[reject.why] = by_why.get(reject.why, 0) + 1
    yield Text(f"{result.reject_count} {'entry' if result.reject_count == 1 else 'entries'}, by cause:")
    for why, number in by_why.items():
        yield Text(f"{number} × {why}")
    for reject in result.rejects[:_MOST_REJECTS]:
        column = f", {reject.column}" if reject.column else ""
        yield hanging("-", Text(f"{reject.file}, line {reject.line}{column}: {reject.text!r}, {reject.why}"))
    left = result.reject_count - min(len(result.rejects), _MOST_REJECTS)
    if left:
        yield Text(f"and {left} more; the result file (--json) lists the first {len(result.rejects)}.")


def _remark_lines(remarks: tuple[str, ...]) -> Iterator[Table | Text]:
    for remark in remarks[:_MOST_REMARKS]:
        yield hanging("-", Text(remark))
    if len(remarks) > _MOST_REMARKS:
        yield Text(f"and {len(remarks) - _MOST_REMARKS} more; the result file (--json) has them all.")
