"""Spells: the stretches of a log in which the flow state holds steady, stated or found.

The log is cut where the heads against one another, the flows or the common head step; what is too short, or still moving from one
state to the next, is left out. A slow change of all heads together is no bar: the gauges are sampled together.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.layout import Layout
from headledger.diagnosis.readings import Timeline
from headledger.plant.job import Job, SpellKind, StatedSpell
from headledger.statistics.series import best_cuts

Array = NDArray[np.float64]

STEPS = 300
"""Pieces of time in which steps are sought: fine enough for the minutes of a visit, few enough to be quick."""

LEAST_PIECES = 4
"""Fewest pieces that make a spell."""

LEAST_SAMPLES = 3
"""Fewest rows of the log that make a found spell."""

LEAST_SHARE = 0.2
"""Shortest spell as a part of the typical one: what is shorter is a transition. [-]"""

MOVING_SHARE = 0.12
"""Largest change of a flow across a spell, as a part of the greatest flow: more is no steady state. [-]"""

STILL_SHARE = 0.01
"""A metered flow below this part of the greatest counts as none. [-]"""

NOTICED_TOLERANCES = 0.3
"""Steps of a gauge smaller than this part of its tolerance need no new spell. [-]"""

NOTICED_FLOW_SHARE = 0.03
"""Steps of a flow smaller than this part of the greatest need no new spell. [-]"""

SETTLING_TIME_CONSTANTS = 4.0
"""Time constants of damping after which a gauge has followed a step to 2 %. [-]"""

ALIKE_TOLERANCES = 0.1
"""How far the middle of the gauges may move against one another from one still stretch to another, in tolerances. [-]"""

STILL_TOLERANCES = 1.0
"""How far the middle of the gauges may disagree with one still head, in tolerances, where no meter says. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Spell:
    """A stretch of the log.

    Parameters
    ----------
    kind : SpellKind
    first, last : int
        First block and the one past the last.
    stated : StatedSpell or None
    """

    kind: SpellKind
    first: int
    last: int
    stated: StatedSpell | None = None


NOTICED = 1.0
"""Change of a column, in its own units of what would be noticed, that counts as one."""

FEWEST_TO_OUTVOTE = 3
"""With fewer gauges than this, none can be told to move alone."""


def find_spells(layout: Layout, timeline: Timeline) -> tuple[Spell, ...]:
    """Spells of a log, in time order: those stated as given, the rest found.

    Parameters
    ----------
    layout : Layout
    timeline : Timeline

    Returns
    -------
    tuple of Spell
        Stretches to be ignored are left out.
    """
    stated = [_stated(timeline, spell) for spell in layout.job.spells]
    taken = np.zeros(timeline.start_s.size, dtype=bool)
    for spell in stated:
        taken[spell.first : spell.last] = True
    spells = [spell for spell in stated if spell.kind is not SpellKind.IGNORE and spell.last > spell.first]
    for first, last in _free_stretches(taken):
        spells += _found(layout, timeline, first, last)
    return tuple(sorted(spells, key=lambda spell: spell.first))


def unread_spells(job: Job, spells: tuple[Spell, ...]) -> tuple[str, ...]:
    """Stated spells in which no log has a row, a sentence each."""
    kept = {id(spell.stated) for spell in spells if spell.stated}
    missing = [s for s in job.spells if s.kind is not SpellKind.IGNORE and id(s) not in kept]
    return tuple(
        f"spells: no log has a row between {_clock(spell.start_s)} and {_clock(spell.end_s)}; that spell is left out."
        for spell in missing
    )


def _clock(time_s: float) -> str:
    """A moment in words, UTC."""
    return f"{datetime.fromtimestamp(time_s, UTC):%Y-%m-%d %H:%M:%S} UTC"


def _stated(timeline: Timeline, spell: StatedSpell) -> Spell:
    """The blocks of a stated spell."""
    first = int(np.searchsorted(timeline.middle_s, spell.start_s, side="left"))
    last = int(np.searchsorted(timeline.middle_s, spell.end_s, side="right"))
    return Spell(kind=spell.kind, first=first, last=last, stated=spell)


