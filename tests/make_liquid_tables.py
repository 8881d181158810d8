"""Makes the liquid tables from reference libraries, once: Chebyshev coefficients in the data file that the package ships.

    python tests/make_liquid_tables.py        (needs CoolProp and, for seawater's density, gsw)

Water: IAPWS-95 density, bulk modulus and vapour pressure, IAPWS 2008 viscosity, by CoolProp. Glycols: CoolProp's incompressible liquids MEG
and MPG (Melinder, by mass), AEG and APG (ASHRAE data, by volume). Seawater: density by TEOS-10 (gsw), viscosity by CoolProp's MITSW.
"""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import CoolProp.CoolProp as cp
import gsw
import numpy as np
from numpy.polynomial import chebyshev

TARGET = Path(__file__).parent.parent / "src" / "headledger" / "physics" / "data" / "liquids.json"
ATMOSPHERE_PA = 101_325.0
WATER_RANGE_K = (273.16, 453.15)


def water_pressure(temperature_k: float) -> float:
    """Atmospheric, or just above saturation where water would boil. [Pa]"""
    return max(ATMOSPHERE_PA, 1.0001 * cp.PropsSI("P", "T", temperature_k, "Q", 0, "Water"))


def one_way(values: Callable[[float], float], low: float, high: float, degree: int) -> list[float]:
    """Chebyshev coefficients of a function of temperature."""
    return list(
        chebyshev.chebinterpolate(lambda x: [values(low + (high - low) * (v + 1) / 2) for v in x], degree).round(12)
    )


def water() -> dict[str, Any]:
    """Tables of water by temperature."""
    low, high = WATER_RANGE_K

    def of(name: str) -> Callable[[float], float]:
        return lambda t: cp.PropsSI(name, "T", t, "P", water_pressure(t), "Water")

    return {
        "range_k": [low, high],
        "density": one_way(of("D"), low, high, 16),
        "log_viscosity": one_way(lambda t: float(np.log(of("V")(t))), low, high, 16),
        "log_vapour_pressure": one_way(
            lambda t: float(np.log(cp.PropsSI("P", "T", t, "Q", 0, "Water"))), low, high, 16
        ),
        "log_bulk_modulus": one_way(lambda t: float(-np.log(of("isothermal_compressibility")(t))), low, high, 16),
    }


def two_way(
    value: Callable[[float, float], float],
    first: tuple[float, float],
    second: tuple[float, float],
    degrees: tuple[int, int],
) -> list[list[float]]:
    """Coefficients of a least-squares fit in two variables, over the points where the library gives a value."""
    points = []
    for a in np.linspace(*first, 41):
        for b in np.linspace(*second, 61):
            try:
                points.append((a, b, value(float(a), float(b))))
            except ValueError:
                continue  # below the freezing point
    table = np.array(points)
    x = 2 * (table[:, 0] - first[0]) / (first[1] - first[0]) - 1
    y = 2 * (table[:, 1] - second[0]) / (second[1] - second[0]) - 1
    basis = chebyshev.chebvander2d(x, y, degrees)
    fit = np.linalg.lstsq(basis, table[:, 2], rcond=1e-12)[0]
    worst = np.abs(basis @ fit - table[:, 2]).max()
    print(f"  fit of {len(points)} points, worst difference {worst:.2e}")
    return [list(row) for row in fit.reshape(degrees[0] + 1, degrees[1] + 1).round(12)]


def glycol(name: str) -> dict[str, Any]:
    """Tables of a glycol by concentration and temperature, with its freezing points."""
    # the volume-based sets begin at 10 %
    least, most = (0.0 if name.startswith("M") else 0.1), 0.6
    fractions, range_k = (least, most), (253.15, 373.15)

    def of(quantity: str, fraction: float, temperature_k: float) -> float:
        return float(cp.PropsSI(quantity, "T", temperature_k, "P", 1e6, f"INCOMP::{name}[{max(fraction, 1e-4)}]"))

    freezing = [
        round(float(cp.PropsSI("T_freeze", "T", 293.15, "P", 1e6, f"INCOMP::{name}[{max(x, 1e-4)}]")), 3)
        for x in np.linspace(least, most, 61)
    ]
    return {
        "fractions": list(fractions),
        "range_k": list(range_k),
        "freezing_k": freezing,
        "density": two_way(lambda x, t: of("D", x, t), fractions, range_k, (5, 5)),
        "log_viscosity": two_way(lambda x, t: float(np.log(of("V", x, t))), fractions, range_k, (5, 6)),
    }


def seawater() -> dict[str, Any]:
    """Tables of seawater by salinity and temperature."""
    salinity, range_k = (0.0, 42.0), (273.15, 313.15)
    return {
        "salinity_g_kg": list(salinity),
        "range_k": list(range_k),
        "density": two_way(lambda s, t: float(gsw.rho_t_exact(s, t - 273.15, 0.0)), salinity, range_k, (5, 8)),
        "log_viscosity": two_way(
            lambda s, t: float(np.log(cp.PropsSI("V", "T", t, "P", 1e6, f"INCOMP::MITSW[{max(s, 0.01) / 1000}]"))),
            salinity,
            range_k,
            (4, 6),
        ),
    }


def main() -> None:
    """Write the data file."""
    tables = {"water": water(), "seawater": seawater()} | {name: glycol(name) for name in ("MEG", "MPG", "AEG", "APG")}
    TARGET.write_text(json.dumps(tables, indent=None, separators=(",", ":")) + "\n")
    print(f"{TARGET.name}: {TARGET.stat().st_size} bytes")


if __name__ == "__main__":
    main()
