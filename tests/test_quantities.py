"""Units at the border: published factors, the trade's spellings, the kinds of pressure, and the words of a refusal."""

from __future__ import annotations

import subprocess
import sys
import tomllib
from pathlib import Path

import numpy as np
import pint
import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger import quantities
from headledger.errors import QuantityError
from headledger.quantities import (
    PRESSURE_FACTORS,
    Dimension,
    PressureKind,
    format_quantity,
    nearest,
    parse_number,
    parse_pressure,
    parse_quantity,
    parse_unit,
    split_header,
    split_quantity,
)

REFERENCE = tomllib.loads((Path(__file__).parent / "reference" / "units.toml").read_text(encoding="utf-8"))
PRESSURE, FLOW, LENGTH = Dimension.PRESSURE, Dimension.FLOW, Dimension.LENGTH
GAUGE, ABSOLUTE, DIFFERENCE = PressureKind.GAUGE, PressureKind.ABSOLUTE, PressureKind.DIFFERENCE
PINT_BASES = {
    PRESSURE: "pascal",
    FLOW: "meter ** 3 / second",
    LENGTH: "meter",
    Dimension.VISCOSITY: "pascal * second",
    Dimension.DENSITY: "kilogram / meter ** 3",
}


@pytest.mark.parametrize(
    ("dimension", "table"),
    [(PRESSURE, "pressure_pa"), (FLOW, "flow_m3_s"), (Dimension.DENSITY, "density_kg_m3")],
)
def test_factors_of_published_units_are_as_printed(dimension, table):
    for name, row in REFERENCE[table].items():
        assert parse_unit(name, dimension).factor == pytest.approx(row["value"], rel=row["relative"], abs=0.0), name


@pytest.mark.parametrize(("name", "pint_name"), REFERENCE["pint"].items())
def test_factors_of_units_that_pint_knows_agree_with_it(name, pint_name):
    registry = pint.get_application_registry()
    dimension = next(d for d, table in quantities._TABLES.items() if name in table)
    theirs = registry.Quantity(1.0, pint_name).to(PINT_BASES[dimension]).magnitude
    # inch_H2O_60F and inch_Hg_60F stand in pint with more digits than the publication prints: half its last digit.
    assert parse_unit(name, dimension).factor == pytest.approx(theirs, rel=2e-6 if "@60F" in name else 1e-9, abs=0.0)


@pytest.mark.parametrize(
    ("text", "same", "kind"),
    [
        ("psig", "psi", GAUGE),
        ("psia", "psi", ABSOLUTE),
        ("psid", "psi", DIFFERENCE),
        ("PSIG", "psi", GAUGE),
        ("psi(g)", "psi", GAUGE),
        ("psi (a)", "psi", ABSOLUTE),
        ("bar", "bar", None),
        ("Bar", "bar", None),
        ("barg", "bar", GAUGE),
        ("bar (a)", "bar", ABSOLUTE),
        ("BARA", "bar", ABSOLUTE),
        ("mbarg", "mbar", GAUGE),
        ("MBAR", "mbar", None),
        ("kPag", "kPa", GAUGE),
        ("KPA", "kPa", None),
        ("kPa g", "kPa", GAUGE),
        ("kPa abs", "kPa", ABSOLUTE),
        ("MPaa", "MPa", ABSOLUTE),
        ("mpag", "MPa", GAUGE),
        ("mH2Og", "mH2O", GAUGE),
        ("mWCg", "mH2O", GAUGE),
        ("ftH2Og", "ftH2O", GAUGE),
        ("ftWC", "ftH2O", None),
        ("inWC", "inH2O", None),
        ("in WC", "inH2O", None),
        ("mCA", "mH2O", None),
        ("ftH2O@60F (g)", "ftH2O@60F", GAUGE),
        ("mmH2O (20 degC)", "mmH2O@20C", None),
        ("inH2O (60 °F)", "inH2O@60F", None),
        ("inH2O @ 4 °C", "inH2O@4C", None),
        ("inH2O@60F (g)", "inH2O@60F", GAUGE),
        ("inHgg", "inHg", GAUGE),
        ("inHga", "inHg", ABSOLUTE),
        ("inHg", "inHg", None),
        ("mm Hg", "mmHg", None),
        ("ata", "at", ABSOLUTE),
        ("atm", "atm", None),
        ("kg/cm²", "kgf/cm2", None),
        ("kg/cm2(g)", "kgf/cm2", GAUGE),
        ("kgf/cm^2", "kgf/cm2", None),
        ("kN/m2", "kPa", None),
    ],
)
def test_pressure_units_in_the_spellings_of_the_trade_mean_their_unit_and_kind(text, same, kind):
    unit = parse_unit(text, PRESSURE)
    assert unit.factor == pytest.approx(parse_unit(same, PRESSURE).factor, rel=1e-12)
    assert unit.kind is kind


