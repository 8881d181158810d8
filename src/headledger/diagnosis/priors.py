"""Prior probabilities of causes: the one table that says how often each number of troubles is met."""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark

NO_CAUSE = 0.5
ONE_CAUSE, TWO_CAUSES, THREE_CAUSES = 0.35, 0.12, 0.03


@dataclass(frozen=True, slots=True, kw_only=True)
class CountPrior:
    """Probability of each number of causes present.

    Parameters
    ----------
    of : tuple of float
        Of none, one, two, …; sums to 1. [-]
    other_kinds : int
        Kinds of cause that are weighed besides those that have marks.
    """

    of: tuple[float, ...] = (NO_CAUSE, ONE_CAUSE, TWO_CAUSES, THREE_CAUSES)
    other_kinds: int = 0

    @property
    def most(self) -> int:
        """Largest set weighed."""
        return len(self.of) - 1


def mark_shares(marks: Sequence[Mark], other_kinds: int = 0) -> NDArray[np.float64]:
    """Prior share of each mark if exactly one cause is present: kinds alike, places alike within a kind.

    Parameters
    ----------
    marks : sequence of Mark
    other_kinds : int
        Kinds weighed besides.

    Returns
    -------
    ndarray, shape (marks,)
        Sums to 1 with what the other kinds have.
    """
    places = Counter(kind for kind, _ in {mark.key for mark in marks})
    kinds = len(places) + other_kinds
    return np.array([mark.share / kinds / places[mark.kind] for mark in marks])
