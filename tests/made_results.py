"""Results made by hand, so that reports and screens are tested without a log or a check."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np

from headledger.diagnosis.result import (
    Against,
    BudgetShare,
    CauseFound,
    CauseKind,
    CheckResult,
    Evidence,
    FlowFound,
    GaugeFound,
    GaugeSpell,
    GradeStep,
    InputFile,
    Place,
    Residual,
    Rival,
    RunGrade,
    SpellFound,
    Trend,
    Verdict,
)
from headledger.plant.digest import Reject
from headledger.plant.gauges import ErrorLimit, Gauge
from headledger.plant.job import Job, SpellKind
from headledger.plant.runs import Run
from headledger.plant.stations import Station
from headledger.quantities import Dimension, PressureKind, Unit

BARG = Unit("barg", Dimension.PRESSURE, 1e5, kind=PressureKind.GAUGE)
BAR = Unit("bar", Dimension.PRESSURE, 1e5, kind=PressureKind.DIFFERENCE)
PSIG = Unit("psig", Dimension.PRESSURE, 6894.757293168361, kind=PressureKind.GAUGE)
METRE = Unit("m", Dimension.LENGTH, 1.0)
# 2026-03-02 08:00 UTC
EIGHT_O_CLOCK_S = 1_772_438_400.0

BUDGET = (
    BudgetShare(what="class of PT-1", percent=61.0),
    BudgetShare(what="elevation of S4 [survey]", percent=38.2),
    BudgetShare(what="the rest", percent=0.8),
)


def left_at(tag: str, spell: int, before_pa: float, after_pa: float | None) -> Residual:
    """A reading off by so much with no cause and with one, give or take 1 500 Pa."""
    after_sd_pa = None if after_pa is None else 1_500.0
    return Residual(
        tag=tag, spell=spell, before_pa=before_pa, after_pa=after_pa, sd_before_pa=1_500.0, sd_after_pa=after_sd_pa
    )


SHIFT_EVIDENCE = Evidence(
    against=(
        Against(
            kind=CauseKind.WRONG_ELEVATION,
            place=Place(gauge="PT-3"),
            evidence_nats=3.4657,
            prior_nats=0.0,
            says="The readings favour it 32 to 1 over a wrong elevation at PT-3.",
        ),
        Against(
            kind=None,
            place=Place(),
            evidence_nats=98.0,
            prior_nats=-5.0,
            says="The readings favour it more than 1000 to 1 over nothing wrong; beforehand it was the less likely, 148 to 1.",
        ),
    ),
    residuals=(
        left_at("PT-1", 1, 400.0, 300.0),
        left_at("PT-1", 2, -500.0, -400.0),
        left_at("PT-2", 1, -7_000.0, -200.0),
        left_at("PT-3", 1, 21_000.0, 0.0),
        left_at("PT-3", 2, 20_500.0, None),
        left_at("PT-4", 2, -3_500.0, 4_000.0),
    ),
    misfit_before=208.4,
    misfit_after=11.2,
    count=18,
    says="Misfit 208 → 11 over 18 readings (sum of squares, in standard deviations).",
)

ZERO_SHIFT = CauseFound(
    kind=CauseKind.ZERO_SHIFT,
    place=Place(gauge="PT-3"),
    size=21_000.0,
    u95=3_000.0,
    unit=BAR,
    probability=0.96,
    accepted=True,
    rivals=(Rival(kind=CauseKind.WRONG_ELEVATION, place=Place(gauge="PT-3"), probability=0.03),),
    says="PT-3 reads 0.21 bar high at every flow.",
    evidence=SHIFT_EVIDENCE,
)
BLOCKAGE = CauseFound(
    kind=CauseKind.BLOCKAGE,
    place=Place(run="R2"),
    size=14.2,
    u95=5.1,
    unit=None,
    probability=0.55,
    accepted=False,
    rivals=(Rival(kind=CauseKind.SPAN_ERROR, place=Place(gauge="PT-4"), probability=0.42),),
    says="Run R2 loses 0.31 bar more than the 0.12 bar expected at 36 m3/h. "
    "Or it is a span error at PT-4 (42 %): these readings cannot tell which.",
    evidence=Evidence(
        against=(
            Against(
                kind=CauseKind.SPAN_ERROR,
                place=Place(gauge="PT-4"),
                evidence_nats=0.1,
                prior_nats=0.0,
                says="The readings do not tell it from a span error at PT-4, and beforehand neither was likelier.",
            ),
        ),
        residuals=(left_at("PT-4", 1, 0.0, 0.0), left_at("PT-4", 2, -11_000.0, -300.0)),
        misfit_before=208.4,
        misfit_after=10.9,
        count=18,
        says="Misfit 208 → 11 over 18 readings with it and a zero shift at PT-3 (sum of squares, in standard deviations).",
    ),
)


def made_gauge(tag: str, station: str, run: str) -> Gauge:
    """A 0 to 10 bar gauge of class 0.6."""
    limit = ErrorLimit(limit_pa=6_000.0, outer_limit_pa=6_000.0, text="0.6 % span")
    return Gauge(
        tag=tag,
        station=station,
        run=run,
        unit=BARG,
        range_low_pa=0.0,
        range_high_pa=1e6,
        accuracy=limit,
        tolerance=limit,
        column=tag,
    )


def made_job() -> Job:
    """Four stations in a row, a gauge at each, and one more at the last."""
    stations = tuple(Station(name=f"S{i}", elevation_m=3.0 * i, elevation_sd_m=0.01) for i in range(1, 5))
    runs = tuple(Run(name=f"R{i}", start=f"S{i}", end=f"S{i + 1}", bore_m=0.1, length_m=40.0) for i in range(1, 4))
    gauges = tuple(made_gauge(f"PT-{i}", f"S{min(i, 4)}", f"R{min(i, 3)}") for i in range(1, 6))
    return Job(
        folder=Path("riser"),
        title="Block C riser [east]",
        site_name="Quay 4",
        stations=stations,
        runs=runs,
        gauges=gauges,
    )


def made_spell(number: int, kind: SpellKind, flow_m3_h: float, *, blocked: bool = False) -> SpellFound:
    """A quarter of an hour of 900 rows, all three runs at one flow."""
    start_s = EIGHT_O_CLOCK_S + 1800.0 * (number - 1)
    flows = tuple(
        FlowFound(run=f"R{i}", flow_m3_s=flow_m3_h / 3600.0, u95_m3_s=0.02 * flow_m3_h / 3600.0) for i in range(1, 4)
    )
    return SpellFound(
        id=number,
        kind=kind,
        start_s=start_s,
        end_s=start_s + 900.0,
        samples=900,
        flows=flows,
        grade=tuple(made_grade(i, flow_m3_h, blocked=blocked) for i in range(1, 4)),
    )


def head_m(station: int, flow_m3_h: float) -> float:
    """Head of the made job's grade line: 42 m, and 0.8 m lost in each run at 36 m³/h, in R2 1.6 m."""
    return 42.0 - 0.8 * (flow_m3_h / 36.0) ** 2 * (station - 1 + (station > 2))


