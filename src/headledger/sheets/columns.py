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


def spell_columns(spell: GaugeSpell, unit: Unit) -> tuple[str, str, str]:
    """Reading, expected and its u95 in the gauge's unit, to the place where the u95 has two significant digits."""
    values = [
        None if value is None else value / unit.factor for value in (spell.reading_pa, spell.expected_pa, spell.u95_pa)
    ]
    decimals = decimals_for(values[2] or 0.0)
    return fixed(values[0], decimals), fixed(values[1], decimals), fixed(values[2], decimals)


def flows_line(spell: SpellFound, unit: Unit) -> str:
    """The flows of a spell in words, runs with the same flow named together; ``none`` for a still spell without any."""
    runs_of: dict[str, list[str]] = {}
    for flow in spell.flows:
        runs_of.setdefault(_flow_text(flow, unit), []).append(flow.run)
    if not runs_of or list(runs_of) == [_flow_text(FlowFound(run="", flow_m3_s=0.0, u95_m3_s=0.0), unit)]:
        return "none"
    return "; ".join(f"{', '.join(runs)}: {text}" for text, runs in runs_of.items())


def _flow_text(flow: FlowFound, unit: Unit) -> str:
    value, doubt = flow.flow_m3_s / unit.factor, flow.u95_m3_s / unit.factor
    decimals = decimals_for(doubt, most=3)
    if doubt == 0.0:
        return f"{value:.4g} {unit.text}"
    return f"{fixed(value, decimals)} ± {fixed(doubt, decimals)} {unit.text}"
