"""Units at the border only: text and columns become SI floats and back, and pressures keep their kind."""

from __future__ import annotations

import math
import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from difflib import get_close_matches
from enum import StrEnum
from functools import lru_cache
from typing import Any, TypeVar

from headledger.errors import QuantityError

Value = TypeVar("Value", float, Any)


class PressureKind(StrEnum):
    """Against what a pressure is measured."""

    GAUGE = "gauge"
    ABSOLUTE = "absolute"
    DIFFERENCE = "difference"


class Dimension(StrEnum):
    """The dimensions that a job file can ask for."""

    LENGTH = "length"
    PRESSURE = "pressure"
    FLOW = "flow"
    TEMPERATURE = "temperature"
    TEMPERATURE_DIFFERENCE = "temperature difference"
    DENSITY = "density"
    VISCOSITY = "viscosity"
    TIME = "time"
    ANGLE = "angle"
    SALINITY = "salinity"
    VOLUME = "volume"
    VOLTAGE = "voltage"
    CURRENT = "current"
    RATIO = "ratio"


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit as written, with what turns it into SI: ``si = value * factor + offset``.

    Parameters
    ----------
    text : str
        As the user wrote it, tidied; used to print values back.
    dimension : Dimension
    factor : float
        SI units per unit.
    offset : float
        SI value of zero; only temperatures have one.
    kind : PressureKind or None
        For pressures.
    """

    text: str
    dimension: Dimension
    factor: float
    offset: float = 0.0
    kind: PressureKind | None = None

    def to_si(self, value: Value) -> Value:
        """Values in this unit, in SI; floats and arrays alike."""
        return value * self.factor + self.offset

    def from_si(self, value: Value) -> Value:
        """Values in SI, in this unit; floats and arrays alike."""
        return (value - self.offset) / self.factor

    def as_difference(self) -> Unit:
        """The same unit for a difference of pressures: ``barg`` becomes ``bar``."""
        if self.dimension is not Dimension.PRESSURE:
            return replace(self, offset=0.0)
        plain, _ = _split_kind(self.text)
        return replace(self, text=plain, kind=PressureKind.DIFFERENCE)


POUND_FORCE_PER_SQUARE_INCH_PA = 0.45359237 * 9.80665 / 0.0254**2
US_GALLON_M3 = 231.0 * 0.0254**3
IMPERIAL_GALLON_M3 = 4.54609e-3
FOOT_M, INCH_M = 0.3048, 0.0254
STANDARD_GRAVITY = 9.80665
ZERO_CELSIUS_K = 273.15
ZERO_FAHRENHEIT_K = 459.67 / 1.8

_WATER_INCH_PA: dict[str, float] = {
    # an inch of water at a stated temperature (NIST SP 811, appendix B.8; 20 °C: instrument industry)
    "4C": 249.082,
    "39F": 249.082,
    "39.2F": 249.082,
    "60F": 248.84,
    "20C": 248.641,
    "68F": 248.641,
}
_INCHES: dict[str, float] = {"in": 1.0, "ft": 12.0, "mm": 1.0 / 25.4, "cm": 10.0 / 25.4, "m": 1000.0 / 25.4}

_PRESSURE: dict[str, float] = {
    "Pa": 1.0,
    "hPa": 100.0,
    "kPa": 1e3,
    "MPa": 1e6,
    "mbar": 100.0,
    "bar": 1e5,
    "psi": POUND_FORCE_PER_SQUARE_INCH_PA,
    "ksi": 1e3 * POUND_FORCE_PER_SQUARE_INCH_PA,
    "psf": POUND_FORCE_PER_SQUARE_INCH_PA / 144.0,
    "kgf/cm2": 1e4 * STANDARD_GRAVITY,
    "at": 1e4 * STANDARD_GRAVITY,
    "atm": 101_325.0,
    "torr": 101_325.0 / 760.0,
    "mmHg": 133.322387415,
    "cmHg": 1333.22387415,
    "inHg": 25.4 * 133.322387415,
    "ftHg": 304.8 * 133.322387415,
    "mH2O": 1e3 * STANDARD_GRAVITY,
    "cmH2O": 10.0 * STANDARD_GRAVITY,
    "mmH2O": STANDARD_GRAVITY,
    "inH2O": 25.4 * STANDARD_GRAVITY,
    "ftH2O": 304.8 * STANDARD_GRAVITY,
    # columns of mercury at a stated temperature (NIST SP 811, appendix B.8)
    "inHg@0C": 3386.38,
    "inHg@32F": 3386.38,
    "inHg@60F": 3376.85,
    **{f"{name}H2O@{at}": count * inch for name, count in _INCHES.items() for at, inch in _WATER_INCH_PA.items()},
}

PRESSURE_FACTORS: dict[str, float] = {
    name: _PRESSURE[name]
    for name in ("kPa", "MPa", "bar", "mbar", "psi", "kgf/cm2", "mH2O", "ftH2O", "inH2O", "inHg", "mmHg")
}
"""Units that pressure gauges of this trade are logged in, in pascals: what a column may be in by mistake."""

_PRESSURE_ALIASES: dict[str, str] = {
    "kg/cm2": "kgf/cm2",
    "kp/cm2": "kgf/cm2",
    "lbf/in2": "psi",
    "lb/in2": "psi",
    "mWC": "mH2O",
    "mWS": "mH2O",
    "mCE": "mH2O",
    "mCA": "mH2O",
    "mWG": "mH2O",
    "cmWC": "cmH2O",
    "mmWC": "mmH2O",
    "mmWS": "mmH2O",
    "mmWG": "mmH2O",
    "inWC": "inH2O",
    "inWG": "inH2O",
    "ftWC": "ftH2O",
    "ftWG": "ftH2O",
    "m WC": "mH2O",
    "in WC": "inH2O",
    "ft WC": "ftH2O",
    "mm Hg": "mmHg",
    "in Hg": "inHg",
    "m H2O": "mH2O",
    "mm H2O": "mmH2O",
    "in H2O": "inH2O",
    "ft H2O": "ftH2O",
}
_PRESSURE_NAMES: dict[str, float] = _PRESSURE | {alias: _PRESSURE[name] for alias, name in _PRESSURE_ALIASES.items()}

_TABLES: dict[Dimension, dict[str, float]] = {
    Dimension.PRESSURE: _PRESSURE,
    Dimension.LENGTH: {
        "m": 1.0,
        "mm": 1e-3,
        "cm": 1e-2,
        "km": 1e3,
        "um": 1e-6,
        "µm": 1e-6,
        "ft": FOOT_M,
        "feet": FOOT_M,
        "in": INCH_M,
        "inch": INCH_M,
        "yd": 0.9144,
        "mi": 1609.344,
    },
    Dimension.FLOW: {
        "m3/s": 1.0,
        "m3/min": 1.0 / 60.0,
        "m3/h": 1.0 / 3600.0,
        "m3/d": 1.0 / 86400.0,
        "L/s": 1e-3,
        "L/min": 1e-3 / 60.0,
        "L/h": 1e-3 / 3600.0,
        "mL/s": 1e-6,
        "mL/min": 1e-6 / 60.0,
        "lps": 1e-3,
        "lpm": 1e-3 / 60.0,
        "lph": 1e-3 / 3600.0,
        "m3/hr": 1.0 / 3600.0,
        "L/hr": 1e-3 / 3600.0,
        "gpm": US_GALLON_M3 / 60.0,
        "gpm (US)": US_GALLON_M3 / 60.0,
        "gpm(US)": US_GALLON_M3 / 60.0,
        "igpm": IMPERIAL_GALLON_M3 / 60.0,
        "US gpm": US_GALLON_M3 / 60.0,
        "USgpm": US_GALLON_M3 / 60.0,
        "gal/min": US_GALLON_M3 / 60.0,
        "US gal/min": US_GALLON_M3 / 60.0,
        "imp gal/min": IMPERIAL_GALLON_M3 / 60.0,
        "gal/h": US_GALLON_M3 / 3600.0,
        "ft3/s": FOOT_M**3,
        "cfs": FOOT_M**3,
        "ft3/min": FOOT_M**3 / 60.0,
        "cfm": FOOT_M**3 / 60.0,
        "MGD": 1e6 * US_GALLON_M3 / 86400.0,
        "ML/d": 1e3 / 86400.0,
        "MLD": 1e3 / 86400.0,
    },
    Dimension.TEMPERATURE_DIFFERENCE: {
        "K": 1.0,
        "degC": 1.0,
        "C": 1.0,
        "°C": 1.0,
        "degF": 1.0 / 1.8,
        "F": 1.0 / 1.8,
        "°F": 1.0 / 1.8,
    },
    Dimension.DENSITY: {
        "kg/m3": 1.0,
        "g/cm3": 1e3,
        "g/mL": 1e3,
        "kg/L": 1e3,
        "lb/ft3": 0.45359237 / FOOT_M**3,
        "lbm/ft3": 0.45359237 / FOOT_M**3,
        "SG": 1e3,
    },
    Dimension.VISCOSITY: {
        "Pa*s": 1.0,
        "Pa s": 1.0,
        "Pa.s": 1.0,
        "mPa*s": 1e-3,
        "mPa s": 1e-3,
        "mPa.s": 1e-3,
        "cP": 1e-3,
        "P": 0.1,
    },
    Dimension.TIME: {"s": 1.0, "ms": 1e-3, "min": 60.0, "h": 3600.0, "hr": 3600.0, "d": 86400.0},
    Dimension.ANGLE: {"deg": 1.0, "°": 1.0, "rad": 57.29577951308232},
    Dimension.SALINITY: {"g/kg": 1.0, "ppt": 1.0, "psu": 1.0},
    Dimension.VOLUME: {"m3": 1.0, "L": 1e-3, "mL": 1e-6, "gal": US_GALLON_M3, "ft3": FOOT_M**3},
    Dimension.VOLTAGE: {"V": 1.0, "mV": 1e-3},
    Dimension.CURRENT: {"mA": 1e-3, "A": 1.0},
    Dimension.RATIO: {"": 1.0, "%": 0.01, "1": 1.0},
}

_TEMPERATURES: dict[str, tuple[float, float]] = {
    "K": (1.0, 0.0),
    "degC": (1.0, ZERO_CELSIUS_K),
    "C": (1.0, ZERO_CELSIUS_K),
    "°C": (1.0, ZERO_CELSIUS_K),
    "degF": (1.0 / 1.8, ZERO_FAHRENHEIT_K),
    "F": (1.0 / 1.8, ZERO_FAHRENHEIT_K),
    "°F": (1.0 / 1.8, ZERO_FAHRENHEIT_K),
    "degR": (1.0 / 1.8, 0.0),
}

_PINT_NAMES: dict[Dimension, str] = {
    Dimension.LENGTH: "meter",
    Dimension.PRESSURE: "pascal",
    Dimension.FLOW: "meter**3/second",
    Dimension.TEMPERATURE: "kelvin",
    Dimension.TEMPERATURE_DIFFERENCE: "kelvin",
    Dimension.DENSITY: "kilogram/meter**3",
    Dimension.VISCOSITY: "pascal*second",
    Dimension.TIME: "second",
    Dimension.ANGLE: "degree",
    Dimension.VOLUME: "meter**3",
    Dimension.VOLTAGE: "volt",
    Dimension.CURRENT: "ampere",
}

_SUFFIX = re.compile(
    r"^(?P<unit>.+?)(?:\s*\((?P<bracket>g|a|d|gauge|abs|absolute|diff)\)|\s+(?P<word>gauge|abs|absolute|diff)|\s*(?P<tail>[gad]))$",
    re.IGNORECASE,
)
_KINDS = {
    "g": PressureKind.GAUGE,
    "gauge": PressureKind.GAUGE,
    "a": PressureKind.ABSOLUTE,
    "abs": PressureKind.ABSOLUTE,
    "absolute": PressureKind.ABSOLUTE,
    "d": PressureKind.DIFFERENCE,
    "diff": PressureKind.DIFFERENCE,
}
_NUMBER = re.compile(
    r"^\s*(?:±|\+/-|\+-)?\s*(?P<number>[-+−]?(?:\d[\d\s]*[.,]?\d*|[.,]\d+)(?:[eE][-+]?\d+)?)\s*(?P<unit>.*?)\s*$"
)


def nearest(name: str, choices: Iterable[str]) -> str | None:
    """The choice that a misspelt name most probably means, or None."""
    folded = {choice.casefold(): choice for choice in choices}
    found = get_close_matches(name.casefold(), folded, n=1, cutoff=0.6)
    return folded[found[0]] if found else None


def split_header(header: str, *, round_brackets: bool = False) -> tuple[str, str | None]:
    """Name and unit text of a column header such as ``elevation [m]``; the unit is None where there is none.

    Parameters
    ----------
    header : str
    round_brackets : bool
        Whether ``PT-1 (psi)`` carries a unit too.

    Returns
    -------
    tuple of str and (str or None)
    """
    match = re.match(r"^\s*(?P<name>.*?)\s*\[(?P<unit>[^\]]*)\]\s*$", header)
    if match is None and round_brackets:
        match = re.match(r"^\s*(?P<name>.+?)\s*\((?P<unit>[^()]*(?:\([^()]*\))?)\)\s*$", header)
    return (match["name"], match["unit"].strip()) if match else (header.strip(), None)


def parse_number(text: str, *, decimal_comma: bool = False) -> float:
    """A finite number as a person or a spreadsheet writes it.

    Raises
    ------
    QuantityError
        Not a number, or not finite.
    """
    plain = text.strip().replace("−", "-").replace("\u00a0", "").replace(" ", "")
    if decimal_comma:
        plain = plain.replace(".", "").replace(",", ".") if "," in plain else plain
    try:
        value = float(plain if plain.isascii() and "_" not in plain else "")
    except ValueError:
        raise QuantityError("not a number", repr(text.strip()), "a number such as 12.5") from None
    if not math.isfinite(value):
        raise QuantityError("not a finite number", repr(text.strip()), "a number such as 12.5")
    return value


def parse_unit(text: str, dimension: Dimension, *, default_kind: PressureKind | None = None) -> Unit:
    """A unit from its text.

    Parameters
    ----------
    text : str
        As written: ``barg``, ``psi (a)``, ``m3/h``, ….
    dimension : Dimension
        What it has to be.
    default_kind : PressureKind, optional
        Of a pressure whose text carries no suffix.

    Returns
    -------
    Unit

    Raises
    ------
    QuantityError
        Unknown, or of another dimension; names the nearest unit of the right one.
    """
    tidy = _tidy(text)
    if dimension is Dimension.TEMPERATURE:
        found = _look_up(tidy.replace(" ", ""), dict.fromkeys(_TEMPERATURES, 0.0))
        if found is not None:
            factor, offset = _TEMPERATURES[found]
            return Unit(text.strip(), dimension, factor, offset)
    elif dimension is Dimension.PRESSURE:
        unit = _pressure_unit(tidy, default_kind)
        if unit is not None:
            return unit
    else:
        spelt = tidy.replace(" ", "") if dimension is Dimension.TEMPERATURE_DIFFERENCE else tidy
        found = _look_up(spelt, _TABLES.get(dimension, {}))
        if found is not None:
            return Unit(text.strip(), dimension, _TABLES[dimension][found])
    return _unit_by_pint(text, tidy, dimension, default_kind)


_LOOK_ALIKES = str.maketrans(
    {"³": "3", "²": "2", "·": "*", "^": None, "º": "°", "˚": "°", "℃": "°C", "℉": "°F", "μ": "µ"}
)
"""Signs that spreadsheets and keyboards put in place of one another, by code point."""


def _tidy(text: str) -> str:
    """A unit's text with the spellings of powers and products made one."""
    plain = text.translate(_LOOK_ALIKES).replace("**", "")
    plain = " ".join(plain.split())
    plain = re.sub(r"\b(liters?|litres?|ltr|l)(?=/|$)", "L", plain)
    return re.sub(r"\s*([/*@])\s*", r"\1", plain)


