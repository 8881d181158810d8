"""Probabilities of conformity: that a normal error lies within its limits."""

from __future__ import annotations

from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

Array = NDArray[np.float64]

NODES = 48
"""Gauss–Legendre nodes across the first limit."""

REACH = 8.0
"""Standard deviations beyond which a normal density is nothing."""


def conformity_probability(value: float, standard_uncertainty: float, lower: float, upper: float) -> float:
    """Probability that a quantity lies between two limits (either may be infinite).

    Parameters
    ----------
    value, standard_uncertainty : float
        Its best estimate and standard uncertainty, normal.
    lower, upper : float

    Returns
    -------
    float
        [-]

    References
    ----------
    JCGM 106:2012, Evaluation of measurement data, 7.2-7.4.
    """
    return float(ndtr((upper - value) / standard_uncertainty) - ndtr((lower - value) / standard_uncertainty))


def inside_box_probability(mean: Array, covariance: Array, limit: Array) -> Array:
    """Probability that one or two correlated normal errors are all within ± their limits.

    Parameters
    ----------
    mean : ndarray, shape (cases, errors)
        One or two errors.
    covariance : ndarray, shape (errors, errors)
        Shared by all cases.
    limit : ndarray, shape (errors,)
        Positive.

    Returns
    -------
    ndarray, shape (cases,)
        [-]
    """
    deviation = np.sqrt(np.maximum(np.diag(covariance), (1e-9 * limit) ** 2))
    if mean.shape[1] == 1:
        return _between(mean[:, 0], deviation[0], limit[0])
    unit, weight = _legendre()
    low = np.clip(mean[:, 0] - REACH * deviation[0], -limit[0], limit[0])
    high = np.clip(mean[:, 0] + REACH * deviation[0], -limit[0], limit[0])
    half = (high - low) / 2.0
    first = (low + high)[:, None] / 2.0 + half[:, None] * unit
    standard = (first - mean[:, [0]]) / deviation[0]
    density = np.exp(-0.5 * standard**2) / (np.sqrt(2.0 * np.pi) * deviation[0])
    slope = covariance[0, 1] / deviation[0] ** 2
    rest = np.sqrt(max(covariance[1, 1] - slope * covariance[0, 1], (1e-9 * limit[1]) ** 2))
    centre = mean[:, [1]] + slope * (first - mean[:, [0]])
    return np.asarray(
        np.clip((half[:, None] * weight * density * _between(centre, rest, limit[1])).sum(axis=1), 0.0, 1.0)
    )


@lru_cache(maxsize=1)
def _legendre() -> tuple[Array, Array]:
    """Nodes and weights on −1 … 1."""
    unit, weight = np.polynomial.legendre.leggauss(NODES)
    return unit, weight


def _between(centre: Array, deviation: float, limit: float) -> Array:
    """Probability of lying within ± limit."""
    return np.asarray(ndtr((limit - centre) / deviation) - ndtr((-limit - centre) / deviation))
