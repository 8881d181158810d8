"""Control charts and calibration lines: a straight line with its doubts, EWMA and CUSUM with limits, the value that stands alone."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import stdtrit

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """A least-squares line ``y = intercept + slope x``.

    Parameters
    ----------
    slope, intercept : float
    slope_sd, intercept_sd : float
        Standard errors, from the scatter about the line.
    residual_sd : float
        Of that scatter, with two degrees of freedom fewer than points.
    """

    slope: float
    intercept: float
    slope_sd: float
    intercept_sd: float
    residual_sd: float


def straight_line(x: Array, y: Array) -> Line:
    """The least-squares line through points, with standard errors.

    Parameters
    ----------
    x, y : ndarray, shape (points,)
        At least three points, not all at one x.

    Returns
    -------
    Line

    References
    ----------
    NIST/SEMATECH e-Handbook of Statistical Methods, 4.1.4.1 and 4.4.3.
    """
    centre = x.mean()
    away = x - centre
    spread = away @ away
    slope = away @ y / spread
    intercept = y.mean() - slope * centre
    rest = y - intercept - slope * x
    deviation = np.sqrt(rest @ rest / (x.size - 2))
    return Line(
        slope=float(slope),
        intercept=float(intercept),
        slope_sd=float(deviation / np.sqrt(spread)),
        intercept_sd=float(deviation * np.sqrt(1.0 / x.size + centre**2 / spread)),
        residual_sd=float(deviation),
    )


def ewma(values: Array, *, start: float, weight: float) -> Array:
    """Exponentially weighted moving averages, one after each value.

    Parameters
    ----------
    values : ndarray, shape (times,)
    start : float
        Before the first value: the target.
    weight : float
        Of the newest value. [-]

    Returns
    -------
    ndarray, shape (times,)

    References
    ----------
    NIST/SEMATECH e-Handbook of Statistical Methods, 6.3.2.4.
    """
    out, level = np.empty(values.size), start
    for time, value in enumerate(values):
        level = weight * float(value) + (1.0 - weight) * level
        out[time] = level
    return out


def ewma_limits(times: int, *, sd: float, weight: float, width: float) -> Array:
    """How far an EWMA may part from its target after each value.

    Parameters
    ----------
    times : int
    sd : float
        Of a single value.
    weight : float
        As of `ewma`. [-]
    width : float
        In standard deviations of the average. [-]

    Returns
    -------
    ndarray, shape (times,)
        Rising to ``width sd sqrt(weight / (2 - weight))``.

    References
    ----------
    NIST/SEMATECH e-Handbook of Statistical Methods, 6.3.2.4; Montgomery, Introduction to Statistical Quality Control, 9.2.
    """
    share = weight / (2.0 - weight) * (1.0 - (1.0 - weight) ** (2.0 * np.arange(1, times + 1)))
    return np.asarray(width * sd * np.sqrt(share))


def cusum(values: Array, *, target: float, allowance: float) -> tuple[Array, Array]:
    """Tabular cumulative sums upward and downward, one pair after each value.

    Parameters
    ----------
    values : ndarray, shape (times,)
    target : float
    allowance : float
        What each value may be off without adding to a sum.

    Returns
    -------
    upper, lower : ndarray, shape (times,)
        Never negative.

    References
    ----------
    NIST/SEMATECH e-Handbook of Statistical Methods, 6.3.2.3.
    """
    upper, lower = np.empty(values.size), np.empty(values.size)
    high = low = 0.0
    for time, value in enumerate(values):
        high = max(0.0, high + float(value) - target - allowance)
        low = max(0.0, low - float(value) + target - allowance)
        upper[time], lower[time] = high, low
    return upper, lower


def cusum_limit(*, allowance: float, run_length: float) -> float:
    """The limit of a two-sided CUSUM of standard normal values that runs so long, on average, before it signals without cause.

    Parameters
    ----------
    allowance : float
        In standard deviations, more than 0. [-]
    run_length : float
        Mean number of values up to a false signal, more than 1. [-]

    Returns
    -------
    float
        In standard deviations. [-]

    Notes
    -----
    Siegmund's approximation ``(exp(2 k b) - 2 k b - 1) / (2 k²)`` with ``b = h + 1.166`` for one side, half of it for both; solved for h
    by bisection.

    References
    ----------
    Siegmund, Sequential Analysis (1985), 2.5; Montgomery, Introduction to Statistical Quality Control, equation 9.6.
    """
    low, high = 0.0, 100.0 / allowance
    for _ in range(80):
        middle = (low + high) / 2.0
        reach = 2.0 * allowance * (middle + 1.166)
        both = (np.exp(min(reach, 600.0)) - reach - 1.0) / (4.0 * allowance**2)
        low, high = (middle, high) if both < run_length else (low, middle)
    return low


def first_beyond(values: Array, limits: Array | float) -> int | None:
    """Index of the first value beyond its limit, None where none is."""
    beyond = np.flatnonzero(values > limits)
    return int(beyond[0]) if beyond.size else None


def against_earlier(values: Array, *, sd: float) -> Array:
    """Each value but the first against the mean of those before it: independent standard normals as long as nothing changes.

    Parameters
    ----------
    values : ndarray, shape (times,)
        Independent, normal, about a level that is not known.
    sd : float
        Of a single value.

    Returns
    -------
    ndarray, shape (times - 1,)
        [-]

    References
    ----------
    Hawkins, Self-starting CUSUM charts for location and scale, The Statistician 36 (1987) 299-315; here with a given sd.
    """
    before = np.arange(1, values.size)
    mean = np.cumsum(values)[:-1] / before
    return np.asarray((values[1:] - mean) / (sd * np.sqrt(1.0 + 1.0 / before)))


def grubbs(values: Array) -> tuple[float, int]:
    """How far the value that stands most alone is from the mean of all, in their standard deviation, and its index.

    Parameters
    ----------
    values : ndarray, shape (values,)
        At least three, not all alike.

    Returns
    -------
    statistic : float
        [-]
    index : int

    References
    ----------
    NIST/SEMATECH e-Handbook of Statistical Methods, 1.3.5.17.1.
    """
    away = np.abs(values - values.mean())
    index = int(np.argmax(away))
    return float(away[index] / values.std(ddof=1)), index


def grubbs_critical(count: int, *, level: float, two_sided: bool = True) -> float:
    """What `grubbs` exceeds with a probability where all values are of one normal population.

    Parameters
    ----------
    count : int
        Number of values, at least three.
    level : float
        That probability. [-]
    two_sided : bool
        Whether the value may stand alone on either side.

    Returns
    -------
    float
        [-]

    References
    ----------
    NIST/SEMATECH e-Handbook of Statistical Methods, 1.3.5.17.1.
    """
    tail = level / (2.0 * count if two_sided else count)
    square = float(stdtrit(count - 2, 1.0 - tail)) ** 2
    return float((count - 1) / np.sqrt(count) * np.sqrt(square / (count - 2 + square)))
