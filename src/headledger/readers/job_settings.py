"""job.toml: its tables and keys, with every unknown key named and every quantity turned into SI."""

from __future__ import annotations

import re
import tomllib
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from headledger.errors import JobError, Problem, QuantityError
from headledger.physics.liquids import liquid_properties
from headledger.plant.job import CheckSettings, DecisionRule, LiquidKind, LiquidSpec, LogSettings, Site
from headledger.quantities import (
    Dimension,
    PressureKind,
    Unit,
    nearest,
    parse_pressure,
    parse_quantity,
    parse_unit,
    split_quantity,
)
from headledger.readers.accuracy import parse_limit
from headledger.readers.tables import Problems, decode

FILE = "job.toml"

KEYS: dict[str, tuple[str, ...]] = {
    "": ("format", "job", "liquid", "site", "check", "hold", "log"),
    "job": (
        "title", "site", "prepared_by", "stations", "runs", "gauges", "logs", "spells", "levels", "timezone",
    ),
    "liquid": (
        "kind", "concentration", "salinity", "temperature", "temperature_uncertainty", "density", "viscosity",
        "vapour_pressure", "density_uncertainty",
    ),
    "site": (
        "datum_altitude", "latitude", "barometer", "barometer_uncertainty", "ambient", "ambient_uncertainty",
    ),
    "check": (
        "tolerance", "decision", "confidence", "elevation_uncertainty", "loss_uncertainty", "flow_uncertainty",
    ),
    "hold": (
        "runs", "material", "E", "poisson", "expansion", "wall", "restrained", "start", "end", "test_pressure", "at",
        "temperature_column", "volume_column", "volume_unit", "stroke_volume", "strokes_column", "accept_fall",
        "accept_time", "accept_leakage",
    ),
    "log": (
        "delimiter", "decimal", "thousands", "encoding", "header_line", "units_line", "stamp", "stamp_format",
        "day_first", "shape", "tag_column", "value_column", "quality_column", "good",
    ),
}  # fmt: skip

