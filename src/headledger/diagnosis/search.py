"""Weighing explanations: none, every single cause, and the sets of causes that the data give weight to.

The evidence of a set is its closed-form Gaussian marginal likelihood with every size integrated out; its prior comes from the one table.
Sets grow best-first: each set within reach of the best is extended by every further cause, and each of its causes is swapped for every
other, until nothing within reach is left.
"""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from dataclasses import dataclass, replace
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.frame import LOSS_KINDS, Frame, all_marks, loss_bends, make_frame, own_frame, with_noise
from headledger.diagnosis.one_sided import sign_log_weight
from headledger.diagnosis.priors import CountPrior, mark_shares
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.starting import first_points
from headledger.diagnosis.state import Point
from headledger.diagnosis.trait import TRAIT_KINDS
from headledger.diagnosis.variants import VARIANT_KINDS, Variant, closed_variants, spoilt_variants, vapour_variants
from headledger.statistics.sizes import NODES, log_sum

Array = NDArray[np.float64]

REACH_NATS = 7.0
"""Sets further below the best than this are not grown from. [nat]"""

KEPT_NATS = 12.0
"""Sets further below the best than this are not listed. [nat]"""

SOLVING_ROUNDS = 4
"""Rounds in which the explanations that lead are solved."""

VARIANT_GAIN, MOST_VARIANTS = 2.0, 4
"""Least log evidence that a changed model must bring to be weighed with further causes, and as many are. [nat], [-]"""

MOST_MOMENTS = 4
"""As many moments at which a cause may begin are weighed together with others: the likeliest."""

PARALLEL = 0.9999
"""Whitened correlation above which two marks are one and the same to the data: never together in a set."""

PAIR_NODES, TRIPLE_NODES = 12, 6
"""Quadrature nodes a sign for sets of two and three: to about 1 % in evidence, far finer than any prior is known."""

