"""Verdicts: each gauge's own error, averaged over explanations, with its class never vouching for itself."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from headledger.diagnosis.budget import OWN_CALIBRATION, InputKind, UncertainInput, instrument_of
from headledger.diagnosis.estimate import FREE_VELOCITY_M_S, Model
from headledger.diagnosis.frame import Frame
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.result import Verdict
from headledger.diagnosis.search import Explanation, Posterior
from headledger.plant.job import CheckSettings, DecisionRule
from headledger.statistics.decisions import inside_box_probability
from headledger.statistics.sizes import SizePosterior, SizePriors, size_posterior

Array = NDArray[np.float64]

WIDENED = 10.0
"""Factor by which a gauge's own calibration is doubted when it is judged, so that its class cannot vouch for itself. [-]"""

UNCHECKED_SHARE = 0.8
"""Part of the widened prior's standard deviation beyond which nothing else in the data determines a gauge. [-]"""

UNKNOWN_FLOW_SHARE = 0.3
"""A flow doubted by more than this part of what any unmetered flow is doubted by is not determined. [-]"""

SUSPECTED = 0.2
"""A gauge with a cause of its own at least this probable is never merely unchecked. [-]"""

WEIGHT_JUDGED = 0.99
"""Verdicts are averaged over the leading explanations that together hold this much; the rest cannot move one by more. [-]"""

NODES_BY_CAUSES = {1: 32, 2: 12, 3: 6}
"""Quadrature nodes a sign and cause for the sizes of a set of so many causes."""


@dataclass(frozen=True, slots=True, kw_only=True)
class OwnError:
    """Distribution of a gauge's own error under one explanation.

    Parameters
    ----------
    outside_probability : float
        That it exceeds the tolerance in some spell. [-]
    mean_pa, sd_pa : ndarray, shape (spells of the gauge,)
        [Pa]
    outside_by_spell : ndarray, shape (spells of the gauge,)
        Probability of being outside in each. [-]
    left_fraction : ndarray, shape (spells of the gauge,)
        Standard deviation left, as a part of the widened prior's. [-]
    """

    outside_probability: float
    mean_pa: Array
    sd_pa: Array
    outside_by_spell: Array
    left_fraction: Array


@dataclass(frozen=True, slots=True, kw_only=True)
class Judged:
    """What is concluded on one gauge.

    Parameters
    ----------
    verdict : Verdict
    outside_probability : float
        Averaged over explanations. [-]
    error_pa, u95_pa, tolerance_pa : float
        Under the leading explanation, in the spell where the error is most probably outside. [Pa]
    unchecked_because : str
        What leaves the pressure there open, as the end of a sentence; empty where the gauge is checked.
    spell : int
        Index of that spell in the model; −1 where the gauge gave no reading.
    """

    verdict: Verdict
    outside_probability: float
    error_pa: float
    u95_pa: float
    tolerance_pa: float
    unchecked_because: str = ""
    spell: int = -1


def own_inputs(model: Model, gauge: int) -> tuple[NDArray[np.int64], Array]:
    """Inputs that make up a gauge's own error, and the factor by which each is widened.

    Parameters
    ----------
    model : Model
    gauge : int

    Returns
    -------
    columns : ndarray of int
    widening : ndarray, shape (columns,)
        [-]
    """
    noun = model.layout.job.gauges[gauge]
    elevations = {d.owner for d in model.layout.elevation_doubts if d.liquid[gauge] or d.constant_pa_m[gauge]}

    def widening(item: UncertainInput) -> float:
        if item.kind in OWN_CALIBRATION and item.owner == instrument_of(noun):
            return WIDENED
        return 1.0 if item.kind is InputKind.ELEVATION and item.owner in elevations else 0.0

    factors = [widening(item) for item in model.inputs]
    columns = [column for column, factor in enumerate(factors) if factor > 0.0]
    return np.array(columns, dtype=np.int64), np.array([factors[column] for column in columns])