KELVIN_UNSTATED, ELEVATION_UNSTATED_M, LOSS_UNSTATED, FLOW_UNSTATED = 10.0, 0.050, 0.15, 0.02
BAROMETER_UNSTATED_PA, BAROMETER_STATED_PA, AMBIENT_UNSTATED_K, DENSITY_UNSTATED = 2000.0, 200.0, 10.0, 0.001
COVERAGE = 2.0
"""Stated ± are half-widths with this coverage factor. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Defaults:
    """Doubts for what the tables leave open, as standard uncertainties.

    Parameters
    ----------
    elevation_sd_m, loss_sd_fraction, flow_sd_fraction : float
        [m], [-], [-]
    loss_stated : bool
    """

    elevation_sd_m: float
    loss_sd_fraction: float
    flow_sd_fraction: float
    loss_stated: bool


class Section:
    """One table of job.toml; faults are noted with their key."""

    def __init__(self, name: str, values: dict[str, Any], problems: Problems) -> None:
        self.name, self.values, self._problems = name, values, problems
        self.faulty = False

    def fault(self, key: str, fault: str, found: str = "", expected: str = "") -> None:
        """Note a problem of a key."""
        self.faulty = True
        self._problems.add(f"{FILE}, [{self.name}] {key}", fault, found, expected)

    def text(self, key: str, default: str = "") -> str:
        """A text."""
        value = self.values.get(key, default)
        if not isinstance(value, str):
            self.fault(key, "must be a text", repr(value), f'{key} = "…"')
            return default
        return value

    def quantity(self, key: str, dimension: Dimension, example: str, kind: PressureKind | None = None) -> float | None:
        """A quantity in SI, None where it is not given or faulty."""
        if key not in self.values:
            return None
        value = self.values[key]
        if not isinstance(value, str):
            self.fault(key, "must be a text with its unit", repr(value), f'{key} = "{example}"')
            return None
        try:
            return parse_quantity(value, dimension) if kind is None else parse_pressure(value, kind)
        except QuantityError as error:
            self.fault(key, error.fault, error.found, error.expected or f'{key} = "{example}"')
            return None

    def positive(self, key: str, dimension: Dimension, example: str, kind: PressureKind | None = None) -> float | None:
        """A quantity above zero in SI, None where it is not given or faulty."""
        value = self.quantity(key, dimension, example, kind)
        if value is not None and value <= 0.0:
            self.fault(key, "must be positive", repr(self.values[key]), f'{key} = "{example}"')
            return None
        return value

    def share(self, key: str, example: str) -> float | None:
        """A ± in per cent as a fraction, None where it is not given or faulty."""
        value = self.quantity(key, Dimension.RATIO, example)
        if value is not None and not (0.0 < abs(value) <= 1.0 and "%" in self.values[key]):
            self.fault(key, "must be a share in per cent", repr(self.values[key]), f'{key} = "{example}"')
            return None
        return value

    def measured(
        self, key: str, dimension: Dimension, example: str, kind: PressureKind | None = None
    ) -> tuple[tuple[str, Unit] | None, float | None]:
        """The log column that measures this where the key is a table ``{ column, unit }``, else its value above zero in SI.

        One of them at most; neither where it is not given or faulty.
        """
        value = self.values.get(key)
        if isinstance(value, dict):
            return self._column(key, value, dimension), None
        return None, self.positive(key, dimension, example, kind)

    def _column(self, key: str, value: dict[str, Any], dimension: Dimension) -> tuple[str, Unit] | None:
        """Name and unit of a log column, None where faulty."""
        name, unit_text = value.get("column"), value.get("unit")
        if not (isinstance(name, str) and isinstance(unit_text, str)) or set(value) - {"column", "unit"}:
            self.fault(key, "must name a column and its unit", str(value), f'{key} = {{ column = "…", unit = "…" }}')
            return None
        try:
            unit = parse_unit(unit_text, dimension, default_kind=PressureKind.ABSOLUTE)
        except QuantityError as error:
            self.fault(key, error.fault, error.found, error.expected)
            return None
        if unit.kind not in (None, PressureKind.ABSOLUTE):
            self.fault(key, "must be an absolute pressure", unit_text, f"{unit.as_difference().text}a")
            return None
        return name, unit


def read_settings(folder: Path, problems: Problems) -> dict[str, Section]:
    """The tables of job.toml.

    Parameters
    ----------
    folder : Path
    problems : Problems

    Returns
    -------
    dict of str to Section

    Raises
    ------
    JobError
        There is no such folder or file, or it is no TOML.
    """
    tree = _tree(folder)
    sections = {}
    for key in tree:
        if key not in KEYS[""]:
            problems.add(FILE, "unknown table or key", key, _did_you_mean(key, KEYS[""]))
    if tree.get("format", 1) != 1:
        problems.add(f"{FILE}, format", "unknown format", repr(tree["format"]), "format = 1")
    for name in KEYS[""][1:]:
        values = tree.get(name, {})
        if not isinstance(values, dict):
            problems.add(FILE, f"[{name}] must be a table", repr(values), f"[{name}]")
            values = {}
        for key in values:
            if key not in KEYS[name]:
                problems.add(f"{FILE}, [{name}]", "unknown key", key, _did_you_mean(key, KEYS[name]))
        sections[name] = Section(name, values, problems)
    return sections


def _tree(folder: Path) -> dict[str, Any]:
    """What job.toml holds, as TOML has it.

    Raises
    ------
    JobError
        There is no such folder or file, or it is no TOML.
    """
    path = folder / FILE
    expected = "a job folder that holds job.toml with its tables of stations, runs and gauges"
    if not folder.is_dir():
        fault = "is a file and no job folder" if folder.is_file() else "there is no such folder"
        raise JobError([Problem(str(folder), fault, "", expected)])
    if not path.is_file():
        raise JobError([Problem(str(folder), "holds no job.toml", "", expected)])
    try:
        return tomllib.loads(decode(path.read_bytes(), FILE))
    except OSError as error:
        raise JobError([Problem(FILE, "cannot be read", error.strerror or str(error), "a readable file")]) from None
    except tomllib.TOMLDecodeError as error:
        line = re.search(r"at line (\d+)", str(error))
        place = f"{FILE}, line {line[1]}" if line else FILE
        fault = f"is not valid TOML ({str(error).partition(' (at ')[0]})"
        raise JobError([Problem(place, fault, "", 'lines such as title = "…"')]) from None
    except RecursionError:
        raise JobError([Problem(FILE, "is nested too deeply", "", "one level of tables")]) from None


def _did_you_mean(key: str, known: tuple[str, ...]) -> str:
    """The nearest known key, or all of them."""
    close = nearest(key, known)
    return close if close else "one of " + ", ".join(known)


def read_liquid(section: Section) -> LiquidSpec:
    """The liquid of a job."""
    kinds = [str(kind) for kind in LiquidKind]
    kind = section.text("kind", "water").casefold()
    if kind not in kinds:
        section.fault("kind", "unknown liquid", kind, _did_you_mean(kind, tuple(kinds)))
        kind = "water"
    column, stated = section.measured("temperature", Dimension.TEMPERATURE, "18 degC")
    doubt = section.quantity("temperature_uncertainty", Dimension.TEMPERATURE_DIFFERENCE, "±1 K")
    if doubt is None:
        doubt = KELVIN_UNSTATED if stated is None and column is None else 1.0
    density_doubt = section.share("density_uncertainty", "±0.1 %")
    concentration, by_volume = _concentration(section, kind)
    _check_belonging(section, kind)
    spec = LiquidSpec(
        kind=LiquidKind(kind),
        concentration_fraction=concentration,
        concentration_by_volume=by_volume,
        salinity_g_kg=section.positive("salinity", Dimension.SALINITY, "35 g/kg"),
        temperature_k=293.15 if stated is None else stated,
        temperature_column=column[0] if column else None,
        temperature_unit=column[1] if column else None,
        temperature_sd_k=abs(doubt) / COVERAGE,
        density_kg_m3=section.positive("density", Dimension.DENSITY, "870 kg/m3"),
        viscosity_pa_s=section.positive("viscosity", Dimension.VISCOSITY, "12 mPa*s"),
        vapour_pressure_pa=section.positive("vapour_pressure", Dimension.PRESSURE, "0.5 kPa", PressureKind.ABSOLUTE),
        density_sd_fraction=abs(DENSITY_UNSTATED if density_doubt is None else density_doubt) / COVERAGE,
    )
    if not section.faulty:
        _check_tables(section, spec)
    return spec


def _check_tables(section: Section, spec: LiquidSpec) -> None:
    """Note a liquid that is outside the tables of its properties."""
    try:
        liquid_properties(
            kind=str(spec.kind),
            temperature_k=spec.temperature_k,
            concentration_fraction=spec.concentration_fraction,
            by_volume=spec.concentration_by_volume,
            salinity_g_kg=spec.salinity_g_kg,
            density_kg_m3=spec.density_kg_m3,
            viscosity_pa_s=spec.viscosity_pa_s,
            vapour_pressure_pa=spec.vapour_pressure_pa,
        )
    except QuantityError as error:
        key, _, fault = error.fault.partition(" ")
        section.fault(key if key in KEYS["liquid"] else "kind", fault, error.found, error.expected)


def _check_belonging(section: Section, kind: str) -> None:
    """Note what a liquid of this kind cannot do without, and what belongs to another kind."""
    for key, kinds, example in (
        ("concentration", ("ethylene-glycol", "propylene-glycol"), "30 %"),
        ("salinity", ("seawater",), ""),
        ("density", ("other",), "870 kg/m3"),
        ("viscosity", ("other",), ""),
        ("vapour_pressure", ("other",), ""),
    ):
        given = key in section.values
        if given and kind not in kinds:
            section.fault(key, f"does not belong to {kind}", repr(section.values[key]), "kind = " + " or ".join(kinds))
        if not given and kind in kinds and example:
            section.fault(key, f"is missing for {kind}", "", f'{key} = "{example}"')


def _concentration(section: Section, kind: str) -> tuple[float | None, bool]:
    """Concentration of a glycol and whether it is by volume."""
    text = section.text("concentration")
    if not text or "glycol" not in kind:
        return None, False
    try:
        number, unit = split_quantity(text)
    except QuantityError:
        number, unit = -1.0, ""
    words = unit.casefold().replace("%", "% ").split()
    if not (0.0 < number < 100.0 and words in (["%"], ["%", "vol"], ["%", "mass"])):
        section.fault("concentration", "not a concentration", repr(text), '"30 %" by mass or "30 % vol" by volume')
        return None, False
    return number / 100.0, words[-1] == "vol"


def read_site(section: Section) -> Site:
    """Where a job stands."""
    column, barometer = section.measured("barometer", Dimension.PRESSURE, "98.9 kPa", PressureKind.ABSOLUTE)
    doubt = section.quantity("barometer_uncertainty", Dimension.PRESSURE, "±0.2 kPa", PressureKind.DIFFERENCE)
    if doubt is None:
        doubt = BAROMETER_UNSTATED_PA if barometer is None and not column else BAROMETER_STATED_PA
    altitude = section.quantity("datum_altitude", Dimension.LENGTH, "210 m")
    latitude = section.quantity("latitude", Dimension.ANGLE, "47 deg")
    if latitude is not None and abs(latitude) > 90.0:
        section.fault("latitude", "is no latitude", f"{latitude:g} deg", "-90 to 90 deg")
    ambient_doubt = section.quantity("ambient_uncertainty", Dimension.TEMPERATURE_DIFFERENCE, "±10 K")
    return Site(
        datum_altitude_m=0.0 if altitude is None else altitude,
        latitude_deg=45.0 if latitude is None else latitude,
        barometer_pa=barometer,
        barometer_column=column[0] if column else None,
        barometer_unit=column[1] if column else None,
        barometer_sd_pa=abs(doubt) / COVERAGE,
        ambient_k=section.positive("ambient", Dimension.TEMPERATURE, "31 degC"),
        ambient_sd_k=abs(AMBIENT_UNSTATED_K if ambient_doubt is None else ambient_doubt) / COVERAGE,
    )


def read_check(section: Section) -> tuple[CheckSettings, Defaults]:
    """How verdicts are given, and the doubts that stand where a table states none."""
    rule = section.text("decision", "guarded").casefold()
    if rule not in [str(r) for r in DecisionRule]:
        section.fault("decision", "unknown rule", rule, "guarded or simple")
        rule = "guarded"
    confidence = section.values.get("confidence", 0.95)
    if isinstance(confidence, bool) or not isinstance(confidence, int | float) or not 0.5 <= float(confidence) < 1.0:
        section.fault("confidence", "must be a share", repr(confidence), "a number from 0.5 to below 1, such as 0.95")
        confidence = 0.95
    elevation = section.quantity("elevation_uncertainty", Dimension.LENGTH, "±50 mm")
    loss, flow = section.share("loss_uncertainty", "±15 %"), section.share("flow_uncertainty", "±2 %")
    settings = CheckSettings(
        decision=DecisionRule(rule),
        confidence_fraction=float(confidence),
        tolerance_text=_tolerance(section),
    )
    return settings, Defaults(
        elevation_sd_m=abs(ELEVATION_UNSTATED_M if elevation is None else elevation) / COVERAGE,
        loss_sd_fraction=abs(LOSS_UNSTATED if loss is None else loss) / COVERAGE,
        flow_sd_fraction=abs(FLOW_UNSTATED if flow is None else flow) / COVERAGE,
        loss_stated=loss is not None,
    )


def _tolerance(section: Section) -> str:
    """The default tolerance as stated, empty where there is none or a faulty one."""
    text = section.text("tolerance")
    try:
        if text:
            parse_limit(text, 1.0)
    except QuantityError as error:
        section.fault("tolerance", error.fault, error.found, error.expected)
        return ""
    return text


def read_log_settings(section: Section) -> LogSettings:
    """What overrides the look at a log."""
    values = section.values

    def line(key: str) -> int | None:
        value = values.get(key)
        if value is None or (isinstance(value, int) and not isinstance(value, bool) and value >= 1):
            return value
        section.fault(key, "must be a line number", repr(value), f"{key} = 3")
        return None

    def several(key: str) -> tuple[str, ...] | None:
        value = values.get(key)
        if value is None:
            return None
        items = [value] if isinstance(value, str) else value
        if not (isinstance(items, list) and all(isinstance(item, str) for item in items)):
            section.fault(key, "must be a text or a list of texts", repr(value), f'{key} = ["Date", "Time"]')
            return None
        return tuple(items)

    def word(key: str) -> str | None:
        return section.text(key) if key in values else None

    day_first = values.get("day_first")
    if day_first is not None and not isinstance(day_first, bool):
        section.fault("day_first", "must be true or false", repr(day_first), "day_first = true")
        day_first = None
    shape = word("shape")
    if shape not in (None, "wide", "long"):
        section.fault("shape", "unknown shape", str(shape), "wide or long")
        shape = None
    return LogSettings(
        delimiter=word("delimiter"),
        decimal=word("decimal"),
        thousands=word("thousands"),
        encoding=word("encoding"),
        header_line=line("header_line"),
        units_line=line("units_line"),
        stamp=several("stamp"),
        stamp_format=word("stamp_format"),
        day_first=day_first,
        shape=shape,
        tag_column=word("tag_column"),
        value_column=word("value_column"),
        quality_column=word("quality_column"),
        good=several("good"),
    )
