"""Heads along the line: they are what the readings say, and their doubt is honest."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from headledger.diagnosis.estimate import Model
from headledger.diagnosis.frame import make_frame
from headledger.diagnosis.grade import _head_derivatives, run_grades, station_heads, tap_head_m
from headledger.diagnosis.search import Explanation, search
from headledger.diagnosis.state import Point
from headledger.statistics.gaussian import whiten

from .worked_job import REFERENCE, worked_model


def test_station_heads_cover_the_truth_as_often_as_they_say() -> None:
    """Of heads drawn from the model's own priors, the errors in units of the stated deviation have a mean square of 1.

    400 draws of 4 heads in 3 spells, the four of a draw hardly independent: the mean square of 1,200 independent ones would lie
    within 1 ± 0.12 at three standard deviations; 0.8 to 1.25 allows for that they are not.
    """
    model = worked_model(REFERENCE["sound"]["readings_kpa"])
    posterior = search(model, kinds=())
    linear = posterior.leading.frame.linear
    random = np.random.default_rng(11)
    squares = []
    for _ in range(400):
        shared = random.standard_normal(len(model.inputs))
        residuals, truths = [], []
        for state, group in zip(linear.states, linear.groups, strict=True):
            own = group.own_offset + group.own_sd * random.standard_normal(group.own_sd.size)
            noise = group.noise_sd * random.standard_normal(group.noise_sd.size)
            residuals.append(group.own @ own + group.shared @ shared + noise)
            truths.append((own, state))
        for index in range(len(model.spells)):
            squares.append(_squared_errors(model, linear, posterior, residuals, truths, shared, index))
    assert 0.8 < float(np.mean(squares)) < 1.25


def _squared_errors(model, linear, posterior, residuals, truths, shared, index):
    """Of one spell's heads, in units of their stated variance."""
    groups = tuple(replace(group, residual=residual) for group, residual in zip(linear.groups, residuals, strict=True))
    drawn = replace(linear, groups=groups, white=whiten(groups))
    explanation = Explanation(chosen=(), frame=make_frame(drawn, []), log_weight=0.0)
    found = station_heads(model, explanation.frame, (), index)
    by_own, by_shared = _head_derivatives(model, explanation.frame.linear, index)
    own, state = truths[index]
    truth = state.head_m + by_own @ own + by_shared @ shared
    return ((found.head_m - truth) / found.sd_m) ** 2


def test_grade_of_a_blockage_falls_by_what_it_takes() -> None:
    """The worked job with a blockage in R2: the fall across R2 is its own loss and the step, and nothing elsewhere."""
    model = worked_model(REFERENCE["R2 loses 18 kPa more at 36 m3/h"]["readings_kpa"])
    posterior = search(model)
    marks = [posterior.leading.frame.marks[i] for i in posterior.leading.chosen]
    assert [(mark.kind.value, mark.place.run) for mark in marks] == [("blockage", "R2")]
    keys = [mark.key for mark in marks]
    for index, spell in enumerate(model.spells):
        grades = run_grades(model, posterior.leading.frame, posterior.leading.chosen, index, keys)
        if spell.is_still:
            assert all(abs(grade.start_m - grade.end_m) < 1e-9 and not grade.steps for grade in grades)
            continue
        assert [len(grade.steps) for grade in grades] == [0, 1, 0]
        described = [grade.start_m - grade.end_m - sum(step.drop_m for step in grade.steps) for grade in grades]
        # three alike runs lose alike, give or take their stated doubt of 15 %
        assert described == pytest.approx([float(np.mean(described))] * 3, rel=0.15)


def test_tap_head_of_a_perfect_reading_is_the_grade_line_there() -> None:
    model = worked_model(REFERENCE["sound"]["readings_kpa"])
    posterior = search(model, kinds=())
    layout = model.layout
    for state in posterior.leading.frame.linear.states:
        for gauge, noun in enumerate(layout.job.gauges):
            station, run = layout.station_index[noun.station], layout.run_index[noun.run]
            velocity_m = state.velocity_pa[run] / state.head_weight_pa_m
            found = tap_head_m(model, state, gauge, float(state.reading_pa[gauge]))
            assert found == pytest.approx(float(state.head_m[station] - velocity_m), abs=1e-9)


def test_station_heads_do_not_depend_on_where_the_model_was_linearised() -> None:
    """Half a metre off, the same readings give the same heads; a calibration curve taken there moves them by micrometres."""
    model = worked_model(REFERENCE["sound"]["readings_kpa"])
    posterior = search(model, kinds=())
    there = station_heads(model, posterior.leading.frame, (), 0)
    points = [
        Point(reference_head_m=state.point.reference_head_m + 0.5, flow_m3_s=state.point.flow_m3_s)
        for state in posterior.leading.frame.linear.states
    ]
    moved = search(Model(model.layout, model.spells), kinds=(), points=points)
    assert station_heads(model, moved.leading.frame, (), 0).head_m == pytest.approx(there.head_m, abs=5e-5)
