"""Evidence with sizes integrated out, against plain grids."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from headledger.statistics.sizes import SizePrior, SizePriors, log_gain, log_sum, size_posterior


def grid(prior: SizePrior, points: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Sizes log-uniform over both signs allowed, by the trapezium rule, and their log weights."""
    size = np.exp(np.linspace(np.log(prior.least), np.log(prior.most), points))
    weight = np.full(points, 1.0 / (points - 1))
    weight[[0, -1]] /= 2.0
    signs = [sign for sign, allowed in ((-1.0, prior.negative), (1.0, prior.positive)) if allowed]
    return np.concatenate([s * size for s in signs]), np.concatenate([np.log(weight / len(signs))] * len(signs))


def gain_by_grid(prior: SizePrior, a: float, b: float) -> float:
    """Log evidence of one cause by 400,001 sizes."""
    size, weight = grid(prior, 400_001)
    return float(log_sum(weight + b * size - 0.5 * a * size**2))


@pytest.mark.parametrize(
    ("a", "b"), [(0.38, 6.0), (0.38, -6.0), (0.01, 0.1), (100.0, 1500.0), (100.0, -30.0), (1e-3, 0.0)]
)
@pytest.mark.parametrize("negative", [True, False])
def test_log_gain_of_one_cause_equals_a_fine_grid(a: float, b: float, negative: bool) -> None:
    prior = SizePrior(least=1.8, most=600.0, negative=negative)
    gain = float(log_gain(SizePriors.of([prior]), np.array([[a]]), np.array([b])))
    assert gain == pytest.approx(gain_by_grid(prior, a, b), abs=2e-3)


@pytest.mark.parametrize("seed", range(8))
def test_log_gain_of_two_causes_equals_a_fine_grid(seed: int) -> None:
    rng = np.random.default_rng(seed)
    priors = (SizePrior(least=0.5, most=100.0, negative=bool(seed % 2)), SizePrior(least=0.2, most=50.0))
    marks = rng.normal(size=(6, 2)) * rng.choice([0.1, 0.5, 2.0], size=2)
    residual = marks @ (rng.normal(size=2) * rng.choice([0.0, 1.0, 5.0], size=2)) + rng.normal(size=6)
    gram, product = marks.T @ marks, marks.T @ residual
    first, second = grid(priors[0], 3001), grid(priors[1], 3001)
    values = first[1][:, None] + second[1][None] + product[0] * first[0][:, None] + product[1] * second[0][None]
    values -= 0.5 * gram[0, 0] * first[0][:, None] ** 2 + 0.5 * gram[1, 1] * second[0][None] ** 2
    values -= gram[0, 1] * first[0][:, None] * second[0][None]
    expected = float(log_sum(values.ravel()))
    assert float(log_gain(SizePriors.of(priors), gram, product)) == pytest.approx(expected, abs=5e-3)


def test_size_posterior_with_a_sharp_mark_is_the_least_squares_size() -> None:
    """A = 10,000 and b/a = 3: a standard deviation of 0.01, over which the log-uniform prior tilts the mean by sd²/size."""
    posterior = size_posterior(SizePriors.of([SizePrior(least=0.1, most=50.0)]), np.array([[1e4]]), np.array([3e4]))
    assert posterior.mean == pytest.approx(3.0 - 0.01**2 / 3.0, abs=1e-6)
    assert posterior.sd == pytest.approx(0.01, rel=1e-3)


def test_size_posterior_of_a_one_sided_cause_stays_on_its_side() -> None:
    prior = SizePriors.of([SizePrior(least=0.5, most=50.0, negative=False)])
    posterior = size_posterior(prior, np.array([[4.0]]), np.array([-8.0]))
    assert posterior.mean >= 0.5
    assert np.all(posterior.sizes[posterior.weights > 0.0] >= 0.5 - 1e-12)
