"""What stands on the sheets, as words and rows: the one source of the PDF and of the table for spreadsheets."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from zoneinfo import ZoneInfo

from headledger import __version__
from headledger.diagnosis.result import CauseFound, CheckResult, GaugeFound, GaugeSpell, SpellFound
from headledger.diagnosis.wording import budget_sentence
from headledger.sheets.columns import error_columns, flow_words, flows_line, spell_columns
from headledger.sheets.gauge_facts import Fact, conditions, history_lines, identity
from headledger.sheets.headline import check_worth, told_causes
from headledger.sheets.marks import by_trouble, verdict_label
from headledger.sheets.numbers import clock_range, percent
from headledger.sheets.why import finding_title, own_residuals

Rows = tuple[tuple[str, ...], ...]

HEADING = "Field check against computed pressure"
NOT_A_CERTIFICATE = (
    "This is no calibration certificate: readings were compared with pressures computed from an energy balance of the piping, "
    "not with a reference standard."
)
SIGNATURES = ("Checked by", "Accepted by")
NUMBERS_ELSEWHERE = (
    "More of what findings rest on would not fit here; the result file (--json) and check --why have it."
)


@dataclass(frozen=True, slots=True, kw_only=True)
class GaugePage:
    """What stands on one gauge's page.

    Parameters
    ----------
    gauge : GaugeFound
    title : str
        Tag and station.
    verdict : str
        Mark and word.
    why : str
        The verdict in words, with what it leans on.
    identity, conditions : tuple of (str, str)
    error_head, error : tuple of str
        Error, uncertainty, tolerance, and how sure.
    spell_head : tuple of str
    spells : tuple of tuple of str
    findings : tuple of (str, str)
        Probability and label of a cause, and its sentence with its rivals.
    behind : tuple of str
        What each of them rests on: its odds, and how far this gauge is off with no cause and with it; empty where nothing is at hand.
    budget : str
        Where the uncertainty comes from, and how it kept to its neighbours.
    """

    gauge: GaugeFound
    title: str
    verdict: str
    why: str
    identity: tuple[Fact, ...]
    conditions: tuple[Fact, ...]
    error_head: tuple[str, ...]
    error: tuple[str, ...]
    spell_head: tuple[str, ...]
    spells: Rows
    findings: tuple[tuple[str, str], ...]
    behind: tuple[str, ...] = ()
    budget: str = ""


def gauge_page(result: CheckResult, gauge: GaugeFound) -> GaugePage:
    """The words and numbers of one gauge's page."""
    unit = gauge.unit.text
    causes = tuple(result.causes[i] for i in (*gauge.causes, *gauge.given))
    return GaugePage(
        gauge=gauge,
        title=f"{gauge.tag} at {gauge.station}",
        verdict=verdict_label(gauge.verdict),
        why=gauge.why,
        identity=identity(result, gauge),
        conditions=conditions(result.job),
        error_head=(
            f"Error, {unit}",
            f"± U (k = 2), {unit}",
            f"Tolerance ±, {unit}",
            "U / tolerance",
            "Likely outside",
            "Span seen",
        ),
        error=(
            *error_columns(gauge),
            _ratio(gauge),
            percent(gauge.outside_probability),
            _span_seen(result, gauge),
        ),
        spell_head=("Spell", "From – until", "Flow at the tap", f"Reads, {unit}", "Expected", "± U", "Off by"),
        spells=tuple(_spell_row(result, gauge, spell, said) for spell, said in _paired(result, gauge)),
        findings=_told(causes),
        behind=tuple(_behind(cause, gauge) for cause in told_causes(causes)[0]),
        budget=" ".join(
            part for part in (budget_sentence(gauge.tag, gauge.budget), *history_lines(result, gauge)) if part
        ),
    )


GAUGES_HEAD = ("Verdict", "Gauge", "Station", "Error", "± U", "Tolerance", "Unit", "Likely outside")


def gauge_rows(result: CheckResult) -> Rows:
    """One row a gauge, the worst news first, under `GAUGES_HEAD`."""
    return tuple(
        (
            verdict_label(gauge.verdict),
            gauge.tag,
            gauge.station,
            *error_columns(gauge),
            gauge.unit.text,
            percent(gauge.outside_probability),
        )
        for gauge in by_trouble(result.gauges)
    )