def made_grade(number: int, flow_m3_h: float, *, blocked: bool) -> RunGrade:
    """The grade line of one run; half of what R2 loses may be a blockage, the second cause of the result."""
    step = GradeStep(cause=1, drop_m=0.8 * (flow_m3_h / 36.0) ** 2)
    return RunGrade(
        run=f"R{number}",
        is_open=True,
        start_m=head_m(number, flow_m3_h),
        end_m=head_m(number + 1, flow_m3_h),
        start_u95_m=0.1,
        end_u95_m=0.1,
        steps=(step,) if number == 2 and flow_m3_h and blocked else (),
    )


def found_gauge(tag: str, station: str, verdict: Verdict, **changes: object) -> GaugeFound:
    """A gauge of 3.2 bar in both spells, 0.005 ± 0.03 bar off; `changes` replace fields."""
    number = min(int(tag[-1]), 4) if tag[-1].isdigit() else 4
    spells = tuple(
        GaugeSpell(
            id=i,
            reading_pa=320_500.0,
            expected_pa=320_000.0,
            u95_pa=3_000.0,
            head_m=head_m(number, flow) + 0.05,
            expected_head_m=head_m(number, flow),
            head_u95_m=0.3,
        )
        for i, flow in ((1, 0.0), (2, 36.0))
    )
    gauge = GaugeFound(
        tag=tag,
        station=station,
        unit=BARG,
        verdict=verdict,
        outside_probability=0.004,
        error_pa=500.0,
        u95_pa=3_000.0,
        tolerance_pa=6_000.0,
        spells=spells,
        budget=BUDGET,
    )
    return replace(gauge, **changes)  # type: ignore[arg-type]