def _free_stretches(taken: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Stretches of blocks that no stated spell covers."""
    edges = np.flatnonzero(np.diff(np.concatenate([[True], taken, [True]]).astype(int)))
    return [(int(a), int(b)) for a, b in zip(edges[::2], edges[1::2], strict=True) if b > a]


def _found(layout: Layout, timeline: Timeline, first: int, last: int) -> list[Spell]:
    """Spells found in one stretch."""
    pieces = _pieces(first, last)
    signal = _signal(layout, timeline, pieces)
    cuts = best_cuts(signal, penalty=12.0 + 4.0 * signal.shape[1])
    cuts = _without_lone_changes(cuts, signal[:, : layout.gauge_count], signal[:, layout.gauge_count :])
    spans = [(pieces[a], pieces[b]) for a, b in pairwise(cuts)]
    spans = [span for span in spans if _is_settled(layout, timeline, span)]
    if not spans:
        return []
    typical = _typical_length(spans)
    trimmed = [_trimmed(layout, timeline, span) for span in spans if span[1] - span[0] >= LEAST_SHARE * typical]
    trimmed = [(a, b) for a, b in trimmed if timeline.samples[a:b].sum() >= LEAST_SAMPLES]
    return [
        Spell(kind=kind, first=a, last=b)
        for (a, b), kind in zip(trimmed, _kinds(layout, timeline, trimmed), strict=True)
    ]


def _without_lone_changes(cuts: Sequence[int], gauges: Array, others: Array) -> list[int]:
    """Cuts at which more than one gauge changes against the rest, or a flow does: one gauge alone that moves is no change of flow.

    Parameters
    ----------
    cuts : sequence of int
        Ends included.
    gauges, others : ndarray, shape (pieces, columns)
        Each in units of what would be noticed.
    """
    if gauges.shape[1] < FEWEST_TO_OUTVOTE:
        return list(cuts)
    kept = [cuts[0]]
    for at, after in pairwise(cuts[1:]):
        before = slice(kept[-1], at)
        behind = slice(at, after)
        moved = np.abs(gauges[behind].mean(axis=0) - gauges[before].mean(axis=0)) > NOTICED
        flows = np.abs(others[behind].mean(axis=0) - others[before].mean(axis=0)) > NOTICED
        if moved.sum() > 1 or flows.any():
            kept.append(at)
    return [*kept, cuts[-1]]


def _typical_length(spans: list[tuple[int, int]]) -> float:
    """Length such that half of the time lies in stretches at least as long: many short transitions do not move it."""
    lengths = np.sort([b - a for a, b in spans])[::-1]
    return float(lengths[int(np.searchsorted(np.cumsum(lengths), lengths.sum() / 2.0))])


def _pieces(first: int, last: int) -> NDArray[np.int64]:
    """Bounds of at most `STEPS` pieces of about equal numbers of blocks."""
    count = min(STEPS, last - first)
    return np.linspace(first, last, count + 1).round().astype(np.int64)


def _piece_means(values: Array, pieces: NDArray[np.int64]) -> Array:
    """Means over pieces, gaps filled from the neighbours; zero where there is nothing at all."""
    ok = np.isfinite(values)
    sums = np.add.reduceat(np.where(ok, values, 0.0), pieces[:-1], axis=0)
    counts = np.add.reduceat(ok.astype(float), pieces[:-1], axis=0)
    with np.errstate(invalid="ignore", divide="ignore"):
        means = np.where(counts > 0, sums / counts, np.nan)
    at = np.arange(means.shape[0])
    for column in range(means.shape[1]):
        known = np.isfinite(means[:, column])
        means[:, column] = np.interp(at, at[known], means[known, column]) if known.any() else 0.0
    return means


def _signal(layout: Layout, timeline: Timeline, pieces: NDArray[np.int64]) -> Array:
    """What steps are sought in, each column in units of what would be noticed: gauges against their middle, the middle, flows."""
    gauges = layout.job.gauges
    reading = _piece_means(timeline.reading_pa, pieces)
    single = np.array([not gauge.is_differential for gauge in gauges])
    level = np.median(reading, axis=0)
    middle = np.median((reading - level)[:, single], axis=1) if single.any() else np.zeros(reading.shape[0])
    least_tolerance = min(gauge.tolerance_at(float(level[i])) for i, gauge in enumerate(gauges))
    columns = []
    for index, gauge in enumerate(gauges):
        rest = reading[:, index] - (middle if single[index] else 0.0)
        noticed = NOTICED_TOLERANCES * gauge.tolerance_at(float(level[index]))
        columns.append(rest / _scale(rest, noticed))
    columns.append(middle / _scale(middle, 3.0 * NOTICED_TOLERANCES * least_tolerance))
    for values in (timeline.flow_m3_s, timeline.speed_ratio, timeline.open_fraction):
        means = _piece_means(values, pieces)
        greatest = np.abs(means).max(axis=0, initial=0.0)
        columns += [
            means[:, run] / _scale(means[:, run], NOTICED_FLOW_SHARE * greatest[run])
            for run in np.flatnonzero(greatest > 0.0)
        ]
    return np.column_stack(columns)


def _scale(values: Array, noticed: float) -> float:
    """Noise of a column of pieces, by the middle of its successive differences, and never below what would be noticed."""
    if values.size < 3:
        return max(noticed, 1e-12)
    # 0.6745 √2: a normal difference's median size (robust scale of first differences)
    noise = float(np.median(np.abs(np.diff(values)))) / (0.6745 * np.sqrt(2.0))
    return float(max(2.0 * noise, noticed, 1e-12))


def _is_settled(layout: Layout, timeline: Timeline, span: tuple[int, int]) -> bool:
    """Whether no metered flow changes much across a stretch, beyond what its noise would."""
    first, last = span
    if last - first < 2:
        return False
    half = (first + last) // 2
    for run in range(layout.run_count):
        flow = timeline.flow_m3_s[:, run]
        parts = [flow[first:half], flow[half:last]]
        parts = [part[np.isfinite(part)] for part in parts]
        if min(part.size for part in parts) == 0:
            continue
        greatest = _greatest_flow(timeline, run)
        noise = float(np.sqrt(sum(part.var() / part.size for part in parts)))
        # halves differ by half of the whole change
        change = 2.0 * abs(float(parts[1].mean() - parts[0].mean()))
        if change > MOVING_SHARE * greatest + 6.0 * noise:
            return False
    return True


def _greatest_flow(timeline: Timeline, run: int) -> float:
    """A run's greatest metered flow, noise aside: the 95th percentile. [m³/s]"""
    flow = np.abs(timeline.flow_m3_s[:, run])
    flow = flow[np.isfinite(flow)]
    return float(np.percentile(flow, 95.0)) if flow.size else 0.0


def _trimmed(layout: Layout, timeline: Timeline, span: tuple[int, int]) -> tuple[int, int]:
    """A stretch less the settling after its start and the edge of its end, never more than a quarter of it at either side."""
    first, last = span
    settle_s = SETTLING_TIME_CONSTANTS * max((gauge.damping_s for gauge in layout.job.gauges), default=0.0)
    settle = int(np.ceil(max(settle_s, 2.0 * timeline.width_s) / timeline.width_s))
    piece = max(1, (last - first) // 40)
    quarter = (last - first) // 4
    return first + min(settle + piece, quarter), last - min(piece + 1, quarter)


def _kinds(layout: Layout, timeline: Timeline, spans: list[tuple[int, int]]) -> list[SpellKind]:
    """Whether liquid moves in each stretch: by meters and pumps, else by whether the heads agree as at rest."""
    graph = layout.graph(tuple(True for _ in range(layout.run_count)))
    by_heads = _still_by_heads(layout, timeline, spans)
    kinds = []
    for (first, last), still in zip(spans, by_heads, strict=True):
        moving = _is_moving(layout, timeline, first, last)
        if moving is None:
            moving = graph.flow.shape[1] > 0 and not still
        kinds.append(SpellKind.FLOWING if moving else SpellKind.STILL)
    return kinds


def _is_moving(layout: Layout, timeline: Timeline, first: int, last: int) -> bool | None:
    """What meters and pump speeds say of a stretch; None where there are none."""
    metered, moving = False, False
    for run in range(layout.run_count):
        flow = timeline.flow_m3_s[first:last, run]
        flow = flow[np.isfinite(flow)]
        if flow.size:
            metered = True
            noise = float(flow.std() / np.sqrt(flow.size))
            moving |= abs(float(flow.mean())) > STILL_SHARE * _greatest_flow(timeline, run) + 4.0 * noise
        speed = timeline.speed_ratio[first:last, run]
        speed = speed[np.isfinite(speed)]
        moving |= bool(speed.size) and float(speed.mean()) > STILL_SHARE
    return moving if metered or moving else None


def _still_by_heads(layout: Layout, timeline: Timeline, spans: list[tuple[int, int]]) -> list[bool]:
    """Stretches in which the gauges agree on one head as at rest.

    The stretch with the best agreement is still if most gauges agree within their tolerance; others are still where most gauges, less
    what each was off by in that one, agree far more closely: a gauge's own error is the same at rest whatever the head.
    """
    single = [i for i, gauge in enumerate(layout.job.gauges) if not gauge.is_differential]
    still = layout.taps.readings_pa(
        np.zeros(len(layout.job.stations)),
        np.zeros(layout.run_count),
        density_kg_m3=layout.nominal_density_kg_m3,
        gravity_m_s2=layout.gravity_m_s2,
    )
    off = np.full((len(spans), len(single)), np.nan)
    for row, (first, last) in enumerate(spans):
        for column, index in enumerate(single):
            values = timeline.reading_pa[first:last, index]
            values = values[np.isfinite(values)]
            if values.size:
                off[row, column] = float(values.mean()) - still[index]
        known = off[row][np.isfinite(off[row])]
        off[row] -= float(np.median(known)) if known.size else 0.0
    tolerance = np.array([layout.job.gauges[i].tolerance.at(*_middle(layout, i)) for i in single])

    def spread(values: Array) -> float:
        known = np.isfinite(values)
        return float(np.median(np.abs(values[known]) / tolerance[known])) if known.sum() >= 2 else np.inf

    if not spans:
        return []
    best = int(np.argmin([spread(row) for row in off]))
    if spread(off[best]) >= STILL_TOLERANCES:
        return [False] * len(spans)
    return [row == best or spread(off[row] - off[best]) < ALIKE_TOLERANCES for row in range(len(spans))]


def _middle(layout: Layout, gauge: int) -> tuple[float, float, float]:
    """Middle and ends of a gauge's range. [Pa]"""
    noun = layout.job.gauges[gauge]
    return (noun.range_low_pa + noun.range_high_pa) / 2.0, noun.range_low_pa, noun.range_high_pa
