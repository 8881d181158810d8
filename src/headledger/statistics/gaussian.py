"""Gaussian data with nuisances: turned once into white residuals, so that all that follows is dot products.

The model is ``r = X x + A t + n``: residuals `r` of some rows, a few unknowns `x` of one group of rows (a spell) with broad priors,
shared uncertain inputs `t` with unit prior variance, and independent noise `n`. Broad priors never enter a covariance: each group's
own unknowns are eliminated by QR on whitened rows, with their priors as further rows.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.statistics.linear import cholesky, solve_lower

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Group:
    """Rows that share unknowns of their own.

    Parameters
    ----------
    residual : ndarray, shape (rows,)
        Measured less computed at the point of linearisation.
    noise_sd : ndarray, shape (rows,)
        Standard deviation of the rows' own noise, all positive.
    own : ndarray, shape (rows, unknowns)
        Derivatives with respect to the group's own unknowns.
    own_sd : ndarray, shape (unknowns,)
        Their prior standard deviations.
    own_offset : ndarray, shape (unknowns,)
        Prior mean less the point of linearisation.
    shared : ndarray, shape (rows, inputs)
        Derivatives with respect to the shared inputs, each in units of its prior standard deviation.
    """

    residual: Array
    noise_sd: Array
    own: Array
    own_sd: Array
    own_offset: Array
    shared: Array


@dataclass(frozen=True, slots=True, kw_only=True)
class Whitened:
    """All groups together, as white residuals of unit variance with every nuisance marginalised.

    Parameters
    ----------
    residual : ndarray, shape (rows,)
        White residuals.
    operator : ndarray, shape (rows, rows)
        What whitens a mark given on the rows of the data: ``operator @ mark``. Its Gram matrix is the inverse covariance of the data.
    shared : ndarray, shape (rows, inputs)
        The shared inputs' derivatives, whitened.
    log_determinant : float
        Of the data's covariance, all priors included.
    """

    residual: Array
    operator: Array
    shared: Array
    log_determinant: float

    @property
    def log_evidence(self) -> float:
        """Log density of the data with no cause present."""
        rows = self.residual.size
        square = float(self.residual @ self.residual)
        return -0.5 * (square + self.log_determinant + rows * float(np.log(2.0 * np.pi)))

    def mark(self, mark: Array) -> Array:
        """White form of a mark (or of columns of marks) on the rows of the data."""
        return self.operator @ mark

    def shared_mean(self) -> Array:
        """Posterior mean of the shared inputs with no cause present, in units of their prior standard deviations."""
        return self.shared.T @ self.residual

    def shared_covariance(self) -> Array:
        """Posterior covariance of the shared inputs with no cause present, in units of their prior standard deviations."""
        return np.eye(self.shared.shape[1]) - self.shared.T @ self.shared


def _eliminate(group: Group) -> tuple[Array, Array, Array, float]:
    """Residual, operator and shared derivatives of one group with its own unknowns marginalised, and its log determinant."""
    rows, unknowns = group.own.shape
    weight = 1.0 / group.noise_sd
    log_determinant = 2.0 * float(np.log(group.noise_sd).sum())
    if unknowns == 0:
        return group.residual * weight, np.diag(weight), group.shared * weight[:, None], log_determinant
    stacked = np.vstack([group.own * weight[:, None], np.diag(1.0 / group.own_sd)])
    q, upper = np.linalg.qr(stacked, mode="complete")
    keep = q[:, unknowns:].T
    operator = keep[:, :rows] * weight
    residual = operator @ group.residual + keep[:, rows:] @ (group.own_offset / group.own_sd)
    log_determinant += 2.0 * float(np.log(group.own_sd).sum() + np.log(np.abs(np.diag(upper[:unknowns]))).sum())
    return residual, operator, operator @ group.shared, log_determinant


def whiten(groups: Sequence[Group]) -> Whitened:
    """White residuals of all groups, with their own unknowns and the shared inputs marginalised.

    Parameters
    ----------
    groups : sequence of Group
        All with the same number of shared inputs; rows of the result stand in their order.

    Returns
    -------
    Whitened
    """
    parts = [_eliminate(group) for group in groups]
    residual = np.concatenate([part[0] for part in parts])
    shared = np.vstack([part[2] for part in parts])
    operator = np.zeros((residual.size, residual.size))
    at = 0
    for part in parts:
        size = part[0].size
        operator[at : at + size, at : at + size] = part[1]
        at += size
    lower = cholesky(np.eye(residual.size) + shared @ shared.T)
    log_determinant = sum(part[3] for part in parts) + 2.0 * float(np.log(np.diag(lower)).sum())
    white = solve_lower(lower, np.column_stack([residual, operator, shared]))
    rows = residual.size
    return Whitened(
        residual=white[:, 0],
        operator=white[:, 1 : rows + 1],
        shared=white[:, rows + 1 :],
        log_determinant=log_determinant,
    )


def own_estimate(group: Group, shared_mean: Array) -> Array:
    """Posterior mean of a group's own unknowns, less the point of linearisation, given the shared inputs.

    Parameters
    ----------
    group : Group
        Its `residual` with every cause already taken off.
    shared_mean : ndarray, shape (inputs,)

    Returns
    -------
    ndarray, shape (unknowns,)
    """
    weight = 1.0 / group.noise_sd
    rows = np.vstack([group.own * weight[:, None], np.diag(1.0 / group.own_sd)])
    target = np.concatenate([(group.residual - group.shared @ shared_mean) * weight, group.own_offset / group.own_sd])
    return np.asarray(np.linalg.lstsq(rows, target, rcond=None)[0])
