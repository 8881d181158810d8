"""The result file: a check's result as plain JSON values, for other programs to read."""

from __future__ import annotations

import json
from typing import Any

from headledger import __version__
from headledger.diagnosis.result import (
    Against,
    CauseFound,
    CauseKind,
    CheckResult,
    Evidence,
    GaugeFound,
    GaugeHistory,
    GaugeSpell,
    NextCheck,
    Residual,
    Rival,
    RunGrade,
    SpellFound,
)
from headledger.plant.digest import Reject
from headledger.quantities import Unit
from headledger.sheets.json_values import in_unit, number, place_to_json, scaled, stamp
from headledger.sheets.sight_json import sight_to_json

RESULT_FORMAT = 1

_SECONDS_PER_HOUR = 3600.0
_PER_HOUR = frozenset({CauseKind.DRIFT, CauseKind.LEAK})
_IN_SECONDS = frozenset({CauseKind.SLUGGISH, CauseKind.CLOCK_OFFSET})


def result_to_json(result: CheckResult) -> dict[str, Any]:
    """The result as the result file holds it: units of the job, times in UTC, null where there is no number."""
    units = {gauge.tag: gauge.unit for gauge in result.gauges}
    return {
        "format": RESULT_FORMAT,
        "headledger": __version__,
        "job": {
            "title": result.job.title,
            "inputs": [
                {"file": item.file, "sha256": item.sha256, "rows": item.rows, "rejected": item.rejected}
                for item in result.inputs
            ],
        },
        "spells": [_spell(spell, result.job.display.flow, result.job.display.length) for spell in result.spells],
        "clean_probability": number(result.clean_probability),
        "gauges": [
            _gauge(gauge)
            | {"history": next((_history(h, gauge.unit) for h in result.histories if h.tag == gauge.tag), None)}
            for gauge in result.gauges
        ],
        "causes": [
            _cause(cause) | {"evidence": cause.evidence and _evidence(cause.evidence, units)} for cause in result.causes
        ],
        "next_checks": [_next_check(check) for check in result.next_checks],
        "rejects": [_reject(reject) for reject in result.rejects],
        "remarks": list(result.remarks),
        "answers": list(result.answers),
        "unexplained": result.unexplained or None,
        "sight": None if result.sight is None else sight_to_json(result.job, result.sight),
    }


def result_to_text(result: CheckResult, *, ascii_only: bool = False) -> str:
    """The result file as text, ending in a line feed; never holds NaN or Infinity."""
    return json.dumps(result_to_json(result), ensure_ascii=ascii_only, indent=2, allow_nan=False) + "\n"


def cause_size(cause: CauseFound) -> tuple[float | None, float | None, str]:
    """Size of a cause, its u95, and their unit: empty for ratios and coefficients, per hour for what grows in time."""
    if cause.kind in _IN_SECONDS and cause.unit is None:
        return cause.size, cause.u95, "s"
    if cause.unit is None:
        return cause.size, cause.u95, ""
    times = _SECONDS_PER_HOUR if cause.kind in _PER_HOUR else 1.0
    suffix = "/h" if cause.kind in _PER_HOUR else ""
    scale = times / cause.unit.factor
    return scaled(cause.size, scale), scaled(cause.u95, scale), cause.unit.as_difference().text + suffix


def _spell(spell: SpellFound, flow_unit: Unit, length_unit: Unit) -> dict[str, Any]:
    return {
        "id": spell.id,
        "kind": spell.kind.value,
        "start": stamp(spell.start_s),
        "end": stamp(spell.end_s),
        "samples": spell.samples,
        "flows": [
            {
                "run": flow.run,
                "value": in_unit(flow.flow_m3_s, flow_unit),
                "u95": in_unit(flow.u95_m3_s, flow_unit),
                "unit": flow_unit.text,
            }
            for flow in spell.flows
        ],
        "grade": [_grade(grade, length_unit) for grade in spell.grade],
    }


def _grade(grade: RunGrade, unit: Unit) -> dict[str, Any]:
    return {
        "run": grade.run,
        "open": grade.is_open,
        "start": in_unit(grade.start_m, unit),
        "end": in_unit(grade.end_m, unit),
        "start_u95": in_unit(grade.start_u95_m, unit),
        "end_u95": in_unit(grade.end_u95_m, unit),
        "unit": unit.text,
        "steps": [{"cause": step.cause, "drop": in_unit(step.drop_m, unit)} for step in grade.steps],
    }