OWN_SOLUTIONS, OWN_NATS = 24, 5.0
"""Leading explanations, and how near the best, that are linearised again, each at its own solution. [-], [nat]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Explanation:
    """A set of causes with its weight.

    Parameters
    ----------
    chosen : tuple of int
        Marks in `frame`; empty for no cause.
    frame : Frame
    log_weight : float
        Log of prior times evidence, on a scale common to all explanations of a search. [nat]
    log_prior : float
        What of it is prior. [nat]
    probability : float
        [-]
    """

    chosen: tuple[int, ...]
    frame: Frame
    log_weight: float
    log_prior: float = 0.0
    probability: float = 0.0

    @property
    def log_evidence(self) -> float:
        """Log evidence, on a scale common to all explanations of a search. [nat]"""
        return self.log_weight - self.log_prior

    def weighed(self, log_weight: float) -> Explanation:
        """The same explanation with another weight."""
        return replace(self, log_weight=log_weight)

    @property
    def keys(self) -> frozenset[tuple[CauseKind, Place]]:
        """Kinds and places of its causes."""
        return frozenset(self.frame.marks[i].key for i in self.chosen)


@dataclass(frozen=True, slots=True, kw_only=True)
class Posterior:
    """What the data say of all explanations weighed.

    Parameters
    ----------
    explanations : tuple of Explanation
        The most probable first; probabilities sum to 1.
    frame : Frame
        In which all of them were first weighed.
    other_kinds : int
        Kinds of cause that were weighed without marks in that frame.
    """

    explanations: tuple[Explanation, ...]
    frame: Frame
    other_kinds: int = 0

    @property
    def clean_probability(self) -> float:
        """Probability that no cause is present."""
        return sum(e.probability for e in self.explanations if not e.chosen)

    @property
    def leading(self) -> Explanation:
        """The most probable explanation."""
        return self.explanations[0]

    def with_explanations(self, explanations: Sequence[Explanation]) -> Posterior:
        """The same posterior with other weights."""
        return replace(self, explanations=_normalised(list(explanations)))

    def probability(self, key: tuple[CauseKind, Place]) -> float:
        """Probability that a cause of this kind is present at this place."""
        return sum(e.probability for e in self.explanations if key in e.keys)


def search(
    model: Model,
    *,
    kinds: Collection[CauseKind] | None = None,
    prior: CountPrior | None = None,
    points: Sequence[Point] | None = None,
    should_stop: Callable[[], bool] | None = None,
) -> Posterior:
    """Weigh every explanation of a model's data.

    Parameters
    ----------
    model : Model
    kinds : collection of CauseKind, optional
        Only these; all by default.
    prior : CountPrior, optional
    points : sequence of Point, optional
        Where to linearise, and stay; by default at the middle of the readings, then at the leading explanation's solution.
    should_stop : callable, optional
        Asked now and then; the search ends early, with what it has, when it says so.

    Returns
    -------
    Posterior
    """
    stay = points is not None
    whole = kinds is None and not stay
    prior = prior or CountPrior(other_kinds=len(VARIANT_KINDS) + len(TRAIT_KINDS) if whole else 0)
    frame = shared_frame(model, points if points is not None else first_points(model.layout, model.spells), kinds)
    # sets of two are enough to see where to linearise
    weighed = _weigh(frame, prior if stay else CountPrior(of=prior.of[:3]), should_stop)
    if not stay:
        best = max(weighed, key=lambda chosen: weighed[chosen])
        frame = shared_frame(model, _solution(model, frame, best), kinds)
    full = frame
    if whole:
        # a cause that stretches a reading stretches its noise: with others beside it, it is weighed on a model of its own
        frame = full.only([index for index, mark in enumerate(full.marks) if mark.noise_factor == 1.0])
    if not stay:
        weighed = _weigh(frame, prior, should_stop)
    log_priors = _log_priors(frame, prior, list(weighed))
    explanations = [
        Explanation(chosen=chosen, frame=frame, log_weight=weight, log_prior=log_priors[chosen])
        for chosen, weight in weighed.items()
    ]
    if not stay:
        explanations = _at_own_solutions(model, explanations, should_stop)
    if whole and not (should_stop and should_stop()):
        explanations += _with_variants(model, frame, full, weighed, prior, should_stop)
    return Posterior(explanations=_normalised(explanations), frame=frame, other_kinds=prior.other_kinds)


def _with_variants(
    model: Model,
    base: Frame,
    full: Frame,
    weighed: dict[tuple[int, ...], float],
    prior: CountPrior,
    should_stop: Callable[[], bool] | None,
) -> list[Explanation]:
    """Explanations that change the model, each alone and with further causes beside it."""
    best = max(weighed, key=lambda chosen: weighed[chosen])
    sizes = np.array([base.size(best, index).mean for index in best])
    left = base.residual - base.white[:, list(best)] @ sizes
    spoilt: dict[tuple[CauseKind, Place], Variant] = {}
    for residual in (base.residual, left):
        for variant in spoilt_variants(base.linear, residual):
            key = (variant.mark.kind, variant.mark.place)
            if key not in spoilt or variant.gain > spoilt[key].gain:
                spoilt[key] = variant
    likely = sorted((v for v in spoilt.values() if v.gain > VARIANT_GAIN), key=lambda v: -v.gain)[:MOST_VARIANTS]
    likely += _worth_weighing(model, base, [*closed_variants(model), *vapour_variants(base.linear)])
    likely += _stretched(model, full)
    found: list[Explanation] = []
    for variant in likely:
        if should_stop and should_stop():
            break
        places = _place_count(model, full, variant.mark.kind)
        found += _weigh_variant(variant, base, full, prior, places, should_stop)
    return found


def _stretched(model: Model, full: Frame) -> list[Variant]:
    """Gauges that may be logged in another unit or scaled to another range, each with the noise that it then really had."""
    index = [i for i, mark in enumerate(full.marks) if mark.noise_factor != 1.0]
    if not index:
        return []
    gains = full.log_gains(np.array([[i] for i in index], dtype=np.int64))
    order = np.argsort(-gains)[: 2 * MOST_VARIANTS]
    return [
        Variant(mark=full.marks[index[k]], model=with_noise(model, [full.marks[index[k]]]), gain=float(gains[k]))
        for k in order
        if gains[k] > VARIANT_GAIN
    ]


def _place_count(model: Model, full: Frame, kind: CauseKind) -> int:
    """At how many places a kind of changed model may sit."""
    job = model.layout.job
    marked = len({mark.place for mark in full.marks if mark.kind is kind})
    if marked:
        return marked
    counts = {CauseKind.CLOSED_OFF: len(job.runs), CauseKind.VAPOUR: len(job.stations)}
    return counts.get(kind, len(job.gauges))


def _worth_weighing(model: Model, base: Frame, variants: Sequence[Variant]) -> list[Variant]:
    """Other ways for the system to stand that explain the readings better than the drawing, before any other cause is allowed for."""
    found = []
    for variant in variants:
        linear = variant.model.linearise(first_points(model.layout, variant.model.spells))
        linear = variant.model.linearise(variant.model.moved(linear, np.zeros(linear.row_count)))
        gain = make_frame(linear, []).log_evidence_of_none - base.log_evidence_of_none
        if gain > VARIANT_GAIN:
            found.append(replace(variant, gain=gain))
    return sorted(found, key=lambda variant: -variant.gain)[:MOST_VARIANTS]


def _weigh_variant(
    variant: Variant,
    base: Frame,
    full: Frame,
    prior: CountPrior,
    places: int,
    should_stop: Callable[[], bool] | None,
) -> list[Explanation]:
    """One changed model, alone and with up to two causes more."""
    model, stretches = variant.model, variant.mark.noise_factor != 1.0
    if variant.mark.spoils or stretches:
        linear = model.linearise([state.point for state in base.linear.states])
    else:
        linear = model.linearise(first_points(model.layout, model.spells))
    effect = variant.mark.vector if stretches else np.zeros(linear.row_count)
    linear = model.linearise(model.moved(linear, effect))
    marks = all_marks(View(model, linear))
    mark = replace(variant.mark, vector=np.zeros(linear.row_count))
    if stretches:
        mark = next((m for m in marks if m.key == mark.key and m.form == mark.form), variant.mark)
    frame = _pruned(make_frame(linear, [m for m in marks if _goes_with(m, mark)], -mark.vector))
    further = CountPrior(
        of=tuple((count + 1) * share for count, share in enumerate(prior.of[1:])), other_kinds=prior.other_kinds
    )
    weighed = _weigh(frame, further, should_stop)
    number = len(frame.marks)
    with_mark = make_frame(linear, [*frame.marks, mark])
    kinds = len({one.kind for one in full.marks}) + prior.other_kinds
    own = float(np.log(mark.share / kinds / places))
    scale = frame.log_evidence_of_none - base.log_evidence_of_none
    top = max(weighed.values())
    kept = {chosen: weight for chosen, weight in weighed.items() if weight > top - KEPT_NATS}
    log_priors = _log_priors(frame, further, list(kept))
    return [
        Explanation(
            chosen=(*chosen, number),
            frame=with_mark,
            log_weight=weight + own + mark.log_jacobian + scale,
            log_prior=log_priors[chosen] + own,
        )
        for chosen, weight in kept.items()
    ]


def _goes_with(mark: Mark, special: Mark) -> bool:
    """Whether a further cause may stand beside the one that changed the model."""
    if mark.noise_factor != 1.0:
        return False
    if special.spoils:
        return special.own[0] not in mark.own
    return not (mark.kind is CauseKind.SPAN_ERROR and special.noise_factor != 1.0 and mark.own == special.own)


def shared_frame(model: Model, points: Sequence[Point], kinds: Collection[CauseKind] | None = None) -> Frame:
    """The frame of all marks at one point."""
    linear = model.linearise(points)
    return _pruned(make_frame(linear, all_marks(View(model, linear), kinds)))


def _pruned(frame: Frame) -> Frame:
    """The frame without the less likely moments of causes that may begin at many: their like stand for them."""
    timed = [index for index, mark in enumerate(frame.marks) if mark.start_s is not None]
    if not timed:
        return frame
    gains = dict(zip(timed, frame.log_gains(np.array([[i] for i in timed])).tolist(), strict=True))
    by_key: dict[tuple[CauseKind, Place], list[int]] = {}
    for index in timed:
        by_key.setdefault(frame.marks[index].key, []).append(index)
    dropped: set[int] = set()
    for same in by_key.values():
        dropped |= set(sorted(same, key=lambda index: -gains[index])[MOST_MOMENTS:])
    kept = [index for index in range(len(frame.marks)) if index not in dropped]
    return frame.only(kept)


def _solution(model: Model, frame: Frame, chosen: tuple[int, ...]) -> tuple[Point, ...]:
    """Points at which an explanation's own unknowns are most probable."""
    shift = np.zeros(frame.linear.row_count)
    for index in chosen:
        shift = shift + frame.marks[index].vector * frame.size(chosen, index).mean
    return model.moved(frame.linear, shift)


