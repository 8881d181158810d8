"""The hydraulic grade line of each spell under one explanation: heads at both ends of every run, with their doubt.

The head at a station is linear in the spell's own unknowns, the shared inputs and the sizes of causes in the pipe, like any data row;
here it is predicted from all rows together.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from headledger.diagnosis.budget import InputKind, input_marks
from headledger.diagnosis.estimate import Linear, Model, cut_off_sections
from headledger.diagnosis.frame import Frame, applied_sizes
from headledger.diagnosis.result import CauseKind, GradeStep, Place, RunGrade
from headledger.diagnosis.state import State
from headledger.statistics.gaussian import Group, own_estimate

Array = NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class StationHeads:
    """Total heads of one spell under one explanation.

    Parameters
    ----------
    head_m : ndarray, shape (stations,)
        [m]
    covariance_m2 : ndarray, shape (stations, stations)
        [m²]
    drop_m : dict of int to ndarray, shape (runs,)
        Head that each of the explanation's marks takes in every run. [m]
    """

    head_m: Array
    covariance_m2: Array
    drop_m: dict[int, Array]

    @property
    def sd_m(self) -> Array:
        """Standard deviation of each head. [m]"""
        return np.asarray(np.sqrt(np.maximum(np.diag(self.covariance_m2), 0.0)))


def station_heads(model: Model, frame: Frame, chosen: Sequence[int], index: int) -> StationHeads:
    """Total heads at every station in one spell, predicted from all readings under one explanation.

    Parameters
    ----------
    model : Model
    frame : Frame
    chosen : sequence of int
        The explanation's marks in the frame.
    index : int
        Of the spell.

    Returns
    -------
    StationHeads

    Notes
    -----
    With the own unknowns ``x``, the shared inputs ``t`` and the sizes ``s`` of the explanation's marks, a head is
    ``E = E₀ + H x + B t + D s``; the moments of ``x`` given ``t`` and ``s``, and of ``t`` given ``s``, follow from the data.
    """
    linear, white = frame.linear, frame.linear.white
    state, group, place = linear.states[index], linear.groups[index], linear.rows[index]
    own, shared = _head_derivatives(model, linear, index)
    marks = [frame.marks[i] for i in chosen]
    sizes = [frame.size(chosen, i) for i in chosen]
    cut = slice(place.start, place.start + place.count)
    whole = np.array([mark.vector for mark in marks]).reshape(len(marks), linear.row_count)
    mean_size = np.array([size.mean for size in sizes])
    # the frame's residual already holds what applied causes took off; undo that only where it was put in
    offset = frame.residual - white.residual
    by_size = np.zeros((state.head_m.size, len(marks)))
    drops: dict[int, Array] = {}
    for column, mark in enumerate(marks):
        if mark.drops_m:
            drops[column] = mark.drops_m[index] * mean_size[column]
            by_size[:, column] = -state.graph.path @ mark.drops_m[index]
    shared_mean = white.shared.T @ (frame.residual - white.operator @ (mean_size @ whole))
    put_in = np.linalg.solve(white.operator, offset)[cut] if offset.any() else 0.0
    rest = group.residual + put_in - mean_size @ whole[:, cut]
    estimate = own_estimate(_with_residual(group, rest), shared_mean)
    # what is applied already is in the state's heads
    head = state.head_m + own @ estimate + shared @ shared_mean + by_size @ (mean_size - applied_sizes(frame, chosen))
    own_covariance, own_by_rows = _own_moments(group)
    moved_by_shared = shared - own @ own_by_rows @ group.shared
    covariance = own @ own_covariance @ own.T
    covariance = covariance + moved_by_shared @ white.shared_covariance() @ moved_by_shared.T
    for column, size in enumerate(sizes):
        shared_shift = -white.shared.T @ (white.operator @ whole[column])
        moved = by_size[:, column] - own @ own_by_rows @ whole[column, cut] + moved_by_shared @ shared_shift
        covariance = covariance + size.sd**2 * np.outer(moved, moved)
    return StationHeads(head_m=head, covariance_m2=covariance, drop_m=drops)


def _with_residual(group: Group, residual: Array) -> Group:
    """The group with other residuals."""
    return Group(
        residual=residual,
        noise_sd=group.noise_sd,
        own=group.own,
        own_sd=group.own_sd,
        own_offset=group.own_offset,
        shared=group.shared,
    )


def _own_moments(group: Group) -> tuple[Array, Array]:
    """Covariance of a spell's own unknowns given all else, and how they follow the residuals of its rows."""
    weighted = group.own / group.noise_sd[:, None]
    upper = np.linalg.qr(np.vstack([weighted, np.diag(1.0 / group.own_sd)]), mode="r")
    root = np.linalg.inv(upper)
    covariance = root @ root.T
    return covariance, covariance @ weighted.T / group.noise_sd


