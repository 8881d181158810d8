"""A first-order lag against its exact response to a step and to a ramp."""

from __future__ import annotations

import tomllib
from pathlib import Path

import numpy as np
import pytest

from headledger.statistics.lag import lagged

EXACT = tomllib.loads((Path(__file__).parent.parent / "reference" / "waves.toml").read_text(encoding="utf-8"))["lag"]
TAU_S = 20.0


def step_response(time_s: np.ndarray, tau_s: float = TAU_S) -> np.ndarray:
    """What a lag shows of a step from 0 to 1 just after the first time."""
    values = np.ones(time_s.size)
    values[0] = 0.0
    return lagged(time_s, values, tau_s)


@pytest.mark.parametrize(("constants", "share", "digits"), EXACT["step"])
@pytest.mark.parametrize("steps", [1, 7, 500])
def test_lagged_step_shows_the_exact_share_at_any_sampling(
    constants: float, share: float, digits: float, steps: int
) -> None:
    time_s = np.linspace(0.0, constants * TAU_S, steps + 1)
    assert step_response(time_s)[-1] == pytest.approx(share, abs=digits)


@pytest.mark.parametrize(("share", "constants", "digits"), EXACT["reached"])
def test_lagged_step_reaches_a_share_after_the_exact_time(share: float, constants: float, digits: float) -> None:
    time_s = np.linspace(0.0, 6.0 * TAU_S, 60_001)
    assert np.interp(share, step_response(time_s), time_s) / TAU_S == pytest.approx(constants, abs=digits)


def test_lagged_step_rises_from_a_tenth_to_nine_tenths_in_the_exact_time() -> None:
    time_s = np.linspace(0.0, 6.0 * TAU_S, 60_001)
    low, high = np.interp([0.1, 0.9], step_response(time_s), time_s) / TAU_S
    assert high - low == pytest.approx(EXACT["rise_10_to_90"], abs=5e-5)


def test_lagged_ramp_stays_behind_by_rate_times_time_constant() -> None:
    """A ramp of 3 a second is 3 · 20 = 60 behind once it has settled; values hold over a step, so half a step more or less."""
    rate, step_s = 3.0, 0.01
    time_s = np.arange(0.0, 20.0 * TAU_S, step_s)
    behind = rate * time_s[-1] - lagged(time_s, rate * time_s, TAU_S)[-1]
    assert behind == pytest.approx(rate * TAU_S, abs=rate * step_s / 2.0 + 1e-6)


def test_lagged_without_a_lag_is_the_signal_itself() -> None:
    values = np.array([[1.0, 2.0], [3.0, 1.0], [0.5, 4.0]])
    assert lagged(np.arange(3.0), values, 0.0) == pytest.approx(values)


def test_lagged_columns_do_not_mix() -> None:
    random = np.random.default_rng(2)
    time_s, values = np.cumsum(random.uniform(0.5, 3.0, 50)), random.standard_normal((50, 3))
    together = lagged(time_s, values, 7.0)
    for column in range(3):
        assert together[:, column] == pytest.approx(lagged(time_s, values[:, column], 7.0))
