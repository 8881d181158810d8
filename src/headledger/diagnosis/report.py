"""From the judged model to the result: pieces of time back to spells, indices to names, deviations to k = 2."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from headledger.diagnosis.contributions import budget_of
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import Finding, Key
from headledger.diagnosis.grade import run_grades, tap_head_m
from headledger.diagnosis.own_error import Expected, expected_readings
from headledger.diagnosis.result import (
    SIZELESS,
    CauseFound,
    Evidence,
    FlowFound,
    GaugeFound,
    GaugeSpell,
    GradeStep,
    RunGrade,
    SpellFound,
    Verdict,
)
from headledger.diagnosis.search import Posterior
from headledger.diagnosis.verdicts import Judged
from headledger.diagnosis.wording import cause_sentence, verdict_sentence


def pieces_by_spell(model: Model) -> dict[int, list[int]]:
    """Indices of the pieces of every spell, by its number."""
    found: dict[int, list[int]] = {}
    for index, spell in enumerate(model.spells):
        found.setdefault(spell.id, []).append(index)
    return found


def spells_found(model: Model, posterior: Posterior, findings: Sequence[Finding]) -> tuple[SpellFound, ...]:
    """Every spell with the flow of every run and the grade line along it, under the leading explanation."""
    keys = [(finding.kind, finding.place) for finding in findings]
    return tuple(_spell(model, posterior, pieces, keys) for pieces in pieces_by_spell(model).values())


def _spell(model: Model, posterior: Posterior, pieces: Sequence[int], keys: Sequence[Key]) -> SpellFound:
    leading = posterior.leading
    linear = leading.frame.linear
    flows = np.mean([linear.states[k].flow_m3_s for k in pieces], axis=0)
    model = linear.model
    deviations = np.mean([model.flow_sd_m3_s(linear, k) for k in pieces], axis=0)
    grades = [run_grades(model, leading.frame, leading.chosen, k, keys) for k in pieces]
    first, last = model.spells[pieces[0]], model.spells[pieces[-1]]
    return SpellFound(
        id=first.id,
        kind=first.kind,
        start_s=first.start_s,
        end_s=last.end_s,
        samples=sum(model.spells[k].samples for k in pieces),
        flows=tuple(
            FlowFound(run=run.name, flow_m3_s=float(flow), u95_m3_s=2.0 * float(sd))
            for run, flow, sd in zip(model.layout.job.runs, flows, deviations, strict=True)
        ),
        grade=tuple(_mean_grade(together) for together in zip(*grades, strict=True)),
    )


def _mean_grade(pieces: Sequence[RunGrade]) -> RunGrade:
    """The grade line of one run over the pieces of a spell."""

    def mean(name: str) -> float:
        return float(np.mean([getattr(piece, name) for piece in pieces]))

    drops: dict[int, float] = {}
    for piece in pieces:
        for step in piece.steps:
            drops[step.cause] = drops.get(step.cause, 0.0) + step.drop_m / len(pieces)
    return RunGrade(
        run=pieces[0].run,
        is_open=pieces[0].is_open,
        start_m=mean("start_m"),
        end_m=mean("end_m"),
        start_u95_m=mean("start_u95_m"),
        end_u95_m=mean("end_u95_m"),
        steps=tuple(GradeStep(cause=cause, drop_m=drop) for cause, drop in drops.items()),
    )


def gauge_found(
    model: Model, posterior: Posterior, findings: Sequence[Finding], gauge: int, judged: Judged
) -> GaugeFound:
    """One gauge's verdict with its numbers by spell and what it leans on."""
    noun = model.layout.job.gauges[gauge]
    causes = tuple(i for i, f in enumerate(findings) if gauge in f.mark.own)
    given = tuple(i for i, f in enumerate(findings) if not f.mark.own and (f.kind, f.place) in posterior.leading.keys)
    expected: Expected | None = None
    if any(np.isfinite(spell.reading_pa[gauge]) for spell in model.spells):
        expected = expected_readings(model, posterior.leading, gauge)
    return GaugeFound(
        tag=noun.tag,
        station=noun.station,
        unit=noun.unit,
        verdict=judged.verdict,
        outside_probability=judged.outside_probability,
        error_pa=judged.error_pa,
        u95_pa=judged.u95_pa,
        tolerance_pa=judged.tolerance_pa,
        spells=_gauge_spells(model, posterior, gauge, judged, expected),
        causes=causes,
        given=given,
        why=verdict_sentence(noun, judged, [findings[i] for i in causes], [findings[i] for i in given]),
        budget=budget_of(model, posterior.leading, gauge, judged.spell) if judged.spell >= 0 else (),
    )


def _gauge_spells(
    model: Model, posterior: Posterior, gauge: int, judged: Judged, expected: Expected | None
) -> tuple[GaugeSpell, ...]:
    """A gauge's reading and what it should have been, spell by spell."""
    said = {} if expected is None else {int(s): i for i, s in enumerate(expected.spells)}
    has_head = not model.layout.job.gauges[gauge].is_differential
    rows = []
    for number, pieces in pieces_by_spell(model).items():
        readings = [
            float(model.spells[k].reading_pa[gauge]) for k in pieces if np.isfinite(model.spells[k].reading_pa[gauge])
        ]
        reading = float(np.mean(readings)) if readings else None
        value = u95 = None
        known = [said[k] for k in pieces if k in said]
        if expected is not None and known and judged.verdict is not Verdict.UNCHECKED:
            value, u95 = float(np.mean(expected.value_pa[known])), 2.0 * float(np.mean(expected.sd_pa[known]))
        state = posterior.leading.frame.linear.states[pieces[len(pieces) // 2]]
        heads = [None if not has_head or pa is None else tap_head_m(model, state, gauge, pa) for pa in (reading, value)]
        rows.append(
            GaugeSpell(
                id=number,
                reading_pa=reading,
                expected_pa=value,
                u95_pa=u95,
                head_m=heads[0],
                expected_head_m=heads[1],
                head_u95_m=None if u95 is None or heads[1] is None else u95 / state.head_weight_pa_m,
            )
        )
    return tuple(rows)


def cause_found(model: Model, finding: Finding, evidence: Evidence | None) -> CauseFound:
    """One finding as the result has it."""
    return CauseFound(
        kind=finding.kind,
        place=finding.place,
        size=None if finding.kind in SIZELESS else finding.mark.reported(finding.size),
        u95=None if finding.kind in SIZELESS else 2.0 * finding.sd * abs(finding.mark.size_factor),
        unit=finding.mark.unit,
        start_s=finding.mark.start_s,
        start_u95_s=None if finding.mark.start_s is None else 2.0 * finding.start_sd_s,
        probability=finding.probability,
        accepted=finding.accepted,
        rivals=finding.rivals,
        says=cause_sentence(model, finding),
        evidence=evidence,
    )
