"""Density, viscosity, vapour pressure and bulk modulus of the liquids that the trade pipes."""

from __future__ import annotations

import json
import math
from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from importlib.resources import files
from typing import Any

import numpy as np
from numpy.polynomial import chebyshev

from headledger.errors import QuantityError

WATER_MOLAR_MASS = 18.015268
GLYCOL_MOLAR_MASS = {"ethylene-glycol": 62.068, "propylene-glycol": 76.095}
BY_MASS = {"ethylene-glycol": "MEG", "propylene-glycol": "MPG"}
BY_VOLUME = {"ethylene-glycol": "AEG", "propylene-glycol": "APG"}
GLYCOL_DENSITY_KG_M3 = {"ethylene-glycol": 1113.0, "propylene-glycol": 1036.0}
"""Of the pure glycols at 20 °C, to turn a volume fraction into a mass fraction for the vapour pressure (from memory)."""


@dataclass(frozen=True, slots=True, kw_only=True)
class LiquidProperties:
    """Properties of a liquid at one temperature and about one atmosphere.

    Parameters
    ----------
    density_kg_m3, viscosity_pa_s : float
        [kg/m³], [Pa s]
    vapour_pressure_pa : float
        [Pa absolute]
    bulk_modulus_pa : float
        Isothermal. [Pa]
    """

    density_kg_m3: float
    viscosity_pa_s: float
    vapour_pressure_pa: float
    bulk_modulus_pa: float


@lru_cache(maxsize=1)
def _tables() -> dict[str, Any]:
    """Chebyshev coefficients, as shipped."""
    text = files("headledger.physics").joinpath("data/liquids.json").read_text(encoding="utf-8")
    tables: dict[str, Any] = json.loads(text)
    return tables


def _scaled(value: float, limits: list[float]) -> float:
    """A value on −1 … 1 of its range."""
    return 2.0 * (value - limits[0]) / (limits[1] - limits[0]) - 1.0


def _demand(name: str, value: float, limits: Sequence[float], unit: str, shift: float = 0.0) -> None:
    """Refuse a value that a table does not hold."""
    low, high = limits
    if not low - 1e-6 <= value <= high + 1e-6:
        raise QuantityError(
            f"{name} is outside the table of this liquid",
            f"{value - shift:.4g} {unit}",
            f"{low - shift:.4g} to {high - shift:.4g} {unit}",
        )


def water_properties(temperature_k: float) -> LiquidProperties:
    """Liquid water at 101.325 kPa, or just above saturation where it would boil.

    Parameters
    ----------
    temperature_k : float
        0.01 to 180 °C. [K]

    Returns
    -------
    LiquidProperties

    Raises
    ------
    QuantityError
        Outside that range.

    References
    ----------
    IAPWS R6-95(2018), Revised Release on the IAPWS Formulation 1995, for density, saturation and compressibility; IAPWS R12-08,
    Release on the IAPWS Formulation 2008 for the Viscosity of Ordinary Water Substance.
    """
    table = _tables()["water"]
    low, high = table["range_k"]
    # 0 °C lies 0.01 K below the table, where nothing changes
    temperature_k = low if low - 0.011 <= temperature_k < low else temperature_k
    _demand("temperature", temperature_k, (low, high), "°C", 273.15)
    at = _scaled(temperature_k, table["range_k"])

    def value(name: str) -> float:
        return float(chebyshev.chebval(at, table[name]))

    return LiquidProperties(
        density_kg_m3=value("density"),
        viscosity_pa_s=float(np.exp(value("log_viscosity"))),
        vapour_pressure_pa=float(np.exp(value("log_vapour_pressure"))),
        bulk_modulus_pa=float(np.exp(value("log_bulk_modulus"))),
    )


def water_vapour_pressure_pa(temperature_k: float) -> float:
    """Vapour pressure of water that is still liquid, below 0 °C as well, where it is part of a glycol mixture.

    Parameters
    ----------
    temperature_k : float
        Up to 180 °C. [K]

    Returns
    -------
    float
        [Pa absolute]

    Notes
    -----
    Below the table ``ln p`` goes on in a straight line over ``1/T``, value and slope joined (Clausius–Clapeyron with the heat of
    evaporation at 0 °C); 1.5 % high at −20 °C.

    References
    ----------
    Supercooled water, for that figure: D. M. Murphy and T. Koop, Q. J. R. Meteorol. Soc. 131 (2005) 1539-1565, equation 10 (from memory).
    """
    table = _tables()["water"]
    low, high = table["range_k"]
    if temperature_k >= low:
        return water_properties(temperature_k).vapour_pressure_pa
    slope = float(chebyshev.chebval(-1.0, chebyshev.chebder(table["log_vapour_pressure"]))) * 2.0 / (high - low)
    return water_properties(low).vapour_pressure_pa * math.exp(slope * low**2 * (1.0 / low - 1.0 / temperature_k))


