"""The numbers behind a finding: odds against what may stand in its stead, and every reading without it and with it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import Finding, Key
from headledger.diagnosis.report import pieces_by_spell
from headledger.diagnosis.result import Against, CauseKind, Evidence, Place, Residual
from headledger.diagnosis.search import Explanation, Posterior
from headledger.diagnosis.wording import against_sentence, beside_words, misfit_sentence

Array = NDArray[np.float64]

WORTH_SHOWING = 0.02
"""Findings less probable than this carry no evidence. [-]"""

MOST_SHOWN = 8
"""As many findings carry evidence, the most probable."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Left:
    """How far the pieces of the log stand from what everything else says, gauge by gauge.

    Parameters
    ----------
    off_pa, sd_pa : ndarray, shape (gauges, pieces)
        nan where a gauge gives no reading, or gives one that is spoilt. [Pa]
    misfit : float
        Sum of squares of the white residuals. [-]
    """

    off_pa: Array
    sd_pa: Array
    misfit: float


def evidence_of(model: Model, posterior: Posterior, findings: Sequence[Finding]) -> tuple[Evidence | None, ...]:
    """The evidence of every finding; None for those too improbable, and for those that are no part of an explanation.

    Parameters
    ----------
    model : Model
    posterior : Posterior
    findings : sequence of Finding
        The most probable first.

    Returns
    -------
    tuple of Evidence or None
        As many as findings.
    """
    best = _best_by_keys(posterior)
    none = best[frozenset()]
    before: Left | None = None
    found: list[Evidence | None] = []
    for finding in findings:
        counted = sum(one is not None for one in found)
        if finding.probability < WORTH_SHOWING or counted >= MOST_SHOWN or not _is_weighed(finding):
            found.append(None)
            continue
        before = before or left_over(model, none)
        after = left_over(model, finding.explanation)
        count = finding.frame.residual.size
        found.append(
            Evidence(
                against=_against(finding, best),
                residuals=tuple(_residuals(model, before, after)),
                misfit_before=before.misfit,
                misfit_after=after.misfit,
                count=count,
                says=misfit_sentence(before.misfit, after.misfit, count, _beside(finding)),
            )
        )
    return tuple(found)


def _is_weighed(finding: Finding) -> bool:
    """Whether a finding is part of its explanation: what is seen between the means, or follows from them, is not."""
    return (finding.kind, finding.place) in finding.explanation.keys


def _beside(finding: Finding) -> str:
    """What else the explanation of a finding holds, in words."""
    return beside_words(finding.explanation.keys - {(finding.kind, finding.place)})


def _best_by_keys(posterior: Posterior) -> dict[frozenset[Key], Explanation]:
    """The most probable explanation of every set of kinds and places."""
    best: dict[frozenset[Key], Explanation] = {}
    for explanation in posterior.explanations:
        best.setdefault(explanation.keys, explanation)
    return best


def _against(finding: Finding, best: dict[frozenset[Key], Explanation]) -> tuple[Against, ...]:
    """A finding against each of its rivals, and against nothing in its stead."""
    own = (finding.kind, finding.place)
    held = finding.explanation
    found = []
    for rival in finding.rivals:
        other = _instead(held, own, (rival.kind, rival.place), best)
        if other is not None:
            found.append(_held_against(held, other, rival.kind, rival.place, ""))
    rest = held.keys - {own}
    without = best.get(rest)
    if without is None:
        rest, without = frozenset(), best[frozenset()]
    return (*found, _held_against(held, without, None, Place(), beside_words(rest)))


def _instead(held: Explanation, own: Key, rival: Key, best: dict[frozenset[Key], Explanation]) -> Explanation | None:
    """The best explanation that holds a rival and not the finding: one otherwise the same where there is one."""
    same = best.get((held.keys - {own}) | {rival})
    if same is not None:
        return same
    return next((e for keys, e in best.items() if rival in keys and own not in keys), None)


def _held_against(held: Explanation, other: Explanation, kind: CauseKind | None, place: Place, beside: str) -> Against:
    evidence = held.log_evidence - other.log_evidence
    prior = held.log_prior - other.log_prior
    return Against(
        kind=kind,
        place=place,
        evidence_nats=evidence,
        prior_nats=prior,
        says=against_sentence(kind, place, evidence, prior, beside),
    )


def left_over(model: Model, explanation: Explanation) -> Left:
    """How far every gauge stands from what everything else says under an explanation, its causes' effects taken off.

    Parameters
    ----------
    model : Model
    explanation : Explanation

    Returns
    -------
    Left

    Notes
    -----
    With ``W`` the whitening operator's columns of a gauge's rows, ``(WᵀW)⁻¹`` is their covariance given all other rows and
    ``(WᵀW)⁻¹ Wᵀ e`` what is left of them: the gauge's stated class and its noise are part of it. The doubt of a cause's size counts where
    the cause is not the gauge's own: one that is has been fitted to these very rows.
    """
    frame = explanation.frame
    sizes = {index: frame.size(explanation.chosen, index) for index in explanation.chosen}
    residual = frame.residual.copy()
    for index, size in sizes.items():
        residual = residual - frame.white[:, index] * size.mean
    shape = (model.layout.gauge_count, len(model.spells))
    off, sd = np.full(shape, np.nan), np.full(shape, np.nan)
    for gauge in range(model.layout.gauge_count):
        rows, spells = frame.linear.gauge_rows(gauge)
        own = [index for index in sizes if gauge in frame.marks[index].own]
        if not rows.size or any(frame.marks[index].spoils for index in own):
            continue
        whitened = frame.linear.white.operator[:, rows]
        inverse = np.linalg.inv(whitened.T @ whitened)
        variance = np.diag(inverse).copy()
        for index, size in sizes.items():
            if index not in own:
                variance += (size.sd * (inverse @ (whitened.T @ frame.white[:, index]))) ** 2
        off[gauge, spells] = inverse @ (whitened.T @ residual)
        sd[gauge, spells] = np.sqrt(variance)
    return Left(off_pa=off, sd_pa=sd, misfit=float(residual @ residual))


def _residuals(model: Model, before: Left, after: Left) -> Iterable[Residual]:
    """Every gauge in every spell, the pieces of a spell averaged."""
    for gauge, noun in enumerate(model.layout.job.gauges):
        for number, pieces in pieces_by_spell(model).items():
            known = [k for k in pieces if np.isfinite(before.off_pa[gauge, k])]
            if not known:
                continue
            unspoilt = [k for k in pieces if np.isfinite(after.off_pa[gauge, k])]
            yield Residual(
                tag=noun.tag,
                spell=number,
                before_pa=float(before.off_pa[gauge, known].mean()),
                after_pa=float(after.off_pa[gauge, unspoilt].mean()) if unspoilt else None,
                sd_before_pa=float(before.sd_pa[gauge, known].mean()),
                sd_after_pa=float(after.sd_pa[gauge, unspoilt].mean()) if unspoilt else None,
            )
