"""What a cause is made of: where it sits, the mark it leaves on the data, the range of its size."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.result import CauseKind, Place
from headledger.quantities import Unit
from headledger.statistics.sizes import SizePrior

Array = NDArray[np.float64]

SMALLEST_TOLERANCES = 0.3
"""The smallest size that matters, as a fraction of the tolerance of the gauge that feels it most."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Mark:
    """One cause at one place: what a unit of its size adds to the stacked data rows.

    Parameters
    ----------
    kind : CauseKind
    place : Place
    vector : ndarray, shape (rows,)
        Added to the data per unit of size.
    prior : SizePrior
    share : float
        Its part of its place's prior, where a place has several forms of a cause (the forms' shares sum to 1). [-]
    log_jacobian : float
        Log of the density of the logged data against the data with the cause undone: a cause that stretches a reading makes any
        logged value less dense. [-]
    own : tuple of int
        Gauges whose own error it is.
    size_base, size_factor : float
        Reported size is ``base + factor * size``.
    unit : Unit or None
        In which the size is spoken of.
    drops_m : tuple of ndarray, shape (runs,) each
        Head that a unit of its size takes in every run, spell by spell; empty for what takes none. [m]
    start_s : float or None
        When it begins, where it does not hold all along. [s since 1970-01-01 UTC]
    spoils : bool
        Whether readings of its gauge say nothing of the pressure any more; its `vector` is then nothing.
    noise_factor : float
        By which it stretches the noise of its gauges. [-]
    form : str
        Which of several forms it is, for wording.
    """

    kind: CauseKind
    place: Place
    vector: Array
    prior: SizePrior
    share: float = 1.0
    log_jacobian: float = 0.0
    own: tuple[int, ...] = ()
    size_base: float = 0.0
    size_factor: float = 1.0
    unit: Unit | None = None
    drops_m: tuple[Array, ...] = ()
    start_s: float | None = None
    spoils: bool = False
    noise_factor: float = 1.0
    form: str = ""

    @property
    def key(self) -> tuple[CauseKind, Place]:
        """What two marks share when they are forms of one cause."""
        return (self.kind, self.place)

    def reported(self, size: float) -> float:
        """Size as it is spoken of, in SI or as a ratio."""
        return self.size_base + self.size_factor * size


@dataclass(frozen=True, slots=True)
class View:
    """What a cause may look at to make its marks: the model and its linearisation.

    Parameters
    ----------
    model : Model
    linear : Linear
    """

    model: Model
    linear: Linear
    _tolerance: list[Array] = field(default_factory=list)
    _closing: dict[int, Array] = field(default_factory=dict)

    @property
    def layout(self) -> Layout:
        """The job as arrays."""
        return self.model.layout

    def tolerance_rows(self) -> Array:
        """Tolerance of the gauge of each data row; infinite for rows that are no gauge's. [Pa]"""
        if not self._tolerance:
            rows = np.full(self.linear.row_count, np.inf)
            for state, place in zip(self.linear.states, self.linear.rows, strict=True):
                for offset, gauge in enumerate(place.gauges):
                    noun = self.layout.job.gauges[gauge]
                    rows[place.start + offset] = noun.tolerance_at(float(state.reading_pa[gauge]))
            self._tolerance.append(rows)
        return self._tolerance[0]

    def readings_pa(self) -> Array:
        """What the gauges read, on the data rows; nan for rows that are no gauge's. [Pa]"""
        rows = np.full(self.linear.row_count, np.nan)
        for spell, place in zip(self.model.spells, self.linear.rows, strict=True):
            rows[place.start : place.start + place.gauges.size] = spell.reading_pa[place.gauges]
        return rows

    def perfect_pa(self) -> Array:
        """What perfect gauges would read at the point, on the data rows; nan for rows that are no gauge's. [Pa]"""
        rows = np.full(self.linear.row_count, np.nan)
        for state, place in zip(self.linear.states, self.linear.rows, strict=True):
            rows[place.start : place.start + place.gauges.size] = state.reading_pa[place.gauges]
        return rows

    def least_size(self, vector: Array) -> float:
        """The smallest size that matters: 0.3 of the tolerance at the gauge that feels it most; infinite where none does."""
        felt = float(np.max(np.abs(self._with_loops_closed(vector)) / self.tolerance_rows(), initial=0.0))
        return SMALLEST_TOLERANCES / felt if felt > 0.0 else np.inf

    def _with_loops_closed(self, vector: Array) -> Array:
        """What a mark does to the gauges once flows have moved so that every loop closes again."""
        closed = vector
        for spell, (group, place) in enumerate(zip(self.linear.groups, self.linear.rows, strict=True)):
            loops = slice(place.start + place.count - place.loops, place.start + place.count)
            if not place.loops or not vector[loops].any():
                continue
            moved = -self._loop_inverse(spell) @ vector[loops]
            if closed is vector:
                closed = vector.copy()
            closed[place.start : place.start + place.count] += group.own @ moved
        return closed

    def _loop_inverse(self, spell: int) -> Array:
        """How a spell's own unknowns close its loops again."""
        if spell not in self._closing:
            place = self.linear.rows[spell]
            self._closing[spell] = np.asarray(
                np.linalg.pinv(self.linear.groups[spell].own[place.count - place.loops :])
            )
        return self._closing[spell]

    def gauge_vector(self, gauge: int, values: Array | float) -> Array:
        """A mark on one gauge's rows alone; `values` one for each of its rows, or one for all."""
        rows, _ = self.linear.gauge_rows(gauge)
        vector = np.zeros(self.linear.row_count)
        vector[rows] = values
        return vector

    def drop_vector(self, drops_m: Sequence[Array]) -> Array:
        """The mark of head lost besides in the runs of each spell, ``drops_m[spell]`` of shape (runs,). [Pa]"""
        vector = np.zeros(self.linear.row_count)
        for state, place, drop in zip(self.linear.states, self.linear.rows, drops_m, strict=True):
            parts = [
                state.reading_from_drop(self.layout)[place.gauges] @ drop,
                np.zeros(place.meters.size),
                -state.graph.path[place.levels] @ drop,
            ]
            if place.loops:
                parts.append(state.graph.loop @ drop)
            vector[place.start : place.start + place.count] = np.concatenate(parts)
        return vector

    def flow_vector(self, flows_m3_s: Sequence[Array]) -> Array:
        """The mark of a change of the independent flows of each spell, shape (independent,) each. [Pa]"""
        vector = np.zeros(self.linear.row_count)
        for state, place, flow in zip(self.linear.states, self.linear.rows, flows_m3_s, strict=True):
            if not flow.size:
                continue
            runs = state.basis @ flow
            drop = state.slope_s_m2 * runs
            parts = [
                state.reading_from_flow(self.layout)[place.gauges] @ flow,
                runs[place.meters],
                -state.graph.path[place.levels] @ drop,
            ]
            if place.loops:
                parts.append(state.graph.loop @ drop)
            vector[place.start : place.start + place.count] = np.concatenate(parts)
        return vector


MarkMaker = Callable[[View], list[Mark]]
"""A kind of cause: from a view of the model to its marks at every place where it may sit."""