def test_pressure_unit_without_suffix_takes_the_default_kind():
    assert parse_unit("bar", PRESSURE, default_kind=GAUGE).kind is GAUGE
    assert parse_unit("bara", PRESSURE, default_kind=GAUGE).kind is ABSOLUTE


@pytest.mark.parametrize(
    ("text", "plain"),
    [("barg", "bar"), ("psi (a)", "psi"), ("kPa", "kPa"), ("inHgg", "inHg"), ("mH2Og", "mH2O"), ("atm", "atm")],
)
def test_as_difference_drops_the_suffix_and_keeps_the_factor(text, plain):
    unit = parse_unit(text, PRESSURE).as_difference()
    assert (unit.text, unit.kind, unit.offset) == (plain, DIFFERENCE, 0.0)
    assert unit.factor == parse_unit(text, PRESSURE).factor


def test_as_difference_of_a_temperature_has_no_offset():
    assert parse_unit("degC", Dimension.TEMPERATURE).as_difference().offset == 0.0


@pytest.mark.parametrize(
    ("text", "si", "dimension"),
    [
        ("18 degC", 291.15, Dimension.TEMPERATURE),
        ("64.4 degF", 291.15, Dimension.TEMPERATURE),
        ("64,4 °F", 291.15, Dimension.TEMPERATURE),
        ("18 ° C", 291.15, Dimension.TEMPERATURE),
        ("±1 K", 1.0, Dimension.TEMPERATURE_DIFFERENCE),
        ("±1.8 °F", 1.0, Dimension.TEMPERATURE_DIFFERENCE),
        ("±1 deg C", 1.0, Dimension.TEMPERATURE_DIFFERENCE),
        ("18 ºC", 291.15, Dimension.TEMPERATURE),
        ("18 ℃", 291.15, Dimension.TEMPERATURE),
        ("64.4℉", 291.15, Dimension.TEMPERATURE),
        ("45 μm", 45e-6, LENGTH),
        ("1000 gpm(US)", 0.0630901964, FLOW),
        ("1000 igpm", 4.54609 / 60.0, FLOW),
        ("3600 lph", 1e-3, FLOW),
        ("86.4 MLD", 1.0, FLOW),
        ("98.9 kPa", 98_900.0, PRESSURE),
        ("±5 mm", 0.005, LENGTH),
        ("+/-5mm", 0.005, LENGTH),
        ("-3 ft", -0.9144, LENGTH),
        ("−3 ft", -0.9144, LENGTH),
        ("1 nautical_mile", 1852.0, LENGTH),
        ("3600 L/h", 1e-3, FLOW),
        ("3.6 m³/h", 1e-3, FLOW),
        ("60 l/min", 1e-3, FLOW),
        ("1 litre/s", 1e-3, FLOW),
        ("1000 gal/min", 0.0630901964, FLOW),
        ("1000 US gpm", 0.0630901964, FLOW),
        ("12 mPa·s", 0.012, Dimension.VISCOSITY),
        ("12 cP", 0.012, Dimension.VISCOSITY),
        ("870 kg/m³", 870.0, Dimension.DENSITY),
        ("1.07 SG", 1070.0, Dimension.DENSITY),
        ("15 %", 0.15, Dimension.RATIO),
        ("2 h", 7200.0, Dimension.TIME),
        ("-22.4 deg", -22.4, Dimension.ANGLE),
        ("35 g/kg", 35.0, Dimension.SALINITY),
        ("250 mV", 0.25, Dimension.VOLTAGE),
        ("4 mA", 0.004, Dimension.CURRENT),
    ],
)
def test_quantity_with_its_unit_is_read_in_si(text, si, dimension):
    """Hand checks: 18 degC = 64.4 degF = 291.15 K; 1 nautical mile = 1852 m; 1000 US gal = 3.785411784 m3; 1000 imperial
    gal = 4.54609 m3; 86.4 ML in 86 400 s = 1 m3/s.
    """
    assert parse_quantity(text, dimension) == pytest.approx(si, rel=1e-9)


