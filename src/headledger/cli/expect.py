"""``headledger expect``: a hand calculation between two points, from its options to its ledger."""

from __future__ import annotations

from typing import Any

import click

from headledger.cli.exit_codes import ExitCode
from headledger.cli.streams import result_stream

_LIQUIDS = ("water", "seawater", "ethylene-glycol", "propylene-glycol", "other")


@click.command(short_help="Calculate by hand: the pressure at a second point, term by term.")
@click.option("--from", "from_pressure", required=True, metavar="PRESSURE", help='At the first point: "3.2 bar".')
@click.option("--from-elevation", metavar="LENGTH", help="Of the first point; 0 m if not given.")
@click.option("--to-elevation", metavar="LENGTH", help="Of the second point; 0 m if not given.")
@click.option("--flow", default="0 m3/h", show_default=True, metavar="FLOW", help="From the first to the second point.")
@click.option("--bore", metavar="LENGTH", help="Of the pipe between them.")
@click.option(
    "--from-bore", metavar="LENGTH", help='At the first point, where it differs; "surface" of a free surface.'
)
@click.option("--to-bore", metavar="LENGTH", help="The same at the second point.")
@click.option("--length", metavar="LENGTH", help="Of the pipe.")
@click.option("--roughness", metavar="LENGTH", help="Of its wall; 0.045 mm (clean commercial steel) if not given.")
@click.option("--hazen-williams", type=click.FloatRange(min=0.0, min_open=True), metavar="C", help="In its place.")
@click.option("--fittings-k", type=click.FloatRange(min=0.0), metavar="K", help="Sum of loss coefficients.")
@click.option("--kv", metavar="FLOW", help='Of a valve: "63 m3/h" at 1 bar.')
@click.option("--drop", metavar="PRESSURE", help="Of equipment, at this flow.")
@click.option("--liquid", type=click.Choice(_LIQUIDS), default="water", show_default=True)
@click.option("--temperature", default="20 degC", show_default=True, metavar="TEMPERATURE")
@click.option("--concentration", metavar="PERCENT", help='Of a glycol: "30 %" by mass, "30 % vol" by volume.')
@click.option("--salinity", metavar="SALINITY", help='Of seawater: "35 g/kg".')
@click.option("--density", metavar="DENSITY", help="Of another liquid.")
@click.option("--viscosity", metavar="VISCOSITY", help="Of another liquid.")
@click.option("--altitude", default="0 m", show_default=True, metavar="LENGTH", help="Of elevation 0 above the sea.")
@click.option("--latitude", default="45 deg", show_default=True, metavar="ANGLE")
@click.option("--unit", metavar="UNIT", help="In which pressures are printed; that of --from if not given.")
def expect(**given: Any) -> int:
    """What a gauge at a second point should read, from the pressure at a first.

    Prints every term of the energy balance as a head and as a pressure. Quantities carry their units: --flow "36 m3/h".
    The air's own weight between the points, about 12 Pa a metre, is left out.
    """
    from headledger.cli.hand_calculation import ledger_lines, read_hand_calculation

    calculation = read_hand_calculation(given | {"from": given["from_pressure"]})
    with result_stream() as stream:
        stream.writelines(line.rstrip() + "\n" for line in ledger_lines(calculation))
    return ExitCode.SOUND