def seawater_properties(temperature_k: float, salinity_g_kg: float) -> LiquidProperties:
    """Seawater at atmospheric pressure.

    Parameters
    ----------
    temperature_k : float
        0 to 40 °C. [K]
    salinity_g_kg : float
        Absolute salinity, 0 to 42. [g/kg]

    Returns
    -------
    LiquidProperties
        Bulk modulus is water's.

    Raises
    ------
    QuantityError
        Outside those ranges.

    References
    ----------
    IOC, SCOR and IAPSO (2010), The international thermodynamic equation of seawater, TEOS-10, for density; M. H. Sharqawy, J. H.
    Lienhard and S. M. Zubair, Thermophysical properties of seawater, Desalin. Water Treat. 16 (2010) 354-380, for viscosity. Vapour
    pressure: water's less 0.537 parts per thousand for each g/kg (Raoult's law for sea salt, from memory).
    """
    table = _tables()["seawater"]
    _demand("temperature", temperature_k, table["range_k"], "°C", 273.15)
    _demand("salinity", salinity_g_kg, table["salinity_g_kg"], "g/kg")
    x, y = _scaled(salinity_g_kg, table["salinity_g_kg"]), _scaled(temperature_k, table["range_k"])
    water = water_properties(temperature_k)
    return LiquidProperties(
        density_kg_m3=float(chebyshev.chebval2d(x, y, np.array(table["density"]))),
        viscosity_pa_s=float(np.exp(chebyshev.chebval2d(x, y, np.array(table["log_viscosity"])))),
        vapour_pressure_pa=water.vapour_pressure_pa * (1.0 - 0.537e-3 * salinity_g_kg),
        bulk_modulus_pa=water.bulk_modulus_pa,
    )


def glycol_properties(
    kind: str, temperature_k: float, concentration_fraction: float, *, by_volume: bool = False
) -> LiquidProperties:
    """A mixture of water and ethylene or propylene glycol.

    Parameters
    ----------
    kind : str
        ``ethylene-glycol`` or ``propylene-glycol``.
    temperature_k : float
        From its freezing point to 100 °C. [K]
    concentration_fraction : float
        Of glycol, 0 to 0.6. [-]
    by_volume : bool
        Whether that is a volume fraction; by mass otherwise.

    Returns
    -------
    LiquidProperties
        Vapour pressure is water's times its mole fraction; bulk modulus is water's.

    Raises
    ------
    QuantityError
        Outside those ranges, or below the freezing point.

    References
    ----------
    Å. Melinder, Properties of Secondary Working Fluids for Indirect Systems, IIR (2010), by mass; ASHRAE Handbook Fundamentals
    (2001), by volume; both as CoolProp has them. Raoult's law for the vapour pressure.
    """
    table = _tables()[(BY_VOLUME if by_volume else BY_MASS)[kind]]
    _demand("temperature", temperature_k, _glycol_limits_k(table, concentration_fraction), "°C", 273.15)
    x, y = _scaled(concentration_fraction, table["fractions"]), _scaled(temperature_k, table["range_k"])
    mass = concentration_fraction
    if by_volume:
        pure = GLYCOL_DENSITY_KG_M3[kind] * concentration_fraction
        mass = pure / (pure + 998.2 * (1.0 - concentration_fraction))
    moles = (1.0 - mass) / WATER_MOLAR_MASS
    return LiquidProperties(
        density_kg_m3=float(chebyshev.chebval2d(x, y, np.array(table["density"]))),
        viscosity_pa_s=float(np.exp(chebyshev.chebval2d(x, y, np.array(table["log_viscosity"])))),
        vapour_pressure_pa=water_vapour_pressure_pa(temperature_k) * moles / (moles + mass / GLYCOL_MOLAR_MASS[kind]),
        bulk_modulus_pa=water_properties(max(temperature_k, 273.16)).bulk_modulus_pa,
    )