def _look_up(name: str, table: Mapping[str, float]) -> str | None:
    """The table's own spelling of a unit; another case is accepted where it cannot mean another unit."""
    if name in table:
        return name
    folded = [entry for entry in table if entry.casefold() == name.casefold()]
    return folded[0] if len(folded) == 1 and not _other_prefix(name, folded[0]) else None


def _other_prefix(name: str, entry: str) -> bool:
    """Whether the case of a name makes milli of the table's mega, or mega of its milli.

    A pressure all in small or all in capital letters says nothing by its case; ``mPa`` and ``Mbar`` do.
    """
    if name[0] == entry[0] or not re.match(r"[mM](Pa|bar|L|V|A)", entry):
        return False
    silent = name.isupper() or name.islower()
    return not (silent and entry[1:].startswith(("Pa", "bar")))


def _split_kind(text: str) -> tuple[str, PressureKind | None]:
    """A pressure unit's text without its suffix, and what the suffix says; a unit of the table is never cut."""
    plain = re.sub(r"\s*[@(](\d+(?:\.\d+)?)\s*(?:°|deg)?\s*([CF])\)?", r"@\1\2", _tidy(text).replace("H20", "H2O"))
    if _look_up(plain, _PRESSURE_NAMES) is not None:
        return plain, None
    match = _SUFFIX.match(plain)
    if not match or _look_up(match["unit"], _PRESSURE_NAMES) is None:
        return plain, None
    return match["unit"], _KINDS[(match["bracket"] or match["word"] or match["tail"]).casefold()]