@pytest.mark.parametrize(
    ("text", "dimension", "message"),
    [
        ("brag", PRESSURE, "quantity: unknown unit, got 'brag', expected barg."),
        (
            "m",
            PRESSURE,
            "quantity: this unit is no unit of pressure, got 'm', expected a unit of pressure such as barg.",
        ),
        ("", PRESSURE, "quantity: not a unit of pressure, got '', expected a unit of pressure such as barg."),
        ("mPa", PRESSURE, "quantity: not a unit of pressure, got 'mPa', expected MPa."),
        ("Mbarg", PRESSURE, "quantity: not a unit of pressure, got 'Mbarg', expected mbarg."),
        (
            "MPa*s",
            Dimension.VISCOSITY,
            "quantity: not a unit of viscosity, got 'MPa*s', expected mPa*s.",
        ),
        ("gmp", FLOW, "quantity: unknown unit, got 'gmp', expected gpm."),
        ("kg/s", FLOW, "quantity: this unit is no unit of flow, got 'kg/s', expected a unit of flow such as m3/h."),
        ("bar", LENGTH, "quantity: this unit is no unit of length, got 'bar', expected a unit of length such as m."),
        ("kg/cm2", Dimension.DENSITY, "quantity: this unit is no unit of density, got 'kg/cm2', expected kg/m3."),
    ],
)
def test_unit_that_is_unknown_or_of_another_dimension_is_refused_with_the_nearest(text, dimension, message):
    with pytest.raises(QuantityError) as caught:
        parse_unit(text, dimension)
    assert str(caught.value) == message


@pytest.mark.parametrize(
    ("text", "dimension", "message"),
    [
        ("18", Dimension.TEMPERATURE,
         "quantity: the unit is missing, got '18', expected a number with a unit of temperature such as degC."),
        ("warm", Dimension.TEMPERATURE,
         "quantity: not a number with a unit, got 'warm', expected a value such as 12.5 kPa."),
        ("nan kPa", PRESSURE, "quantity: not a number with a unit, got 'nan kPa', expected a value such as 12.5 kPa."),
        ("1e999 kPa", PRESSURE, "quantity: not a finite number, got '1e999', expected a number such as 12.5."),
        ("1,000 m", LENGTH,
         "quantity: the comma may mark thousands or decimals, got '1,000 m', expected 1000 or 1.000."),
    ],
)  # fmt: skip
def test_quantity_that_cannot_be_read_is_refused_in_words(text, dimension, message):
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, dimension)
    assert str(caught.value) == message


@pytest.mark.parametrize("text", ["nan", "inf", "-inf", "1e999", "1_000", "٣", "0x10", "", "1.2.3", "1,5"])
def test_number_that_is_none_or_not_finite_is_refused(text):
    with pytest.raises(QuantityError):
        parse_number(text)


def test_number_with_a_decimal_comma_is_read_only_where_asked():
    assert parse_number("1.234,5", decimal_comma=True) == 1234.5
    assert parse_number("0.5", decimal_comma=True) == 0.5
    assert parse_number("−2 500") == -2500.0


def test_pressure_of_a_kind_refuses_the_suffix_of_another():
    assert parse_pressure("98.9 kPa", ABSOLUTE) == 98_900.0
    assert parse_pressure("98.9 kPaa", ABSOLUTE) == 98_900.0
    with pytest.raises(QuantityError) as caught:
        parse_pressure("98.9 kPag", ABSOLUTE)
    assert str(caught.value) == (
        "quantity: of the wrong kind, gauge and not absolute, got '98.9 kPag', expected 98.9 kPaa."
    )
    with pytest.raises(QuantityError, match=r"expected 0\.02 bar\.$"):
        parse_pressure("±0.02 barg", DIFFERENCE)


def test_litre_prefixes_are_never_guessed_from_another_case():
    """Hand check: a megalitre a minute is 1000 m3 in 60 s, a millilitre a day 1e-6 m3 in 86 400 s."""
    assert parse_unit("ML/min", FLOW).factor == pytest.approx(1000.0 / 60.0)
    assert parse_unit("ml/d", FLOW).factor == pytest.approx(1e-6 / 86_400.0)


