"""Gas in a gauge's own leg: off by part of the leg's column, nearly the same at every flow."""

from __future__ import annotations

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.result import CauseKind, Place
from headledger.plant.gauges import Gauge
from headledger.statistics.sizes import SizePrior


def leg_column_pa(view: View, index: int, gauge: Gauge) -> float:
    """What the leg's liquid adds to the reading, all of which gas can take away. [Pa]"""
    if gauge.elevation_m is None or gauge.is_differential or gauge.corrected_to_tap or gauge.corrected_to_m is not None:
        return 0.0
    leg = view.layout.leg_density_kg_m3(gauge)
    if leg is None:
        _, spells = view.linear.gauge_rows(index)
        leg = view.linear.states[int(spells[0])].density_kg_m3 if spells.size else 0.0
    height = view.layout.job.station(gauge.station).elevation_m - gauge.elevation_m
    return leg * view.layout.gravity_m_s2 * height


def marks(view: View) -> list[Mark]:
    """One mark a gauge with a liquid leg: low where the instrument hangs below its tap, high where it stands above."""
    found = []
    for index, gauge in enumerate(view.layout.job.gauges):
        column = leg_column_pa(view, index, gauge)
        if column == 0.0:
            continue
        vector = view.gauge_vector(index, 1.0)
        least = view.least_size(vector)
        if least < abs(column):
            found.append(
                Mark(
                    kind=CauseKind.LEG_GAS,
                    place=Place(gauge=gauge.tag),
                    vector=vector,
                    prior=SizePrior(least=least, most=abs(column), negative=column > 0.0, positive=column < 0.0),
                    own=(index,),
                    unit=gauge.unit.as_difference(),
                )
            )
    return found
