"""What a first-order lag makes of a signal: a damped or slow instrument."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def lagged(time_s: Array, values: Array, lag_s: float) -> Array:
    """Signals as a first-order lag would show them, each at rest at its first value.

    Parameters
    ----------
    time_s : ndarray, shape (times,)
        Rising, not of even step. [s]
    values : ndarray, shape (times, ...)
        In any unit; each value holds since the time before it.
    lag_s : float
        Time constant ``τ``; none where it is not positive. [s]

    Returns
    -------
    ndarray, shape (times, ...)
        In the unit of the values; where there is no lag, the values themselves.

    Notes
    -----
    ``τ dy/dt = x - y``, solved exactly between two times: ``y1 = k y0 + (1 - k) x1`` with ``k = exp(-dt / τ)``.
    """
    if lag_s <= 0.0:
        return values
    out = np.empty_like(values)
    out[0] = values[0]
    keep = np.exp(-np.diff(time_s) / lag_s)
    for row in range(1, values.shape[0]):
        out[row] = keep[row - 1] * out[row - 1] + (1.0 - keep[row - 1]) * values[row]
    return out
