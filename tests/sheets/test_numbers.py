"""Printed numbers: places, percentages that claim no certainty, and times."""

from __future__ import annotations

import pytest

from headledger.sheets.numbers import clock_range, decimals_for, fixed, percent


@pytest.mark.parametrize(
    ("doubt", "decimals"), [(0.03, 3), (0.26, 2), (2.6, 1), (26.0, 0), (2600.0, 0), (0.0, 3), (float("nan"), 3)]
)
def test_decimals_show_two_digits_of_the_doubt(doubt: float, decimals: int):
    assert decimals_for(doubt) == decimals


@pytest.mark.parametrize(
    ("value", "signed", "text"),
    [(0.2104, True, "+0.210"), (-0.0001, True, "0.000"), (None, False, "–"), (float("nan"), False, "–")],
)
def test_fixed_writes_no_minus_zero_and_no_nan(value: float | None, signed: bool, text: str):
    assert fixed(value, 3, signed=signed) == text


@pytest.mark.parametrize(
    ("probability", "text"), [(0.0, "< 1 %"), (0.01, "1 %"), (0.426, "43 %"), (0.99, "99 %"), (1.0, "> 99 %")]
)
def test_percent_never_claims_certainty(probability: float, text: str):
    assert percent(probability) == text


def test_clock_range_over_midnight_writes_both_days():
    assert clock_range(0.0, 86_400.0) == "1970-01-01 00:00 – 1970-01-02 00:00"
    assert clock_range(0.0, 60.0) == "1970-01-01 00:00 – 00:01"
