"""The check as a table for spreadsheets: one row a gauge and spell, comma-separated."""

from __future__ import annotations

import csv
import math
from io import StringIO

from headledger.diagnosis.result import CheckResult, GaugeFound, GaugeSpell, SpellFound
from headledger.diagnosis.wording import budget_sentence
from headledger.sheets.json_values import stamp

COLUMNS = (
    "tag",
    "serial",
    "station",
    "unit",
    "verdict",
    "outside probability",
    "error",
    "error u95",
    "tolerance",
    "spell",
    "kind",
    "start",
    "end",
    "reading",
    "expected",
    "expected u95",
    "why",
    "budget",
)

# A spreadsheet takes a cell that begins so for a formula.
_FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")
_SIGNIFICANT_DIGITS = 6


def result_to_csv(result: CheckResult) -> str:
    """The table as text: RFC 4180, a header line, pressures in each gauge's own unit, times in UTC."""
    buffer = StringIO()
    writer = csv.writer(buffer)
    writer.writerow(COLUMNS)
    spells = {spell.id: spell for spell in result.spells}
    for gauge in result.gauges:
        for said in gauge.spells:
            writer.writerow(_row(result, gauge, spells[said.id], said))
    return buffer.getvalue()


def harmless(text: str) -> str:
    """Text that no spreadsheet runs: an apostrophe stands before what would be taken for a formula."""
    return f"'{text}" if text.startswith(_FORMULA_STARTS) else text


def _row(result: CheckResult, gauge: GaugeFound, spell: SpellFound, said: GaugeSpell) -> tuple[str, ...]:
    factor = gauge.unit.factor
    return (
        harmless(gauge.tag),
        harmless(result.job.gauge(gauge.tag).serial),
        harmless(gauge.station),
        gauge.unit.text,
        gauge.verdict.value,
        _number(gauge.outside_probability),
        _number(gauge.error_pa / factor),
        _number(gauge.u95_pa / factor),
        _number(gauge.tolerance_pa / factor),
        str(spell.id),
        spell.kind.value,
        stamp(spell.start_s) or "",
        stamp(spell.end_s) or "",
        _number(None if said.reading_pa is None else said.reading_pa / factor),
        _number(None if said.expected_pa is None else said.expected_pa / factor),
        _number(None if said.u95_pa is None else said.u95_pa / factor),
        harmless(gauge.why),
        harmless(budget_sentence(gauge.tag, gauge.budget)),
    )


def _number(value: float | None) -> str:
    return "" if value is None or not math.isfinite(value) else f"{value:.{_SIGNIFICANT_DIGITS}g}"