def _pressure_unit(tidy: str, default_kind: PressureKind | None) -> Unit | None:
    """A pressure unit with the kind that its suffix gives it; None where it is not in the table."""
    plain, kind = _split_kind(tidy)
    found = _look_up(plain, _PRESSURE_NAMES)
    return None if found is None else Unit(tidy, Dimension.PRESSURE, _PRESSURE_NAMES[found], kind=kind or default_kind)


@lru_cache(maxsize=1)
def _registry() -> Any:
    """The general unit library, loaded only for units that the trade's own table lacks."""
    import pint

    return pint.UnitRegistry()


def _unit_by_pint(text: str, tidy: str, dimension: Dimension, kind: PressureKind | None) -> Unit:
    """A unit that only the general library knows, with its dimension checked."""
    if not tidy or dimension not in _PINT_NAMES or _twisted(tidy, dimension):
        raise QuantityError(f"not a unit of {dimension}", repr(text.strip()), _right_units(tidy, dimension))
    spelt = re.sub(r"(?<=[A-Za-z])([23])\b", r"**\1", tidy)
    try:
        factor = float(_registry().Quantity(1.0, spelt).to(_PINT_NAMES[dimension]).magnitude)
    except Exception as error:  # pint raises many kinds, some of them plain AttributeError or AssertionError
        wrong = type(error).__name__ == "DimensionalityError"
        fault = f"this unit is no unit of {dimension}" if wrong else "unknown unit"
        raise QuantityError(fault, repr(text.strip()), _right_units(tidy, dimension)) from None
    if not (math.isfinite(factor) and factor > 0.0):
        raise QuantityError(f"not a unit of {dimension}", repr(text.strip()), _right_units(tidy, dimension))
    return Unit(text.strip(), dimension, factor, kind=kind)


