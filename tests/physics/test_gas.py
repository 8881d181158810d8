"""Clearing velocities against figures worked by hand from each author's rule, and what must hold of their range."""

from __future__ import annotations

import math
import tomllib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.physics.gas import clearing_range_m_s, clearing_velocities_m_s, relative_volume

REFERENCE = tomllib.loads((Path(__file__).parent.parent / "reference" / "gas.toml").read_text(encoding="utf-8"))
G = 9.80665
ONE_BORE_M = 1.0 / G
"""Bore at which √(g D) is 1 m/s, so that velocities are Froude numbers."""


def froude(slope_deg: float, volume_ratio: float | None = None) -> dict[str, tuple[float, float]]:
    """Froude numbers by the first word of each author."""
    volume_m3 = None if volume_ratio is None else volume_ratio * math.pi * ONE_BORE_M**3 / 4.0
    found = clearing_velocities_m_s(
        bore_m=ONE_BORE_M, slope_rad=math.radians(slope_deg), gravity_m_s2=G, volume_m3=volume_m3
    )
    return {name.split()[0].rstrip(","): ends for name, ends in found.items()}


@pytest.mark.parametrize(("slope_deg", "kent", "wisner", "low", "high", "kalinske"), REFERENCE["froude"]["rows"])
def test_clearing_velocities_on_each_slope_match_the_authors(
    slope_deg: float, kent: float, wisner: float, low: float, high: float, kalinske: float
) -> None:
    found, digits = froude(slope_deg), REFERENCE["froude"]["digits"]
    assert found["Kent"] == pytest.approx((kent, kent), abs=digits)
    assert found["Wisner"] == pytest.approx((wisner, wisner), abs=digits)
    assert found["Escarameia"] == pytest.approx((low, high), abs=digits)
    assert found["Kalinske"] == pytest.approx((kalinske, kalinske), abs=digits)
    assert found["Pothof"] == pytest.approx(REFERENCE["pothof_clemens"]["froude"])


@pytest.mark.parametrize(("volume_ratio", "a"), REFERENCE["escarameia"]["rows"])
def test_clearing_velocities_of_a_known_volume_take_one_a_of_the_table(volume_ratio: float, a: float) -> None:
    """At 30° √sin is √0.5: 0.56 · 0.70711 = 0.39598 beside a."""
    assert froude(30.0, volume_ratio)["Escarameia"] == pytest.approx((0.39598 + a, 0.39598 + a), abs=5e-6)


@pytest.mark.parametrize(("bore_m", "unit_m_s"), REFERENCE["unit_velocity"]["rows"])
def test_clearing_velocities_grow_with_the_root_of_the_bore(bore_m: float, unit_m_s: float) -> None:
    """Pothof and Clemens's higher end is a Froude number of 1: √(g D) itself."""
    found = clearing_velocities_m_s(bore_m=bore_m, slope_rad=math.radians(10.0), gravity_m_s2=G)
    assert found["Pothof and Clemens 2010"][1] == pytest.approx(unit_m_s, abs=REFERENCE["unit_velocity"]["digits_m_s"])


def test_clearing_velocity_of_ten_degrees_in_dn_200_matches_wisner() -> None:
    found = clearing_velocities_m_s(bore_m=0.2, slope_rad=math.radians(10.0), gravity_m_s2=G)
    expected = REFERENCE["wisner"]["velocity_m_s"]
    assert found["Wisner, Mohsen and Kouwen 1975"][0] == pytest.approx(expected, abs=REFERENCE["wisner"]["digits_m_s"])


def test_relative_volume_of_one_bore_of_full_pipe_is_one() -> None:
    """A length of one bore holds π D³ / 4."""
    assert relative_volume(math.pi * 0.3**3 / 4.0, 0.3) == pytest.approx(1.0)


def test_clearing_range_of_ten_degrees_goes_from_kalinske_to_pothof() -> None:
    """Froude numbers at 10°: 0.450 the lowest, 1.0 the highest; times 1.4005 m/s in 200 mm."""
    low, high = clearing_range_m_s(bore_m=0.2, slope_rad=math.radians(10.0), gravity_m_s2=G)
    assert (low, high) == pytest.approx((0.450 * 1.4005, 1.4005), abs=0.001)


def test_clearing_range_of_a_vertical_leg_leaves_out_who_says_nothing_of_it() -> None:
    """At 90° the sine is 1: Escarameia's 0.56 + 0.45 = 1.01 is the lowest, Kent's 1.23 the highest."""
    low, high = clearing_range_m_s(bore_m=ONE_BORE_M, slope_rad=math.pi / 2.0, gravity_m_s2=G)
    assert (low, high) == pytest.approx((1.01, 1.23))


@pytest.mark.parametrize("slope_rad", [0.0, -0.1, 1.6])
def test_clearing_velocities_of_a_pipe_that_does_not_fall_are_refused(slope_rad: float) -> None:
    with pytest.raises(ValueError, match="must fall"):
        clearing_velocities_m_s(bore_m=0.1, slope_rad=slope_rad, gravity_m_s2=G)


@given(st.floats(0.001, math.pi / 2.0), st.floats(0.01, 2.0), st.floats(0.0, 1.0))
def test_clearing_range_with_a_volume_lies_within_that_without(
    slope_rad: float, bore_m: float, volume_m3: float
) -> None:
    low, high = clearing_range_m_s(bore_m=bore_m, slope_rad=slope_rad, gravity_m_s2=G)
    low_known, high_known = clearing_range_m_s(bore_m=bore_m, slope_rad=slope_rad, gravity_m_s2=G, volume_m3=volume_m3)
    assert 0.0 < low <= low_known <= high_known <= high
