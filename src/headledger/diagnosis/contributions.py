"""Where a gauge's uncertainty comes from: the variance of its own error, split by the sources that make it up."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.budget import OWN_CALIBRATION, InputKind, UncertainInput, instrument_of
from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.own_error import ErrorBySize, Widened, error_by_size, own_inputs, prediction
from headledger.diagnosis.result import BudgetShare
from headledger.diagnosis.search import Explanation
from headledger.diagnosis.wording import NOTHING_MEASURES, SCATTER, THE_REST, class_words, size_words, source_words

Array = NDArray[np.float64]

WORTH_NAMING = 0.01
"""Sources with a smaller part of the variance are told together. [-]"""


def budget_of(model: Model, explanation: Explanation, gauge: int, spell: int) -> tuple[BudgetShare, ...]:
    """What each source has in the variance of a gauge's own error, in percent.

    Parameters
    ----------
    model : Model
    explanation : Explanation
    gauge : int
    spell : int
        Index of one in which the gauge reads; of the model.

    Returns
    -------
    tuple of BudgetShare
        The largest first, what is below `WORTH_NAMING` as one at the end.
    """
    return shares(variance_by_source(model, explanation, gauge, spell))


def shares(variances: Mapping[str, float]) -> tuple[BudgetShare, ...]:
    """Percent of the sum of some variances, the largest first, the small ones as one at the end.

    Parameters
    ----------
    variances : mapping of str to float
        By source, all in one unit.

    Returns
    -------
    tuple of BudgetShare
        Empty where there is no variance at all.

    References
    ----------
    JCGM 100:2008, 5.1.2, equation (10): independent contributions combine as the sum of their squares.
    """
    whole = sum(variances.values())
    if not whole > 0.0:
        return ()
    named = {what: variance for what, variance in variances.items() if variance > WORTH_NAMING * whole}
    ordered = sorted(named, key=lambda what: -named[what])
    found = [BudgetShare(what=what, percent=100.0 * named[what] / whole) for what in ordered]
    rest = whole - sum(named.values())
    if len(named) < sum(variance > 0.0 for variance in variances.values()):
        found.append(BudgetShare(what=THE_REST, percent=100.0 * rest / whole))
    return tuple(found)


def variance_by_source(model: Model, explanation: Explanation, gauge: int, spell: int) -> dict[str, float]:
    """The variance of a gauge's own error in one spell, by source.

    Parameters
    ----------
    model, explanation, gauge, spell
        As for `budget_of`.

    Returns
    -------
    dict of str to float
        [Pa²]

    Notes
    -----
    The data are ``r = X x + A t + n`` with independent `x`, `t` and `n`. The error is ``e = c·t`` with the gauge's own calibration curve
    `c`, its estimate ``G r``, so that ``e − G r = (c − G A) t − G X x − G n``: its variance is a sum over inputs, unknowns and rows. What
    the sizes of causes add is what knowing them would take away, one after the other (the law of total variance), the gauge's own first.
    """
    frame = explanation.frame
    rows, spells = frame.linear.gauge_rows(gauge)
    at = int(np.flatnonzero(spells == spell)[0])
    columns, widening = own_inputs(frame.linear.model, gauge)
    if any(frame.marks[i].spoils and gauge in frame.marks[i].own for i in explanation.chosen):
        return _of_spoilt(explanation, gauge, at)
    curve = frame.linear.calibration[np.ix_(rows, columns)]
    widened = Widened(frame, columns, widening)
    weights = widened.inverse(widened.own @ (widened.prior_variance * curve[at]))
    left = -frame.linear.white.shared.T @ weights
    left[columns] += curve[at]
    prior_sd = np.ones(left.size)
    prior_sd[columns] = widening
    by_row = frame.linear.white.operator.T @ weights
    found = _by_source(frame.linear, gauge, (left * prior_sd) ** 2, by_row, by_row)
    by_size = error_by_size(frame, explanation.chosen, gauge, rows, curve, widened)
    for index, variance in _of_sizes(by_size, at):
        found[size_words(*frame.marks[index].key)] += variance
    return dict(found)


def _of_sizes(by_size: ErrorBySize, at: int) -> list[tuple[int, float]]:
    """Variance that each size in doubt adds in one row, in turn. [Pa²]"""
    if not by_size.free:
        return []
    mean = by_size.mean_pa[:, at]
    first = float(by_size.weights @ (mean - by_size.weights @ mean) ** 2)
    further = np.zeros(0)
    if by_size.spread.size:
        further = (np.linalg.cholesky(by_size.spread).T @ by_size.slope_pa[:, at]) ** 2
    return list(zip(by_size.free, [first, *further.tolist()], strict=True))


def _of_spoilt(explanation: Explanation, gauge: int, at: int) -> dict[str, float]:
    """The same for a gauge whose readings say nothing: what it should read, from everything else. [Pa²]"""
    frame = explanation.frame
    predicted = prediction(frame.linear, gauge)
    found = _by_source(frame.linear, gauge, predicted.by_input[at] ** 2, predicted.by_row[at], predicted.others[at])
    for index in explanation.chosen:
        mark = frame.marks[index]
        if gauge not in mark.own and not mark.prior.is_point:
            size = frame.size(explanation.chosen, index)
            found[size_words(*mark.key)] += size.sd**2 * float(predicted.weights[at] @ frame.white[:, index]) ** 2
    return dict(found)


def _by_source(linear: Linear, gauge: int, by_input: Array, by_row: Array, noisy: Array) -> defaultdict[str, float]:
    """Variances of inputs, of unknowns by what each row counts for, and of rows' noise, gathered under their names. [Pa²]"""
    found: defaultdict[str, float] = defaultdict(float)
    for item, variance in zip(linear.model.inputs, by_input, strict=True):
        found[_name(linear.model, item, gauge)] += float(variance)
    for index, (place, group) in enumerate(zip(linear.rows, linear.groups, strict=True)):
        cut = slice(place.start, place.start + place.count)
        by_noise = (noisy[cut] * group.noise_sd) ** 2
        by_unknown = (by_row[cut] @ group.own * group.own_sd) ** 2
        names = (*_row_names(linear, index), *_unknown_names(linear, index))
        for name, variance in zip(names, (*by_noise, *by_unknown), strict=True):
            found[name] += float(variance)
    return found


