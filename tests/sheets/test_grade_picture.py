"""The line along the pipe: what stands where, checked against the result that it is drawn from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from headledger.diagnosis.result import CauseKind, CheckResult, GradeStep, RunGrade, Trend, Verdict
from headledger.plant.job import LevelPoint
from headledger.sheets.cells import draw_cells
from headledger.sheets.drawing import Role
from headledger.sheets.grade_picture import best_way, grade_picture, tells_most
from headledger.sheets.paths import way_past, ways_through
from headledger.sheets.trend_picture import trend_picture
from tests.sample_results import sample_result


def test_ways_pass_every_run_of_every_sample(any_sample: CheckResult):
    ways = ways_through(any_sample.job)
    assert {leg.run.name for way in ways for leg in way.legs} == {run.name for run in any_sample.job.runs}
    for way in ways:
        for before, after in zip(way.legs, way.legs[1:], strict=False):
            assert before.last == after.first


def test_ways_of_a_branched_line_end_at_each_branch():
    names = {way.name for way in ways_through(sample_result("branched-sound").job)}
    assert names == {"PLANT to NORTH", "PLANT to EAST", "PLANT to SOUTH"}


def test_ways_of_a_ring_pass_the_run_that_closes_it(sound_result: CheckResult):
    closing = replace(sound_result.job.runs[0], name="R4", start="S4", end="S1")
    job = replace(sound_result.job, runs=(*sound_result.job.runs, closing))
    assert {leg.run.name for way in ways_through(job) for leg in way.legs} == {"R1", "R2", "R3", "R4"}


def test_every_gauge_stands_at_its_own_head(any_sample: CheckResult):
    """What is drawn is the head that the result holds, in the job's unit of length, unless it lies beyond the panel."""
    scale = 1.0 / any_sample.job.display.length.factor
    for way in ways_through(any_sample.job):
        for spell in any_sample.spells:
            drawing = grade_picture(any_sample, way, spell)
            panel = drawing.panels[0]
            heads = sorted(
                said.head_m * scale
                for gauge in any_sample.gauges
                for said in gauge.spells
                if gauge.station in way.stations and said.id == spell.id and said.head_m is not None
            )
            drawn = sorted(mark.y for mark in drawing.marks)
            assert drawn == pytest.approx([min(max(head, panel.low), panel.high) for head in heads])
            assert all(bool(mark.beyond) == (" at " in mark.label) for mark in drawing.marks)


def test_blockage_is_drawn_as_the_step_it_is():
    """The step's height is what the blockage takes, and the line ends where the described loss takes the rest."""
    result = sample_result("cooling-strainer")
    spell = result.spells[tells_most(result)]
    grade = next(one for one in spell.grade if one.run == "STR-1")
    (step,) = grade.steps
    drawing = grade_picture(result, ways_through(result.job)[0], spell)
    (drawn,) = [line for line in drawing.lines if line.role is Role.STEP]
    (x0, top), (x1, foot) = drawn.points
    assert x0 == x1
    assert top - foot == pytest.approx(step.drop_m)
    line = next(line for line in drawing.lines if line.role is Role.GRADE)
    assert line.points[0][1] == pytest.approx(spell.grade[0].start_m)
    assert line.points[-1][1] == pytest.approx(spell.grade[-1].end_m)
    assert any(note.text.startswith("blockage ") for note in drawing.notes)
    assert "strainer" in [note.text for note in drawing.notes]


def test_pocket_is_drawn_where_it_sits():
    """From the saddle down, over no more of the fall than the pocket is high."""
    result = sample_result("hill-main-air")
    spell = result.spells[-1]
    step = next(one for grade in spell.grade if grade.run == "M3" for one in grade.steps)
    drawing = grade_picture(result, ways_through(result.job)[0], spell)
    (beads,) = drawing.beads
    heights = [y for _, y in beads.points]
    assert heights[0] == pytest.approx(38.0)
    assert heights[0] - heights[-1] == pytest.approx(step.drop_m)
    assert "○" in "".join(span.text for row in draw_cells(drawing, 78, 20) for span in row)


def test_reading_far_off_the_line_stands_at_the_edge_and_says_where():
    result = sample_result("fire-main-units")
    drawing = grade_picture(result, ways_through(result.job)[0], result.spells[0], chosen="PIT-903")
    (mark,) = [mark for mark in drawing.marks if mark.label.startswith("PIT-903")]
    assert mark.beyond == -1
    assert mark.chosen
    text = "".join(span.text for row in draw_cells(drawing, 78, 12) for span in row)
    assert f"↓{mark.label}" in text
    assert mark.label.endswith(" ft")


def test_scales_stay_from_spell_to_spell(any_sample: CheckResult):
    way = ways_through(any_sample.job)[0]
    panels = {grade_picture(any_sample, way, spell).panels for spell in any_sample.spells}
    assert len(panels) == 1


def test_shut_run_parts_the_line_and_says_so(sound_result: CheckResult):
    spell = sound_result.spells[1]
    grade = tuple(replace(one, is_open=one.run != "R2") for one in spell.grade)
    drawing = grade_picture(sound_result, ways_through(sound_result.job)[0], replace(spell, grade=grade))
    assert len([line for line in drawing.lines if line.role is Role.GRADE]) == 2
    assert "shut" in [note.text for note in drawing.notes]


