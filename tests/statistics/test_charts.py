"""Lines, control charts and the test for a value that stands alone, against the figures of NIST."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from headledger.statistics.charts import (
    against_earlier,
    cusum,
    cusum_limit,
    ewma,
    ewma_limits,
    first_beyond,
    grubbs,
    grubbs_critical,
    straight_line,
)

REFERENCE: dict[str, Any] = tomllib.loads(
    (Path(__file__).parents[1] / "reference" / "charts.toml").read_text(encoding="utf-8")
)


@pytest.mark.parametrize("name", ["slope", "intercept", "slope_sd", "intercept_sd", "residual_sd"])
def test_straight_line_through_norris_has_its_certified_values(name: str):
    norris = REFERENCE["norris"]
    line = straight_line(np.array(norris["x"]), np.array(norris["y"]))
    assert getattr(line, name) == pytest.approx(norris[name], rel=norris["relative"])


def test_straight_line_through_norris_leaves_its_certified_share_unexplained():
    norris = REFERENCE["norris"]
    y = np.array(norris["y"])
    line = straight_line(np.array(norris["x"]), y)
    whole = ((y - y.mean()) ** 2).sum()
    assert 1.0 - line.residual_sd**2 * (y.size - 2) / whole == pytest.approx(
        norris["r_squared"], rel=norris["relative"]
    )


def test_ewma_of_the_handbook_has_its_averages_and_limits():
    chart = REFERENCE["ewma"]
    averages = ewma(np.array(chart["values"]), start=chart["target"], weight=chart["weight"])
    assert averages == pytest.approx(chart["averages"], abs=chart["average_digits"] + 1e-9)
    limits = ewma_limits(20, sd=chart["sd"], weight=chart["weight"], width=chart["width"])
    assert chart["target"] + limits[-1] == pytest.approx(chart["upper_limit"], abs=chart["limit_digits"])
    assert chart["target"] - limits[-1] == pytest.approx(chart["lower_limit"], abs=chart["limit_digits"])
    assert first_beyond(np.abs(averages - chart["target"]), limits) is None


def test_ewma_limit_of_the_first_value_is_that_of_its_share():
    """The first average holds the first value by its weight alone: 3 × 2 × 0.3."""
    assert ewma_limits(5, sd=2.0, weight=0.3, width=3.0)[0] == pytest.approx(1.8)


def test_cusum_of_the_handbook_has_its_sums_and_signal():
    chart = REFERENCE["cusum"]
    upper, lower = cusum(np.array(chart["values"]), target=chart["target"], allowance=chart["allowance"])
    assert upper[12:] == pytest.approx(chart["last_upper_sums"], abs=chart["sum_digits"] + 1e-9)
    assert first_beyond(upper, chart["limit"]) == chart["signal_at_group"] - 1
    assert first_beyond(lower, chart["limit"]) is None


def test_cusum_downward_mirrors_the_one_upward():
    values = np.random.default_rng(4).normal(size=50)
    upper, lower = cusum(values, target=0.2, allowance=0.5)
    mirrored = cusum(0.4 - values, target=0.2, allowance=0.5)
    assert lower == pytest.approx(mirrored[0])
    assert upper == pytest.approx(mirrored[1])


def test_cusum_limit_inverts_the_published_run_length():
    known = REFERENCE["cusum_run_length"]
    ends = [
        cusum_limit(allowance=known["allowance"], run_length=known["two_sided"] + shift)
        for shift in (-known["digits"], known["digits"])
    ]
    assert ends[0] < known["limit"] < ends[1]


def test_against_earlier_makes_independent_standard_values_of_an_unknown_level():
    """Over 20 000 drawn series of 6: variances 1, no covariance, within four standard errors."""
    drawn = 7.0 + 3.0 * np.random.default_rng(2).normal(size=(20_000, 6))
    standard = np.array([against_earlier(row, sd=3.0) for row in drawn])
    assert np.cov(standard.T) == pytest.approx(np.eye(5), abs=4.0 * np.sqrt(2.0 / 20_000))


def test_against_earlier_of_a_step_by_hand():
    """0 0 3 with sd 1: the third stands 3 above the mean 0 of two, in sqrt(1 + 1/2)."""
    assert against_earlier(np.array([0.0, 0.0, 3.0]), sd=1.0) == pytest.approx([0.0, 3.0 / np.sqrt(1.5)])


def test_grubbs_of_the_uranium_data_has_its_statistic_and_critical_values():
    known = REFERENCE["grubbs"]
    statistic, index = grubbs(np.array(known["values"]))
    assert statistic == pytest.approx(known["statistic"], abs=known["digits"])
    assert index == 7
    for two_sided, name in ((False, "critical_one_sided"), (True, "critical_two_sided")):
        critical = grubbs_critical(8, level=known["level"], two_sided=two_sided)
        assert critical == pytest.approx(known[name], abs=known["digits"])
