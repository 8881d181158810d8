"""Readings before there are any: what perfect gauges would read in each flow state that a visit is to have.

A plan's states are those that spells.csv or the command line names; where none is named, still and two flows at the usual design
velocity. Flows that a state does not give follow from loops, surfaces and pumps, and beyond these from an even velocity.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.averages import DEFAULT_SAMPLE_NOISE_TOLERANCES
from headledger.diagnosis.estimate import FREE_VELOCITY_M_S, Model
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.state import Applied, Point, State, evaluate, spell_graph
from headledger.physics.tapping import AIR_WEIGHT_PA_M
from headledger.plant.job import SpellKind, StatedFlow, StatedSpell
from headledger.plant.runs import RunState
from headledger.plant.stations import StationKind

Array = NDArray[np.float64]

FULL_AND_HALF = (1.0, 0.5)
"""Flows of a visit that nobody planned, as parts of the design flow. [-]"""

LOOSE_SHARE = 0.5
"""How far an assumed flow may move to close loops and meet surfaces, as a part of itself. [-]"""

MOST_STEPS, SETTLED_M = 40, 1e-7
"""Steps in which flows and heads are solved, and the change of heads at which they stand."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Planned:
    """The states of a visit with what perfect gauges would read in them.

    Parameters
    ----------
    spells : tuple of SpellMeans
    points : tuple of Point
        Where their readings are perfect.
    assumed : tuple of str
        What was taken because nobody said it, a sentence each.
    """

    spells: tuple[SpellMeans, ...]
    points: tuple[Point, ...]
    assumed: tuple[str, ...] = ()


def plan_states(layout: Layout, states: Sequence[StatedSpell] = ()) -> Planned:
    """What perfect gauges would read in the states of a visit.

    Parameters
    ----------
    layout : Layout
    states : sequence of StatedSpell
        By default those of the job's spells.csv, without the ones to be ignored; where there are none, still and two flows.

    Returns
    -------
    Planned
    """
    named = tuple(state for state in (states or layout.job.spells) if state.kind is not SpellKind.IGNORE)
    wanted = named or _usual_states()
    assumed = [] if named else ["no flow states are planned: taken as still, half and full flow."]
    spells, points = [], []
    lead = _lead_run(layout)
    for number, state in enumerate(wanted, start=1):
        spell, loose = _bare_spell(layout, state, number)
        if state.kind is SpellKind.FLOWING and not state.flows and lead >= 0:
            share = FULL_AND_HALF[1] if not named and number == 2 else FULL_AND_HALF[0]
            loose = loose.copy()
            loose[lead] = share * FREE_VELOCITY_M_S * layout.area_m2[lead]
        spell, point = _solved(layout, spell, loose)
        spells.append(spell)
        points.append(point)
    if any(state.kind is SpellKind.FLOWING and not state.flows for state in wanted):
        assumed.append(
            f"flows that no plan gives: {FREE_VELOCITY_M_S:g} m/s at most, as pumps, surfaces and loops allow."
        )
    assumed.append(
        f"scatter of a mean: {100.0 * DEFAULT_SAMPLE_NOISE_TOLERANCES:.0f} % of the gauge's tolerance, and never below its division."
    )
    return Planned(spells=tuple(spells), points=tuple(points), assumed=tuple(assumed))


def perfect(layout: Layout, spell: SpellMeans, point: Point, applied: Applied | None = None) -> SpellMeans:
    """The spell with what perfect gauges, and perfect meters where it has a flow, would say at a point.

    Parameters
    ----------
    layout : Layout
    spell : SpellMeans
        Gauges and meters that are silent in it stay so.
    point : Point
    applied : Applied, optional
        Causes that change the hydraulics.

    Returns
    -------
    SpellMeans
    """
    state = evaluate(layout, spell, point, applied=applied)
    return replace(
        spell,
        reading_pa=np.where(np.isfinite(spell.reading_pa), state.reading_pa, np.nan),
        flow_m3_s=np.where(np.isfinite(spell.flow_m3_s), state.flow_m3_s, np.nan),
        level_m=np.where(np.isfinite(spell.level_m), _levels_at(state), np.nan),
    )


def _levels_at(state: State) -> Array:
    """Levels at which the surfaces agree with a state; the air above them weighs a little. [m]"""
    return np.asarray(state.head_m / (1.0 - AIR_WEIGHT_PA_M / state.head_weight_pa_m))


def _usual_states() -> tuple[StatedSpell, ...]:
    """Still, half flow, full flow."""
    kinds = (SpellKind.STILL, SpellKind.FLOWING, SpellKind.FLOWING)
    return tuple(StatedSpell(start_s=0.0, end_s=0.0, kind=kind) for kind in kinds)