def _twisted(tidy: str, dimension: Dimension) -> bool:
    """Whether a unit is one of the table but for the case of its prefix: ``mPa`` is hardly a millipascal.

    Litres are left alone: megalitres and millilitres are both flows of the trade.
    """
    if dimension is Dimension.VISCOSITY:
        return tidy.casefold() in {name.casefold() for name in _TABLES[dimension]}
    if dimension is not Dimension.PRESSURE:
        return False
    match = _SUFFIX.match(tidy)
    known = {name.casefold() for name in _PRESSURE_NAMES}
    return tidy.casefold() in known or bool(match and match["unit"].casefold() in known)


def _right_units(tidy: str, dimension: Dimension) -> str:
    """What would be right in place of a faulty unit: the nearest of its dimension, or an example."""
    choices = [*(_TEMPERATURES if dimension is Dimension.TEMPERATURE else _TABLES[dimension])]
    if dimension is Dimension.PRESSURE:
        choices += [name + suffix for name in PRESSURE_FACTORS for suffix in "ga"]
    close = nearest(tidy, choices)
    example = {Dimension.PRESSURE: "barg", Dimension.FLOW: "m3/h", Dimension.TEMPERATURE: "degC", Dimension.RATIO: "%"}
    return f"{close}" if close else f"a unit of {dimension} such as {example.get(dimension, choices[0])}"