def _normalised(explanations: list[Explanation]) -> tuple[Explanation, ...]:
    """Explanations with probabilities, the most probable first."""
    weights = np.array([e.log_weight for e in explanations])
    total = float(log_sum(weights))
    ordered = sorted(explanations, key=lambda e: -e.log_weight)
    return tuple(replace(e, probability=float(np.exp(e.log_weight - total))) for e in ordered)


def set_log_priors(shares: NDArray[np.float64], prior: CountPrior, sets: NDArray[np.int64]) -> Array:
    """Log priors of many sets of marks of one size, shape (sets, k)."""
    count = sets.shape[1]
    if count == 0:
        return np.full(sets.shape[0], np.log(prior.of[0]))
    # unordered sets of different causes: count! orders, less what would be the same cause twice
    spread = float(np.sum(shares**2))
    distinct = {1: 1.0, 2: 1.0 - spread}.get(count, max((1.0 - spread) ** 3, 0.1))
    orders = float(np.prod(np.arange(1, count + 1)))
    return np.asarray(np.log(prior.of[count] * orders / distinct) + np.log(shares)[sets].sum(axis=1))


def set_log_prior(shares: NDArray[np.float64], prior: CountPrior, chosen: Sequence[int]) -> float:
    """Log prior of one set of marks."""
    return float(set_log_priors(shares, prior, np.array([chosen], dtype=np.int64))[0])


