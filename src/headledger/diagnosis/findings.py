"""From weighed explanations to findings: each cause once, with its probability, its size and its rivals."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import dataclass, replace

import numpy as np

from headledger.diagnosis.causes.base import Mark
from headledger.diagnosis.frame import Frame
from headledger.diagnosis.result import CauseKind, Place, Rival
from headledger.diagnosis.search import Explanation, Posterior

ACCEPTED = 0.8
"""A cause at least this probable is accepted. [-]"""

LEFT_OUT = 0.02
"""A list of causes ends where the rest together is below this. [-]"""

RIVAL_SHARE = 0.02
"""A rival below this part of the weight that a cause and its rivals share is not named. [-]"""

NEGLIGIBLE = 1e-6
"""Explanations less probable than this make nothing a rival. [-]"""

Key = tuple[CauseKind, Place]


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One cause as the explanations have it.

    Parameters
    ----------
    kind : CauseKind
    place : Place
    probability : float
        Summed over every explanation that holds it. [-]
    rivals : tuple of Rival
        What stands in its stead in explanations otherwise the same, the most probable first.
    explanation : Explanation
        The most probable that holds it.
    mark : Mark
        Its mark there.
    size, sd : float
        Posterior mean and standard deviation of its size there, as the mark counts it.
    start_sd_s : float
        Standard deviation of the moment at which it begins, over all explanations that hold it. [s]
    statement : str
        What it says of itself, where that is more than its mark tells.
    """

    kind: CauseKind
    place: Place
    probability: float
    rivals: tuple[Rival, ...]
    explanation: Explanation
    mark: Mark
    size: float
    sd: float
    start_sd_s: float = 0.0
    statement: str = ""

    @property
    def accepted(self) -> bool:
        """Whether it is taken as present."""
        return self.probability >= ACCEPTED

    @property
    def frame(self) -> Frame:
        """The frame of its explanation."""
        return self.explanation.frame


def list_findings(posterior: Posterior) -> tuple[Finding, ...]:
    """Every cause that the data give weight to, the most probable first.

    Parameters
    ----------
    posterior : Posterior

    Returns
    -------
    tuple of Finding
        Ends where the rest together is below `LEFT_OUT`.
    """
    probability: dict[Key, float] = defaultdict(float)
    best: dict[Key, Explanation] = {}
    starts: dict[Key, list[tuple[float, float]]] = defaultdict(list)
    for explanation in posterior.explanations:
        for key in explanation.keys:
            probability[key] += explanation.probability
            best.setdefault(key, explanation)
        for mark in (explanation.frame.marks[i] for i in explanation.chosen):
            if mark.start_s is not None:
                starts[mark.key].append((explanation.probability, mark.start_s))
    swaps = _swaps(posterior)
    ordered = sorted(probability, key=lambda key: -probability[key])
    left = sum(probability.values())
    found = []
    for key in ordered:
        if left < LEFT_OUT:
            break
        left -= probability[key]
        finding = _finding(key, best[key], probability, swaps)
        found.append(replace(finding, start_sd_s=_start_sd_s(posterior, starts.get(key, []))))
    return tuple(found)


def _start_sd_s(posterior: Posterior, starts: list[tuple[float, float]]) -> float:
    """Standard deviation of a moment that several explanations put elsewhere, each to within a piece of time. [s]"""
    weights = np.array([weight for weight, _ in starts])
    if not weights.size or weights.sum() <= 0.0:
        return 0.0
    moments = np.array([moment for _, moment in starts])
    mean = float(weights @ moments / weights.sum())
    pieces = posterior.frame.linear.model.spells
    piece_s = float(np.median([piece.end_s - piece.start_s for piece in pieces]))
    return float(np.sqrt(weights @ (moments - mean) ** 2 / weights.sum() + piece_s**2 / 12.0))


def _swaps(posterior: Posterior) -> dict[Key, dict[Key, float]]:
    """For each cause, the weight of what stands in its stead in explanations otherwise the same.

    Every such setting counts by the part of the cause's own weight that lies in it, so that what a cause merely comes along with is no
    rival of it.
    """
    by_rest: dict[frozenset[Key], dict[Key, float]] = defaultdict(lambda: defaultdict(float))
    whole: dict[Key, float] = defaultdict(float)
    for explanation in posterior.explanations:
        if explanation.probability < NEGLIGIBLE:
            break
        for key in explanation.keys:
            by_rest[explanation.keys - {key}][key] += explanation.probability
            whole[key] += explanation.probability
    swaps: dict[Key, dict[Key, float]] = defaultdict(lambda: defaultdict(float))
    for stead in by_rest.values():
        for key, own in stead.items():
            share = own / whole[key] if whole[key] > 0.0 else 0.0
            if share > LEFT_OUT:
                for other, weight in stead.items():
                    if other != key:
                        swaps[key][other] += share * weight
    return swaps


def _finding(key: Key, best: Explanation, probability: dict[Key, float], swaps: dict[Key, dict[Key, float]]) -> Finding:
    """One cause with its size and rivals."""
    index = next(i for i in best.chosen if best.frame.marks[i].key == key)
    size = best.frame.size(best.chosen, index)
    whole = probability[key] + sum(swaps[key].values())
    rivals = [
        Rival(kind=other[0], place=other[1], probability=probability[other])
        for other, weight in swaps[key].items()
        if weight >= RIVAL_SHARE * whole
    ]
    return Finding(
        kind=key[0],
        place=key[1],
        probability=min(probability[key], 1.0),
        rivals=tuple(sorted(rivals, key=lambda rival: -rival.probability)),
        explanation=best,
        mark=best.frame.marks[index],
        size=size.mean,
        sd=size.sd,
    )