def _gauge(gauge: GaugeFound) -> dict[str, Any]:
    return {
        "tag": gauge.tag,
        "station": gauge.station,
        "unit": gauge.unit.text,
        "verdict": gauge.verdict.value,
        "outside_probability": number(gauge.outside_probability),
        "error": in_unit(gauge.error_pa, gauge.unit),
        "u95": in_unit(gauge.u95_pa, gauge.unit),
        "tolerance": in_unit(gauge.tolerance_pa, gauge.unit),
        "spells": [_gauge_spell(spell, gauge.unit) for spell in gauge.spells],
        "causes": list(gauge.causes),
        "given": list(gauge.given),
        "why": gauge.why,
        "budget": [{"what": share.what, "percent": number(share.percent)} for share in gauge.budget],
    }


def _gauge_spell(spell: GaugeSpell, unit: Unit) -> dict[str, Any]:
    return {
        "id": spell.id,
        "reading": in_unit(spell.reading_pa, unit),
        "expected": in_unit(spell.expected_pa, unit),
        "u95": in_unit(spell.u95_pa, unit),
    }


def _history(history: GaugeHistory, unit: Unit) -> dict[str, Any]:
    # a zero is on the gauge's own scale, its standard error a difference
    zero = None if history.zero_pa is None else (history.zero_pa - unit.offset) / unit.factor
    return {
        "holds": history.holds,
        "leaves": stamp(history.leaves_at_s),
        "by": history.by,
        "spike": stamp(history.spike_s),
        "zero": number(zero),
        "zero_sd": in_unit(history.zero_sd_pa, unit),
        "span": number(history.span_ratio),
        "span_sd": number(history.span_sd_ratio),
        "says": history.says,
    }


def _cause(cause: CauseFound) -> dict[str, Any]:
    size, u95, unit_text = cause_size(cause)
    return {
        "kind": cause.kind.value,
        "at": place_to_json(cause.place),
        # a ratio of units is exact, and rounding would put it outside its u95 of nothing
        "size": size if u95 == 0.0 else number(size),
        "u95": number(u95),
        "unit": unit_text,
        "start": stamp(cause.start_s),
        "start_u95": number(cause.start_u95_s),
        "probability": number(cause.probability),
        "accepted": cause.accepted,
        "rivals": [_rival(rival) for rival in cause.rivals],
        "says": cause.says,
    }


def _evidence(evidence: Evidence, units: dict[str, Unit]) -> dict[str, Any]:
    return {
        "against": [_against(against) for against in evidence.against],
        "residuals": [_residual(residual, units[residual.tag]) for residual in evidence.residuals],
        "misfit": {
            "before": number(evidence.misfit_before),
            "after": number(evidence.misfit_after),
            "count": evidence.count,
            "says": evidence.says,
        },
    }


def _against(against: Against) -> dict[str, Any]:
    return {
        # the same word that `next_checks` have for it
        "kind": "none" if against.kind is None else against.kind.value,
        "at": place_to_json(against.place),
        "evidence_nats": number(against.evidence_nats),
        "prior_nats": number(against.prior_nats),
        "says": against.says,
    }


def _residual(residual: Residual, unit: Unit) -> dict[str, Any]:
    return {
        "gauge": residual.tag,
        "spell": residual.spell,
        "before": in_unit(residual.before_pa, unit),
        "after": in_unit(residual.after_pa, unit),
        "sd_before": in_unit(residual.sd_before_pa, unit),
        "sd_after": in_unit(residual.sd_after_pa, unit),
        "unit": unit.as_difference().text,
    }


def _next_check(check: NextCheck) -> dict[str, Any]:
    return {
        "action": check.action,
        "at": place_to_json(check.place),
        "gain_bits": number(check.gain_bits),
        "minutes": number(check.minutes),
        "separates": [list(pair) for pair in check.separates],
        "says": check.says,
        "caution": check.caution,
    }


def _rival(rival: Rival) -> dict[str, Any]:
    return {
        "kind": rival.kind.value,
        "at": place_to_json(rival.place),
        "probability": number(rival.probability),
    }


def _reject(reject: Reject) -> dict[str, Any]:
    return {
        "file": reject.file,
        "line": reject.line,
        "column": reject.column,
        "text": reject.text,
        "why": reject.why,
    }
