"""The result file against its contract: keys, units, times, and no NaN."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest

from headledger import __version__
from headledger.diagnosis.result import CauseFound, CauseKind, CheckResult, GaugeHistory, Place, Verdict
from headledger.quantities import Dimension, Unit
from headledger.sheets.json_values import stamp
from headledger.sheets.to_json import cause_size, result_to_json, result_to_text
from tests.made_results import BAR, METRE, PSIG, found_gauge


def cause_of(kind: CauseKind, size: float | None, unit: Unit | None, place: Place = Place()) -> CauseFound:
    return CauseFound(kind=kind, place=place, size=size, u95=size, unit=unit, probability=0.9, accepted=True)


def test_result_file_of_a_troubled_job_has_the_promised_keys(troubled_result: CheckResult):
    written = result_to_json(troubled_result)
    assert written["format"] == 1
    assert written["headledger"] == __version__
    assert written["job"] == {
        "title": "Block C riser [east]",
        "inputs": [{"file": "log.csv", "sha256": "ab" * 32, "rows": 5400, "rejected": 1}],
    }
    assert set(written) >= {"spells", "clean_probability", "gauges", "causes", "next_checks", "rejects"}
    assert set(written["gauges"][0]) == {
        "tag", "station", "unit", "verdict", "outside_probability", "error", "u95", "tolerance", "spells", "causes",
        "given", "why", "budget", "history",
    }  # fmt: skip
    assert set(written["causes"][0]) == {
        "kind", "at", "size", "u95", "unit", "start", "start_u95", "probability", "accepted", "rivals", "says",
        "evidence",
    }  # fmt: skip


def test_budget_and_evidence_are_written_in_the_unit_of_the_gauge(troubled_result: CheckResult):
    """A bar is 100 000 Pa; a finding that spoils a reading leaves no number after."""
    written = result_to_json(troubled_result)
    assert written["gauges"][0]["budget"][0] == {"what": "class of PT-1", "percent": 61.0}
    assert written["gauges"][4]["budget"] == []
    evidence = written["causes"][0]["evidence"]
    assert evidence["against"][0] == {
        "kind": "wrong-elevation",
        "at": {"gauge": "PT-3"},
        "evidence_nats": 3.4657,
        "prior_nats": 0.0,
        "says": "The readings favour it 32 to 1 over a wrong elevation at PT-3.",
    }
    assert (evidence["against"][1]["kind"], evidence["against"][1]["at"]) == ("none", {})
    assert evidence["residuals"][3] == {
        "gauge": "PT-3", "spell": 1, "before": 0.21, "after": 0.0, "sd_before": 0.015, "sd_after": 0.015, "unit": "bar",
    }  # fmt: skip
    assert (evidence["residuals"][4]["after"], evidence["residuals"][4]["sd_after"]) == (None, None)
    assert evidence["misfit"] == {
        "before": 208.4,
        "after": 11.2,
        "count": 18,
        "says": "Misfit 208 → 11 over 18 readings (sum of squares, in standard deviations).",
    }


def test_finding_without_evidence_is_written_as_null(troubled_result: CheckResult):
    bare = replace(troubled_result, causes=(cause_of(CauseKind.NOISY, None, None),))
    assert result_to_json(bare)["causes"][0]["evidence"] is None


def test_every_key_of_budget_and_evidence_is_described_for_contributors(troubled_result: CheckResult):
    """The table of the result file in DEVELOPERS.md names each of them."""
    described = (Path(__file__).parents[2] / "DEVELOPERS.md").read_text(encoding="utf-8").split("## The result file")[1]
    evidence = result_to_json(troubled_result)["causes"][0]["evidence"]
    rows = [evidence["against"][0], evidence["residuals"][0], evidence["misfit"]]
    rows.append(result_to_json(troubled_result)["gauges"][0]["budget"][0])
    for key in {"budget", "evidence", *evidence, *(key for row in rows for key in row)}:
        assert f"`{key}`" in described, key


def test_gauge_numbers_are_in_the_unit_of_the_gauge(troubled_result: CheckResult):
    """PT-3 was made 21 000 Pa off with a tolerance of 6 000 Pa; a bar is 100 000 Pa."""
    gauge = result_to_json(troubled_result)["gauges"][2]
    assert (gauge["unit"], gauge["error"], gauge["u95"], gauge["tolerance"]) == ("barg", 0.21, 0.03, 0.06)
    assert gauge["spells"][0] == {"id": 1, "reading": 3.41, "expected": 3.2, "u95": 0.03}


def test_history_of_a_gauge_is_in_its_unit_and_null_where_there_is_none(troubled_result: CheckResult):
    """A bar is 100 000 Pa; 1 772 438 400 s is 2026-03-02 08:00 UTC."""
    kept = GaugeHistory(
        tag="PT-3", holds=False, leaves_at_s=1_772_438_400.0, by="cusum", zero_pa=2_000.0, zero_sd_pa=500.0,
        span_ratio=1.01, span_sd_ratio=0.004, says="They leave.",
    )  # fmt: skip
    gauges = result_to_json(replace(troubled_result, histories=(kept,)))["gauges"]
    assert gauges[0]["history"] is None
    assert gauges[2]["history"] == {
        "holds": False, "leaves": "2026-03-02T08:00:00Z", "by": "cusum", "spike": None, "zero": 0.02, "zero_sd": 0.005,
        "span": 1.01, "span_sd": 0.004, "says": "They leave.",
    }  # fmt: skip


def test_gauge_in_psi_is_written_to_six_digits(sound_result: CheckResult):
    """100 kPa is 14.5037737... psi (NIST SP 811: 1 psi is 6 894.757 Pa)."""
    gauge = replace(found_gauge("PT-1", "S1", Verdict.PASS, error_pa=1e5), unit=PSIG)
    assert result_to_json(replace(sound_result, gauges=(gauge,)))["gauges"][0]["error"] == 14.5038


def test_spell_times_and_flows_are_iso_utc_and_display_unit(troubled_result: CheckResult):
    spell = result_to_json(troubled_result)["spells"][1]
    assert (spell["start"], spell["end"]) == ("2026-03-02T08:30:00Z", "2026-03-02T08:45:00Z")
    assert spell["flows"][0] == {"run": "R1", "value": 36.0, "u95": 0.72, "unit": "m3/h"}
    assert (spell["kind"], spell["samples"]) == ("flowing", 900)


def test_stamp_with_a_fraction_keeps_milliseconds():
    assert stamp(0.25) == "1970-01-01T00:00:00.250Z"
    assert stamp(None) is None


def test_missing_numbers_become_null_and_never_nan(troubled_result: CheckResult):
    text = result_to_text(troubled_result)
    read_back = json.loads(text, parse_constant=lambda word: pytest.fail(f"{word} in the result file"))
    assert read_back["gauges"][4]["error"] is None
    assert read_back["gauges"][4]["spells"][0]["expected"] is None


def test_result_text_of_odd_names_stays_readable_utf_8(troubled_result: CheckResult):
    job = replace(troubled_result.job, title='Größe "ß" [m]\n')
    read_back = json.loads(result_to_text(replace(troubled_result, job=job)))
    assert read_back["job"]["title"] == 'Größe "ß" [m]\n'


@pytest.mark.parametrize(
    ("cause", "expected"),
    [
        (cause_of(CauseKind.ZERO_SHIFT, 21_000.0, BAR), (0.21, "bar")),
        (cause_of(CauseKind.SPAN_ERROR, 1.02, None), (1.02, "")),
        (cause_of(CauseKind.BLOCKAGE, 14.2, None), (14.2, "")),
        # 1 bar an hour is 100 000 Pa in 3 600 s.
        (cause_of(CauseKind.DRIFT, 1e5 / 3600.0, BAR), (1.0, "bar/h")),
        (cause_of(CauseKind.LEAK, -1e5 / 7200.0, BAR), (-0.5, "bar/h")),
        (cause_of(CauseKind.WRONG_ELEVATION, 2.5, METRE), (2.5, "m")),
        # The foot is 0.3048 m exactly.
        (cause_of(CauseKind.AIR_POCKET, 3.048, Unit("ft", Dimension.LENGTH, 0.3048)), (10.0, "ft")),
        (cause_of(CauseKind.SLUGGISH, 30.0, None), (30.0, "s")),
        (cause_of(CauseKind.CLOCK_OFFSET, 30.0, Unit("s", Dimension.TIME, 1.0)), (30.0, "s")),
        (cause_of(CauseKind.SWAPPED, None, None), (None, "")),
    ],
)
def test_cause_size_is_in_its_own_unit(cause: CauseFound, expected: tuple[float | None, str]):
    size, u95, unit = cause_size(cause)
    assert (size, unit) == (pytest.approx(expected[0], rel=1e-12) if expected[0] else None, expected[1])
    assert u95 == size


@pytest.mark.parametrize(
    ("place", "expected"),
    [
        (Place(gauge="PT-1"), {"gauge": "PT-1"}),
        (Place(gauges=("PT-1", "PT-2")), {"gauges": ["PT-1", "PT-2"]}),
        (Place(run="R1"), {"run": "R1"}),
        (Place(station="S1"), {"station": "S1"}),
        (Place(), {}),
    ],
)
def test_place_is_named_by_what_it_is(sound_result: CheckResult, place: Place, expected: dict[str, object]):
    cause = cause_of(CauseKind.STEP, 1.0, BAR, place)
    assert result_to_json(replace(sound_result, causes=(cause,)))["causes"][0]["at"] == expected


def test_rival_and_start_are_written(troubled_result: CheckResult):
    cause = replace(troubled_result.causes[0], start_s=1_772_438_400.0)
    written = result_to_json(replace(troubled_result, causes=(cause,)))["causes"][0]
    assert written["start"] == "2026-03-02T08:00:00Z"
    assert written["rivals"] == [{"kind": "wrong-elevation", "at": {"gauge": "PT-3"}, "probability": 0.03}]


def test_rejects_are_listed_by_file_and_line(troubled_result: CheckResult):
    assert result_to_json(troubled_result)["rejects"] == [
        {"file": "log.csv", "line": 120, "column": "PT-3", "text": "BAD [x]", "why": "not a number"}
    ]
