"""The joint model of a job: all rows of all spells, linearised at a point, with every doubt carried.

Rows of a spell are the readings of its gauges, meters beyond those that set a flow, surfaces with a level, and the loops that must
close. Its own unknowns are the heads of its parts and, while liquid moves, its independent flows.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.budget import InputKind, UncertainInput, input_marks, uncertain_inputs
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.state import Applied, Point, State, evaluate, spell_graph
from headledger.physics.tapping import AIR_WEIGHT_PA_M
from headledger.statistics.gaussian import Group, Whitened, own_estimate, whiten

Array = NDArray[np.float64]

HEAD_SD_M = 30.0
"""Prior width of an unknown head, about the readings' own middle: what freeing a head costs an explanation. [m]"""

CUT_OFF_WANDER_M = (0.005, 0.5)
"""How far the head of a section that is cut off wanders from spell to spell, at least and at most: nothing moves it but warmth and
seeping valves. Between these it is taken from the section's own heads, so that no explanation gains by stretching them. [m]"""

FREE_VELOCITY_M_S = 1.5
"""Prior width of an unmetered flow, as a velocity in its bore: the usual range of piping design (common practice). [m/s]"""

LOOP_NOISE_M = 1e-5
"""How exactly a loop must close: far below any reading's noise, far above rounding. [m]"""

