"""Probabilities of conformity against published figures and a two-dimensional grid."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import ndtr

from headledger.statistics.decisions import conformity_probability, inside_box_probability


def test_conformity_probability_one_sided_matches_jcgm_106() -> None:
    """JCGM 106:2012, one-sided normal: limit 10, estimate 9.7, standard uncertainty 0.2 gives 0.933193."""
    assert conformity_probability(9.7, 0.2, -np.inf, 10.0) == pytest.approx(0.933193, abs=0.5e-6)


@pytest.mark.parametrize(
    ("guard_in_expanded", "false_accept"), [(3.0, 9.9e-10), (1.5, 0.00135), (1.0, 0.02275), (0.83, 0.04846), (0.0, 0.5)]
)
def test_conformity_probability_at_a_guarded_limit_matches_ilac_g8(
    guard_in_expanded: float, false_accept: float
) -> None:
    """ILAC-G8:09/2019, Table 1: a value accepted just at the limit less r·U, U = 2u; the risk that it is outside."""
    outside = 1.0 - conformity_probability(10.0 - guard_in_expanded * 2.0, 1.0, -np.inf, 10.0)
    assert outside == pytest.approx(false_accept, rel=6e-3)


def test_inside_box_probability_of_independent_errors_is_their_product() -> None:
    mean, covariance, limit = np.array([[0.4, -0.2]]), np.diag([0.25, 1.0]), np.array([1.0, 1.5])
    one = ndtr((1.0 - 0.4) / 0.5) - ndtr((-1.0 - 0.4) / 0.5)
    two = ndtr(1.5 + 0.2) - ndtr(-1.5 + 0.2)
    assert inside_box_probability(mean, covariance, limit)[0] == pytest.approx(one * two, abs=1e-9)


def test_inside_box_probability_of_one_and_the_same_error_is_that_of_the_tighter_limit() -> None:
    covariance = np.array([[1.0, 1.0], [1.0, 1.0]])
    inside = inside_box_probability(np.array([[0.3, 0.3]]), covariance, np.array([1.0, 2.0]))[0]
    assert inside == pytest.approx(ndtr(0.7) - ndtr(-1.3), abs=1e-6)


def test_inside_box_probability_far_outside_is_nothing() -> None:
    inside = inside_box_probability(np.array([[9.0, 9.0]]), np.eye(2) * 0.01, np.array([1.0, 1.0]))[0]
    assert inside == pytest.approx(0.0, abs=1e-12)