def parse_quantity(text: str, dimension: Dimension, *, default_kind: PressureKind | None = None) -> float:
    """A value with its unit, in SI; a leading ± is dropped.

    Parameters
    ----------
    text : str
        For example ``18 degC``, ``98.9 kPa``, ``±5 mm``.
    dimension : Dimension
    default_kind : PressureKind, optional

    Returns
    -------
    float

    Raises
    ------
    QuantityError
    """
    number, unit = split_quantity(text)
    if not unit and dimension is not Dimension.RATIO:
        raise QuantityError("the unit is missing", repr(text.strip()), f"a number with {_right_units('', dimension)}")
    return float(parse_unit(unit, dimension, default_kind=default_kind).to_si(number))


def parse_pressure(text: str, kind: PressureKind) -> float:
    """A pressure of a given kind with its unit, in pascals; a leading ± is dropped.

    Parameters
    ----------
    text : str
        With the suffix of its kind or with none; a difference has none.
    kind : PressureKind

    Returns
    -------
    float
        [Pa]

    Raises
    ------
    QuantityError
        No pressure, or its suffix says another kind.
    """
    number, unit_text = split_quantity(text)
    value = parse_quantity(text, Dimension.PRESSURE, default_kind=kind)
    unit = parse_unit(unit_text, Dimension.PRESSURE, default_kind=kind)
    if unit.kind is not kind:
        suffix = {PressureKind.GAUGE: "g", PressureKind.ABSOLUTE: "a", PressureKind.DIFFERENCE: ""}[kind]
        right = f"{number:g} {unit.as_difference().text}{suffix}"
        raise QuantityError(f"of the wrong kind, {unit.kind} and not {kind}", repr(text.strip()), right)
    return value