def made_reading(number: int, reading_pa: float, expected_pa: float, u95_pa: float, head: float) -> GaugeSpell:
    """A reading with the heads that belong to it, the liquid weighing 9 800 Pa a metre."""
    return GaugeSpell(
        id=number,
        reading_pa=reading_pa,
        expected_pa=expected_pa,
        u95_pa=u95_pa,
        head_m=head + (reading_pa - expected_pa) / 9_800.0,
        expected_head_m=head,
        head_u95_m=u95_pa / 9_800.0,
    )


def made_trend() -> Trend:
    """A reading every half minute over both spells; the third gauge stands a little higher."""
    start_s = np.asarray(EIGHT_O_CLOCK_S + 30.0 * np.arange(90), dtype=np.float64)
    reading = np.where(start_s < EIGHT_O_CLOCK_S + 1200.0, 320_500.0, 290_500.0)[:, None] + np.zeros((90, 5))
    reading[:, 2] += 20_000.0
    reading[40:44, 0] = np.nan
    return Trend(start_s=start_s, width_s=30.0, reading_pa=reading)


def sound_result() -> CheckResult:
    """Every gauge passes, no cause, nothing rejected."""
    return CheckResult(
        job=made_job(),
        inputs=(InputFile(file="log.csv", rows=5400, rejected=0, fingerprint=lambda: "ab" * 32),),
        spells=(made_spell(1, SpellKind.STILL, 0.0), made_spell(2, SpellKind.FLOWING, 36.0)),
        clean_probability=0.97,
        gauges=tuple(found_gauge(f"PT-{i}", f"S{min(i, 4)}", Verdict.PASS) for i in range(1, 6)),
        causes=(),
        trend=made_trend(),
    )


def troubled_result() -> CheckResult:
    """PT-3 fails by a zero shift, PT-4 and run R2 are not told apart, PT-5 is unchecked, one cell rejected."""
    failed = found_gauge(
        "PT-3",
        "S3",
        Verdict.FAIL,
        outside_probability=0.994,
        error_pa=21_000.0,
        causes=(0,),
        spells=(
            made_reading(1, 341_000.0, 320_000.0, 3_000.0, head_m(3, 0.0)),
            made_reading(2, 309_000.0, 288_000.0, 4_000.0, head_m(3, 36.0)),
        ),
        why="PT-3 is 0.21 bar high in both spells, more than three times its tolerance of 0.06 bar.",
    )
    open_question = found_gauge(
        "PT-4",
        "S4",
        Verdict.UNRESOLVED,
        outside_probability=0.43,
        error_pa=-11_000.0,
        u95_pa=26_000.0,
        given=(1,),
        why="PT-4 is low only while the liquid flows: by its own slope, or by a blockage in R2.",
    )
    alone = found_gauge(
        "PT-5",
        "S4",
        Verdict.UNCHECKED,
        outside_probability=0.5,
        error_pa=float("nan"),
        u95_pa=float("nan"),
        spells=(GaugeSpell(id=1, reading_pa=310_000.0, expected_pa=None, u95_pa=None),),
        budget=(),
        why="Nothing else in the data determines the pressure at PT-5.",
    )
    sound = sound_result()
    return replace(
        sound,
        spells=(made_spell(1, SpellKind.STILL, 0.0), made_spell(2, SpellKind.FLOWING, 36.0, blocked=True)),
        inputs=(InputFile(file="log.csv", rows=5400, rejected=1, fingerprint=lambda: "ab" * 32),),
        clean_probability=0.004,
        gauges=(*sound.gauges[:2], failed, open_question, alone),
        causes=(ZERO_SHIFT, BLOCKAGE),
        rejects=(Reject(file="log.csv", line=120, column="PT-3", text="BAD [x]", why="not a number"),),
        reject_count=1,
        remarks=("S1 and S4 were taken as open: one run ends there.",),
    )