def test_head_that_nothing_determines_has_no_line(sound_result: CheckResult):
    spell = sound_result.spells[1]
    grade = tuple(replace(one, end_u95_m=60.0) if one.run == "R3" else one for one in spell.grade)
    drawing = grade_picture(sound_result, ways_through(sound_result.job)[0], replace(spell, grade=grade))
    assert "head not determined" in [note.text for note in drawing.notes]


def test_levels_shape_the_pipe_and_bring_the_ground(sound_result: CheckResult):
    levels = (
        LevelPoint(run="R1", distance_m=10.0, elevation_m=9.0, ground_m=11.0),
        LevelPoint(run="R1", distance_m=30.0, elevation_m=1.0, ground_m=2.0),
    )
    result = replace(sound_result, job=replace(sound_result.job, levels=levels))
    drawing = grade_picture(result, ways_through(result.job)[0], result.spells[0])
    heights = [y for _, y in drawing.fills[0].points]
    assert heights == [3.0, 9.0, 1.0, 6.0, 9.0, 12.0]
    (ground,) = [line for line in drawing.lines if line.role is Role.GROUND]
    assert [y for _, y in ground.points] == [11.0, 2.0]


def test_line_backwards_is_the_line_mirrored(troubled_result: CheckResult):
    """A run that the way passes from its end to its start has its step at the same place, falling the other way."""
    first, second, third = troubled_result.job.runs
    job = replace(troubled_result.job, runs=(first, replace(second, start="S3", end="S2"), third))
    spell = troubled_result.spells[1]

    def turned(grade: RunGrade) -> RunGrade:
        if grade.run != "R2":
            return grade
        steps = tuple(GradeStep(cause=step.cause, drop_m=-step.drop_m) for step in grade.steps)
        return replace(grade, start_m=grade.end_m, end_m=grade.start_m, steps=steps)

    result = replace(troubled_result, job=job)
    backwards = grade_picture(result, ways_through(job)[0], replace(spell, grade=tuple(map(turned, spell.grade))))
    forwards = grade_picture(troubled_result, ways_through(troubled_result.job)[0], spell)
    assert len(forwards.lines) > 2
    for one, other in zip(forwards.lines, backwards.lines, strict=True):
        for here, there in zip(one.points, other.points, strict=True):
            assert here == pytest.approx(there)


def test_best_way_leads_past_the_leading_cause():
    result = sample_result("branched-sound")
    ways = ways_through(result.job)
    failed = next(gauge for gauge in result.gauges if gauge.station == "SOUTH")
    troubled = replace(
        result,
        causes=(),
        gauges=tuple(replace(g, verdict=Verdict.FAIL) if g is failed else g for g in result.gauges),
    )
    assert "SOUTH" in ways[best_way(troubled, ways)].stations
    assert way_past(ways, run="BR-S") == best_way(troubled, ways)
    assert way_past(ways, station="NOWHERE") is None


def test_trend_keeps_peaks_parts_at_gaps_and_names_its_lines(sound_result: CheckResult):
    gauge = sound_result.gauges[0]
    drawing = trend_picture(sound_result, gauge, spell_id=2)
    assert drawing is not None
    readings = [line for line in drawing.lines if line.role is Role.READING]
    assert len(readings) == 2
    assert {note.text for note in drawing.notes} == {"reading", "expected"}
    assert [shade.label for shade in drawing.shades] == ["1 still", "2 flowing"]
    assert [shade.role for shade in drawing.shades] == [Role.SPELL, Role.CHOSEN_SPELL]
    assert [stop.text for stop in drawing.stops][:3] == ["08:00", "08:10", "08:20"]


def test_trend_of_a_long_log_holds_its_greatest_reading(sound_result: CheckResult):
    start_s = 1e9 + np.arange(20_000.0)
    reading = np.full((20_000, 5), 3e5)
    reading[12_345, 0] = 4e5
    result = replace(sound_result, trend=Trend(start_s=start_s, width_s=1.0, reading_pa=reading))
    drawing = trend_picture(result, result.gauges[0])
    assert drawing is not None
    points = [point for line in drawing.lines if line.role is Role.READING for point in line.points]
    assert len(points) <= 1200
    assert max(y for _, y in points) == pytest.approx(4.0)


def test_trend_of_a_gauge_that_said_nothing_is_none(sound_result: CheckResult):
    assert trend_picture(replace(sound_result, trend=None), sound_result.gauges[0]) is None


def test_every_kind_of_cause_in_a_run_has_its_word_on_the_step(troubled_result: CheckResult):
    kept = troubled_result.causes[0]
    for kind, word in (
        (CauseKind.BLOCKAGE, "blockage? 0.800 m"),
        (CauseKind.LOW_LOSS, "less loss than described? 0.800 m"),
        (CauseKind.AIR_POCKET, "air pocket? 0.800 m"),
    ):
        result = replace(troubled_result, causes=(kept, replace(troubled_result.causes[1], kind=kind)))
        drawing = grade_picture(result, ways_through(result.job)[0], result.spells[1])
        assert [note.text for note in drawing.notes if note.role is Role.STEP] == [word]
