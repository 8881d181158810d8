"""How each gauge kept to its neighbours over the log, by control charts; and the line of its readings over what was expected.

The charts stand beside the judgement and take no part in it: they see a gauge wander within a spell. What changes between spells alone,
while the flow does, may be the pipe's, and is left to the judgement.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaincinv, ndtri

from headledger.diagnosis.layout import Layout
from headledger.diagnosis.neighbours import left_over, own_and_others
from headledger.diagnosis.readings import Timeline
from headledger.diagnosis.result import GaugeFound, GaugeHistory
from headledger.diagnosis.spells import Spell
from headledger.diagnosis.wording import history_statement
from headledger.statistics.charts import (
    against_earlier,
    cusum,
    cusum_limit,
    ewma,
    ewma_limits,
    first_beyond,
    grubbs,
    grubbs_critical,
    straight_line,
)
from headledger.statistics.series import batch_means

Array = NDArray[np.float64]

BATCHES, FEWEST_BATCHES, FEWEST_BLOCKS = 8, 4, 3
"""Stretches of a spell that are charted, long enough to hold what wanders slowly; without so many, or shorter, a spell is left out."""

FEWEST_CHARTED = 8
"""Stretches over all spells without which no chart is drawn."""

FALSE_ALARM = 0.005
"""Probability that a chart of a gauge that keeps still leaves its limits in one log. [-]"""

ALLOWANCE, WEIGHT = 0.5, 0.2
"""Of the CUSUM, in standard deviations; of the EWMA's newest value: both for changes of one standard deviation (common practice). [-]"""

SURE = 0.95
"""So surely is the scatter no greater than it is taken to be. [-]"""

MOST_ALIKE = 0.8
"""Greatest autocorrelation of neighbouring stretches that is allowed for. [-]"""

ALONE_LEVEL = 0.001
"""Probability that a stretch is left out as standing alone where none does. [-]"""

SPREAD_TOLERANCES = 2.0
"""Expected readings must span so many tolerances before a line through them says anything. [-]"""


def gauge_histories(
    layout: Layout, timeline: Timeline, spells: Sequence[Spell], found: Sequence[GaugeFound]
) -> tuple[GaugeHistory, ...]:
    """The history of every gauge whose neighbours say enough.

    Parameters
    ----------
    layout : Layout
    timeline : Timeline
    spells : sequence of Spell
    found : sequence of GaugeFound
        In the order of the gauge table.

    Returns
    -------
    tuple of GaugeHistory

    Notes
    -----
    A gauge's difference from what its neighbours' motions explain is averaged over stretches of each spell. Every stretch is held against
    those before it in its spell, so that no level has to be known and what a spell's flow leaves unexplained does not count. The scatter
    comes from successive differences, widened for autocorrelation and taken at its upper end; the limits follow from the wanted rate
    of false alarms over so many stretches.
    """
    cut = [_without_spike(*_stretches(layout, timeline, spells, gauge)) for gauge in range(layout.gauge_count)]
    usable = [sum(one.size for one in means) >= FEWEST_CHARTED and _half_square(means, 1) > 0.0 for means, _, _ in cut]
    # how long a wander lasts is the system's: of one gauge alone a step would look like it
    alikes = [_alike(means) for (means, _, _), told in zip(cut, usable, strict=True) if told]
    alike = float(np.median(alikes)) if alikes else 0.0
    histories = []
    for one, (means, times, spike_s), told in zip(found, cut, usable, strict=True):
        if told:
            at, by = _first_leaving(means, times, _scatter(means, alike))
            histories.append(
                GaugeHistory(
                    tag=one.tag,
                    holds=at is None,
                    leaves_at_s=at,
                    by=by,
                    spike_s=spike_s,
                    says=history_statement(layout, at, by, spike_s),
                    **_line(one),
                )
            )
    return tuple(histories)


