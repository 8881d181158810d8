"""What an action found on site, and how the judgement moves once it is known."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.next_checks import outcome_density
from headledger.diagnosis.search import Posterior
from headledger.diagnosis.site_actions import Action


@dataclass(frozen=True, slots=True, kw_only=True)
class Answer:
    """What an action found on site.

    Parameters
    ----------
    action : Action
    outcome : float
        1 or 0 for yes or no; else in SI.
    """

    action: Action
    outcome: float


def answered(model: Model, posterior: Posterior, answers: Sequence[Answer]) -> Posterior:
    """The posterior once the results of actions are known.

    Parameters
    ----------
    model : Model
    posterior : Posterior
    answers : sequence of Answer

    Returns
    -------
    Posterior
        The same explanations, weighed anew.
    """
    if not answers:
        return posterior
    moved = []
    for explanation in posterior.explanations:
        likelihood = 0.0
        for answer in answers:
            density = outcome_density(model, explanation, answer.action, np.array([answer.outcome]))
            likelihood += float(np.log(np.maximum(density[0], 1e-300)))
        moved.append(explanation.weighed(explanation.log_weight + likelihood))
    return posterior.with_explanations(moved)
