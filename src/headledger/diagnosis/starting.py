"""Where to linearise first: flows as metered, the others as loops, surfaces and gauges together have them, heads in the middle.

One bad gauge must not pull the start along, so gauges count by Huber's cost: square near the fit, straight beyond.
"""

from __future__ import annotations

from collections.abc import Sequence
from itertools import product

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.estimate import FREE_VELOCITY_M_S, middle_heads_m
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.state import Point, State, evaluate, spell_graph

Array = NDArray[np.float64]

LOOP_SCALE_M, LEVEL_SCALE_M = 0.01, 0.05
"""How far a loop may stay open and a surface be missed before it weighs, in the search for a start. [m]"""

HUBER = 1.5
"""Residual, in a gauge's own tolerance and accuracy, beyond which it pulls no harder. [-]"""

STARTS = (0.3, -0.3)
"""Flows to start the search from, as parts of the usual design flow, one sign pattern after another. [-]"""

MOST_PATTERNS, MOST_STEPS = 8, 40


def first_points(layout: Layout, spells: Sequence[SpellMeans]) -> tuple[Point, ...]:
    """Points at which every spell's model is evaluated first.

    Parameters
    ----------
    layout : Layout
    spells : sequence of SpellMeans

    Returns
    -------
    tuple of Point
    """
    points: list[Point] = []
    for index, spell in enumerate(spells):
        graph = spell_graph(layout, spell)
        before = points[-1].flow_m3_s if index and spells[index - 1].id == spell.id else None
        flows = np.zeros(0) if spell.is_still else _first_flows(layout, spell, before)
        point = Point(reference_head_m=np.zeros(graph.parts), flow_m3_s=flows)
        state = evaluate(layout, spell, point)
        points.append(Point(reference_head_m=middle_heads_m(layout, spell, state), flow_m3_s=flows))
    return tuple(points)


def _first_flows(layout: Layout, spell: SpellMeans, before: Array | None) -> Array:
    """Independent flows: as metered, the others by the best of several robust fits, or from the piece before of the same spell. [m³/s]"""
    runs = spell_graph(layout, spell).basis
    metered = np.isfinite(spell.flow_m3_s[runs])
    flows = np.where(metered, np.nan_to_num(spell.flow_m3_s[runs]), 0.0)
    free = np.flatnonzero(~metered)
    if not free.size:
        return flows
    scale = FREE_VELOCITY_M_S * layout.area_m2[runs[free]]
    fit = _Fit(layout, spell, flows, free, scale)
    if before is not None and before.size == flows.size:
        flows[free] = fit.from_start(before[free])[1]
        return flows
    patterns = list(product(STARTS, repeat=min(free.size, 3)))[:MOST_PATTERNS]
    tried = [fit.from_start(np.resize(np.array(pattern), free.size) * scale) for pattern in patterns]
    flows[free] = min(tried, key=lambda pair: pair[0])[1]
    return flows


class _Fit:
    """Robust fit of one spell's heads and unmetered flows."""

    def __init__(self, layout: Layout, spell: SpellMeans, flows: Array, free: NDArray[np.int64], scale: Array) -> None:
        self._layout, self._spell, self._flows, self._free, self._scale = layout, spell, flows, free, scale
        self._gauges = np.flatnonzero(np.isfinite(spell.reading_pa))
        self._levels = np.flatnonzero(np.isfinite(spell.level_m))
        nouns = [layout.job.gauges[g] for g in self._gauges]
        self._doubt = np.array(
            [
                g.tolerance_at(float(p)) + g.accuracy.at(float(p), g.range_low_pa, g.range_high_pa)
                for g, p in zip(nouns, spell.reading_pa[self._gauges], strict=True)
            ]
        )

    def from_start(self, start: Array) -> tuple[float, Array]:
        """Cost and flows that Gauss–Newton with halving steps reaches from a start."""
        graph = spell_graph(self._layout, self._spell)
        point = self._point(np.zeros(graph.parts), start)
        heads = middle_heads_m(self._layout, self._spell, evaluate(self._layout, self._spell, point))
        unknown = np.concatenate([heads, start / self._scale])
        cost, residual, slopes = self._rows(unknown)
        for _ in range(MOST_STEPS):
            step = np.linalg.lstsq(slopes, -residual, rcond=1e-10)[0]
            size, better = 1.0, False
            while size > 1e-4 and not better:
                trial = self._rows(unknown + size * step)
                better = trial[0] < cost - 1e-9 * abs(cost)
                size /= 2.0
            if not better:
                break
            unknown = unknown + 2.0 * size * step
            cost, residual, slopes = trial
        return cost, unknown[graph.parts :] * self._scale

    def _point(self, heads: Array, free_flows: Array) -> Point:
        """A point with these unknowns."""
        flows = self._flows.copy()
        flows[self._free] = free_flows
        return Point(reference_head_m=heads, flow_m3_s=flows)

    def _rows(self, unknown: Array) -> tuple[float, Array, Array]:
        """Cost, weighted residuals and their derivatives with heads and scaled flows."""
        parts = spell_graph(self._layout, self._spell).parts
        point = self._point(unknown[:parts], unknown[parts:] * self._scale)
        state = evaluate(self._layout, self._spell, point)
        away = (state.reading_pa - self._spell.reading_pa)[self._gauges] / self._doubt
        weight = np.sqrt(np.minimum(1.0, HUBER / np.maximum(np.abs(away), 1e-12)))
        gauges = np.hstack(
            [state.reading_from_head(self._layout), self._by_flow(state.reading_from_flow(self._layout))]
        )
        gauges = gauges[self._gauges] / self._doubt[:, None]
        drops = state.slope_s_m2[:, None] * state.basis
        exact, exact_slopes = self._exact_rows(state, drops)
        flows = unknown[parts:]
        residual = np.concatenate([away * weight, exact, flows])
        slopes = np.vstack(
            [gauges * weight[:, None], exact_slopes, np.hstack([np.zeros((flows.size, parts)), np.eye(flows.size)])]
        )
        straight = np.abs(away) > HUBER
        huber = np.where(straight, HUBER * (np.abs(away) - HUBER / 2.0), away**2 / 2.0).sum()
        return float(huber + (exact**2).sum() / 2.0 + (flows**2).sum() / 2.0), residual, slopes

    def _by_flow(self, slopes: Array) -> Array:
        """Derivatives with the scaled free flows, of derivatives with all independent ones."""
        return np.asarray(slopes[:, self._free] * self._scale)

    def _exact_rows(self, state: State, drops: Array) -> tuple[Array, Array]:
        """Rows of loops and surfaces."""
        graph = state.graph
        member = np.zeros((self._levels.size, graph.parts))
        member[np.arange(self._levels.size), graph.part[self._levels]] = 1.0
        levels = (state.head_m - self._spell.level_m)[self._levels] / LEVEL_SCALE_M
        level_slopes = np.hstack([member, self._by_flow(-graph.path[self._levels] @ drops)]) / LEVEL_SCALE_M
        loops = graph.loop @ state.drop_m / LOOP_SCALE_M
        none = np.zeros((loops.size, graph.parts))
        loop_slopes = np.hstack([none, self._by_flow(graph.loop @ drops)]) / LOOP_SCALE_M
        return np.concatenate([levels, loops]), np.vstack([level_slopes, loop_slopes])
