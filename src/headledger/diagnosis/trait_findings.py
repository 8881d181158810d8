"""Traits as findings: their odds against everything else, and what is left of the hope that nothing is wrong."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence

import numpy as np

from headledger.diagnosis.causes.base import Mark
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.findings import LEFT_OUT, Finding
from headledger.diagnosis.priors import CountPrior
from headledger.diagnosis.result import CauseKind, Rival
from headledger.diagnosis.search import Posterior
from headledger.diagnosis.trait import Trait
from headledger.diagnosis.verdicts import own_cause_probability
from headledger.diagnosis.wording import trait_statement
from headledger.statistics.sizes import SizePrior


def trait_findings(model: Model, posterior: Posterior, traits: Sequence[Trait]) -> tuple[tuple[Finding, ...], float]:
    """Findings of traits, and the probability that there is none.

    Parameters
    ----------
    model : Model
    posterior : Posterior
    traits : sequence of Trait

    Returns
    -------
    findings : tuple of Finding
    none : float
        [-]

    Notes
    -----
    Traits of one gauge explain the same stretches of the log and exclude one another. A gauge whose means are explained by a cause of
    its own is not suspected of a trait as well: what is seen of it in time may be that cause's.
    """
    prior = CountPrior()
    kinds = len({mark.kind for mark in posterior.frame.marks}) + posterior.other_kinds
    expected = sum(count * share for count, share in enumerate(prior.of))
    together: dict[tuple[int, ...], list[tuple[Trait, float]]] = defaultdict(list)
    for trait in traits:
        sound = 1.0 - max((own_cause_probability(posterior, gauge) for gauge in trait.own), default=0.0)
        odds = expected / kinds / trait.places * max(sound, 0.0) * float(np.exp(min(trait.log_ratio, 500.0)))
        together[trait.own].append((trait, odds))
    found: list[Finding] = []
    none = 1.0
    for rivals in together.values():
        whole = 1.0 + sum(odds for _, odds in rivals)
        none /= whole
        found += [_finding(model, posterior, trait, odds / whole, rivals, whole) for trait, odds in rivals]
    return tuple(f for f in found if f.probability >= LEFT_OUT), none


def _finding(
    model: Model,
    posterior: Posterior,
    trait: Trait,
    probability: float,
    together: Sequence[tuple[Trait, float]],
    whole: float,
) -> Finding:
    """One trait as a finding, with the other traits of its gauge as rivals."""
    leading = posterior.leading
    unit = model.layout.job.display.pressure if trait.kind is CauseKind.LEAK else None
    mark = Mark(
        kind=trait.kind,
        place=trait.place,
        vector=np.zeros(leading.frame.linear.row_count),
        prior=SizePrior(least=0.0, most=0.0),
        own=trait.own,
        unit=unit,
    )
    rivals = [
        Rival(kind=other.kind, place=other.place, probability=odds / whole)
        for other, odds in together
        if other is not trait and odds / whole >= LEFT_OUT
    ]
    return Finding(
        kind=trait.kind,
        place=trait.place,
        probability=probability,
        rivals=tuple(rivals),
        explanation=leading,
        mark=mark,
        size=trait.size,
        sd=trait.sd,
        statement=trait_statement(model, trait.kind, trait.place, trait.size),
    )
