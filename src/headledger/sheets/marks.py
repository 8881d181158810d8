"""Marks, words and order of verdicts, and the cautions: the same on every report, screen and sheet."""

from __future__ import annotations

from collections.abc import Iterable

from headledger.diagnosis.result import GaugeFound, Verdict

MARKS: dict[Verdict, str] = {
    Verdict.FAIL: "▲",
    Verdict.UNRESOLVED: "?",
    Verdict.UNCHECKED: "–",
    Verdict.PASS: "✓",
}

CAUTIONS: tuple[str, ...] = (
    "A reading of zero does not prove that a line is without pressure.",
    "Before anything is opened: isolate, vent and lock out by the site's own rules.",
    "Trapped air under test pressure stores energy that water does not.",
    "Hydrostatic tests and acceptance limits follow the local code and a licensed person; "
    "this report replaces neither.",
)

_TROUBLE = tuple(MARKS)


def verdict_label(verdict: Verdict) -> str:
    """Mark and word of a verdict, never one without the other."""
    return f"{MARKS[verdict]} {verdict.value}"


def by_trouble(gauges: Iterable[GaugeFound]) -> tuple[GaugeFound, ...]:
    """The gauges with the worst news first; among equals the more probably outside, then as the table has them."""
    return tuple(sorted(gauges, key=lambda gauge: (_TROUBLE.index(gauge.verdict), -gauge.outside_probability)))
