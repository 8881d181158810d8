"""A gauge's and a spell's numbers in the units that they are read in, for any table."""

from __future__ import annotations

from headledger.diagnosis.result import FlowFound, GaugeFound, GaugeSpell, SpellFound
from headledger.quantities import Unit
from headledger.sheets.numbers import decimals_for, fixed


def error_columns(gauge: GaugeFound) -> tuple[str, str, str]:
    """Error, its u95 and the tolerance in the gauge's unit, to the place where the u95 has two significant digits."""
    factor = gauge.unit.factor
    decimals = decimals_for(gauge.u95_pa / factor)
    return (
        fixed(gauge.error_pa / factor, decimals, signed=True),
        fixed(gauge.u95_pa / factor, decimals),
        fixed(gauge.tolerance_pa / factor, decimals),
    )


def spell_columns(spell: GaugeSpell, unit: Unit) -> tuple[str, str, str, str]:
    """Reading, expected, its u95, and reading less expected in the gauge's unit, to where the u95 has two significant digits."""
    reading, expected, doubt = (
        None if value is None else value / unit.factor for value in (spell.reading_pa, spell.expected_pa, spell.u95_pa)
    )
    decimals = decimals_for(doubt or 0.0)
    off = None if reading is None or expected is None else reading - expected
    return (
        fixed(reading, decimals),
        fixed(expected, decimals),
        fixed(doubt, decimals),
        fixed(off, decimals, signed=True),
    )


def flows_line(spell: SpellFound, unit: Unit) -> str:
    """The flows of a spell in words, runs with the same flow named together; ``none`` for a still spell without any."""
    runs_of: dict[str, list[str]] = {}
    for flow in spell.flows:
        runs_of.setdefault(flow_words(flow, unit), []).append(flow.run)
    if not runs_of or list(runs_of) == [flow_words(FlowFound(run="", flow_m3_s=0.0, u95_m3_s=0.0), unit)]:
        return "none"
    return "; ".join(f"{', '.join(runs)}: {text}" for text, runs in runs_of.items())


def flow_words(flow: FlowFound, unit: Unit) -> str:
    """A flow with its u95 in words."""
    value, doubt = flow.flow_m3_s / unit.factor, flow.u95_m3_s / unit.factor
    decimals = decimals_for(doubt, most=3)
    if doubt == 0.0:
        return f"{value:.4g} {unit.text}"
    return f"{fixed(value, decimals)} ± {fixed(doubt, decimals)} {unit.text}"