def own_error(model: Model, explanation: Explanation, gauge: int) -> OwnError | None:
    """Distribution of a gauge's own error under one explanation; None where the gauge gave no reading.

    Parameters
    ----------
    model : Model
    explanation : Explanation
    gauge : int

    Returns
    -------
    OwnError or None
    """
    frame = explanation.frame
    rows, spells = frame.linear.gauge_rows(gauge)
    if not rows.size:
        return None
    model = frame.linear.model
    columns, widening = own_inputs(model, gauge)
    if any(frame.marks[i].spoils and gauge in frame.marks[i].own for i in explanation.chosen):
        return _error_of_spoilt(model, explanation, gauge, columns, widening)
    curve = frame.linear.calibration[np.ix_(rows, columns)]
    by_size = error_by_size(frame, explanation.chosen, gauge, rows, curve, Widened(frame, columns, widening))
    weights, mean_pa, covariance = by_size.weights, by_size.mean_pa, by_size.covariance_pa2
    noun = model.layout.job.gauges[gauge]
    perfect = np.array([frame.linear.states[s].reading_pa[gauge] for s in spells])
    tolerance = np.array([noun.tolerance_at(float(p)) for p in perfect])
    deviation = np.sqrt(np.maximum(np.diag(covariance), 0.0))
    by_spell = np.array(
        [
            float(
                weights @ (1.0 - inside_box_probability(mean_pa[:, [k]], covariance[np.ix_([k], [k])], tolerance[[k]]))
            )
            for k in range(rows.size)
        ]
    )
    ends = [int(np.argmin(perfect)), int(np.argmax(perfect))]
    together = 1.0 - inside_box_probability(mean_pa[:, ends], covariance[np.ix_(ends, ends)], tolerance[ends])
    mean = weights @ mean_pa
    spread = weights @ (mean_pa - mean) ** 2
    prior_sd = np.sqrt(((curve * widening) ** 2).sum(axis=1))
    return OwnError(
        outside_probability=max(float(weights @ together), float(by_spell.max())),
        mean_pa=mean,
        sd_pa=np.sqrt(deviation**2 + spread),
        outside_by_spell=by_spell,
        left_fraction=np.sqrt(deviation**2 + spread) / prior_sd,
    )


def _error_of_spoilt(
    model: Model, explanation: Explanation, gauge: int, columns: NDArray[np.int64], widening: Array
) -> OwnError:
    """Own error of a gauge whose readings say nothing any more: what it reads less what all else says that it should."""
    expected = expected_readings(model, explanation, gauge)
    rows, spells = explanation.frame.linear.gauge_rows(gauge)
    mean = np.array([model.spells[s].reading_pa[gauge] for s in spells]) - expected.value_pa
    deviation = np.maximum(expected.sd_pa, 1e-9)
    noun = model.layout.job.gauges[gauge]
    tolerance = np.array([noun.tolerance_at(float(value)) for value in expected.value_pa])
    outside = 1.0 - (ndtr((tolerance - mean) / deviation) - ndtr((-tolerance - mean) / deviation))
    curve = explanation.frame.linear.calibration[np.ix_(rows, columns)]
    return OwnError(
        outside_probability=float(outside.max()),
        mean_pa=mean,
        sd_pa=deviation,
        outside_by_spell=outside,
        left_fraction=deviation / np.sqrt(((curve * widening) ** 2).sum(axis=1)),
    )


