"""The few dense solvers that the rest needs, in numpy alone: scipy.linalg would double the time to start."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


def cholesky(matrix: Array) -> Array:
    """Lower Cholesky factor of a symmetric positive definite matrix.

    Raises
    ------
    numpy.linalg.LinAlgError
        Where it is not positive definite.
    """
    return np.asarray(np.linalg.cholesky(matrix), dtype=np.float64)


def solve_lower(lower: Array, right: Array) -> Array:
    """Solution of ``lower @ x = right`` for a lower triangular matrix, right-hand sides in columns.

    Raises
    ------
    numpy.linalg.LinAlgError
        Where it is singular.
    """
    return np.asarray(np.linalg.solve(lower, right), dtype=np.float64)
