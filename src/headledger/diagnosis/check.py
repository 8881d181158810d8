"""The pipeline of a check, readable top to bottom: job and log in, result out."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np

from headledger.diagnosis.averages import spell_means
from headledger.diagnosis.circulation import circulations
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import Finding, list_findings
from headledger.diagnosis.grade import run_grades, tap_head_m
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.readings import read_timeline
from headledger.diagnosis.result import (
    SIZELESS,
    CauseFound,
    CheckResult,
    FlowFound,
    GaugeFound,
    GaugeSpell,
    InputFile,
    SpellFound,
    Trend,
    Verdict,
)
from headledger.diagnosis.search import Posterior, search
from headledger.diagnosis.spells import find_spells, unread_spells
from headledger.diagnosis.vapour import vapour_findings
from headledger.diagnosis.verdicts import Expected, Judged, expected_readings, judge_gauge
from headledger.diagnosis.wording import cause_sentence, verdict_sentence
from headledger.errors import JobError, NothingToCheckError, Problem
from headledger.plant.digest import Digest
from headledger.plant.job import Job
from headledger.readers.job import read_job
from headledger.readers.log_files import file_sha256
from headledger.readers.logs import read_logs

Progress = Callable[[str, float], None]


def check_folder(
    folder: Path, *, on_progress: Progress | None = None, should_stop: Callable[[], bool] | None = None
) -> CheckResult:
    """Check the job in a folder.

    Parameters
    ----------
    folder : Path
    on_progress : callable, optional
        Called with what is being done and how far it is, 0 to 1.
    should_stop : callable, optional
        Asked now and then; the judgement ends early when it says so.

    Returns
    -------
    CheckResult

    Raises
    ------
    JobError
        The job or its logs cannot be used; carries every problem.
    NothingToCheckError
        No spell holds a reading.
    """
    tell = on_progress or (lambda _what, _share: None)
    tell("reading the job", 0.0)
    job = read_job(folder)
    tell("reading the log", 0.05)
    digests = read_logs(job, on_progress=lambda share: tell("reading the log", 0.05 + 0.35 * share))
    return check_job(job, digests, on_progress=tell, should_stop=should_stop)


def check_job(
    job: Job,
    digests: Sequence[Digest],
    *,
    on_progress: Progress | None = None,
    should_stop: Callable[[], bool] | None = None,
) -> CheckResult:
    """Check a job on the digests of its logs.

    Parameters
    ----------
    job : Job
    digests : sequence of Digest
    on_progress, should_stop
        As for `check_folder`.

    Returns
    -------
    CheckResult

    Raises
    ------
    JobError, NothingToCheckError
        As for `check_folder`.
    """
    tell = on_progress or (lambda _what, _share: None)
    layout = Layout(job)
    timeline = read_timeline(layout, digests)
    tell("finding spells", 0.45)
    stretches = find_spells(layout, timeline)
    spells = spell_means(layout, timeline, stretches)
    if not spells:
        raise NothingToCheckError(
            f"{job.title}: the log holds no stretch in which the flow state is steady and a gauge gives a reading. "
            "State spells in spells.csv, or take a longer reading at one flow."
        )
    tell("weighing causes", 0.5)
    model = Model(layout, spells)
    try:
        posterior = search(model, should_stop=should_stop)
    except np.linalg.LinAlgError as error:
        raise JobError([_too_far_apart(job)]) from error
    findings = sorted(
        [*list_findings(posterior), *vapour_findings(model, posterior)], key=lambda finding: -finding.probability
    )
    tell("judging gauges", 0.85)
    judged = [judge_gauge(model, posterior, gauge) for gauge in range(layout.gauge_count)]
    return CheckResult(
        job=job,
        inputs=_inputs(job, digests),
        spells=tuple(_spell(model, posterior, findings, index) for index in range(len(spells))),
        clean_probability=posterior.clean_probability,
        gauges=tuple(_gauge(model, posterior, findings, gauge, one) for gauge, one in enumerate(judged)),
        causes=tuple(_cause(model, finding) for finding in findings),
        rejects=tuple(reject for digest in digests for reject in digest.rejects),
        reject_count=sum(digest.reject_count for digest in digests),
        remarks=(*job.remarks, *timeline.remarks, *unread_spells(job, stretches), *circulations(model)),
        trend=Trend(start_s=timeline.start_s, width_s=timeline.width_s, reading_pa=timeline.reading_pa),
    )


def _too_far_apart(job: Job) -> Problem:
    """The problem of numbers that no arithmetic can weigh together."""
    return Problem(
        place=job.title,
        fault="its numbers lie too far apart to be weighed together",
        expected="elevations, bores, flows, ranges and accuracies that belong to one system; look for one off by powers of ten",
    )


def _inputs(job: Job, digests: Sequence[Digest]) -> tuple[InputFile, ...]:
    """Every file that the result rests on, with its fingerprint."""
    logs = {
        digest.file: InputFile(
            file=digest.file, sha256=file_sha256(path), rows=digest.row_count, rejected=digest.reject_count
        )
        for digest, path in zip(digests, job.log_files, strict=True)
    }
    tables = [
        InputFile(file=path.name, sha256=file_sha256(path), rows=0, rejected=0)
        for path in job.files
        if path not in job.log_files
    ]
    return (*tables, *logs.values())


def _spell(model: Model, posterior: Posterior, findings: Sequence[Finding], index: int) -> SpellFound:
    """One spell with the flow of every run and the grade line along it, under the leading explanation."""
    spell: SpellMeans = model.spells[index]
    linear = posterior.leading.frame.linear
    flows = linear.states[index].flow_m3_s
    deviation = model.flow_sd_m3_s(linear, index)
    return SpellFound(
        id=spell.id,
        kind=spell.kind,
        start_s=spell.start_s,
        end_s=spell.end_s,
        samples=spell.samples,
        flows=tuple(
            FlowFound(run=run.name, flow_m3_s=float(flow), u95_m3_s=2.0 * float(sd))
            for run, flow, sd in zip(model.layout.job.runs, flows, deviation, strict=True)
        ),
        grade=run_grades(
            model, posterior.leading.frame, posterior.leading.chosen, index, [(f.kind, f.place) for f in findings]
        ),
    )


def _gauge(model: Model, posterior: Posterior, findings: Sequence[Finding], gauge: int, judged: Judged) -> GaugeFound:
    """One gauge's verdict with its numbers by spell and what it leans on."""
    noun = model.layout.job.gauges[gauge]
    causes = tuple(i for i, f in enumerate(findings) if gauge in f.mark.own)
    given = tuple(i for i, f in enumerate(findings) if not f.mark.own and (f.kind, f.place) in posterior.leading.keys)
    expected: Expected | None = None
    if model_has_reading(model, gauge):
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
    )