def _lead_run(layout: Layout) -> int:
    """The run whose flow sets the visit's: metered and widest, else widest; −1 without runs."""
    runs = layout.job.runs
    return max(range(len(runs)), key=lambda i: (runs[i].flow_column is not None, runs[i].area_m2, -i), default=-1)


def _bare_spell(layout: Layout, state: StatedSpell, number: int) -> tuple[SpellMeans, Array]:
    """A state without readings; and the flows that it gives, nan elsewhere. [m³/s]"""
    job = layout.job
    still = state.kind is SpellKind.STILL
    given = np.full(layout.run_count, np.nan)
    relative = np.array([run.flow_doubt.relative_fraction for run in job.runs])
    absolute = np.array([run.flow_doubt.absolute for run in job.runs])
    for flow in state.flows if not still else ():
        run = layout.run_index[flow.run]
        given[run] = flow.flow_m3_s
        relative[run], absolute[run] = flow.doubt.relative_fraction, flow.doubt.absolute
    surface = np.array([station.kind is StationKind.SURFACE for station in job.stations])
    own_k = np.array([np.nan if run.temperature_k is None else run.temperature_k for run in job.runs])
    spell = SpellMeans(
        id=number,
        kind=state.kind,
        start_s=state.start_s,
        end_s=state.end_s,
        samples=0,
        reading_pa=np.full(layout.gauge_count, np.nan),
        noise_pa=planned_noise_pa(layout),
        flow_m3_s=given,
        flow_noise_m3_s=np.zeros(layout.run_count),
        flow_relative_sd=relative,
        flow_absolute_sd_m3_s=absolute,
        level_m=np.where(surface, layout.station_elevation_m, np.nan),
        level_sd_m=np.where(surface, [max(station.elevation_sd_m, 1e-4) for station in job.stations], np.nan),
        temperature_k=job.liquid.temperature_k,
        speed_ratio=np.array([float(run.is_pump and not still) for run in job.runs]),
        is_open=tuple(run.state is not RunState.CLOSED for run in job.runs),
        run_temperature_k=own_k if np.isfinite(own_k).any() else None,
    )
    return spell, given


def planned_noise_pa(layout: Layout) -> Array:
    """Scatter of a spell mean of each gauge before there is a log, shape (gauges,). [Pa]"""
    noise = [
        max(DEFAULT_SAMPLE_NOISE_TOLERANCES * g.tolerance_at(g.range_high_pa), g.division_pa / np.sqrt(12.0), 1e-3)
        for g in layout.job.gauges
    ]
    return np.array(noise)


def _solved(layout: Layout, spell: SpellMeans, wanted: Array) -> tuple[SpellMeans, Point]:
    """A state with its flows and heads solved, and what its gauges and meters then say."""
    graph = spell_graph(layout, spell)
    flows = np.zeros(0)
    if not spell.is_still:
        flows = _even_flows(layout, graph.flow, wanted)
    point = Point(reference_head_m=np.zeros(graph.parts), flow_m3_s=flows)
    point = Point(reference_head_m=_heads_mid_range(layout, spell, point), flow_m3_s=flows)
    point = _settled(layout, _guided(layout, spell, flows), point)
    point = Point(reference_head_m=_heads_mid_range(layout, spell, point), flow_m3_s=point.flow_m3_s)
    state = evaluate(layout, spell, point)
    metered = np.array([run.flow_column is not None for run in layout.job.runs])
    heard = replace(
        spell,
        reading_pa=state.reading_pa,
        flow_m3_s=np.where(np.isfinite(spell.flow_m3_s) | (metered & (not spell.is_still)), state.flow_m3_s, np.nan),
    )
    return perfect(layout, heard, point), point


def with_loss(layout: Layout, spell: SpellMeans, point: Point, run: int, coefficient: float) -> SpellMeans:
    """What perfect gauges would read in a state with a loss more in one run, the flows that no meter gives solved anew.

    Parameters
    ----------
    layout : Layout
    spell : SpellMeans
        Of perfect readings.
    point : Point
        Its own.
    run : int
    coefficient : float
        On the run's velocity head. [-]

    Returns
    -------
    SpellMeans
    """
    applied = Applied(loss_k={run: coefficient})
    silent = replace(spell, reading_pa=np.full(layout.gauge_count, np.nan))
    solved = _settled(layout, _guided(layout, silent, point.flow_m3_s), point, applied)
    return perfect(layout, spell, solved, applied)