LEAST_FLOW_NOISE_FRACTION = 1e-6
"""Floor of a metered flow's noise, so that a stated flow without noise stays solvable. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class SpellRows:
    """Where the rows of one spell lie in the stacked data.

    Parameters
    ----------
    start : int
        First row.
    gauges : ndarray of int
        Gauges that gave a reading, in row order.
    meters : ndarray of int
        Runs whose meters are checked rather than used to set a flow.
    levels : ndarray of int
        Stations with a known surface.
    loops : int
        Loops that must close.
    """

    start: int
    gauges: NDArray[np.int64]
    meters: NDArray[np.int64]
    levels: NDArray[np.int64]
    loops: int

    @property
    def count(self) -> int:
        """Number of rows."""
        return sum(int(part.size) for part in (self.gauges, self.meters, self.levels)) + self.loops


@dataclass(frozen=True, slots=True, kw_only=True)
class Linear:
    """The model linearised at one point.

    Parameters
    ----------
    states : tuple of State
        Of each spell at the point.
    rows : tuple of SpellRows
    groups : tuple of Group
        One a spell.
    white : Whitened
    applied : Applied
        Causes allowed for in the states.
    model : Model
        What was linearised.
    calibration : ndarray, shape (rows, inputs)
        How the shared inputs move the data rows, in their standard deviations (the groups' `shared`, stacked).
    """

    states: tuple[State, ...]
    rows: tuple[SpellRows, ...]
    groups: tuple[Group, ...]
    white: Whitened
    applied: Applied
    model: Model
    calibration: Array

    def noise_pa(self, gauge: int) -> Array:
        """Noise of one gauge's rows. [Pa]"""
        found = [
            float(group.noise_sd[int(np.flatnonzero(place.gauges == gauge)[0])])
            for place, group in zip(self.rows, self.groups, strict=True)
            if (place.gauges == gauge).any()
        ]
        return np.array(found)

    @property
    def row_count(self) -> int:
        """Number of rows of the stacked data."""
        return int(self.calibration.shape[0])

    def gauge_rows(self, gauge: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Rows of one gauge in the stacked data, and the spells they belong to."""
        rows, spells = [], []
        for spell, place in enumerate(self.rows):
            where = np.flatnonzero(place.gauges == gauge)
            if where.size:
                rows.append(place.start + int(where[0]))
                spells.append(spell)
        return np.array(rows, dtype=np.int64), np.array(spells, dtype=np.int64)


class Model:
    """A job with what its spells said.

    Parameters
    ----------
    layout : Layout
    spells : sequence of SpellMeans
    certain : bool
        Whether everything that the job states is taken as exactly so: to solve a state, not to judge one.
    """

    def __init__(self, layout: Layout, spells: Sequence[SpellMeans], *, certain: bool = False) -> None:
        self.layout = layout
        self.spells = tuple(spells)
        self._cut_off_m: dict[str, tuple[float, float]] = {}
        self.inputs: tuple[UncertainInput, ...] = (
            *(() if certain else uncertain_inputs(layout)),
            *(
                UncertainInput(kind=InputKind.CUT_OFF, owner=name, sd=HEAD_SD_M)
                for name in sorted({name for spell in self.spells for name in cut_off_sections(layout, spell).values()})
            ),
        )

    def linearise(self, points: Sequence[Point], *, applied: Applied | None = None) -> Linear:
        """The model at a point of each spell.

        Parameters
        ----------
        points : sequence of Point
        applied : Applied, optional

        Returns
        -------
        Linear
        """
        applied = applied or Applied()
        states, places, groups = [], [], []
        start = 0
        for spell, point in zip(self.spells, points, strict=True):
            state = evaluate(self.layout, spell, point, applied=applied)
            place = self._rows(spell, state, start)
            states.append(state)
            places.append(place)
            groups.append(self._group(spell, state, place, applied))
            start += place.count
        return Linear(
            states=tuple(states),
            rows=tuple(places),
            groups=tuple(groups),
            white=whiten(groups),
            applied=applied,
            model=self,
            calibration=np.vstack([group.shared for group in groups]),
        )

    def _rows(self, spell: SpellMeans, state: State, start: int) -> SpellRows:
        """Rows of a spell."""
        moving = state.point.flow_m3_s.size > 0
        used = set(state.graph.basis.tolist()) if moving else set()
        meters = [
            run
            for run in range(self.layout.run_count)
            if moving and np.isfinite(spell.flow_m3_s[run]) and run not in used
        ]
        return SpellRows(
            start=start,
            gauges=np.flatnonzero(np.isfinite(spell.reading_pa)),
            meters=np.array(meters, dtype=np.int64),
            levels=np.flatnonzero(np.isfinite(spell.level_m)),
            loops=state.graph.loop.shape[0] if moving else 0,
        )

    def _group(self, spell: SpellMeans, state: State, place: SpellRows, applied: Applied) -> Group:
        """Residuals, doubts and derivatives of one spell's rows."""
        layout = self.layout
        readings, flow_marks, drop_marks = input_marks(layout, self.inputs, spell, state, applied)
        from_flow = state.reading_from_flow(layout)
        own_flow_marks = flow_marks[state.graph.basis] if from_flow.shape[1] else np.zeros((0, len(self.inputs)))
        # a metered independent run flows as its meter says, give or take its gain: that gain is a shared input
        readings = readings + from_flow @ own_flow_marks
        drop_from_flow = state.slope_s_m2[:, None] * state.basis
        heads = state.reading_from_head(layout)
        for part, name in cut_off_sections(layout, spell).items():
            column = next(c for c, i in enumerate(self.inputs) if i.kind is InputKind.CUT_OFF and i.owner == name)
            readings[:, column] = self.inputs[column].sd * heads[:, part]
        residual = [spell.reading_pa[place.gauges] - state.reading_pa[place.gauges]]
        noise = [spell.noise_pa[place.gauges]]
        own = [np.hstack([heads, from_flow])[place.gauges]]
        shared = [readings[place.gauges]]
        if place.meters.size:
            ratio = np.array([applied.meter_ratio.get(int(run), 1.0) for run in place.meters])
            residual.append(spell.flow_m3_s[place.meters] - ratio * state.flow_m3_s[place.meters])
            noise.append(self._flow_noise(spell, place.meters))
            slopes = ratio[:, None] * state.basis[place.meters]
            own.append(np.hstack([np.zeros((place.meters.size, state.graph.parts)), slopes]))
            shared.append(slopes @ own_flow_marks + flow_marks[place.meters])
        if place.levels.size:
            self._add_levels(spell, state, place, (residual, noise, own, shared), own_flow_marks, drop_marks)
        if place.loops:
            loop = state.graph.loop
            residual.append(-loop @ (state.drop_m + state.column_m))
            noise.append(np.full(place.loops, LOOP_NOISE_M))
            slopes = loop @ drop_from_flow
            own.append(np.hstack([np.zeros((place.loops, state.graph.parts)), slopes]))
            shared.append(slopes @ own_flow_marks + loop @ drop_marks)
        own_sd, own_offset = self._own_priors(spell, state, applied)
        return Group(
            residual=np.concatenate(residual),
            noise_sd=np.concatenate(noise),
            own=np.vstack(own),
            own_sd=own_sd,
            own_offset=own_offset,
            shared=np.vstack(shared),
        )

    def _add_levels(
        self,
        spell: SpellMeans,
        state: State,
        place: SpellRows,
        parts: tuple[list[Array], list[Array], list[Array], list[Array]],
        own_flow_marks: Array,
        drop_marks: Array,
    ) -> None:
        """Append the rows that say that a surface's head is its level."""
        residual, noise, own, shared = parts
        at = place.levels
        path = state.graph.path[at]
        head = spell.level_m[at] - spell.level_m[at] * AIR_WEIGHT_PA_M / state.head_weight_pa_m
        residual.append(head - state.head_m[at])
        noise.append(spell.level_sd_m[at])
        member = np.zeros((at.size, state.graph.parts))
        member[np.arange(at.size), state.graph.part[at]] = 1.0
        slopes = -path @ (state.slope_s_m2[:, None] * state.basis)
        own.append(np.hstack([member, slopes]))
        shared.append(slopes @ own_flow_marks - path @ drop_marks)

    def _flow_noise(self, spell: SpellMeans, runs: NDArray[np.int64]) -> Array:
        """Noise of metered flows, never quite nothing. [m³/s]"""
        area = self.layout.area_m2[runs]
        floor = LEAST_FLOW_NOISE_FRACTION * np.maximum(np.abs(spell.flow_m3_s[runs]), 0.01 * area)
        return np.maximum(spell.flow_noise_m3_s[runs], floor)

    def _own_priors(self, spell: SpellMeans, state: State, applied: Applied) -> tuple[Array, Array]:
        """Prior widths of a spell's own unknowns, and their means less the point."""
        graph, point = state.graph, state.point
        middle = middle_heads_m(self.layout, spell, state)
        offset_head = middle - point.reference_head_m
        sd_head = np.full(graph.parts, HEAD_SD_M)
        for part, name in cut_off_sections(self.layout, spell).items():
            middle_m, sd_head[part] = self._cut_off_heads_m(name)
            offset_head[part] = middle_m - point.reference_head_m[part]
        if not point.flow_m3_s.size:
            return sd_head, offset_head
        runs = graph.basis
        metered = np.isfinite(spell.flow_m3_s[runs])
        ratio = np.array([applied.meter_ratio.get(int(run), 1.0) for run in runs])
        said = np.where(metered, np.nan_to_num(spell.flow_m3_s[runs]) / ratio, 0.0)
        free = FREE_VELOCITY_M_S * self.layout.area_m2[runs]
        sd_flow = free
        if metered.any():
            sd_flow = np.where(metered, self._flow_noise_or(spell, runs, free), free)
        return np.concatenate([sd_head, sd_flow]), np.concatenate([offset_head, said - point.flow_m3_s])

    def _cut_off_heads_m(self, name: str) -> tuple[float, float]:
        """Middle and spread over all spells of what the gauges of a cut-off section say of its head. [m]"""
        if name not in self._cut_off_m:
            said = []
            for spell in self.spells:
                parts = {section: part for part, section in cut_off_sections(self.layout, spell).items()}
                if name in parts:
                    graph = spell_graph(self.layout, spell)
                    flows = np.zeros(0 if spell.is_still else graph.basis.size)
                    point = Point(reference_head_m=np.zeros(graph.parts), flow_m3_s=flows)
                    state = evaluate(self.layout, spell, point)
                    said.append(float(middle_heads_m(self.layout, spell, state)[parts[name]]))
            spread = float(np.clip(1.5 * np.std(said), *CUT_OFF_WANDER_M))
            self._cut_off_m[name] = (float(np.median(said)), spread)
        return self._cut_off_m[name]

    def _flow_noise_or(self, spell: SpellMeans, runs: NDArray[np.int64], other: Array) -> Array:
        """Noise of metered flows, `other` where there is no meter."""
        metered = np.isfinite(spell.flow_m3_s[runs])
        noise = other.copy()
        noise[metered] = self._flow_noise(spell, runs[metered])
        return noise

    def flow_sd_m3_s(self, linear: Linear, index: int) -> Array:
        """Posterior standard deviation of every run's flow in one spell, with no cause's size in doubt.

        Parameters
        ----------
        linear : Linear
        index : int
            Of the spell.

        Returns
        -------
        ndarray, shape (runs,)
            [m³/s]

        Notes
        -----
        An independent flow is what its meter says, moved by the meter's gain, plus a rest that the readings weigh against its prior:
        its covariance is the rest's own plus what the shared inputs' posterior brings by both ways.
        """
        spell, state, group = self.spells[index], linear.states[index], linear.groups[index]
        parts = state.graph.parts
        if not state.point.flow_m3_s.size:
            return np.zeros(self.layout.run_count)
        weighted = group.own / group.noise_sd[:, None]
        upper = np.linalg.qr(np.vstack([weighted, np.diag(1.0 / group.own_sd)]), mode="r")
        root = np.linalg.inv(upper)
        own = root @ root.T
        by_shared = -own @ weighted.T @ (group.shared / group.noise_sd[:, None])
        _, flow_marks, _ = input_marks(self.layout, self.inputs, spell, state, linear.applied)
        by_shared = by_shared[parts:] + flow_marks[state.graph.basis]
        covariance = own[parts:, parts:] + by_shared @ linear.white.shared_covariance() @ by_shared.T
        return np.asarray(np.sqrt(np.maximum(np.einsum("ri,ij,rj->r", state.basis, covariance, state.basis), 0.0)))

    def moved(self, linear: Linear, shift: Array) -> tuple[Point, ...]:
        """The points at which the spells' own unknowns are most probable.

        Parameters
        ----------
        linear : Linear
        shift : ndarray, shape (rows,)
            What causes add to the data rows, taken off first.

        Returns
        -------
        tuple of Point
        """
        mean = linear.white.shared.T @ (linear.white.residual - linear.white.mark(shift))
        points = []
        for state, place, group in zip(linear.states, linear.rows, linear.groups, strict=True):
            cut = slice(place.start, place.start + place.count)
            rest = Group(
                residual=group.residual - shift[cut],
                noise_sd=group.noise_sd,
                own=group.own,
                own_sd=group.own_sd,
                own_offset=group.own_offset,
                shared=group.shared,
            )
            step = own_estimate(rest, mean)
            parts = state.graph.parts
            points.append(
                Point(
                    reference_head_m=state.point.reference_head_m + step[:parts],
                    flow_m3_s=state.point.flow_m3_s + step[parts:],
                )
            )
        return tuple(points)


def cut_off_sections(layout: Layout, spell: SpellMeans) -> dict[int, str]:
    """Parts that shut valves cut off in a spell: by part, a name that is the same in every spell.

    Parameters
    ----------
    layout : Layout
    spell : SpellMeans

    Returns
    -------
    dict of int to str
        Parts without exchange or pump beside a larger one; named by their stations.
    """
    # what a loss of unknown size parts has no head of its own: it follows, only by an unknown amount
    piped, graph = layout.graph(spell.is_open), spell_graph(layout, spell)
    if piped.parts < 2:
        return {}
    sizes = np.bincount(piped.part, minlength=piped.parts)
    largest = int(np.argmax(sizes))
    driven = {int(piped.part[layout.ends[run][0]]) for run in layout.pumps}
    found = {}
    for part in range(piped.parts):
        members = np.flatnonzero(piped.part == part)
        alone = np.unique(graph.part[members])
        exchanges = any(layout.exchanges[int(s)] for s in members)
        if part != largest and part not in driven and not exchanges and alone.size == 1:
            found[int(alone[0])] = " ".join(layout.job.stations[int(s)].name for s in members)
    return found


def middle_heads_m(layout: Layout, spell: SpellMeans, state: State) -> Array:
    """The middle of what the gauges of each part say of its reference head, with the drops of a state.

    Parameters
    ----------
    layout : Layout
    spell : SpellMeans
    state : State

    Returns
    -------
    ndarray, shape (parts,)
        Medians, so that a minority of bad gauges does not move them; the state's own head where a part has no gauge. [m]
    """
    said = state.point.reference_head_m.copy()
    single = layout.taps.head.sum(axis=1) > 0.5  # differential gauges say nothing of a head
    usable = np.isfinite(spell.reading_pa) & single
    if not usable.any():
        return said
    tap = np.argmax(layout.taps.head, axis=1)
    part = state.graph.part[tap]
    estimate = said[part] + (spell.reading_pa - state.reading_pa) / state.head_weight_pa_m
    for index in range(state.graph.parts):
        here = usable & (part == index)
        if here.any():
            said[index] = float(np.median(estimate[here]))
    return said
