"""Series in time: where they step, and how well their means are known."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def best_cuts(signal: Array, *, penalty: float) -> list[int]:
    """Bounds of the stretches of constant mean that fit a series best.

    Parameters
    ----------
    signal : ndarray, shape (times, columns)
        In units of each column's noise.
    penalty : float
        Cost of one stretch more, in the same units squared.

    Returns
    -------
    list of int
        Starting with 0 and ending with the number of times.

    Notes
    -----
    The exact minimum of squared error plus penalty, by dynamic programming over the last cut.

    References
    ----------
    Jackson et al., An algorithm for optimal partitioning of data on an interval, IEEE Signal Processing Letters 12 (2005) 105-108.
    """
    times = signal.shape[0]
    centred = signal - signal.mean(axis=0)
    sums = np.vstack([np.zeros(signal.shape[1]), np.cumsum(centred, axis=0)])
    squares = np.concatenate([[0.0], np.cumsum((centred**2).sum(axis=1))])
    cost = np.zeros(times + 1)
    cost[0] = -penalty
    previous = np.zeros(times + 1, dtype=np.int64)
    for end in range(1, times + 1):
        length = end - np.arange(end)
        error = squares[end] - squares[:end] - ((sums[end] - sums[:end]) ** 2).sum(axis=1) / length
        total = cost[:end] + error + penalty
        previous[end] = int(np.argmin(total))
        cost[end] = total[previous[end]]
    cuts = [times]
    while cuts[-1] > 0:
        cuts.append(int(previous[cuts[-1]]))
    return cuts[::-1]


def batch_means(values: Array, batches: int) -> Array:
    """Means over consecutive batches of about equal length, missing values left out.

    Parameters
    ----------
    values : ndarray, shape (times, columns)
    batches : int

    Returns
    -------
    ndarray, shape (batches, columns)
        nan where a batch has no value.
    """
    bounds = np.linspace(0, values.shape[0], batches + 1).round().astype(int)
    ok = np.isfinite(values)
    sums = np.add.reduceat(np.where(ok, values, 0.0), bounds[:-1], axis=0)
    counts = np.add.reduceat(ok.astype(float), bounds[:-1], axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.asarray(np.where(counts > 0, sums / counts, np.nan))
