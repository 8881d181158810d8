"""Whether the likeliest explanation explains the readings at all: causes weigh against one another, and all may be wrong."""

from __future__ import annotations

import math
from dataclasses import dataclass

from scipy.special import chdtrc

from headledger.diagnosis.search import Posterior

UNKNOWN_PRIOR = 1e-3
"""Probability beforehand of a trouble that no cause of the table describes (no source). [-]"""

WORTH_SAYING = 0.2
"""Probability of such a trouble from which it is said. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Fit:
    """How well the likeliest explanation explains the readings.

    Parameters
    ----------
    misfit : float
        Sum of squares of the white residuals with every cause of the explanation taken off at its mean size. [-]
    rows : int
        That it is expected to be.
    unknown_probability : float
        That something else is there. [-]
    """

    misfit: float
    rows: int
    unknown_probability: float

    @property
    def is_poor(self) -> bool:
        """Whether it should be said that nothing weighed explains the readings."""
        return self.unknown_probability >= WORTH_SAYING


def fit_of(posterior: Posterior) -> Fit:
    """How well the likeliest explanation of a posterior fits.

    Parameters
    ----------
    posterior : Posterior

    Returns
    -------
    Fit

    Notes
    -----
    The misfit has the χ² distribution with as many degrees of freedom as there are rows, since unknowns have priors and are
    marginalised. Its tail probability p speaks for something else by at most ``1/(−e p ln p)``.

    References
    ----------
    Sellke, Bayarri and Berger, Calibration of p values for testing precise null hypotheses, The American Statistician 55 (2001) 62-71,
    eq. 2 (from memory).
    """
    leading = posterior.leading
    frame, residual = leading.frame, leading.frame.residual
    for index in leading.chosen:
        residual = residual - frame.white[:, index] * frame.size(leading.chosen, index).mean
    misfit, rows = float(residual @ residual), int(residual.size)
    return Fit(misfit=misfit, rows=rows, unknown_probability=unknown_probability(float(chdtrc(rows, misfit))))


def unknown_probability(tail: float) -> float:
    """Probability of a trouble outside the table, from the tail probability of a misfit. [-]"""
    if tail >= math.exp(-1.0):
        return UNKNOWN_PRIOR
    against = -math.e * tail * math.log(tail) if tail > 0.0 else 0.0
    return UNKNOWN_PRIOR / (UNKNOWN_PRIOR + (1.0 - UNKNOWN_PRIOR) * against)