@pytest.mark.parametrize(
    ("header", "parts"),
    [
        ("elevation [m]", ("elevation", "m")),
        ("  Bore[ in ] ", ("Bore", "in")),
        ("tag", ("tag", None)),
        ("Kv [m3/h]", ("Kv", "m3/h")),
        ("length []", ("length", "")),
    ],
)
def test_header_is_split_into_name_and_unit(header, parts):
    assert split_header(header) == parts


@pytest.mark.parametrize(
    ("header", "parts"),
    [
        ("PT-1 (psi)", ("PT-1", "psi")),
        ("PT-1 (bar(g))", ("PT-1", "bar(g)")),
        ("PT-1 [barg]", ("PT-1", "barg")),
        ("PT-1", ("PT-1", None)),
    ],
)
def test_header_with_round_brackets_is_split_only_where_asked(header, parts):
    assert split_header(header, round_brackets=True) == parts
    if "(" in header:
        assert split_header(header) == (header, None)


def test_nearest_names_the_likely_word_and_nothing_for_a_far_one():
    assert nearest("Accurcy", ["tag", "accuracy", "unit"]) == "accuracy"
    assert nearest("xyz", ["tag", "accuracy", "unit"]) is None


def test_arrays_are_converted_whole():
    unit = parse_unit("degF", Dimension.TEMPERATURE)
    assert np.allclose(unit.to_si(np.array([32.0, 212.0])), [273.15, 373.15], rtol=0.0, atol=1e-9)


def test_format_quantity_keeps_so_many_digits_and_no_exponent():
    bar = parse_unit("bar", PRESSURE)
    assert [format_quantity(value, bar) for value in (2_041.0, 123_456_000.0, 0.0)] == [
        "0.0204 bar",
        "1235 bar",
        "0 bar",
    ]


@pytest.mark.parametrize(
    ("value_pa", "resolution_pa", "text"),
    [
        (204_137.0, 312.0, "2.0414 bar"),
        (204_137.0, 31_200.0, "2.04 bar"),
        (-0.3, 31_200.0, "0.00 bar"),
        (0.0, 312.0, "0.0000 bar"),
        (204_137.0, 4e6, "2 bar"),
        (204_137.0, 0.0, "2.04 bar"),
    ],
)
def test_format_quantity_with_a_resolution_shows_its_first_two_digits(value_pa, resolution_pa, text):
    """Hand check: 312 Pa is 0.0031 bar, so four decimals; 31 200 Pa is 0.31 bar, so two; 40 bar, so none."""
    assert format_quantity(value_pa, parse_unit("bar", PRESSURE), resolution=resolution_pa) == text


ALL_UNITS = [
    *((name, dimension) for dimension, table in quantities._TABLES.items() for name in table if name),
    *((name, Dimension.TEMPERATURE) for name in quantities._TEMPERATURES),
]


@given(st.sampled_from(ALL_UNITS), st.floats(1e-9, 1e6) | st.floats(-1e6, -1e-9) | st.just(0.0))
def test_value_to_si_and_back_is_the_same_value(entry, value):
    unit = parse_unit(*entry)
    # The last digits of a value much smaller than the unit's offset are lost in the sum: an ulp of the offset each way.
    assert unit.from_si(unit.to_si(value)) == pytest.approx(value, rel=1e-12, abs=4e-16 * unit.offset / unit.factor)


@given(st.sampled_from(sorted(PRESSURE_FACTORS)), st.sampled_from(["g", "a", " (g)", " abs"]), st.floats(0.001, 1e4))
def test_pressure_in_any_unit_and_suffix_is_the_value_times_its_factor(name, suffix, value):
    number, unit = split_quantity(f"{value!r} {name}{suffix}")
    assert number == value
    assert parse_unit(unit, PRESSURE).to_si(value) == pytest.approx(value * PRESSURE_FACTORS[name], rel=1e-12)


def test_units_of_the_trade_are_read_without_loading_the_unit_library():
    program = (
        "import sys; from headledger.quantities import Dimension, parse_quantity; "
        "parse_quantity('3 psig', Dimension.PRESSURE); parse_quantity('3 gpm', Dimension.FLOW); "
        "print('pint' in sys.modules)"
    )
    assert (
        subprocess.run([sys.executable, "-c", program], capture_output=True, text=True, check=True).stdout == "False\n"
    )
