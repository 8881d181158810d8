"""One finding, one sentence: screen, text, result file, table and sheet say the same of the same thing."""

from __future__ import annotations

import csv
import io
import re
import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from rich.text import Text
from textual.widgets import Static

from headledger.diagnosis.result import CheckResult, Verdict
from headledger.diagnosis.wording import budget_sentence, percent
from headledger.sheets.headline import check_worth, headline, told_causes
from headledger.sheets.marks import CAUTIONS, by_trouble, verdict_label
from headledger.sheets.pdf import sheets_to_pdf
from headledger.sheets.spreadsheet import result_to_csv
from headledger.sheets.text import write_report
from headledger.sheets.to_json import result_to_json
from headledger.sheets.why import own_residuals, with_evidence
from headledger.tui.app import HeadledgerApp
from headledger.tui.screens.gauge import GaugeScreen
from headledger.tui.screens.why import WhyScreen
from headledger.tui.widgets.gauge_table import GaugeTable
from tests.outside_programs import needs


def squeezed(text: str) -> str:
    """Without any white space: lines break differently on every page and screen."""
    return re.sub(r"\s+", "", text)


def said_of_the_job(result: CheckResult) -> list[str]:
    """Every sentence of a result that all of its forms must hold."""
    told, _ = told_causes(result.causes)
    return [
        *(line for answer in headline(result) for line in answer.lines),
        *(cause.says for cause in told),
        *(check.says for check in result.next_checks),
        *(check_worth(check) for check in result.next_checks),
        *CAUTIONS,
    ]


def said_of_gauges(result: CheckResult) -> list[str]:
    return [gauge.why for gauge in result.gauges]


def said_of_the_evidence(result: CheckResult) -> list[list[str]]:
    """What is said of each finding that has numbers behind it: its odds, and its misfit at the end."""
    evidence = [cause.evidence for cause in with_evidence(result.causes) if cause.evidence]
    return [[*(against.says for against in one.against), one.says] for one in evidence]


def test_text_asked_why_says_what_the_result_says(any_sample: CheckResult):
    buffer = io.StringIO()
    write_report(any_sample, buffer, width=100, why=True)
    text = squeezed(buffer.getvalue())
    for sentence in (sentence for said in said_of_the_evidence(any_sample) for sentence in said):
        assert squeezed(sentence) in text
    for gauge in any_sample.gauges:
        assert squeezed(budget_sentence(gauge.tag, gauge.budget)) in text


def test_text_says_what_the_result_says(any_sample: CheckResult):
    buffer = io.StringIO()
    write_report(any_sample, buffer, width=100)
    text = squeezed(buffer.getvalue())
    for sentence in said_of_the_job(any_sample):
        assert squeezed(sentence) in text
    for gauge in any_sample.gauges:
        assert squeezed(f"{verdict_label(gauge.verdict)} {gauge.tag}") in text
        assert gauge.verdict is Verdict.PASS or squeezed(gauge.why) in text


def test_result_file_and_table_say_what_the_result_says(any_sample: CheckResult):
    told = result_to_json(any_sample)
    assert [gauge["why"] for gauge in told["gauges"]] == said_of_gauges(any_sample)
    assert [cause["says"] for cause in told["causes"]] == [cause.says for cause in any_sample.causes]
    evidence = [cause["evidence"] for cause in told["causes"] if cause["evidence"]]
    assert [[*(a["says"] for a in one["against"]), one["misfit"]["says"]] for one in evidence] == said_of_the_evidence(
        any_sample
    )
    rows = list(csv.DictReader(io.StringIO(result_to_csv(any_sample))))
    assert {(row["tag"], row["budget"]) for row in rows} == {
        (gauge.tag, budget_sentence(gauge.tag, gauge.budget)) for gauge in any_sample.gauges
    }
    for gauge, written in zip(any_sample.gauges, told["gauges"], strict=True):
        assert [share["what"] for share in written["budget"]] == [share.what for share in gauge.budget]
    assert {(row["tag"], row["verdict"], row["why"]) for row in rows} == {
        (gauge.tag, gauge.verdict.value, gauge.why) for gauge in any_sample.gauges
    }
    for row in rows:
        gauge = next(gauge for gauge in told["gauges"] if gauge["tag"] == row["tag"])
        spell = next(spell for spell in gauge["spells"] if str(spell["id"]) == row["spell"])
        assert float(row["reading"]) == spell["reading"]
        assert float(row["error"]) == gauge["error"]


