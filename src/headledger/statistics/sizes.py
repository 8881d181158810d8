"""Priors of a cause's size, and the evidence of causes with their sizes integrated out.

With white residuals ``e`` and a cause's white mark ``u`` the likelihood ratio of size ``s`` against no cause is
``exp(b s - a s²/2)`` with ``a = u·u`` and ``b = u·e``; for several causes `a` is the Gram matrix of their marks. The prior over sizes is
log-uniform between physical limits (one or both signs), so the integral is done by Gauss–Legendre nodes placed where the integrand
lives, to about 1e-6 for one cause and nested for more; a size that is one stated value only shifts the residual. Everything works on
many sets at once: leading axes are sets.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

REACH = 7.0
"""Half-width of the window of integration in standard deviations: what lies outside is below 1e-11."""

NODES = 32
"""Gauss–Legendre nodes a sign; the log-uniform prior is smooth in log size, so this is plenty over such a window."""


@dataclass(frozen=True, slots=True, kw_only=True)
class SizePrior:
    """Prior of a cause's size.

    Parameters
    ----------
    least, most : float
        Magnitudes between which the size is log-uniform; ``least == most`` is one stated value, of positive sign.
    negative, positive : bool
        Signs allowed, equally probable.
    """

    least: float
    most: float
    negative: bool = True
    positive: bool = True

    @property
    def is_point(self) -> bool:
        """Whether the size is one stated value."""
        return self.most <= self.least


@dataclass(frozen=True, slots=True, kw_only=True)
class SizePriors:
    """Priors of the sizes of many sets of causes, none of them a stated value.

    Parameters
    ----------
    least, most : ndarray, shape (..., k)
    negative, positive : ndarray of bool, shape (..., k)
    """

    least: Array
    most: Array
    negative: NDArray[np.bool_]
    positive: NDArray[np.bool_]

    @classmethod
    def of(cls, priors: Sequence[SizePrior]) -> SizePriors:
        """Arrays of shape (k,) of some priors."""
        return cls(
            least=np.array([prior.least for prior in priors]),
            most=np.array([prior.most for prior in priors]),
            negative=np.array([prior.negative for prior in priors], dtype=bool),
            positive=np.array([prior.positive for prior in priors], dtype=bool),
        )

    def __getitem__(self, key: Any) -> SizePriors:
        """Priors of some sets or causes, by an index of the arrays."""
        return SizePriors(
            least=self.least[key], most=self.most[key], negative=self.negative[key], positive=self.positive[key]
        )


@lru_cache(maxsize=8)
def _legendre(count: int) -> tuple[Array, Array]:
    """Nodes on 0 … 1 and log weights."""
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return (nodes + 1.0) / 2.0, np.log(weights / 2.0)


def log_sum(values: Array, axis: int = -1) -> Array:
    """Log of the sum of exponentials along an axis, safe for -inf."""
    top = np.max(values, axis=axis, keepdims=True)
    top = np.where(np.isfinite(top), top, 0.0)
    with np.errstate(divide="ignore"):
        return np.asarray(np.log(np.exp(values - top).sum(axis=axis)) + np.squeeze(top, axis=axis))


def _nodes(prior: SizePriors, low: Array, high: Array, count: int) -> tuple[Array, Array]:
    """Sizes at which to evaluate the likelihood within a signed window, and their log weights, shape (..., 2 count).

    A weight is -inf where a sign is not allowed or the window does not meet the prior's range.
    """
    unit, log_unit = _legendre(count)
    whole = np.log(prior.most / prior.least) * (prior.negative.astype(float) + prior.positive)
    sizes, weights = [], []
    for sign, allowed in ((-1.0, prior.negative), (1.0, prior.positive)):
        near, far = (low, high) if sign > 0 else (-high, -low)
        start = np.log(np.clip(near, prior.least, prior.most))
        width = np.log(np.clip(far, prior.least, prior.most)) - start
        with np.errstate(divide="ignore"):
            log_width = np.where(allowed, np.log(width / whole), -np.inf)
        sizes.append(sign * np.exp(start[..., None] + width[..., None] * unit))
        weights.append(log_width[..., None] + log_unit)
    return np.concatenate(sizes, axis=-1), np.concatenate(weights, axis=-1)


def _window(prior: SizePriors, a: Array, b: Array) -> tuple[Array, Array]:
    """Signed window of sizes that holds the integrand of one cause, also where its peak is outside the range allowed."""
    centre = b / a
    gap: Array = np.full(centre.shape, np.inf)
    for sign, allowed in ((-1.0, prior.negative), (1.0, prior.positive)):
        mirrored = sign * centre
        beyond = np.maximum(0.0, np.maximum(prior.least - mirrored, mirrored - prior.most))
        gap = np.where(allowed, np.minimum(gap, beyond), gap)
    # distance from the peak to the nearest size allowed; the integrand falls off from there
    reach = np.sqrt(gap**2 + 2.0 * REACH**2 / a)
    return centre - reach, centre + reach


def _outer_window(priors: SizePriors, gram: Array, product: Array) -> tuple[Array, Array]:
    """Window of the first cause of a set, where its marginal lives.

    The marginal is the Gaussian's while the best sizes of all causes are allowed; where a limit binds it moves towards the
    conditional with the others absent, so the window then spans both.
    """
    causes = product.shape[-1]
    jitter = 1e-12 * np.trace(gram, axis1=-2, axis2=-1)[..., None, None] * np.eye(causes)
    covariance = np.linalg.inv(gram + jitter)
    best = (covariance @ product[..., None])[..., 0]
    deviation = np.sqrt(np.maximum(covariance[..., 0, 0], 0.0))
    fits = (priors.positive & (best >= priors.least)) | (priors.negative & (best <= -priors.least))
    allowed = np.all(fits & (np.abs(best) <= priors.most), axis=-1)
    low, high = best[..., 0] - REACH * deviation, best[..., 0] + REACH * deviation
    alone_low, alone_high = _window(priors[..., 0], gram[..., 0, 0], product[..., 0])
    return np.where(allowed, low, np.minimum(low, alone_low)), np.where(allowed, high, np.maximum(high, alone_high))


def _first_cause(priors: SizePriors, gram: Array, product: Array, count: int) -> tuple[Array, Array]:
    """Nodes of the first cause's size and, at each, the log of prior, likelihood and the other causes' integral."""
    if product.shape[-1] == 1:
        low, high = _window(priors[..., 0], gram[..., 0, 0], product[..., 0])
    else:
        low, high = _outer_window(priors, gram, product)
    sizes, weights = _nodes(priors[..., 0], low, high, count)
    values = weights + product[..., :1] * sizes - 0.5 * gram[..., 0, :1] * sizes**2
    if product.shape[-1] > 1:
        rest = product[..., None, 1:] - gram[..., None, 1:, 0] * sizes[..., None]
        values = values + log_gain(priors[..., None, 1:], gram[..., None, 1:, 1:], rest, count)
    return sizes, values


def log_gain(priors: SizePriors, gram: Array, product: Array, count: int = NODES) -> Array:
    """Log evidence of sets of causes against none, their sizes integrated out.

    Parameters
    ----------
    priors : SizePriors, arrays of shape (..., k)
    gram : ndarray, shape (..., k, k)
        Products of the white marks with one another; diagonal positive.
    product : ndarray, shape (..., k)
        Products of the white marks with the white residual.
    count : int
        Nodes a sign and cause.

    Returns
    -------
    ndarray, shape (...,)
    """
    return log_sum(_first_cause(priors, gram, product, count)[1])


@dataclass(frozen=True, slots=True, kw_only=True)
class SizePosterior:
    """Posterior of one cause's size on nodes, all else in its set integrated out.

    Parameters
    ----------
    sizes, weights : ndarray, shape (nodes,)
        Weights sum to 1.
    """

    sizes: Array
    weights: Array

    @property
    def mean(self) -> float:
        """Posterior mean."""
        return float(self.weights @ self.sizes)

    @property
    def sd(self) -> float:
        """Posterior standard deviation."""
        return float(np.sqrt(self.weights @ (self.sizes - self.mean) ** 2))


def size_posterior(priors: SizePriors, gram: Array, product: Array, count: int = NODES) -> SizePosterior:
    """Posterior of the size of the first cause of one set.

    Parameters
    ----------
    priors, gram, product
        As for `log_gain`, of one set: shapes (k,), (k, k) and (k,).
    count : int
        Nodes a sign and cause.

    Returns
    -------
    SizePosterior
    """
    sizes, values = _first_cause(priors, gram, product, count)
    return SizePosterior(sizes=sizes, weights=np.exp(values - log_sum(values)))