def _guided(layout: Layout, spell: SpellMeans, flows: Array) -> SpellMeans:
    """The spell with its given flows held, and the others near where they are now."""
    guide = np.full(layout.run_count, np.nan)
    if flows.size:
        guide[spell_graph(layout, spell).basis] = flows
    given = np.isfinite(spell.flow_m3_s)
    loose = LOOSE_SHARE * np.maximum(np.abs(np.nan_to_num(guide)), 0.1 * layout.area_m2)
    return replace(
        spell,
        flow_m3_s=np.where(given, spell.flow_m3_s, guide),
        flow_noise_m3_s=np.where(given, 1e-9, loose),
        flow_relative_sd=np.zeros(layout.run_count),
        flow_absolute_sd_m3_s=np.zeros(layout.run_count),
    )


def _even_flows(layout: Layout, basis: Array, wanted: Array) -> Array:
    """Independent flows that meet the wanted ones and else have as even a velocity as they can. [m³/s]"""
    known = np.isfinite(wanted)
    weight = np.where(known, 1e4, 1.0) / layout.area_m2
    target = np.where(known, np.nan_to_num(wanted), 0.0)
    return np.asarray(np.linalg.lstsq(basis * weight[:, None], target * weight, rcond=None)[0])


def _heads_mid_range(layout: Layout, spell: SpellMeans, point: Point) -> Array:
    """Heads of the parts: as their surfaces stand, else where their gauges are in the middle of their ranges. [m]"""
    state = evaluate(layout, spell, point)
    heads = point.reference_head_m.copy()
    middle_pa = np.array([(g.range_low_pa + g.range_high_pa) / 2.0 for g in layout.job.gauges])
    single = np.array([not g.is_differential for g in layout.job.gauges], dtype=bool)
    tap = np.argmax(layout.taps.head, axis=1) if layout.gauge_count else np.zeros(0, dtype=np.int64)
    for part in range(state.graph.parts):
        levels = np.flatnonzero(np.isfinite(spell.level_m) & (state.graph.part == part))
        if levels.size:
            heads[part] += float(np.mean(spell.level_m[levels] - state.head_m[levels])) if spell.is_still else 0.0
            if not spell.is_still:
                first = int(levels[0])
                heads[part] += float(spell.level_m[first] - state.head_m[first])
            continue
        here = single & (state.graph.part[tap] == part)
        if here.any():
            heads[part] += float(np.median((middle_pa - state.reading_pa)[here])) / state.head_weight_pa_m
    return heads


def _settled(layout: Layout, spell: SpellMeans, point: Point, applied: Applied | None = None) -> Point:
    """The point at which loops close and surfaces are met."""
    model = Model(layout, [spell], certain=True)
    for _ in range(MOST_STEPS):
        linear = model.linearise([point], applied=applied)
        if not linear.row_count:
            return point
        moved = model.moved(linear, np.zeros(linear.row_count))[0]
        change = float(np.max(np.abs(moved.reference_head_m - point.reference_head_m), initial=0.0))
        flow = float(np.max(np.abs(moved.flow_m3_s - point.flow_m3_s), initial=0.0))
        # half steps while flows still swing: the square law overshoots from one side to the other
        share = 1.0 if flow < 0.05 * float(np.max(np.abs(point.flow_m3_s), initial=1e-9)) else 0.5
        point = Point(
            reference_head_m=point.reference_head_m + share * (moved.reference_head_m - point.reference_head_m),
            flow_m3_s=point.flow_m3_s + share * (moved.flow_m3_s - point.flow_m3_s),
        )
        if change < SETTLED_M and share == 1.0:
            break
    return point


def scaled(layout: Layout, spell: SpellMeans, point: Point, factor: float, number: int) -> tuple[SpellMeans, Point]:
    """The same state at another flow, its metered flows scaled, everything else solved anew."""
    flows = [
        StatedFlow(run=run.name, flow_m3_s=factor * float(spell.flow_m3_s[index]), doubt=run.flow_doubt)
        for index, run in enumerate(layout.job.runs)
        if np.isfinite(spell.flow_m3_s[index])
    ]
    state = StatedSpell(start_s=spell.end_s, end_s=spell.end_s, kind=SpellKind.FLOWING, flows=tuple(flows))
    bare, wanted = _bare_spell(layout, state, number)
    if not flows:
        wanted = factor * evaluate(layout, spell, point).flow_m3_s
    bare = replace(bare, speed_ratio=spell.speed_ratio, is_open=spell.is_open, is_unsure=spell.is_unsure)
    return _solved(layout, bare, wanted)


def stilled(layout: Layout, number: int) -> tuple[SpellMeans, Point]:
    """A still state."""
    bare, wanted = _bare_spell(layout, StatedSpell(start_s=0.0, end_s=0.0, kind=SpellKind.STILL), number)
    return _solved(layout, bare, wanted)
