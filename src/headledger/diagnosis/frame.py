"""A linearised model with the white marks of its causes: the frame in which explanations are weighed."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.causes import MAKERS
from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.result import CauseKind, Place
from headledger.diagnosis.state import Applied, Point, spell_graph
from headledger.statistics.sizes import NODES, SizePosterior, SizePriors, log_gain, size_posterior

Array = NDArray[np.float64]


LOSS_KINDS = frozenset({CauseKind.BLOCKAGE, CauseKind.LOW_LOSS})
"""Causes that change a run's loss."""


SETTLED = 1e-3
"""Change of every size, as a part of it, at which an explanation's own solution stands. [-]"""


@dataclass(frozen=True, slots=True, kw_only=True)
class Frame:
    """Marks of causes on one linearised model.

    Parameters
    ----------
    linear : Linear
    marks : tuple of Mark
    white : ndarray, shape (rows, marks)
        White marks.
    residual : ndarray, shape (rows,)
        White residual at size 0 of every cause.
    gram : ndarray, shape (marks, marks)
    product : ndarray, shape (marks,)
    """

    linear: Linear
    marks: tuple[Mark, ...]
    white: Array
    residual: Array
    gram: Array
    product: Array

    def only(self, kept: Sequence[int]) -> Frame:
        """The frame with some of its marks."""
        index = np.array(kept, dtype=np.int64)
        return replace(
            self,
            marks=tuple(self.marks[i] for i in kept),
            white=self.white[:, index],
            gram=self.gram[np.ix_(index, index)],
            product=self.product[index],
        )

    @property
    def log_evidence_of_none(self) -> float:
        """Log density of the data with no cause present. [-]"""
        square = float(self.residual @ self.residual)
        rows = self.residual.size
        return -0.5 * (square + self.linear.white.log_determinant + rows * float(np.log(2.0 * np.pi)))

    def log_gains(self, sets: NDArray[np.int64], count: int = NODES) -> Array:
        """Log evidence of many sets of marks against none, Jacobians included.

        Parameters
        ----------
        sets : ndarray of int, shape (sets, k)
        count : int
            Quadrature nodes a sign and cause.

        Returns
        -------
        ndarray, shape (sets,)
        """
        point = np.array([mark.prior.is_point for mark in self.marks])[sets]
        priors = SizePriors.of([mark.prior for mark in self.marks])
        out = np.array([mark.log_jacobian for mark in self.marks])[sets].sum(axis=1)
        for pattern in np.unique(point, axis=0):
            rows = np.flatnonzero(np.all(point == pattern, axis=1))
            fixed, free = sets[rows][:, pattern], sets[rows][:, ~pattern]
            sizes = priors.least[fixed]
            out[rows] += (self.product[fixed] * sizes).sum(axis=1)
            out[rows] -= 0.5 * np.einsum("si,sij,sj->s", sizes, _block(self.gram, fixed, fixed), sizes)
            if free.shape[1]:
                product = self.product[free] - np.einsum("sij,sj->si", _block(self.gram, free, fixed), sizes)
                out[rows] += log_gain(priors[free], _block(self.gram, free, free), product, count)
        return np.asarray(out)

    def log_gain(self, chosen: Sequence[int]) -> float:
        """Log evidence of one set of marks against none."""
        return float(self.log_gains(np.array([chosen], dtype=np.int64))[0]) if len(chosen) else 0.0

    def size(self, chosen: Sequence[int], which: int) -> SizePosterior:
        """Posterior of the size of mark `which` (an index into `marks`) within a set."""
        if self.marks[which].prior.is_point:
            return SizePosterior(sizes=np.array([self.marks[which].prior.least]), weights=np.ones(1))
        fixed = [i for i in chosen if self.marks[i].prior.is_point]
        free = [which, *(i for i in chosen if i not in fixed and i != which)]
        sizes = np.array([self.marks[i].prior.least for i in fixed])
        product = self.product[free] - self.gram[np.ix_(free, fixed)] @ sizes
        priors = SizePriors.of([self.marks[i].prior for i in free])
        return size_posterior(priors, self.gram[np.ix_(free, free)], product, NODES if len(free) < 3 else NODES // 3)


def _block(gram: Array, first: NDArray[np.int64], second: NDArray[np.int64]) -> Array:
    """Blocks of the Gram matrix for many sets, shape (sets, k, l)."""
    return np.asarray(gram[first[:, :, None], second[:, None, :]])


def make_frame(linear: Linear, marks: Sequence[Mark], offset: Array | None = None) -> Frame:
    """Frame of a linearised model and marks.

    Parameters
    ----------
    linear : Linear
    marks : sequence of Mark
    offset : ndarray, shape (rows,), optional
        Added to the data rows: what causes already applied in the states took off.

    Returns
    -------
    Frame
    """
    vectors = np.column_stack([mark.vector for mark in marks]) if marks else np.zeros((linear.row_count, 0))
    white = linear.white.mark(vectors)
    # a mark that the heads follow wholly has no length left; a floor keeps its evidence at that of no information
    lengths = np.einsum("ij,ij->j", white, white)
    gram = white.T @ white
    gram[np.diag_indices_from(gram)] = np.maximum(lengths, 1e-18)
    residual = linear.white.residual if offset is None else linear.white.residual + linear.white.mark(offset)
    return Frame(
        linear=linear,
        marks=tuple(marks),
        white=white,
        residual=residual,
        gram=gram,
        product=white.T @ residual,
    )


def all_marks(view: View, kinds: Collection[CauseKind] | None = None) -> list[Mark]:
    """Marks of every kind of cause (or of those named) at every place."""
    found: list[Mark] = []
    for kind, maker in MAKERS.items():
        if kinds is None or kind in kinds:
            found += maker(view)
    return found


def own_frame(model: Model, shared: Frame, chosen: Sequence[int]) -> tuple[Frame, tuple[int, ...]]:
    """The frame of one explanation, linearised at its own solution.

    Parameters
    ----------
    model : Model
    shared : Frame
        In which the explanation was found.
    chosen : sequence of int
        Its marks.

    Returns
    -------
    frame : Frame
        With the explanation's marks alone.
    chosen : tuple of int
        Their indices in it.
    """
    frame, index = shared, tuple(chosen)
    wanted = [(shared.marks[i].key, shared.marks[i].form) for i in chosen]
    scaled = with_noise(model, [shared.marks[i] for i in chosen])
    # all is near linear but what bends the hydraulics, and that is met by further rounds
    kinds = {shared.marks[i].kind for i in chosen}
    bends = bool(kinds & {CauseKind.DENSITY_ERROR, CauseKind.FLOW_METER_ERROR})
    rounds = 4 if kinds & LOSS_KINDS and loss_bends(shared.linear) else 2 if bends else 1
    settled = np.full(len(index), np.nan)
    for _ in range(rounds):
        sizes = np.array([frame.size(index, i).mean for i in index])
        if np.allclose(sizes, settled, rtol=SETTLED):
            break
        settled = sizes
        vectors = np.column_stack([frame.marks[i].vector for i in index])
        points = model.moved(frame.linear, vectors @ (sizes - applied_sizes(frame, index)))
        frame, index = _frame_at(scaled, points, rounds > 2, wanted, [frame.marks[i] for i in index], sizes)
    return frame, index


def with_noise(model: Model, marks: Sequence[Mark]) -> Model:
    """The model with the noise of stretched gauges taken back to what it was before it was stretched."""
    factors = {gauge: mark.noise_factor for mark in marks if mark.noise_factor != 1.0 for gauge in mark.own}
    if not factors:
        return model

    def quieter(spell: SpellMeans) -> SpellMeans:
        noise = spell.noise_pa.copy()
        for gauge, factor in factors.items():
            noise[gauge] /= factor
        return replace(spell, noise_pa=noise)

    return Model(model.layout, [quieter(spell) for spell in model.spells])


def loss_bends(linear: Linear) -> bool:
    """Whether flows follow from losses, so that a changed loss moves them and is more than a step in the heads."""
    for spell, state in zip(linear.model.spells, linear.states, strict=True):
        if state.point.flow_m3_s.size:
            unmetered = not np.isfinite(spell.flow_m3_s[state.graph.basis]).all()
            if state.graph.loop.shape[0] or unmetered:
                return True
    return False


def applied_sizes(frame: Frame, index: Sequence[int]) -> Array:
    """Sizes at which the marks of a set are already allowed for in a frame's states."""
    applied = frame.linear.applied
    return np.array([_applied_size(frame.marks[i], frame, applied) for i in index])


def _applied_size(mark: Mark, frame: Frame, applied: Applied) -> float:
    """Size at which one mark is already allowed for."""
    if mark.kind is CauseKind.DENSITY_ERROR:
        return applied.density_ratio - 1.0
    if mark.kind in LOSS_KINDS and applied.loss_k:
        return mark.size_factor * applied.loss_k.get(frame.linear.model.layout.run_index[mark.place.run], 0.0)
    if mark.kind is CauseKind.FLOW_METER_ERROR and applied.meter_names:
        return dict(applied.meter_names).get(mark.place.run, 1.0) - 1.0
    return 0.0


def _frame_at(
    model: Model,
    points: Sequence[Point],
    bends: bool,
    wanted: Sequence[tuple[tuple[CauseKind, Place], str]],
    before: Sequence[Mark],
    sizes: Array,
) -> tuple[Frame, tuple[int, ...]]:
    """Frame of an explanation's marks at its points, with the causes that bend the hydraulics applied at their sizes."""
    density, meters, names, losses = 1.0, {}, [], {}
    for mark, size in zip(before, sizes, strict=True):
        if mark.kind is CauseKind.DENSITY_ERROR:
            density = 1.0 + float(size)
        elif mark.kind is CauseKind.FLOW_METER_ERROR:
            meters[model.layout.run_index[mark.place.run]] = 1.0 + float(size)
            names.append((mark.place.run, 1.0 + float(size)))
        elif mark.kind in LOSS_KINDS and bends:
            losses[model.layout.run_index[mark.place.run]] = mark.size_factor * float(size)
    applied = Applied(density_ratio=density, meter_ratio=meters, meter_names=tuple(names), loss_k=losses)
    if meters:
        points = _rescaled(model, points, applied)
    linear = model.linearise(points, applied=applied)
    kinds = {mark.kind for mark in before}
    made = {(mark.key, mark.form): mark for mark in all_marks(View(model, linear), kinds)}
    marks = [replace(made.get(key, old), prior=old.prior) for key, old in zip(wanted, before, strict=True)]
    offset = np.zeros(linear.row_count)
    frame = make_frame(linear, marks)
    for mark in marks:
        offset = offset + mark.vector * _applied_size(mark, frame, applied)
    return make_frame(linear, marks, offset), tuple(range(len(marks)))


def _rescaled(model: Model, points: Sequence[Point], applied: Applied) -> tuple[Point, ...]:
    """Points whose metered flows are what the meters say over their ratio."""
    moved = []
    for spell, point in zip(model.spells, points, strict=True):
        flows = point.flow_m3_s.copy()
        if flows.size:
            basis = spell_graph(model.layout, spell).basis
            for column, run in enumerate(basis):
                if int(run) in applied.meter_ratio and np.isfinite(spell.flow_m3_s[run]):
                    flows[column] = spell.flow_m3_s[run] / applied.meter_ratio[int(run)]
        moved.append(Point(reference_head_m=point.reference_head_m, flow_m3_s=flows))
    return tuple(moved)