def _log_priors(frame: Frame, prior: CountPrior, sets: Sequence[tuple[int, ...]]) -> dict[tuple[int, ...], float]:
    """Log prior of every set of a list, those of one size in one sweep."""
    shares = mark_shares(frame.marks, prior.other_kinds)
    found: dict[tuple[int, ...], float] = {}
    for count in {len(chosen) for chosen in sets}:
        same = [chosen for chosen in sets if len(chosen) == count]
        index = np.array(same, dtype=np.int64).reshape(len(same), count)
        found |= dict(zip(same, set_log_priors(shares, prior, index).tolist(), strict=True))
    return found


def _weigh(frame: Frame, prior: CountPrior, should_stop: Callable[[], bool] | None) -> dict[tuple[int, ...], float]:
    """Log weight of every set worth listing, by its sorted marks; evidence of none is taken as the zero of the scale."""
    shares = mark_shares(frame.marks, prior.other_kinds)
    weights: dict[tuple[int, ...], float] = {(): set_log_prior(shares, prior, ())}
    if not frame.marks or prior.most < 1:
        return weights
    singles = [(index,) for index in range(len(frame.marks))]
    weights |= _evaluate(frame, shares, prior, singles)
    if prior.most >= 2:
        pairs = _pairs(frame)
        bound = _pair_bounds(frame, pairs) + set_log_priors(
            shares, prior, np.array(pairs, dtype=np.int64).reshape(-1, 2)
        )
        floor = max(weights.values()) - KEPT_NATS
        weights |= _evaluate(
            frame, shares, prior, [pair for pair, most in zip(pairs, bound, strict=True) if most > floor]
        )
    grown: set[tuple[int, ...]] = set()
    while prior.most >= 3 and not (should_stop and should_stop()):
        top = max(weights.values())
        seeds = [s for s, w in weights.items() if len(s) >= 2 and w > top - REACH_NATS and s not in grown]
        if not seeds:
            break
        seeds = sorted(seeds, key=lambda s: -weights[s])[:8]
        grown |= set(seeds)
        fresh = {n for seed in seeds for n in _neighbours(frame, seed, prior.most)} - weights.keys()
        weights |= _evaluate(frame, shares, prior, sorted(fresh))
    return weights


def _compatible(frame: Frame) -> NDArray[np.bool_]:
    """Whether two marks may stand in one set: not forms of one cause, not one and the same to the data, no gauge scaled twice."""
    keys: dict[tuple[CauseKind, Place], int] = {}
    key = np.array([keys.setdefault(mark.key, len(keys)) for mark in frame.marks])
    scale = np.array([mark.kind in (CauseKind.SPAN_ERROR, CauseKind.WRONG_UNIT) for mark in frame.marks])
    gauge = np.array([mark.place.gauge for mark in frame.marks])
    rescaled = scale[:, None] & scale[None, :] & (gauge[:, None] == gauge[None, :])
    length = np.sqrt(np.diag(frame.gram))
    parallel = np.abs(frame.gram) > PARALLEL * np.outer(length, length)
    return np.asarray((key[:, None] != key[None, :]) & ~parallel & ~rescaled)


def _pairs(frame: Frame) -> list[tuple[int, ...]]:
    """Every pair of marks that may stand together."""
    first, second = np.nonzero(np.triu(_compatible(frame), 1))
    return list(zip(first.tolist(), second.tolist(), strict=True))


