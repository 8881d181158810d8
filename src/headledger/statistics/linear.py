"""The few dense solvers that the rest needs, by scipy's LAPACK wrappers, with the failure said in words."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import lapack

Array = NDArray[np.float64]


def cholesky(matrix: Array) -> Array:
    """Lower Cholesky factor of a symmetric positive definite matrix.

    Raises
    ------
    numpy.linalg.LinAlgError
        Where it is not positive definite.
    """
    return np.asarray(np.linalg.cholesky(matrix))


def solve_lower(lower: Array, right: Array) -> Array:
    """Solution of ``lower @ x = right`` for a lower triangular matrix."""
    solution, info = lapack.dtrtrs(lower, np.asfortranarray(right), lower=1)
    if info != 0:
        raise np.linalg.LinAlgError("triangular matrix is singular")
    return np.asarray(solution)