class Widened:
    """Products in white space once some inputs are doubted more: a small update of the inverse covariance.

    With ``V = 1`` in white space and columns ``C`` of the added doubt, ``(1 + C Cᵀ)⁻¹ = 1 − C (1 + CᵀC)⁻¹ Cᵀ``.
    """

    def __init__(self, frame: Frame, columns: NDArray[np.int64], widening: Array) -> None:
        shared = frame.linear.white.shared[:, columns]
        added = shared * np.sqrt(np.maximum(widening**2 - 1.0, 0.0))
        self._added = added
        self._middle = np.linalg.inv(np.eye(added.shape[1]) + added.T @ added)
        self.own = shared
        self.prior_variance = widening**2

    def inverse(self, right: Array) -> Array:
        """``V'⁻¹ right``."""
        return np.asarray(right - self._added @ (self._middle @ (self._added.T @ right)))

    def product(self, left: Array, right: Array) -> Array:
        """``leftᵀ V'⁻¹ right``."""
        return np.asarray(left.T @ right - (left.T @ self._added) @ self._middle @ (self._added.T @ right))


@dataclass(frozen=True, slots=True, kw_only=True)
class ErrorBySize:
    """A gauge's own error at each size of the first cause of a set whose size is in doubt.

    Parameters
    ----------
    free : tuple of int
        Marks whose size is in doubt: the gauge's own first.
    weights : ndarray, shape (sizes,)
        Of the sizes of the first; one where there is none. [-]
    mean_pa : ndarray, shape (sizes, rows)
        [Pa]
    known_pa2 : ndarray, shape (rows, rows)
        Covariance with every size known. [Pa²]
    slope_pa : ndarray, shape (further, rows)
        What a unit of each further size does to the error. [Pa]
    spread : ndarray, shape (further, further)
        Covariance of the further sizes, the first known.
    """

    free: tuple[int, ...]
    weights: Array
    mean_pa: Array
    known_pa2: Array
    slope_pa: Array
    spread: Array

    @property
    def covariance_pa2(self) -> Array:
        """Covariance at any one size of the first, shape (rows, rows). [Pa²]"""
        return np.asarray(self.known_pa2 + self.slope_pa.T @ self.spread @ self.slope_pa)


def error_by_size(
    frame: Frame, chosen: Sequence[int], gauge: int, rows: NDArray[np.int64], curve: Array, widened: Widened
) -> ErrorBySize:
    """A gauge's own error at each size of the set's first free cause.

    The first free cause is the gauge's own where it has one; further ones are taken as normal about their best size.
    """
    marks = frame.marks
    fixed = [i for i in chosen if marks[i].prior.is_point]
    free = sorted((i for i in chosen if i not in fixed), key=lambda i: gauge not in marks[i].own)
    stated = np.array([marks[i].prior.least for i in fixed])
    residual = frame.residual - frame.white[:, fixed] @ stated
    white = frame.white[:, free]
    effect = np.array([marks[i].vector[rows] if gauge in marks[i].own else np.zeros(rows.size) for i in free])
    base = sum(
        (marks[i].vector[rows] * marks[i].prior.least for i in fixed if gauge in marks[i].own), np.zeros(rows.size)
    )
    variance = widened.prior_variance
    gain = curve * variance @ widened.product(widened.own, np.column_stack([residual, white]))
    own = np.diag(variance) - variance[:, None] * widened.product(widened.own, widened.own) * variance
    covariance = curve @ own @ curve.T
    base = base + gain[:, 0]
    slope: Array = np.zeros((0, rows.size))
    spread: Array = np.zeros((0, 0))
    if not free:
        return ErrorBySize(
            free=(), weights=np.ones(1), mean_pa=base[None, :], known_pa2=covariance, slope_pa=slope, spread=spread
        )
    # what a unit of each size does to the estimate of the error
    slope = np.asarray((effect.T - gain[:, 1:]).T)
    gram = widened.product(white, white)
    gram[np.diag_indices_from(gram)] = np.maximum(np.diag(gram), 1e-18)
    product = widened.product(white, residual[:, None])[:, 0]
    posterior: SizePosterior = size_posterior(
        SizePriors.of([marks[i].prior for i in free]), gram, product, NODES_BY_CAUSES.get(len(free), 6)
    )
    mean = base[None, :] + posterior.sizes[:, None] * slope[0][None, :]
    if len(free) > 1:
        most = np.array([marks[i].prior.most for i in free[1:]])
        spread = np.asarray(np.linalg.inv(gram[1:, 1:] + np.diag(1.0 / most**2)))
        centre = (product[1:][None, :] - posterior.sizes[:, None] * gram[1:, 0][None, :]) @ spread
        mean = mean + centre @ slope[1:]
    return ErrorBySize(
        free=tuple(free),
        weights=posterior.weights,
        mean_pa=mean,
        known_pa2=covariance,
        slope_pa=slope[1:],
        spread=spread,
    )


