"""The sight as picture and words: every gauge of the way at its own sight, losses as lines, and the same numbers in the table."""

from __future__ import annotations

import pytest

from headledger.diagnosis.result import CauseKind, CheckResult, Sight
from headledger.sheets.cells import draw_cells
from headledger.sheets.paths import ways_through
from headledger.sheets.sight_picture import sight_picture
from headledger.sheets.sight_words import sight_words


def sight_of(result: CheckResult) -> Sight:
    assert result.sight is not None
    return result.sight


def test_picture_puts_every_gauge_at_the_head_of_its_smallest_shift(any_sample: CheckResult):
    sight = sight_of(any_sample)
    way = ways_through(any_sample.job)[0]
    drawing = sight_picture(any_sample.job, sight, way)
    shifts = {one.place.gauge: one.seen for one in sight.troubles if one.kind is CauseKind.ZERO_SHIFT}
    scale = 1.0 / any_sample.job.display.length.factor
    on_way = {gauge.tag for gauge in any_sample.job.gauges if gauge.station in way.stations}
    assert {mark.label for mark in drawing.marks} == on_way
    for mark in drawing.marks:
        seen = shifts.get(mark.label)
        if seen is not None and not mark.beyond:
            assert mark.y == pytest.approx(seen / sight.head_weight_pa_m * scale)


def test_picture_stays_on_its_scale(any_sample: CheckResult):
    drawing = sight_picture(any_sample.job, sight_of(any_sample), ways_through(any_sample.job)[0])
    panel = drawing.panels[0]
    heights = [y for line in drawing.lines for _, y in line.points] + [mark.y for mark in drawing.marks]
    assert min(heights) >= panel.low
    assert max(heights) <= panel.high
    rows = draw_cells(drawing, 78, 12)
    assert all(sum(len(span.text) for span in row) == 78 for row in rows)


def test_words_hold_a_row_for_every_gauge_and_every_loss(any_sample: CheckResult):
    sight = sight_of(any_sample)
    words = sight_words(any_sample.job, sight)
    assert [row[0] for row in words.gauges] == [gauge.tag for gauge in any_sample.job.gauges]
    kinds = [row[0] for row in words.troubles]
    assert kinds.count("blockage") == sum(one.kind is CauseKind.BLOCKAGE for one in sight.troubles)
    assert all(one.says.endswith(".") for one in sight.troubles)