@needs("pdftotext")
def test_sheet_says_what_the_result_says(any_sample: CheckResult, tmp_path: Path):
    path = tmp_path / "sheet.pdf"
    path.write_bytes(sheets_to_pdf(any_sample))
    # in the order of the content: what is read within one column of a table stays together
    done = subprocess.run(["pdftotext", "-raw", str(path), "-"], capture_output=True, text=True, check=True)
    text = squeezed(done.stdout)
    for sentence in [*said_of_the_job(any_sample), *said_of_gauges(any_sample)]:
        assert squeezed(sentence) in text
    for gauge in any_sample.gauges:
        assert squeezed(f"{verdict_label(gauge.verdict)}") in text
        assert squeezed(budget_sentence(gauge.tag, gauge.budget)) in text
        for cause in told_causes(any_sample.causes[i] for i in (*gauge.causes, *gauge.given))[0]:
            against = cause.evidence.against if cause.evidence else ()
            for sentence in (*(one.says for one in against), own_residuals(cause, gauge)):
                assert squeezed(sentence) in text


@pytest.mark.parametrize("size", [(80, 24), (160, 48)])
async def test_screen_of_why_says_what_the_result_says(any_sample: CheckResult, size: tuple[int, int]):
    def check(folder: Path, **_: Any) -> CheckResult:
        return any_sample

    app = HeadledgerApp(Path("job"), check=check)
    async with app.run_test(size=size) as pilot:
        await app.workers.wait_for_complete()
        await pilot.pause()
        await pilot.press("enter", "y")
        await pilot.pause()
        assert isinstance(app.screen, WhyScreen)
        gauge = by_trouble(any_sample.gauges)[0]
        text = squeezed(words_on(app))
        for share in gauge.budget:
            assert squeezed(percent(share.percent / 100.0)) in text
            assert squeezed(share.what) in text
        seen = ""
        for _ in with_evidence(any_sample.causes):
            seen += squeezed(words_on(app))
            await pilot.press("n")
            await pilot.pause()
        for sentence in (sentence for said in said_of_the_evidence(any_sample) for sentence in said):
            assert squeezed(sentence) in seen


@pytest.mark.parametrize("size", [(80, 24), (160, 48)])
async def test_screen_says_what_the_result_says(any_sample: CheckResult, size: tuple[int, int]):
    def check(folder: Path, **_: Any) -> CheckResult:
        return any_sample

    app = HeadledgerApp(Path("job"), check=check)
    async with app.run_test(size=size) as pilot:
        await app.workers.wait_for_complete()
        await pilot.pause()
        text = squeezed(words_on(app))
        for sentence in said_of_the_job(any_sample):
            assert squeezed(sentence) in text
        table = app.screen.query_one(GaugeTable)
        rows = [[str(cell) for cell in table.get_row_at(row)] for row in range(table.row_count)]
        for gauge in any_sample.gauges:
            assert [verdict_label(gauge.verdict), gauge.tag] in [row[:2] for row in rows]
        await pilot.press("enter")
        for _ in any_sample.gauges:
            await pilot.pause()
            assert isinstance(app.screen, GaugeScreen)
            gauge = next(gauge for gauge in any_sample.gauges if gauge.tag == app.screen.tag)
            assert squeezed(gauge.why) in squeezed(words_on(app))
            await pilot.press("n")


def words_on(app: HeadledgerApp) -> str:
    def plain(widget: Static) -> str:
        content = widget.render()
        return content.plain if isinstance(content, Text) else str(content)

    read: Callable[[Static], str] = plain
    return "\n".join(read(widget) for widget in app.screen.query(Static).results(Static))