SPELLS_HEAD = ("Spell", "Kind", "From – until", "Rows", "Flow")


def spell_rows(result: CheckResult) -> Rows:
    """One row a spell, under `SPELLS_HEAD`."""
    zone = ZoneInfo(result.job.timezone)
    return tuple(
        (
            str(spell.id),
            spell.kind.value,
            clock_range(spell.start_s, spell.end_s, zone),
            str(spell.samples),
            flows_line(spell, result.job.display.flow),
        )
        for spell in result.spells
    )


def findings(result: CheckResult) -> tuple[tuple[str, str], ...]:
    """Every finding worth telling: probability and label, and its sentence."""
    return _told(result.causes)


def next_checks(result: CheckResult) -> tuple[tuple[str, str], ...]:
    """What to do on site next: what it tells apart, and what it takes."""
    return tuple((check.says, check_worth(check)) for check in result.next_checks)


def input_lines(result: CheckResult) -> tuple[str, ...]:
    """One line a file that the result rests on, with its sha256."""
    return tuple(
        f"sha256 of {item.file}: {item.sha256}"
        + (f" ({item.rows} rows, {item.rejected} rejected)" if item.rows else "")
        for item in result.inputs
    )


def fingerprint(result: CheckResult) -> str:
    """One sha256 for all inputs: that of their lines as ``sha256sum`` prints them, sorted by file name.

    So that it can be made again by hand: ``sha256sum FILES | sort -k 2 | sha256sum``.
    """
    lines = [f"{item.sha256}  {item.file}\n" for item in sorted(result.inputs, key=lambda item: item.file)]
    return hashlib.sha256("".join(lines).encode("utf-8", "surrogateescape")).hexdigest()


def made_by(result: CheckResult) -> str:
    """Which version of the tool, and which inputs."""
    return f"headledger {__version__}, inputs {fingerprint(result)[:16]}"


def _told(causes: tuple[CauseFound, ...]) -> tuple[tuple[str, str], ...]:
    told, rest = told_causes(causes)
    sentences = tuple((finding_title(cause), cause.says) for cause in told)
    return (*sentences, ("", rest)) if rest else sentences


def _behind(cause: CauseFound, gauge: GaugeFound) -> str:
    if cause.evidence is None:
        return ""
    odds = " ".join(against.says for against in cause.evidence.against)
    return f"{odds} {own_residuals(cause, gauge)}".strip()


def _paired(result: CheckResult, gauge: GaugeFound) -> tuple[tuple[SpellFound, GaugeSpell], ...]:
    by_id = {said.id: said for said in gauge.spells}
    return tuple((spell, by_id[spell.id]) for spell in result.spells if spell.id in by_id)


def _spell_row(result: CheckResult, gauge: GaugeFound, spell: SpellFound, said: GaugeSpell) -> tuple[str, ...]:
    noun = result.job.gauge(gauge.tag)
    flow = next((flow for flow in spell.flows if flow.run == noun.run), None)
    return (
        f"{spell.id} {spell.kind.value}",
        clock_range(spell.start_s, spell.end_s, ZoneInfo(result.job.timezone)),
        "" if flow is None else flow_words(flow, result.job.display.flow),
        *spell_columns(said, gauge.unit),
    )


def _ratio(gauge: GaugeFound) -> str:
    if not gauge.tolerance_pa > 0.0 or gauge.u95_pa != gauge.u95_pa:
        return "–"
    return f"{gauge.u95_pa / gauge.tolerance_pa:.2g}"


def _span_seen(result: CheckResult, gauge: GaugeFound) -> str:
    """How much of its range the gauge was seen to use: only there is it checked."""
    noun = result.job.gauge(gauge.tag)
    said = [spell.reading_pa for spell in gauge.spells if spell.reading_pa is not None]
    if not said:
        return "none"
    ends = [100.0 * (value - noun.range_low_pa) / noun.span_pa for value in (min(said), max(said))]
    return f"{ends[0]:.0f} to {ends[1]:.0f} %" if round(ends[0]) != round(ends[1]) else f"{ends[0]:.0f} %"