def _glycol_limits_k(table: dict[str, Any], concentration_fraction: float) -> tuple[float, float]:
    """Freezing point, or the table's coldest where that is warmer, and the table's hottest; refuses a foreign concentration. [K]"""
    least, most = table["fractions"]
    _demand("concentration", 100.0 * concentration_fraction, (100.0 * least, 100.0 * most), "%")
    freezing = np.interp(
        concentration_fraction, np.linspace(least, most, len(table["freezing_k"])), table["freezing_k"]
    )
    coldest, hottest = table["range_k"]
    return max(float(freezing), coldest), hottest


def temperature_limits_k(
    *, kind: str, concentration_fraction: float | None = None, by_volume: bool = False
) -> tuple[float, float]:
    """Coldest and hottest temperature at which `liquid_properties` knows a liquid, so that a difference can stay within.

    Parameters
    ----------
    kind : str
        As in `liquid_properties`.
    concentration_fraction : float, optional
        Of a glycol. [-]
    by_volume : bool

    Returns
    -------
    tuple of float
        Unlimited for ``other``. [K]

    Raises
    ------
    QuantityError
        Unknown kind, or a concentration outside the table.
    """
    if kind in BY_MASS:
        table = _tables()[(BY_VOLUME if by_volume else BY_MASS)[kind]]
        return _glycol_limits_k(table, _demand_concentration(concentration_fraction))
    if kind in ("water", "seawater"):
        coldest, hottest = _tables()[kind]["range_k"]
        return coldest, hottest
    _demand_other(kind)
    return 0.0, math.inf


def _demand_concentration(concentration_fraction: float | None) -> float:
    """Refuse a glycol that does not say how much of it there is."""
    if concentration_fraction is None:
        raise QuantityError("concentration is missing for a glycol", "", 'concentration = "30 %"')
    return concentration_fraction


def _demand_other(kind: str) -> None:
    """Refuse a kind that no table knows, unless it brings its own values."""
    if kind != "other":
        raise QuantityError("unknown liquid", kind, "water, seawater, ethylene-glycol, propylene-glycol or other")


@lru_cache(maxsize=512)
def liquid_properties(
    *,
    kind: str,
    temperature_k: float,
    concentration_fraction: float | None = None,
    by_volume: bool = False,
    salinity_g_kg: float | None = None,
    density_kg_m3: float | None = None,
    viscosity_pa_s: float | None = None,
    vapour_pressure_pa: float | None = None,
) -> LiquidProperties:
    """Properties of a liquid by its kind.

    Parameters
    ----------
    kind : str
        ``water``, ``seawater``, ``ethylene-glycol``, ``propylene-glycol`` or ``other``.
    temperature_k : float
        [K]
    concentration_fraction : float, optional
        Of a glycol. [-]
    by_volume : bool
    salinity_g_kg : float, optional
        Of seawater; 35 if not given. [g/kg]
    density_kg_m3, viscosity_pa_s, vapour_pressure_pa : float, optional
        Of ``other``; water's viscosity and vapour pressure stand in where they are not given. [kg/m³], [Pa s], [Pa absolute]

    Returns
    -------
    LiquidProperties

    Raises
    ------
    QuantityError
        Unknown kind, a value outside the table, or a concentration or density missing where the kind needs it.
    """
    if kind == "water":
        return water_properties(temperature_k)
    if kind == "seawater":
        return seawater_properties(temperature_k, 35.0 if salinity_g_kg is None else salinity_g_kg)
    if kind in BY_MASS:
        fraction = _demand_concentration(concentration_fraction)
        return glycol_properties(kind, temperature_k, fraction, by_volume=by_volume)
    _demand_other(kind)
    if density_kg_m3 is None:
        raise QuantityError("a liquid of kind other needs its density", "", 'density = "870 kg/m3"')
    water = water_properties(min(max(temperature_k, 273.16), 453.15))
    return LiquidProperties(
        density_kg_m3=density_kg_m3,
        viscosity_pa_s=water.viscosity_pa_s if viscosity_pa_s is None else viscosity_pa_s,
        vapour_pressure_pa=water.vapour_pressure_pa if vapour_pressure_pa is None else vapour_pressure_pa,
        bulk_modulus_pa=water.bulk_modulus_pa,
    )