def judge_gauge(model: Model, posterior: Posterior, gauge: int) -> Judged:
    """The verdict on one gauge.

    Parameters
    ----------
    model : Model
    posterior : Posterior
    gauge : int

    Returns
    -------
    Judged
    """
    settings = model.layout.job.check
    noun = model.layout.job.gauges[gauge]
    leading = own_error(model, posterior.leading, gauge)
    if leading is None:
        return Judged(
            verdict=Verdict.UNCHECKED,
            outside_probability=float("nan"),
            error_pa=float("nan"),
            u95_pa=float("nan"),
            tolerance_pa=noun.tolerance_at((noun.range_low_pa + noun.range_high_pa) / 2.0),
        )
    worst = int(np.argmax(leading.outside_by_spell + 1e-9 * np.abs(leading.mean_pa)))
    _, spells = posterior.leading.frame.linear.gauge_rows(gauge)
    state = posterior.leading.frame.linear.states[int(spells[worst])]
    outside = outside_probability(model, posterior, gauge)
    # where a cause of its own stands beside one in the pipe, the two explain the readings alike: that is no want of readings
    suspected = own_cause_probability(posterior, gauge) >= SUSPECTED
    unchecked = bool(leading.left_fraction[worst] > UNCHECKED_SHARE) and not suspected
    return Judged(
        verdict=decide(outside, unchecked=unchecked, settings=settings),
        outside_probability=outside,
        error_pa=float(leading.mean_pa[worst]),
        u95_pa=2.0 * float(leading.sd_pa[worst]),
        tolerance_pa=noun.tolerance_at(float(state.reading_pa[gauge])),
        unchecked_because=why_unchecked(model, posterior, gauge, int(spells[worst])) if unchecked else "",
        spell=int(spells[worst]),
    )


def why_unchecked(model: Model, posterior: Posterior, gauge: int, index: int) -> str:
    """What leaves the pressure at a gauge open in a spell, as the end of a sentence."""
    layout, linear = model.layout, posterior.leading.frame.linear
    spell, state = linear.model.spells[index], linear.states[index]
    station = layout.station_index[layout.job.gauges[gauge].station]
    part = state.graph.part
    others = [
        other
        for other in np.flatnonzero(np.isfinite(spell.reading_pa))
        if other != gauge and part[layout.station_index[layout.job.gauges[int(other)].station]] == part[station]
    ]
    levels = [s for s in np.flatnonzero(np.isfinite(spell.level_m)) if part[s] == part[station]]
    if not others and not levels:
        return ", since no other gauge and no surface shares a known head with it"
    deviation = _flow_sd_without(model, posterior, gauge, index)
    open_flows = [
        run.name
        for number, run in enumerate(layout.job.runs)
        if deviation[number] > UNKNOWN_FLOW_SHARE * FREE_VELOCITY_M_S * layout.area_m2[number]
    ]
    if open_flows:
        return f", since the flow in {', '.join(open_flows[:3])} is not determined"
    return ""


