"""Liquids, gravity and barometer against published values and the libraries that made the tables."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from headledger.errors import QuantityError
from headledger.physics.earth import gravity_m_s2, standard_pressure_pa
from headledger.physics.liquids import (
    BY_MASS,
    BY_VOLUME,
    glycol_properties,
    liquid_properties,
    seawater_properties,
    temperature_limits_k,
    water_properties,
    water_vapour_pressure_pa,
)

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


@pytest.mark.parametrize(("kelvin", "pressure"), LIQUIDS["water_saturation"]["rows"])
def test_water_vapour_pressure_matches_the_industrial_formulation(kelvin: float, pressure: float) -> None:
    found = water_properties(kelvin).vapour_pressure_pa
    assert found == pytest.approx(pressure, rel=LIQUIDS["water_saturation"]["tolerance"])


@pytest.mark.parametrize(("celsius", "density"), LIQUIDS["water_by_kell"]["rows"])
def test_water_density_matches_kell(celsius: float, density: float) -> None:
    found = water_properties(celsius + 273.15).density_kg_m3
    assert found == pytest.approx(density, abs=LIQUIDS["water_by_kell"]["tolerance_kg_m3"])


def test_water_pressed_by_its_bulk_modulus_has_the_published_density() -> None:
    """Hand: ρ grows by (3 MPa − 101.325 kPa)/K; K itself grows by some 0.7 %, which is 0.005 kg/m³ of the 1.3 gained."""
    case = LIQUIDS["water_pressed"]
    water = water_properties(case["temperature_k"])
    found = water.density_kg_m3 * (1.0 + (case["pressure_pa"] - 101_325.0) / water.bulk_modulus_pa)
    assert found == pytest.approx(case["density_kg_m3"], abs=case["tolerance_kg_m3"])


def test_water_viscosity_matches_the_release_of_2008() -> None:
    case = LIQUIDS["water_viscosity_2008"]
    assert water_properties(case["temperature_k"]).viscosity_pa_s == pytest.approx(
        case["viscosity_pa_s"], rel=case["tolerance"]
    )


@pytest.mark.parametrize(("celsius", "pressure", "relative"), LIQUIDS["water_supercooled"]["rows"])
def test_water_vapour_pressure_below_zero_matches_supercooled_water(
    celsius: float, pressure: float, relative: float
) -> None:
    assert water_vapour_pressure_pa(celsius + 273.15) == pytest.approx(pressure, rel=relative)


def test_water_vapour_pressure_passes_the_end_of_its_table_with_value_and_slope() -> None:
    edge, step = 273.16, 1e-3
    below, at, above = (water_vapour_pressure_pa(edge + side * step) for side in (-1.0, 0.0, 1.0))
    assert (at - below) / step == pytest.approx((above - at) / step, rel=1e-3)


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


def test_water_vapour_pressure_and_bulk_modulus_agree_with_their_library() -> None:
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    for celsius in np.linspace(0.5, 99.5, 12):
        kelvin = float(celsius) + 273.15
        found = water_properties(kelvin)
        saturated = coolprop.PropsSI("P", "T", kelvin, "Q", 0, "Water")
        compressibility = coolprop.PropsSI("isothermal_compressibility", "T", kelvin, "P", 101325.0, "Water")
        assert found.vapour_pressure_pa == pytest.approx(saturated, rel=WATER["vapour_tolerance"])
        assert found.bulk_modulus_pa * compressibility == pytest.approx(1.0, rel=1e-3)


def test_water_expands_by_its_table_as_by_its_library() -> None:
    """A central difference of one kelvin, as others take it; 1e-7 /K is 1e-4 kg/m³ in a kelvin."""
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    for celsius in (2.0, 5.0, 10.0, 20.0, 30.0, 40.0, 60.0, 90.0):
        kelvin = celsius + 273.15
        colder, same, warmer = (water_properties(kelvin + side).density_kg_m3 for side in (-0.5, 0.0, 0.5))
        expansion = coolprop.PropsSI("isobaric_expansion_coefficient", "T", kelvin, "P", 101325.0, "Water")
        assert (colder - warmer) / same == pytest.approx(expansion, abs=1e-6, rel=1e-3)


@pytest.mark.parametrize(("celsius", "density"), LIQUIDS["seawater"]["rows"])
def test_seawater_density_matches_teos_10(celsius: float, density: float) -> None:
    found = seawater_properties(celsius + 273.15, 35.16504).density_kg_m3
    assert found == pytest.approx(density, abs=LIQUIDS["seawater"]["tolerance_kg_m3"])


def test_seawater_without_salt_is_fresh() -> None:
    case = LIQUIDS["seawater_without_salt"]
    found = seawater_properties(case["celsius"] + 273.15, 0.0).density_kg_m3
    assert found == pytest.approx(case["density_kg_m3"], abs=case["tolerance_kg_m3"])


def test_seawater_vapour_pressure_is_that_of_the_activity_of_its_water() -> None:
    """Hand: exp(−φ m M) = exp(−0.9024 × 1.16058 × 0.0180153) = 0.98131 at 25 °C; φ and m of standard seawater from memory."""
    ratio = seawater_properties(298.15, 35.16504).vapour_pressure_pa / water_properties(298.15).vapour_pressure_pa
    assert ratio == pytest.approx(0.98131, abs=0.001)


def test_seawater_viscosity_agrees_with_its_library() -> None:
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    for salinity in (5.0, 20.0, 35.0, 41.0):
        for celsius in (0.5, 11.0, 23.0, 39.5):
            expected = coolprop.PropsSI("V", "T", celsius + 273.15, "P", 1e6, f"INCOMP::MITSW[{salinity / 1000.0}]")
            found = seawater_properties(celsius + 273.15, salinity).viscosity_pa_s
            assert found == pytest.approx(expected, rel=WATER["viscosity_tolerance"])


@pytest.mark.parametrize("row", LIQUIDS["glycol"]["rows"], ids=lambda row: f"{row[0]} {row[2]} vol {row[1]}")
def test_glycol_properties_match_the_published_sets(row: list[Any]) -> None:
    kind, by_volume, per_cent, densities, viscosity = row
    for celsius, density in zip((0, 20, 40, 60, 80), densities, strict=True):
        found = glycol_properties(kind, celsius + 273.15, per_cent / 100.0, by_volume=by_volume)
        assert found.density_kg_m3 == pytest.approx(density, rel=LIQUIDS["glycol"]["density_tolerance"])
    at_20 = glycol_properties(kind, 293.15, per_cent / 100.0, by_volume=by_volume)
    assert at_20.viscosity_pa_s == pytest.approx(viscosity * 1e-3, rel=LIQUIDS["glycol"]["viscosity_tolerance"])


@pytest.mark.parametrize("by_volume", [False, True])
@pytest.mark.parametrize("kind", sorted(BY_MASS))
def test_glycol_table_agrees_with_its_library_between_its_points(kind: str, by_volume: bool) -> None:
    coolprop = pytest.importorskip("CoolProp.CoolProp")
    name = (BY_VOLUME if by_volume else BY_MASS)[kind]
    for fraction in (0.13, 0.27, 0.41, 0.58):
        coldest, hottest = temperature_limits_k(kind=kind, concentration_fraction=fraction, by_volume=by_volume)
        for kelvin in np.linspace(coldest + 0.05, hottest, 7):
            found = glycol_properties(kind, float(kelvin), fraction, by_volume=by_volume)
            where = ("T", float(kelvin), "P", 1e6, f"INCOMP::{name}[{fraction}]")
            assert found.density_kg_m3 == pytest.approx(
                coolprop.PropsSI("D", *where), abs=WATER["density_tolerance_kg_m3"]
            )
            assert found.viscosity_pa_s == pytest.approx(
                coolprop.PropsSI("V", *where), rel=WATER["viscosity_tolerance"]
            )


def test_glycol_vapour_pressure_is_waters_times_its_mole_fraction() -> None:
    """Hand, 50 % ethylene glycol by mass at 20 °C: 27.754 and 8.056 mol a kg/1000, so 0.77504 × 2339.3 Pa = 1813.0 Pa."""
    found = glycol_properties("ethylene-glycol", 293.15, 0.5).vapour_pressure_pa
    assert found == pytest.approx(1813.0, rel=WATER["vapour_tolerance"])


def test_glycol_vapour_pressure_by_volume_is_that_of_its_mass_fraction() -> None:
    """Hand, 50 % ethylene glycol by volume at 20 °C: 1113/(1113 + 998.2) = 52.719 % by mass, 26.245 and 8.494 mol: 0.75550 × 2339.3 Pa."""
    found = glycol_properties("ethylene-glycol", 293.15, 0.5, by_volume=True).vapour_pressure_pa
    assert found == pytest.approx(1767.3, rel=WATER["vapour_tolerance"])


def test_glycol_is_liquid_down_to_its_freezing_point_and_no_further() -> None:
    freezing = LIQUIDS["glycol_freezing"]["kelvin"]
    assert glycol_properties("ethylene-glycol", freezing + 0.05, 0.3).density_kg_m3 > 1000.0
    with pytest.raises(QuantityError, match="temperature is outside the table"):
        glycol_properties("ethylene-glycol", freezing - 0.05, 0.3)


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


def test_glycol_without_concentration_is_refused() -> None:
    with pytest.raises(QuantityError, match="concentration is missing"):
        liquid_properties(kind="ethylene-glycol", temperature_k=293.15)


def test_other_liquid_without_density_is_refused() -> None:
    with pytest.raises(QuantityError, match="needs its density"):
        liquid_properties(kind="other", temperature_k=293.15)


@pytest.mark.parametrize(
    ("kind", "kelvin"), [("water", 272.0), ("water", 460.0), ("water", float("nan")), ("seawater", 320.0)]
)
def test_liquid_outside_its_table_is_refused(kind: str, kelvin: float) -> None:
    with pytest.raises(QuantityError, match="temperature is outside the table"):
        liquid_properties(kind=kind, temperature_k=kelvin)


def test_liquid_properties_of_another_liquid_are_its_own() -> None:
    found = liquid_properties(kind="other", temperature_k=293.15, density_kg_m3=870.0, viscosity_pa_s=0.012)
    assert (found.density_kg_m3, found.viscosity_pa_s) == (870.0, 0.012)


@pytest.mark.parametrize(("latitude", "altitude", "gravity"), EARTH["gravity"]["rows"])
def test_gravity_matches_wgs_84(latitude: float, altitude: float, gravity: float) -> None:
    assert gravity_m_s2(latitude, altitude) == pytest.approx(gravity, abs=EARTH["gravity"]["tolerance"])


@pytest.mark.parametrize(("altitude", "pressure"), EARTH["atmosphere"]["rows"])
def test_standard_pressure_matches_the_1976_atmosphere(altitude: float, pressure: float) -> None:
    assert standard_pressure_pa(altitude) == pytest.approx(pressure, abs=EARTH["atmosphere"]["tolerance_pa"])
