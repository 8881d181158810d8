"""Wave speeds and the pressure of a stopped flow against figures worked by hand."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from headledger.physics.waves import stop_pressure_pa, travel_s, wave_speed_m_s

REFERENCE = tomllib.loads((Path(__file__).parent.parent / "reference" / "waves.toml").read_text(encoding="utf-8"))
KORTEWEG, JOUKOWSKY = REFERENCE["korteweg"], REFERENCE["joukowsky"]


@pytest.mark.parametrize(("wall", "modulus_pa", "speed_m_s"), KORTEWEG["rows"])
def test_wave_speed_in_each_wall_matches_korteweg(wall: str, modulus_pa: float, speed_m_s: float) -> None:
    found = wave_speed_m_s(
        bulk_modulus_pa=KORTEWEG["bulk_modulus_pa"],
        density_kg_m3=KORTEWEG["density_kg_m3"],
        bore_to_wall_ratio=KORTEWEG["bore_to_wall_ratio"],
        wall_modulus_pa=modulus_pa,
    )
    assert found == pytest.approx(speed_m_s, abs=KORTEWEG["digits_m_s"]), wall


@pytest.mark.parametrize(("density", "wave", "change", "bar", "digits"), JOUKOWSKY["rows"])
def test_stop_pressure_of_a_stopped_flow_matches_joukowsky(
    density: float, wave: float, change: float, bar: float, digits: float
) -> None:
    rise_pa = stop_pressure_pa(density_kg_m3=density, wave_m_s=wave, change_m_s=change)
    assert rise_pa / 1e5 == pytest.approx(bar, abs=digits)


def test_stop_pressure_as_head_matches_joukowsky() -> None:
    """12 bar of 1000 kg/m³ at 9.80665 m/s² are 122.37 m."""
    rise_pa = stop_pressure_pa(density_kg_m3=1000.0, wave_m_s=1200.0, change_m_s=1.0)
    assert rise_pa / (1000.0 * 9.80665) == pytest.approx(JOUKOWSKY["head_m"], abs=JOUKOWSKY["head_digits_m"])


def test_travel_time_of_a_kilometre_is_four_seconds_by_the_slowest_wave() -> None:
    """1000 m at 250 m/s."""
    assert travel_s(1000.0) == pytest.approx(4.0)
    assert travel_s(1000.0, 1000.0) == pytest.approx(1.0)
