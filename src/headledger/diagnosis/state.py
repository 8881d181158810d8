"""The hydraulic state of one spell: heads, flows and perfect readings at a point, with their derivatives."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout, liquid_at
from headledger.diagnosis.means import SpellMeans
from headledger.physics.liquids import LiquidProperties
from headledger.physics.losses import pump_head
from headledger.physics.network import Graph

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Point:
    """Where a spell's model is evaluated.

    Parameters
    ----------
    reference_head_m : ndarray, shape (parts,)
        Total head at the reference station of each part of the graph. [m]
    flow_m3_s : ndarray, shape (independent,)
        Flows of the independent runs; empty in a still spell. [m³/s]
    """

    reference_head_m: Array
    flow_m3_s: Array


@dataclass(frozen=True, slots=True, kw_only=True)
class Applied:
    """Causes that change the hydraulics itself, at the size at which they are applied.

    Parameters
    ----------
    density_ratio : float
        True over stated. [-]
    meter_ratio : dict of int to float
        Read over true, by run. [-]
    meter_names : tuple of (str, float)
        The same by the name of the run.
    """

    density_ratio: float = 1.0
    meter_ratio: dict[int, float] = field(default_factory=dict)
    meter_names: tuple[tuple[str, float], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class State:
    """A spell's hydraulics at a point.

    Parameters
    ----------
    graph : Graph
    point : Point
    basis : ndarray, shape (runs, independent)
        Flows of all runs from the independent ones; no columns in a still spell.
    flow_m3_s, drop_m, slope_s_m2, velocity_pa : ndarray, shape (runs,)
        Flow; head lost (a pump's lift is negative); its derivative with flow; velocity pressure. [m³/s], [m], [s/m²], [Pa]
    head_m : ndarray, shape (stations,)
        [m]
    reading_pa : ndarray, shape (gauges,)
        Of perfect instruments. [Pa]
    density_kg_m3 : float
        [kg/m³]
    head_weight_pa_m : float
        ρ g, what a metre of head weighs. [Pa/m]
    """

    graph: Graph
    point: Point
    basis: Array
    flow_m3_s: Array
    drop_m: Array
    slope_s_m2: Array
    velocity_pa: Array
    head_m: Array
    reading_pa: Array
    density_kg_m3: float
    head_weight_pa_m: float

    def reading_from_flow(self, layout: Layout) -> Array:
        """Derivative of the readings with the independent flows, shape (gauges, independent). [Pa s/m³]"""
        heads = -self.graph.path @ (self.slope_s_m2[:, None] * self.basis)
        moving = self.density_kg_m3 * (self.flow_m3_s / layout.area_m2**2)[:, None] * self.basis
        return np.asarray(self.head_weight_pa_m * (layout.taps.head @ heads) - layout.taps.velocity @ moving)

    def reading_from_drop(self, layout: Layout) -> Array:
        """Derivative of the readings with the head lost in each run, shape (gauges, runs). [Pa/m]"""
        return np.asarray(-self.head_weight_pa_m * (layout.taps.head @ self.graph.path))

    def reading_from_head(self, layout: Layout) -> Array:
        """Derivative of the readings with each part's reference head, shape (gauges, parts). [Pa/m]"""
        member = np.zeros((self.head_m.size, self.graph.parts))
        member[np.arange(self.head_m.size), self.graph.part] = 1.0
        return np.asarray(self.head_weight_pa_m * (layout.taps.head @ member))


def spell_graph(layout: Layout, spell: SpellMeans) -> Graph:
    """The piping graph as its valves stand in a spell."""
    return layout.graph(spell.is_open)


def evaluate(
    layout: Layout,
    spell: SpellMeans,
    point: Point,
    *,
    applied: Applied | None = None,
    liquid: LiquidProperties | None = None,
) -> State:
    """Hydraulics of a spell at a point.

    Parameters
    ----------
    layout : Layout
    spell : SpellMeans
    point : Point
    applied : Applied, optional
        Causes to allow for.
    liquid : LiquidProperties, optional
        In place of the job's liquid at the spell's temperature.

    Returns
    -------
    State
    """
    graph = spell_graph(layout, spell)
    liquid = liquid or liquid_at(layout.job.liquid, spell.temperature_k)
    density = float(liquid.density_kg_m3) * (applied.density_ratio if applied else 1.0)
    basis = graph.flow[:, : point.flow_m3_s.size]
    flow = basis @ point.flow_m3_s
    drop, slope = layout.loss_table(liquid).evaluate(flow)
    drop, slope = np.array(drop), np.array(slope)
    for run, polynomial in layout.pumps.items():
        lift, lift_slope = pump_head(polynomial, float(flow[run]), float(spell.speed_ratio[run]))
        drop[run] -= lift
        slope[run] -= lift_slope
    head = graph.heads_m(point.reference_head_m, drop)
    velocity = 0.5 * density * (flow / layout.area_m2) ** 2
    return State(
        graph=graph,
        point=point,
        basis=basis,
        flow_m3_s=flow,
        drop_m=drop,
        slope_s_m2=slope,
        velocity_pa=velocity,
        head_m=head,
        reading_pa=layout.taps.readings_pa(head, velocity, density_kg_m3=density, gravity_m_s2=layout.gravity_m_s2),
        density_kg_m3=density,
        head_weight_pa_m=density * layout.gravity_m_s2,
    )