def _head_derivatives(model: Model, linear: Linear, index: int) -> tuple[Array, Array]:
    """Derivatives of a spell's heads with its own unknowns and with the shared inputs."""
    spell, state = model.spells[index], linear.states[index]
    graph = state.graph
    member = np.zeros((state.head_m.size, graph.parts))
    member[np.arange(state.head_m.size), graph.part] = 1.0
    from_flow = -graph.path @ (state.slope_s_m2[:, None] * state.basis)
    _, flow_marks, drop_marks = input_marks(model.layout, model.inputs, spell, state, linear.applied)
    shared = -graph.path @ drop_marks
    if from_flow.shape[1]:
        shared = shared + from_flow @ flow_marks[graph.basis]
    for part, name in cut_off_sections(model.layout, spell).items():
        column = next(c for c, i in enumerate(model.inputs) if i.kind is InputKind.CUT_OFF and i.owner == name)
        shared[:, column] += model.inputs[column].sd * member[:, part]
    return np.hstack([member, from_flow]), shared


def run_grades(
    model: Model, frame: Frame, chosen: Sequence[int], index: int, causes: Sequence[tuple[CauseKind, Place]]
) -> tuple[RunGrade, ...]:
    """The grade line along every run in one spell.

    Parameters
    ----------
    model : Model
    frame : Frame
    chosen : sequence of int
    index : int
        Of the spell.
    causes : sequence of (CauseKind, Place)
        Of the result, in its order.

    Returns
    -------
    tuple of RunGrade
    """
    layout, spell = model.layout, model.spells[index]
    state = frame.linear.states[index]
    heads = station_heads(model, frame, chosen, index)
    number = {key: at for at, key in enumerate(causes)}
    keys = [frame.marks[i].key for i in chosen]
    found = []
    for run, noun in enumerate(layout.job.runs):
        start, end = layout.ends[run]
        velocity_m = float(state.velocity_pa[run]) / state.head_weight_pa_m
        steps = tuple(
            GradeStep(cause=number[keys[column]], drop_m=float(drop[run]))
            for column, drop in heads.drop_m.items()
            if drop[run] and keys[column] in number
        )
        found.append(
            RunGrade(
                run=noun.name,
                is_open=spell.is_open[run],
                start_m=float(heads.head_m[start]) - velocity_m,
                end_m=float(heads.head_m[end]) - velocity_m,
                start_u95_m=2.0 * float(heads.sd_m[start]),
                end_u95_m=2.0 * float(heads.sd_m[end]),
                steps=steps,
            )
        )
    return tuple(found)


def tap_head_m(model: Model, state: State, gauge: int, reading_pa: float) -> float:
    """Head of the grade line at a gauge's tap for which a perfect instrument would read this. [m]

    Parameters
    ----------
    model : Model
    state : State
        Of the spell.
    gauge : int
        One with one tap.
    reading_pa : float
        In the gauge's own reference. [Pa]

    Notes
    -----
    Of the energy line the reading lacks the velocity head, as the grade line does: ``(p - c) / (ρ g) + z``.
    """
    layout = model.layout
    run = int(layout.tap_run[gauge])
    heavier = 0.0 if run < 0 else float(state.run_density_kg_m3[run]) - state.density_kg_m3
    weather_pa = float(state.weather_pa[gauge])
    leg_pa = heavier * layout.gravity_m_s2 * layout.process_leg_m[gauge]
    return float(
        (reading_pa - layout.taps.constant_pa[gauge] - leg_pa - weather_pa) / state.head_weight_pa_m
        + layout.taps.column_m[gauge]
    )
