"""Closed loops whose columns differ in weight: they have no still state, since the difference drives the liquid round."""

from __future__ import annotations

import numpy as np

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.state import spell_graph, spell_liquid

WORTH_TELLING_PA = 50.0
"""A smaller difference of columns drives nothing that a gauge would see. [Pa]"""


def circulations(model: Model) -> tuple[str, ...]:
    """A sentence for every loop that the model takes as still although its columns do not balance.

    Parameters
    ----------
    model : Model

    Returns
    -------
    tuple of str
    """
    layout = model.layout
    said: dict[tuple[str, ...], tuple[float, list[int]]] = {}
    for spell in model.spells:
        if not spell.is_still or spell.run_temperature_k is None:
            continue
        liquid = spell_liquid(layout, spell)
        drive_pa = (liquid.density_kg_m3 - liquid.run_density_kg_m3) * layout.gravity_m_s2 * layout.fall_m
        for loop in spell_graph(layout, spell).loop:
            total = abs(float(loop @ drive_pa))
            if total > WORTH_TELLING_PA:
                runs = tuple(layout.job.runs[int(run)].name for run in np.flatnonzero(loop))
                most, spells = said.get(runs, (0.0, []))
                said[runs] = (max(most, total), list(dict.fromkeys([*spells, spell.id])))
    unit = layout.job.display.pressure
    return tuple(
        f"{', '.join(runs)}: their columns differ by {most / unit.factor:.2g} {unit.text} round the loop, so that the liquid circulates in "
        f"spell {', '.join(map(str, spells))}, which is taken as still."
        for runs, (most, spells) in said.items()
    )