def model_has_reading(model: Model, gauge: int) -> bool:
    """Whether a gauge gave a reading in some spell."""
    return any(np.isfinite(spell.reading_pa[gauge]) for spell in model.spells)


def _gauge_spells(
    model: Model, posterior: Posterior, gauge: int, judged: Judged, expected: Expected | None
) -> tuple[GaugeSpell, ...]:
    """A gauge's reading and what it should have been, spell by spell."""
    said = {} if expected is None else {int(s): i for i, s in enumerate(expected.spells)}
    has_head = not model.layout.job.gauges[gauge].is_differential
    rows = []
    for index, spell in enumerate(model.spells):
        reading = float(spell.reading_pa[gauge]) if np.isfinite(spell.reading_pa[gauge]) else None
        value = u95 = None
        if expected is not None and index in said and judged.verdict is not Verdict.UNCHECKED:
            value, u95 = float(expected.value_pa[said[index]]), 2.0 * float(expected.sd_pa[said[index]])
        state = posterior.leading.frame.linear.states[index]
        heads = [None if not has_head or pa is None else tap_head_m(model, state, gauge, pa) for pa in (reading, value)]
        rows.append(
            GaugeSpell(
                id=spell.id,
                reading_pa=reading,
                expected_pa=value,
                u95_pa=u95,
                head_m=heads[0],
                expected_head_m=heads[1],
                head_u95_m=None if u95 is None or heads[1] is None else u95 / state.head_weight_pa_m,
            )
        )
    return tuple(rows)


def _cause(model: Model, finding: Finding) -> CauseFound:
    """One finding as the result has it."""
    return CauseFound(
        kind=finding.kind,
        place=finding.place,
        size=None if finding.kind in SIZELESS else finding.mark.reported(finding.size),
        u95=None if finding.kind in SIZELESS else 2.0 * finding.sd * abs(finding.mark.size_factor),
        unit=finding.mark.unit,
        probability=finding.probability,
        accepted=finding.accepted,
        rivals=finding.rivals,
        says=cause_sentence(model, finding),
    )
