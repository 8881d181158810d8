"""What another spell would settle: its readings as each explanation foresees them, and the bits between them and the work to be done.

A spell is a vector of readings, so that its information is found on joint draws: each from one explanation, weighed by all.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.frame import all_marks
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.planned import scaled, stilled
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.search import Explanation, Posterior
from headledger.diagnosis.state import Point
from headledger.statistics.sizes import log_sum

Array = NDArray[np.float64]

DRAWS = 200
"""Joint draws for the information of a vector."""

SEED = 11
"""The same random numbers for every spell, so that their differences are the spells' own."""

AFTER_S, LONG_S = 600.0, 900.0
"""When a further spell would begin after the last one, and how long it would be. [s]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Foreseen:
    """Readings of a further spell under one explanation, in whitened units common to all of them.

    Parameters
    ----------
    mean : ndarray, shape (rows,)
    covariance : ndarray, shape (rows, rows)
    """

    mean: Array
    covariance: Array


def further_spell(model: Model, posterior: Posterior, flow_factor: float) -> tuple[SpellMeans, Point] | None:
    """A spell after the last one: at rest for a factor of 0, else at so many times the greatest flow; None without a flow to scale."""
    points = [state.point for state in posterior.frame.linear.states]
    number = max(spell.id for spell in model.spells) + 1
    if flow_factor == 0.0:
        spell, point = stilled(model.layout, number)
    else:
        states = posterior.frame.linear.states
        flows = [float(np.max(np.abs(state.flow_m3_s), initial=0.0)) for state in states]
        top = int(np.argmax(flows))
        if flows[top] == 0.0:
            return None
        spell, point = scaled(model.layout, model.spells[top], points[top], flow_factor, number)
    start_s = max(one.end_s for one in model.spells) + AFTER_S
    silent = ~np.any([np.isfinite(one.reading_pa) for one in model.spells], axis=0)
    noise = np.nanmedian([one.noise_pa for one in model.spells], axis=0)
    heard = np.where(silent, np.nan, spell.reading_pa)
    return replace(spell, reading_pa=heard, noise_pa=noise, start_s=start_s, end_s=start_s + LONG_S), point


def foresee(
    posterior: Posterior, explanations: Sequence[Explanation], spell: SpellMeans, point: Point
) -> list[Foreseen]:
    """The readings of a further spell under each explanation.

    Parameters
    ----------
    posterior : Posterior
    explanations : sequence of Explanation
    spell : SpellMeans
        With readings of any value: which gauges read is what counts.
    point : Point

    Returns
    -------
    list of Foreseen

    Notes
    -----
    With ``W`` the whitening operator's columns of the new rows, ``(WᵀW)⁻¹`` is their covariance given all other rows, and
    ``(WᵀW)⁻¹ Wᵀ e`` how far they lie from what those foresee, ``e`` the white residual with the explanation's causes taken off.
    """
    base = posterior.frame.linear
    model = Model(base.model.layout, (*base.model.spells, spell))
    linear = model.linearise((*(state.point for state in base.states), point))
    place = linear.rows[-1]
    rows = np.arange(place.start, place.start + place.gauges.size)
    whitened = linear.white.operator[:, rows]
    covariance = np.linalg.inv(whitened.T @ whitened)
    kinds = {e.frame.marks[i].kind for e in explanations for i in e.chosen}
    made = {(mark.key, mark.form): mark for mark in all_marks(View(model, linear), kinds)}
    scale = np.sqrt(np.diag(covariance))
    found = []
    for explanation in explanations:
        residual, spread = linear.white.residual, covariance
        for index in explanation.chosen:
            white = linear.white.mark(_vector(explanation.frame.marks[index], made, linear))
            size = explanation.frame.size(explanation.chosen, index)
            residual = residual - white * size.mean
            moved = covariance @ (whitened.T @ white)
            spread = spread + size.sd**2 * np.outer(moved, moved)
        mean = -covariance @ (whitened.T @ residual)
        found.append(Foreseen(mean=mean / scale, covariance=spread / np.outer(scale, scale)))
    return found


def _vector(mark: Mark, made: dict[tuple[tuple[CauseKind, Place], str], Mark], linear: Linear) -> Array:
    """A mark on all rows, the new spell's too; one that has no place there leaves the new rows alone."""
    again = made.get((mark.key, mark.form))
    if again is not None:
        return again.vector
    vector = np.zeros(linear.row_count)
    vector[: mark.vector.size] = mark.vector[: linear.row_count]
    return vector


def joint_bits(classes: Sequence[tuple[float, Sequence[tuple[float, Foreseen]]]]) -> tuple[float, Array]:
    """Bits between the class and the readings, and how far the readings of every two classes overlap.

    Parameters
    ----------
    classes : sequence of (float, sequence of (float, Foreseen))
        Weight of each class, and of its members' shares within it.

    Returns
    -------
    bits : float
    overlap : ndarray, shape (classes, classes)
        1 where they are the same. [-]
    """
    random = np.random.default_rng(SEED)
    rows = classes[0][1][0][1].mean.size
    standard = random.standard_normal((DRAWS, rows))
    pick = random.random(DRAWS)
    weights = np.array([weight for weight, _ in classes])
    logs = np.empty((len(classes), len(classes), DRAWS))
    for number, (_, members) in enumerate(classes):
        draws = _drawn(members, standard, pick)
        for other, (_, theirs) in enumerate(classes):
            logs[number, other] = _log_density(theirs, draws)
    mixed = log_sum(logs + np.log(weights)[None, :, None], axis=1)
    own = np.array([logs[k, k] for k in range(len(classes))])
    bits = float(weights @ ((own - mixed).mean(axis=1))) / float(np.log(2.0))
    overlap = np.exp(np.minimum(logs - own[:, None, :], 0.0)).mean(axis=2)
    return max(bits, 0.0), overlap


def _drawn(members: Sequence[tuple[float, Foreseen]], standard: Array, pick: Array) -> Array:
    """Draws of a class: of each member by its share."""
    edges = np.cumsum([share for share, _ in members])
    which = np.minimum(np.searchsorted(edges, pick * edges[-1]), len(members) - 1)
    out = np.empty_like(standard)
    for number, (_, member) in enumerate(members):
        mine = which == number
        if mine.any():
            out[mine] = member.mean + standard[mine] @ _root(member.covariance).T
    return out


def _root(covariance: Array) -> Array:
    """A matrix whose square is the covariance."""
    values, vectors = np.linalg.eigh(covariance)
    return np.asarray(vectors * np.sqrt(np.maximum(values, 0.0)))


def _log_density(members: Sequence[tuple[float, Foreseen]], draws: Array) -> Array:
    """Log density of draws under a class."""
    logs = []
    for share, member in members:
        values, vectors = np.linalg.eigh(member.covariance)
        values = np.maximum(values, 1e-12 * float(values.max()))
        along = (draws - member.mean) @ vectors
        logs.append(np.log(share) - 0.5 * ((along**2 / values).sum(axis=1) + float(np.log(values).sum())))
    return log_sum(np.array(logs), axis=0)
