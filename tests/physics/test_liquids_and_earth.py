"""Liquids, gravity and barometer against published values and the libraries that made the tables."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from headledger.errors import QuantityError
from headledger.physics.earth import gravity_m_s2, standard_pressure_pa
from headledger.physics.liquids import glycol_properties, liquid_properties, seawater_properties, water_properties

REFERENCES = Path(__file__).parent.parent / "reference"
LIQUIDS: dict[str, Any] = tomllib.loads((REFERENCES / "liquids.toml").read_text(encoding="utf-8"))
EARTH: dict[str, Any] = tomllib.loads((REFERENCES / "earth.toml").read_text(encoding="utf-8"))
WATER = LIQUIDS["water"]


@pytest.mark.parametrize("row", WATER["rows"], ids=lambda row: f"{row[0]} °C")
def test_water_properties_match_the_iapws_tables(row: list[float]) -> None:
    found = water_properties(row[0] + 273.15)
    assert found.density_kg_m3 == pytest.approx(row[1], abs=WATER["density_tolerance_kg_m3"])
    assert found.viscosity_pa_s == pytest.approx(row[2] * 1e-3, rel=WATER["viscosity_tolerance"])
    assert found.vapour_pressure_pa == pytest.approx(row[3] * 1e3, rel=WATER["vapour_tolerance"])


@pytest.mark.parametrize(("fahrenheit", "ratio"), LIQUIDS["water_ratio"]["rows"])
def test_water_density_ratio_matches_the_hydrotest_table(fahrenheit: float, ratio: float) -> None:
    at_60 = water_properties((60.0 + 459.67) / 1.8).density_kg_m3
    found = at_60 / water_properties((fahrenheit + 459.67) / 1.8).density_kg_m3
    assert found == pytest.approx(ratio, abs=LIQUIDS["water_ratio"]["tolerance"])


def test_water_bulk_modulus_at_20_degrees_is_that_of_iapws_95() -> None:
    """2.1791 GPa by CoolProp; Kell's compressibility agrees to four digits."""
    assert water_properties(293.15).bulk_modulus_pa == pytest.approx(2.1791e9, rel=5e-5)


def test_water_table_agrees_with_its_library_between_the_printed_temperatures() -> None:
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    for celsius in np.linspace(0.5, 99.5, 34):
        kelvin = float(celsius) + 273.15
        found = water_properties(kelvin)
        assert found.density_kg_m3 == pytest.approx(
            coolprop.PropsSI("D", "T", kelvin, "P", 101325.0, "Water"), abs=WATER["density_tolerance_kg_m3"]
        )
        assert found.viscosity_pa_s == pytest.approx(
            coolprop.PropsSI("V", "T", kelvin, "P", 101325.0, "Water"), rel=WATER["viscosity_tolerance"]
        )


@pytest.mark.parametrize(("celsius", "density"), LIQUIDS["seawater"]["rows"])
def test_seawater_density_matches_teos_10(celsius: float, density: float) -> None:
    found = seawater_properties(celsius + 273.15, 35.16504).density_kg_m3
    assert found == pytest.approx(density, abs=LIQUIDS["seawater"]["tolerance_kg_m3"])


@pytest.mark.parametrize("row", LIQUIDS["glycol"]["rows"], ids=lambda row: f"{row[0]} {row[2]} vol {row[1]}")
def test_glycol_properties_match_the_published_sets(row: list[Any]) -> None:
    kind, by_volume, per_cent, densities, viscosity = row
    for celsius, density in zip((0, 20, 40, 60, 80), densities, strict=True):
        found = glycol_properties(kind, celsius + 273.15, per_cent / 100.0, by_volume=by_volume)
        assert found.density_kg_m3 == pytest.approx(density, rel=LIQUIDS["glycol"]["density_tolerance"])
    at_20 = glycol_properties(kind, 293.15, per_cent / 100.0, by_volume=by_volume)
    assert at_20.viscosity_pa_s == pytest.approx(viscosity * 1e-3, rel=LIQUIDS["glycol"]["viscosity_tolerance"])


def test_glycol_by_volume_is_denser_than_by_mass_as_the_trap_says() -> None:
    """50 % ethylene glycol at 20 °C: 1064.9 by mass, 1073.4 kg/m³ by volume."""
    by_mass = glycol_properties("ethylene-glycol", 293.15, 0.5).density_kg_m3
    by_volume = glycol_properties("ethylene-glycol", 293.15, 0.5, by_volume=True).density_kg_m3
    assert by_volume - by_mass == pytest.approx(8.5, abs=0.3)


def test_glycol_below_its_freezing_point_is_refused() -> None:
    with pytest.raises(QuantityError, match="temperature is outside the table"):
        glycol_properties("ethylene-glycol", 243.15, 0.3)


def test_liquid_properties_of_an_unknown_kind_are_refused() -> None:
    with pytest.raises(QuantityError, match="unknown liquid, got milk"):
        liquid_properties(kind="milk", temperature_k=293.15)


def test_liquid_properties_of_another_liquid_are_its_own() -> None:
    found = liquid_properties(kind="other", temperature_k=293.15, density_kg_m3=870.0, viscosity_pa_s=0.012)
    assert (found.density_kg_m3, found.viscosity_pa_s) == (870.0, 0.012)


@pytest.mark.parametrize(("latitude", "altitude", "gravity"), EARTH["gravity"]["rows"])
def test_gravity_matches_wgs_84(latitude: float, altitude: float, gravity: float) -> None:
    assert gravity_m_s2(latitude, altitude) == pytest.approx(gravity, abs=EARTH["gravity"]["tolerance"])


@pytest.mark.parametrize(("altitude", "pressure"), EARTH["atmosphere"]["rows"])
def test_standard_pressure_matches_the_1976_atmosphere(altitude: float, pressure: float) -> None:
    assert standard_pressure_pa(altitude) == pytest.approx(pressure, abs=EARTH["atmosphere"]["tolerance_pa"])
