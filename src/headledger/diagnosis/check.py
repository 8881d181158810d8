"""The pipeline of a check, readable top to bottom: job and log in, result out."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np

from headledger.diagnosis.answers import Answer, answered
from headledger.diagnosis.averages import spell_pieces
from headledger.diagnosis.circulation import circulations
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.evidence import evidence_of
from headledger.diagnosis.findings import list_findings
from headledger.diagnosis.fit import fit_of
from headledger.diagnosis.history import gauge_histories
from headledger.diagnosis.lags import unlagged
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.next_checks import next_checks
from headledger.diagnosis.readings import read_timeline, with_logged_barometer
from headledger.diagnosis.report import cause_found, gauge_found, spells_found
from headledger.diagnosis.result import CauseKind, CheckResult, InputFile, Trend
from headledger.diagnosis.search import search
from headledger.diagnosis.sight import sight_of
from headledger.diagnosis.site_actions import parse_answer
from headledger.diagnosis.spells import find_spells, unread_spells
from headledger.diagnosis.trait_findings import trait_findings
from headledger.diagnosis.traits import find_traits, undone, undone_traits
from headledger.diagnosis.vapour import vapour_findings
from headledger.diagnosis.verdicts import judge_gauge
from headledger.diagnosis.wording import unexplained_sentence
from headledger.errors import JobError, NothingToCheckError, Problem
from headledger.plant.digest import Digest
from headledger.plant.job import Job
from headledger.readers.job import read_job
from headledger.readers.log_files import sha256_in_background
from headledger.readers.logs import read_logs
from headledger.records.digest_cache import recalled_digest, remember_digest

Progress = Callable[[str, float], None]


def check_folder(
    folder: Path,
    *,
    answers: Sequence[str] = (),
    on_progress: Progress | None = None,
    should_stop: Callable[[], bool] | None = None,
) -> CheckResult:
    """Check the job in a folder.

    Parameters
    ----------
    folder : Path
    answers : sequence of str
        Results of actions on site, as `parse_answer` reads them.
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
    digests = read_logs(
        job,
        recall=recalled_digest,
        remember=remember_digest,
        on_progress=lambda share: tell("reading the log", 0.05 + 0.35 * share),
    )
    return check_job(job, digests, answers=answers, on_progress=tell, should_stop=should_stop)


def check_job(
    job: Job,
    digests: Sequence[Digest],
    *,
    answers: Sequence[str] = (),
    on_progress: Progress | None = None,
    should_stop: Callable[[], bool] | None = None,
) -> CheckResult:
    """Check a job on the digests of its logs.

    Parameters
    ----------
    job : Job
    digests : sequence of Digest
    answers, on_progress, should_stop
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
    found_on_site = [parse_answer(text, job) for text in answers]
    job = with_logged_barometer(job, digests)
    layout = Layout(job)
    timeline = read_timeline(layout, digests)
    tell("finding spells", 0.45)
    stretches = find_spells(layout, timeline)
    traits = find_traits(layout, timeline, stretches)
    right = undone(digests, traits, timeline)
    if right is not None:
        timeline = read_timeline(layout, right)
        stretches = find_spells(layout, timeline)
        again = find_traits(layout, timeline, stretches)
        traits = (*undone_traits(traits), *(one for one in again if one.kind is not CauseKind.CLOCK_OFFSET))
    pieces = spell_pieces(layout, unlagged(timeline, traits), stretches)
    if not pieces:
        raise NothingToCheckError(
            f"{job.title}: the log holds no stretch in which the flow state is steady and a gauge gives a reading. "
            "State spells in spells.csv, or take a longer reading at one flow."
        )
    tell("weighing causes", 0.5)
    model = Model(layout, pieces)
    try:
        posterior = search(model, should_stop=should_stop)
    except np.linalg.LinAlgError as error:
        raise JobError([_too_far_apart(job)]) from error
    told = [Answer(action=action, outcome=outcome) for action, outcome in found_on_site]
    posterior = answered(model, posterior, told)
    seen, unseen = trait_findings(model, posterior, traits)
    findings = sorted(
        [*list_findings(posterior), *seen, *vapour_findings(model, posterior)],
        key=lambda finding: -round(finding.probability, 2),
    )
    fit = fit_of(posterior)
    tell("judging gauges", 0.85)
    judged = [judge_gauge(model, posterior, gauge) for gauge in range(layout.gauge_count)]
    gauges = tuple(gauge_found(model, posterior, findings, gauge, one) for gauge, one in enumerate(judged))
    return CheckResult(
        job=job,
        inputs=_inputs(job, digests),
        spells=spells_found(model, posterior, findings),
        clean_probability=posterior.clean_probability * unseen * (1.0 - fit.unknown_probability),
        gauges=gauges,
        histories=gauge_histories(layout, timeline, stretches, gauges),
        causes=tuple(
            cause_found(model, finding, evidence)
            for finding, evidence in zip(findings, evidence_of(model, posterior, findings), strict=True)
        ),
        rejects=tuple(reject for digest in digests for reject in digest.rejects),
        reject_count=sum(digest.reject_count for digest in digests),
        remarks=(*job.remarks, *timeline.remarks, *unread_spells(job, stretches), *circulations(model)),
        next_checks=next_checks(model, posterior, findings),
        answers=tuple(answers),
        unexplained=unexplained_sentence(fit.misfit, fit.rows) if fit.is_poor else "",
        sight=sight_of(model, [state.point for state in posterior.frame.linear.states]),
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
            file=digest.file,
            rows=digest.row_count,
            rejected=digest.reject_count,
            fingerprint=sha256_in_background(path),
        )
        for digest, path in zip(digests, job.log_files, strict=True)
    }
    tables = [
        InputFile(file=path.name, rows=0, rejected=0, fingerprint=sha256_in_background(path))
        for path in job.files
        if path not in job.log_files
    ]
    return (*tables, *logs.values())