def _pair_bounds(frame: Frame, pairs: Sequence[tuple[int, ...]]) -> Array:
    """What the log gain of each pair cannot exceed: that of its best sizes, without limits and without a prior's cost."""
    index = np.array(pairs, dtype=np.int64).reshape(-1, 2)
    point = np.array([mark.prior.is_point for mark in frame.marks])
    size = np.array([mark.prior.least for mark in frame.marks])
    jacobian = np.array([mark.log_jacobian for mark in frame.marks])
    own = np.diag(frame.gram)
    bound = jacobian[index].sum(axis=1)
    i, j = index[:, 0], index[:, 1]
    cross = frame.gram[i, j]
    for first, second in ((i, j), (j, i)):
        # a stated size only shifts what the other one sees
        mixed = point[first] & ~point[second]
        fixed = frame.product[first] * size[first] - 0.5 * own[first] * size[first] ** 2
        seen = frame.product[second] - cross * size[first]
        bound += np.where(mixed, fixed + 0.5 * seen**2 / own[second], 0.0)
    both = point[i] & point[j]
    alone = [frame.product[k] * size[k] - 0.5 * own[k] * size[k] ** 2 for k in (i, j)]
    bound += np.where(both, alone[0] + alone[1] - cross * size[i] * size[j], 0.0)
    determinant = np.maximum(own[i] * own[j] - cross**2, 1e-12 * own[i] * own[j])
    bi, bj = frame.product[i], frame.product[j]
    free = 0.5 * (own[j] * bi**2 - 2.0 * cross * bi * bj + own[i] * bj**2) / determinant
    return np.asarray(bound + np.where(~point[i] & ~point[j], free, 0.0))


def _neighbours(frame: Frame, seed: tuple[int, ...], most: int) -> set[tuple[int, ...]]:
    """Sets one step from a set: one mark more, or one swapped for another."""
    compatible = _compatible(frame)
    found: set[tuple[int, ...]] = set()
    bases = [seed] if len(seed) < most else []
    bases += [tuple(i for i in seed if i != gone) for gone in seed] if len(seed) > 2 else []
    for base in bases:
        allowed = np.all(compatible[list(base)], axis=0)
        found |= {tuple(sorted((*base, int(more)))) for more in np.flatnonzero(allowed)}
    return found


def _evaluate(
    frame: Frame, shares: NDArray[np.float64], prior: CountPrior, sets: Sequence[tuple[int, ...]]
) -> dict[tuple[int, ...], float]:
    """Log weights of many sets of one size, those with like priors of size in one sweep."""
    if not sets:
        return {}
    index = np.array(sets)
    count = {1: NODES, 2: PAIR_NODES}.get(index.shape[1], TRIPLE_NODES)
    values = frame.log_gains(index, count) + set_log_priors(shares, prior, index)
    return {chosen: float(value) for chosen, value in zip(sets, values, strict=True)}


def _at_own_solutions(
    model: Model, explanations: list[Explanation], should_stop: Callable[[], bool] | None
) -> list[Explanation]:
    """The leading explanations linearised again, each at its own solution."""
    base = explanations[0].frame
    weights = {e.chosen: e for e in explanations}
    wanted: set[tuple[int, ...]] = set()
    if loss_bends(base.linear):
        # a loss that moves the flows is not judged by what a small one would do
        wanted |= {chosen for chosen in weights if len(chosen) == 1 and base.marks[chosen[0]].kind in LOSS_KINDS}
    solved: set[tuple[int, ...]] = set()
    # what leads may fall back once it is solved, and leave others in the lead that are not
    for _ in range(SOLVING_ROUNDS):
        ordered = sorted(weights, key=lambda chosen: -weights[chosen].log_weight)
        top = weights[ordered[0]].log_weight
        wanted |= {c for c in ordered[:OWN_SOLUTIONS] if weights[c].log_weight > top - OWN_NATS}
        # what is part of a likely set is weighed as exactly as the set
        wanted |= {part for c in wanted for size in range(len(c)) for part in combinations(c, size) if part in weights}
        fresh = wanted - solved
        if not fresh or (should_stop and should_stop()):
            break
        for chosen in fresh:
            weights[chosen] = _at_own_solution(model, base, chosen, weights[chosen])
        solved |= fresh
    return list(weights.values())


def _at_own_solution(model: Model, base: Frame, chosen: tuple[int, ...], before: Explanation) -> Explanation:
    """One explanation linearised at its own solution."""
    if not chosen:
        return replace(before, log_weight=before.log_weight + sign_log_weight(model, before.frame, ()))
    frame, own = own_frame(model, base, chosen)
    weight = (
        frame.log_evidence_of_none
        - base.log_evidence_of_none
        + frame.log_gain(own)
        + before.log_prior
        + sign_log_weight(model, frame, own)
    )
    return replace(before, chosen=own, frame=frame, log_weight=weight)