def _name(model: Model, item: UncertainInput, gauge: int) -> str:
    """The source that an input belongs to."""
    if item.kind is InputKind.CUT_OFF:
        return NOTHING_MEASURES
    if item.kind in OWN_CALIBRATION:
        own = item.owner == instrument_of(model.layout.job.gauges[gauge])
        tags = [noun.tag for noun in model.layout.job.gauges if instrument_of(noun) == item.owner]
        return class_words([model.layout.job.gauges[gauge].tag] if own else tags, own=own)
    return source_words(item.kind, item.owner)


def _row_names(linear: Linear, index: int) -> Sequence[str]:
    """The source of each row's own noise in a spell."""
    place = linear.rows[index]
    stations = linear.model.layout.job.stations
    levels = [f"level of {stations[int(at)].name}" for at in place.levels]
    return [*[SCATTER] * (place.gauges.size + place.meters.size), *levels, *[NOTHING_MEASURES] * place.loops]


def _unknown_names(linear: Linear, index: int) -> Sequence[str]:
    """The source of each of a spell's own unknowns: a metered flow is known but for its meter's scatter."""
    state, spell = linear.states[index], linear.model.spells[index]
    flows = []
    if state.point.flow_m3_s.size:
        flows = [SCATTER if np.isfinite(spell.flow_m3_s[run]) else NOTHING_MEASURES for run in state.graph.basis]
    return [*[NOTHING_MEASURES] * state.graph.parts, *flows]
