"""A gauge's own error and what it should read, under one explanation, with its class never vouching for itself."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.special import ndtr

from headledger.diagnosis.budget import OWN_CALIBRATION, InputKind, UncertainInput, instrument_of
from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.frame import Frame
from headledger.diagnosis.search import Explanation
from headledger.statistics.decisions import inside_box_probability
from headledger.statistics.sizes import SizePosterior, SizePriors, size_posterior

Array = NDArray[np.float64]

WIDENED = 10.0
"""Factor by which a gauge's own calibration is doubted when it is judged, so that its class cannot vouch for itself. [-]"""

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


@dataclass(frozen=True, slots=True, kw_only=True)
class Prediction:
    """How a gauge's residuals from what all other rows predict depend on the data and on what is uncertain.

    Parameters
    ----------
    weights : ndarray, shape (rows of the gauge, rows)
        Of the white residuals.
    by_row : ndarray, shape (rows of the gauge, rows)
        Of the data rows: one for each of its own.
    others : ndarray, shape (rows of the gauge, rows)
        The same without its own.
    by_input : ndarray, shape (rows of the gauge, inputs)
        Of the shared inputs, without the gauge's own calibration curve. [Pa]
    """

    weights: Array
    by_row: Array
    others: Array
    by_input: Array


def prediction(linear: Linear, gauge: int) -> Prediction:
    """A gauge's residuals from what all other rows predict.

    Parameters
    ----------
    linear : Linear
    gauge : int

    Returns
    -------
    Prediction
    """
    rows, _ = linear.gauge_rows(gauge)
    columns, _ = own_inputs(linear.model, gauge)
    whitened = linear.white.operator[:, rows]
    weights = np.asarray(np.linalg.solve(whitened.T @ whitened, whitened.T))
    by_row = weights @ linear.white.operator
    others = by_row.copy()
    others[:, rows] = 0.0
    by_input = weights @ linear.white.shared
    by_input[:, columns] -= linear.calibration[np.ix_(rows, columns)]
    return Prediction(weights=weights, by_row=by_row, others=others, by_input=by_input)


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
    With ``W`` the whitening operator's columns of the gauge's rows, ``(WᵀW)⁻¹ Wᵀ e`` is their residual from that prediction. Its variance
    is summed from its sources with the gauge's own calibration and noise left out: to take them off the whole would leave rounding
    alone where a spoilt reading has a wide noise.
    """
    frame = explanation.frame
    model = frame.linear.model
    _, spells = frame.linear.gauge_rows(gauge)
    predicted = prediction(frame.linear, gauge)
    residual = frame.residual.copy()
    readings = np.array([model.spells[s].reading_pa[gauge] for s in spells])
    covariance = predicted.by_input @ predicted.by_input.T
    noise = np.concatenate([group.noise_sd for group in frame.linear.groups])
    scattered = predicted.others * noise
    covariance = covariance + scattered @ scattered.T
    for place, group in zip(frame.linear.rows, frame.linear.groups, strict=True):
        unknown = predicted.by_row[:, place.start : place.start + place.count] @ group.own * group.own_sd
        covariance = covariance + unknown @ unknown.T
    for index in explanation.chosen:
        if gauge in frame.marks[index].own:
            continue
        size = frame.size(explanation.chosen, index)
        residual = residual - frame.white[:, index] * size.mean
        moved = predicted.weights @ frame.white[:, index]
        covariance = covariance + size.sd**2 * np.outer(moved, moved)
    value = readings - predicted.weights @ residual
    return Expected(spells=spells, value_pa=value, sd_pa=np.sqrt(np.maximum(np.diag(covariance), 0.0)))