def split_quantity(text: str) -> tuple[float, str]:
    """Number and unit text of a quantity, a leading ± dropped.

    Raises
    ------
    QuantityError
        No number at its start.
    """
    match = _NUMBER.match(text)
    if not match:
        raise QuantityError("not a number with a unit", repr(text.strip()), "a value such as 12.5 kPa")
    number = match["number"].replace(" ", "").replace("−", "-")
    if re.fullmatch(r"[-+]?[1-9]\d{0,2},\d{3}", number):
        either = f"{number.replace(',', '')} or {number.replace(',', '.')}"
        raise QuantityError("the comma may mark thousands or decimals", repr(text.strip()), either)
    return parse_number(number.replace(",", ".")), match["unit"]


def format_quantity(si_value: float, unit: Unit, digits: int = 3, *, resolution: float | None = None) -> str:
    """A value in a unit with so many significant digits, never in exponent form.

    Parameters
    ----------
    si_value : float
        [SI]
    unit : Unit
    digits : int
        Significant digits.
    resolution : float, optional
        Smallest step worth printing, such as a standard uncertainty; its first two digits set the decimals in
        place of `digits`. [SI]

    Returns
    -------
    str
    """
    value = float(unit.from_si(si_value))
    step, wanted = (resolution / unit.factor, 2) if resolution and math.isfinite(resolution) else (value, digits)
    if not math.isfinite(value) or step == 0.0:
        return f"{value:g} {unit.text}"
    places = max(0, wanted - 1 - math.floor(math.log10(abs(step))))
    return f"{round(value, places) + 0.0:.{places}f} {unit.text}"