def _flow_sd_without(model: Model, posterior: Posterior, gauge: int, index: int) -> Array:
    """Standard deviation of every run's flow in a spell, from everything but one gauge. [m³/s]"""
    linear = posterior.leading.frame.linear

    def silent(spell: SpellMeans) -> SpellMeans:
        readings = spell.reading_pa.copy()
        readings[gauge] = np.nan
        return replace(spell, reading_pa=readings)

    rest = Model(model.layout, [silent(spell) for spell in linear.model.spells])
    without = rest.linearise([state.point for state in linear.states], applied=linear.applied)
    return rest.flow_sd_m3_s(without, index)


def own_cause_probability(posterior: Posterior, gauge: int) -> float:
    """Probability that some cause of a gauge's own is present. [-]"""
    return sum(e.probability for e in posterior.explanations if any(gauge in e.frame.marks[i].own for i in e.chosen))


def outside_probability(model: Model, posterior: Posterior, gauge: int) -> float:
    """Probability that a gauge's own error exceeds its tolerance in some spell, averaged over explanations. [-]"""
    total, weight = 0.0, 0.0
    for explanation in posterior.explanations:
        if weight > WEIGHT_JUDGED:
            break
        error = own_error(model, explanation, gauge)
        if error is not None:
            total += explanation.probability * error.outside_probability
            weight += explanation.probability
    return min(total / weight, 1.0) if weight else float("nan")


def decide(outside: float, *, unchecked: bool, settings: CheckSettings) -> Verdict:
    """The word for a probability of being outside, by the job's rule; `unchecked` outranks `pass`.

    Parameters
    ----------
    outside : float
        [-]
    unchecked : bool
    settings : CheckSettings

    Returns
    -------
    Verdict
    """
    limit = settings.confidence_fraction if settings.decision is DecisionRule.GUARDED else 0.5
    if outside >= limit:
        return Verdict.FAIL
    if unchecked:
        return Verdict.UNCHECKED
    return Verdict.PASS if outside <= 1.0 - limit else Verdict.UNRESOLVED


@dataclass(frozen=True, slots=True, kw_only=True)
class Expected:
    """What everything but a gauge says that it should read. [Pa]

    Parameters
    ----------
    spells : ndarray of int
        Indices of the spells.
    value_pa, sd_pa : ndarray, shape (spells,)
        [Pa]
    """

    spells: NDArray[np.int64]
    value_pa: Array
    sd_pa: Array


def expected_readings(model: Model, explanation: Explanation, gauge: int) -> Expected:
    """Perfect readings of a gauge predicted from everything but itself, under one explanation.

    Parameters
    ----------
    model : Model
    explanation : Explanation
    gauge : int

    Returns
    -------
    Expected

    Notes
    -----
    With ``W`` the whitening operator's columns of the gauge's rows, ``(WᵀW)⁻¹`` is the covariance of those rows given all others and
    ``(WᵀW)⁻¹ Wᵀ e`` their residual from that prediction; the gauge's own calibration and noise are then taken off.
    """
    frame = explanation.frame
    model = frame.linear.model
    rows, spells = frame.linear.gauge_rows(gauge)
    columns, _ = own_inputs(model, gauge)
    curve = frame.linear.calibration[np.ix_(rows, columns)]
    whitened = frame.linear.white.operator[:, rows]
    inverse = np.linalg.inv(whitened.T @ whitened)
    residual = frame.residual.copy()
    readings = np.array([model.spells[s].reading_pa[gauge] for s in spells])
    noise = frame.linear.noise_pa(gauge)
    covariance = inverse - curve @ curve.T - np.diag(noise**2)
    for index in explanation.chosen:
        if gauge in frame.marks[index].own:
            continue
        size = frame.size(explanation.chosen, index)
        residual = residual - frame.white[:, index] * size.mean
        moved = inverse @ (whitened.T @ frame.white[:, index])
        covariance = covariance + size.sd**2 * np.outer(moved, moved)
    value = readings - inverse @ (whitened.T @ residual)
    return Expected(spells=spells, value_pa=value, sd_pa=np.sqrt(np.maximum(np.diag(covariance), 0.0)))
