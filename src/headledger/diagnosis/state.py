"""The hydraulic state of one spell: heads, flows and perfect readings at a point, with their derivatives."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout, liquid_at, still_liquid_k
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
    loss_k : dict of int to float
        Loss coefficients added, by run; negative ones take away. [-]
    """

    density_ratio: float = 1.0
    meter_ratio: dict[int, float] = field(default_factory=dict)
    meter_names: tuple[tuple[str, float], ...] = ()
    loss_k: dict[int, float] = field(default_factory=dict)


@dataclass(frozen=True, slots=True, kw_only=True)
class LiquidShift:
    """A change of the liquid, for derivatives.

    Parameters
    ----------
    density_ratio : float
        On every density. [-]
    temperature_k : float
        On the job's liquid, which fills all runs without a temperature of their own. [K]
    run_k : tuple of (int, float)
        On runs with a temperature of their own. [K]
    """

    density_ratio: float = 1.0
    temperature_k: float = 0.0
    run_k: tuple[tuple[int, float], ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SpellLiquid:
    """The liquid of one spell: the job's, in which heads are counted, and that of every run.

    Parameters
    ----------
    density_kg_m3 : float
        [kg/m³]
    run_density_kg_m3, run_viscosity_pa_s : ndarray, shape (runs,)
        [kg/m³], [Pa s]
    """

    density_kg_m3: float
    run_density_kg_m3: Array
    run_viscosity_pa_s: Array


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
    added_m : ndarray, shape (runs,)
        What of `drop_m` is of loss coefficients that causes add. [m]
    column_m : ndarray, shape (runs,)
        Head that a run's own liquid, lighter or heavier than the job's, takes over its fall. [m]
    head_m : ndarray, shape (stations,)
        Of the job's liquid. [m]
    reading_pa : ndarray, shape (gauges,)
        Of perfect instruments. [Pa]
    density_kg_m3 : float
        Of the job's liquid. [kg/m³]
    run_density_kg_m3 : ndarray, shape (runs,)
        [kg/m³]
    head_weight_pa_m : float
        ρ g, what a metre of head weighs. [Pa/m]
    weather_pa : ndarray, shape (gauges,)
        What the barometer of this spell, against that of the visit, adds to each reading. [Pa]
    """

    graph: Graph
    point: Point
    basis: Array
    flow_m3_s: Array
    drop_m: Array
    slope_s_m2: Array
    velocity_pa: Array
    added_m: Array
    column_m: Array
    head_m: Array
    reading_pa: Array
    density_kg_m3: float
    run_density_kg_m3: Array
    head_weight_pa_m: float
    weather_pa: Array

    def reading_from_flow(self, layout: Layout) -> Array:
        """Derivative of the readings with the independent flows, shape (gauges, independent). [Pa s/m³]"""
        heads = -self.graph.path @ (self.slope_s_m2[:, None] * self.basis)
        moving = (self.run_density_kg_m3 * self.flow_m3_s / layout.area_m2**2)[:, None] * self.basis
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
    """The piping graph as its valves stand in a spell, its heads tied by runs whose drop is known."""
    return layout.graph(spell.is_open, spell_ties(layout, spell))


def spell_ties(layout: Layout, spell: SpellMeans) -> tuple[bool, ...]:
    """Which runs tie the heads of their ends in a spell."""
    ties = layout.ties(spell.is_open, still=spell.is_still)
    if not any(spell.is_unsure):
        return ties
    return tuple(tied and not unsure for tied, unsure in zip(ties, spell.is_unsure, strict=True))


def spell_liquid(layout: Layout, spell: SpellMeans, shift: LiquidShift | None = None) -> SpellLiquid:
    """The liquid of a spell.

    Parameters
    ----------
    layout : Layout
    spell : SpellMeans
    shift : LiquidShift, optional

    Returns
    -------
    SpellLiquid
        A temperature shifted beyond what the liquid is known for stops there.
    """
    shift, spec = shift or LiquidShift(), layout.job.liquid

    def at(temperature_k: float, more_k: float) -> LiquidProperties:
        return liquid_at(spec, still_liquid_k(spec, temperature_k + more_k) if more_k else temperature_k)

    own = at(spell.temperature_k, shift.temperature_k)
    density = np.full(layout.run_count, float(own.density_kg_m3))
    viscosity = np.full(layout.run_count, float(own.viscosity_pa_s))
    if spell.run_temperature_k is not None:
        moved = dict(shift.run_k)
        for run in np.flatnonzero(np.isfinite(spell.run_temperature_k)):
            liquid = at(float(spell.run_temperature_k[run]), moved.get(int(run), 0.0))
            density[run], viscosity[run] = float(liquid.density_kg_m3), float(liquid.viscosity_pa_s)
    return SpellLiquid(
        density_kg_m3=float(own.density_kg_m3) * shift.density_ratio,
        run_density_kg_m3=density * shift.density_ratio,
        run_viscosity_pa_s=viscosity,
    )


def evaluate(
    layout: Layout,
    spell: SpellMeans,
    point: Point,
    *,
    applied: Applied | None = None,
    shift: LiquidShift | None = None,
) -> State:
    """Hydraulics of a spell at a point.

    Parameters
    ----------
    layout : Layout
    spell : SpellMeans
    point : Point
    applied : Applied, optional
        Causes to allow for.
    shift : LiquidShift, optional
        Of the liquid.

    Returns
    -------
    State

    Notes
    -----
    Heads are metres of the job's liquid, ρ₀. Along a run of another density ρ the energy balance
    ``p_a + ρ g z_a = p_b + ρ g z_b + ρ g h`` becomes ``E_a − E_b = (ρ/ρ₀) h + (1 − ρ/ρ₀)(z_a − z_b)``.
    """
    graph = spell_graph(layout, spell)
    liquid = spell_liquid(layout, spell, shift)
    heavier = applied.density_ratio if applied else 1.0
    density, run_density = liquid.density_kg_m3 * heavier, liquid.run_density_kg_m3 * heavier
    ratio = run_density / density
    basis = graph.flow[:, : point.flow_m3_s.size]
    flow = basis @ point.flow_m3_s
    # what a loss table holds of rated drops is for the liquid at hand, whatever is found out about its density
    table = layout.loss_table(liquid.run_density_kg_m3, liquid.run_viscosity_pa_s)
    drop, slope = (ratio * part for part in table.evaluate(flow))
    for run, polynomial in layout.pumps.items():
        lift, lift_slope = pump_head(polynomial, float(flow[run]), float(spell.speed_ratio[run]))
        drop[run] -= ratio[run] * lift
        slope[run] -= ratio[run] * lift_slope
    added = np.zeros(layout.run_count)
    for run, coefficient in (applied.loss_k if applied else {}).items():
        per_square = ratio[run] * coefficient / (2.0 * layout.gravity_m_s2 * layout.area_m2[run] ** 2)
        added[run] = per_square * flow[run] * abs(flow[run])
        slope[run] += 2.0 * per_square * abs(flow[run])
    drop = drop + added
    column = (1.0 - ratio) * layout.fall_m
    head = graph.heads_m(point.reference_head_m, drop + column)
    velocity = 0.5 * run_density * (flow / layout.area_m2) ** 2
    readings = layout.taps.readings_pa(head, velocity, density_kg_m3=density, gravity_m_s2=layout.gravity_m_s2)
    tapped = layout.tap_run >= 0
    own_leg = np.where(tapped, run_density[layout.tap_run] - density, 0.0) if layout.run_count else 0.0
    rise_pa = 0.0 if spell.barometer_pa is None else spell.barometer_pa - layout.barometer_pa
    weather = rise_pa * layout.follows_barometer
    return State(
        graph=graph,
        point=point,
        basis=basis,
        flow_m3_s=flow,
        drop_m=drop,
        slope_s_m2=slope,
        velocity_pa=velocity,
        added_m=added,
        column_m=column,
        head_m=head,
        reading_pa=readings + own_leg * layout.gravity_m_s2 * layout.process_leg_m + weather,
        density_kg_m3=density,
        run_density_kg_m3=run_density,
        head_weight_pa_m=density * layout.gravity_m_s2,
        weather_pa=weather,
    )