def _stretches(
    layout: Layout, timeline: Timeline, spells: Sequence[Spell], gauge: int
) -> tuple[list[Array], list[Array]]:
    """Means over stretches of each spell of a gauge's difference from its neighbours, and when each stretch begins. [Pa], [s]"""
    others = [k for k in range(layout.gauge_count) if k != gauge]
    told = own_and_others(layout, timeline, spells, (gauge,), others)
    if told is None:
        return [], []
    rest = left_over(told, told.motions)
    means, times = [], []
    for spell in spells:
        start_s = timeline.start_s[spell.first]
        end_s = timeline.start_s[spell.last - 1]
        within = (told.time_s >= start_s) & (told.time_s <= end_s)
        count = min(BATCHES, int(within.sum()) // FEWEST_BLOCKS)
        if count >= FEWEST_BATCHES:
            means.append(batch_means(rest[within], count)[:, 0])
            bounds = np.linspace(0, int(within.sum()), count + 1).round().astype(int)[:-1]
            times.append(told.time_s[within][bounds])
    return means, times


def _without_spike(means: list[Array], times: list[Array]) -> tuple[list[Array], list[Array], float | None]:
    """Stretches without the one that stands alone among all, such as a zero check during the log, and when that was."""
    away = np.concatenate([one - np.median(one) for one in means]) if means else np.zeros(0)
    if away.size < FEWEST_CHARTED or away.std() == 0.0:
        return means, times, None
    statistic, index = grubbs(away)
    if statistic <= grubbs_critical(away.size, level=ALONE_LEVEL):
        return means, times, None
    spike_s = float(np.concatenate(times)[index])
    kept = [time != spike_s for time in times]
    means = [one[keep] for one, keep in zip(means, kept, strict=True)]
    return means, [time[keep] for time, keep in zip(times, kept, strict=True)], spike_s


def _scatter(means: list[Array], alike: float) -> float:
    """Standard deviation of a stretch in the long run, from differences within spells, at the upper end of what so few allow. [Pa]

    Notes
    -----
    Half the mean square of successive differences is ``σ² (1 - r)``, of those two apart ``σ² (1 - r²)``, where r is the autocorrelation
    of neighbours, `alike`; both are taken about their mean in each spell, so that a drift is no scatter. A mean of many stretches has
    the variance of independent ones of ``σ² (1 + r) / (1 - r)``. Successive differences of n values are worth about 2 n / 3 degrees of
    freedom (von Neumann et al., Annals of Mathematical Statistics 12 (1941) 153-162).
    """
    freedom = 2.0 * sum(one.size - 1 for one in means) / 3.0
    upper = freedom / (2.0 * float(gammaincinv(freedom / 2.0, 1.0 - SURE)))
    return float(np.sqrt(_half_square(means, 1) * upper * (1.0 + alike)) / (1.0 - alike))


def _alike(means: list[Array]) -> float:
    """Autocorrelation of neighbouring stretches, from differences one and two apart; none below 0. [-]"""
    return float(np.clip(_half_square(means, 2) / _half_square(means, 1) - 1.0, 0.0, MOST_ALIKE))


def _half_square(means: list[Array], apart: int) -> float:
    """Half the mean square of differences so many apart, about their mean in each spell: σ² where stretches are independent. [Pa²]"""
    total = worth = 0.0
    for one in means:
        steps = one[apart:] - one[:-apart]
        if steps.size > 1:
            total += float(((steps - steps.mean()) ** 2).sum())
            # the mean of m such differences is that of the ends alone
            worth += steps.size - apart / steps.size
    return total / worth / 2.0 if worth > 0.0 else 0.0


def _first_leaving(means: list[Array], times: list[Array], sd_pa: float) -> tuple[float | None, str | None]:
    """When a chart first leaves its limits, and which; None where both hold. [s]"""
    standard = np.concatenate([against_earlier(one, sd=sd_pa) for one in means])
    average = np.abs(ewma(standard, start=0.0, weight=WEIGHT))
    # every stretch is a chance to leave on either side
    width = float(ndtri(1.0 - FALSE_ALARM / (2.0 * standard.size)))
    upper, lower = cusum(standard, target=0.0, allowance=ALLOWANCE)
    limit = cusum_limit(allowance=ALLOWANCE, run_length=standard.size / FALSE_ALARM)
    found = {
        "ewma": first_beyond(average, ewma_limits(standard.size, sd=1.0, weight=WEIGHT, width=width)),
        "cusum": first_beyond(np.maximum(upper, lower), limit),
    }
    left = [(index, name) for name, index in found.items() if index is not None]
    if not left:
        return None, None
    index, name = min(left)
    return float(np.concatenate([one[1:] for one in times])[index]), name


def _line(found: GaugeFound) -> dict[str, float]:
    """Zero and span of readings over what was expected, each with its standard uncertainty; nothing where the spells tell neither.

    What is expected is doubtful as well, and alike in all spells in a way not known here: to the scatter about the line is added the
    most that the expected values' standard uncertainties can do to it.
    """
    rows = [
        (s.expected_pa, s.reading_pa, s.u95_pa / 2.0)
        for s in found.spells
        if s.expected_pa is not None and s.reading_pa is not None and s.u95_pa is not None
    ]
    if len(rows) < 3:
        return {}
    expected, reading, doubt = np.array(rows).T
    if np.ptp(expected) < SPREAD_TOLERANCES * found.tolerance_pa:
        return {}
    line = straight_line(expected, reading)
    away = expected - expected.mean()
    on_slope = away / (away @ away)
    on_zero = 1.0 / expected.size - expected.mean() * on_slope
    return {
        "zero_pa": line.intercept,
        "zero_sd_pa": float(np.hypot(line.intercept_sd, np.abs(on_zero) @ doubt)),
        "span_ratio": line.slope,
        "span_sd_ratio": float(np.hypot(line.slope_sd, np.abs(on_slope) @ doubt)),
    }
