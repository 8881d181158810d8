"""Scales, placing of words, and drawings in cells."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from headledger.sheets.cells import draw_cells
from headledger.sheets.drawing import (
    Band,
    Drawing,
    Fill,
    Line,
    Mark,
    Note,
    Panel,
    Role,
    Stop,
    tick_labels,
    tick_step,
    ticks,
    widened,
)
from headledger.sheets.placing import Box, Placer


def one_panel(**parts: object) -> Drawing:
    """A drawing from 0 to 1 across and 0 to 10 up."""
    return Drawing(start=0.0, end=1.0, panels=(Panel(low=0.0, high=10.0, share=1.0, name="head, m"),), **parts)  # type: ignore[arg-type]


def text_rows(drawing: Drawing, width: int, height: int) -> list[str]:
    return ["".join(span.text for span in row) for row in draw_cells(drawing, width, height)]


@given(extent=st.floats(1e-6, 1e9), most=st.integers(1, 12))
def test_tick_step_is_round_and_divides_into_no_more_parts_than_asked(extent: float, most: int):
    step = tick_step(extent, most)
    digits = step / 10.0 ** math.floor(math.log10(step) + 1e-9)
    assert min(abs(digits - round_one) for round_one in (1.0, 2.0, 5.0)) < 1e-6
    assert extent / step <= most * (1.0 + 1e-6)


@given(low=st.floats(-1e4, 1e4), extent=st.floats(1e-3, 1e4))
def test_ticks_lie_on_the_scale_and_their_labels_tell_them_apart(low: float, extent: float):
    values = ticks(low, low + extent, 5)
    slack = 1e-6 * max(extent, abs(low))
    assert all(low - slack <= value <= low + extent + slack for value in values)
    assert len(set(tick_labels(values))) == len(values)


@given(low=st.floats(-1e4, 1e4), extent=st.floats(1e-2, 1e4), most=st.integers(1, 6))
def test_ticks_are_never_none(low: float, extent: float, most: int):
    assert ticks(low, low + extent, most)


def test_ticks_of_a_hand_example():
    """From 0 to 50 in at most five parts: every 10; labels without decimals."""
    assert ticks(0.0, 50.0, 5) == (0.0, 10.0, 20.0, 30.0, 40.0, 50.0)
    assert tick_labels((0.0, 0.5, 1.0)) == ("0.0", "0.5", "1.0")


def test_widened_keeps_the_least_extent_about_the_middle():
    low, high = widened(5.0, 5.0, least=2.0, margin=0.0)
    assert (low, high) == (4.0, 6.0)


def test_placer_prefers_what_covers_no_line_and_never_covers_a_word():
    placer = Placer(Box(0, 0, 10, 3))
    placer.take(Box(0, 0, 5, 1))
    placer.take(Box(0, 1, 10, 2), soft=True)
    assert placer.place([Box(0, 0, 4, 1), Box(0, 1, 4, 2), Box(0, 2, 4, 3)]) == Box(0, 2, 4, 3)
    assert placer.place([Box(0, 2, 2, 3), Box(5, 1, 9, 2)], cover_lines=False) is None
    assert placer.place([Box(0, 2, 2, 3), Box(5, 1, 9, 2)]) == Box(5, 1, 9, 2)
    assert placer.place([Box(8, 0, 12, 1)]) is None


def test_cells_put_a_mark_in_the_row_of_its_height():
    """On a scale of 0 to 10 over ten rows, 7.5 lies in the third row from the top: rows hold 10 to 9, 9 to 8, 8 to 7."""
    drawing = one_panel(marks=(Mark(x=0.5, y=7.5, sign="▲", label="PT-1", role=Role.FAIL),))
    rows = text_rows(drawing, 40, 11)
    (found,) = [index for index, row in enumerate(rows) if "▲" in row]
    assert found == 2
    assert "▲PT-1" in rows[2]


def test_cells_draw_a_step_upright():
    drawing = one_panel(lines=(Line(points=((0.0, 9.0), (0.5, 9.0), (0.5, 1.0), (1.0, 1.0)), role=Role.GRADE),))
    rows = draw_cells(drawing, 60, 12)
    columns = set()
    for row in rows[2:9]:
        column = 0
        for span in row:
            if span.role is Role.GRADE:
                columns.add(column)
                assert len(span.text) == 1
            column += len(span.text)
    assert len(columns) == 1


def test_cells_keep_every_word_apart_where_gauges_crowd():
    marks = tuple(Mark(x=0.5, y=5.0, sign="✓", label=f"PT-{i}", role=Role.PASS) for i in range(4))
    text = "\n".join(text_rows(one_panel(marks=marks), 60, 12))
    assert text.count("✓") == 4
    for i in range(4):
        assert f"PT-{i}" in text


def test_cells_never_leave_out_the_word_of_the_chosen_gauge():
    line = Line(points=((0.0, 5.0), (1.0, 5.0)), role=Role.GRADE)
    wall = tuple(Line(points=((0.0, y), (1.0, y)), role=Role.GRADE) for y in (1.0, 3.0, 7.0, 9.0))
    mark = Mark(x=0.5, y=5.0, sign="✓", label="PT-1", role=Role.PASS, chosen=True)
    assert "PT-1" in "\n".join(text_rows(one_panel(lines=(line, *wall), marks=(mark,)), 40, 7))


def test_cells_shade_a_band_and_fill_the_pipe():
    drawing = one_panel(
        bands=(Band(points=((0.0, 6.0, 8.0), (1.0, 6.0, 8.0))),),
        fills=(Fill(points=((0.0, 3.0), (1.0, 3.0)), role=Role.PIPE),),
    )
    rows = draw_cells(drawing, 40, 11)
    shaded = [index for index, row in enumerate(rows) if any(span.ground is Role.BAND for span in row)]
    filled = [index for index, row in enumerate(rows) if any(span.ground is Role.PIPE for span in row)]
    assert shaded == [2, 3]
    assert filled == [7, 8, 9]


def test_cells_name_stops_by_rank_where_room_is_short():
    stops = tuple(Stop(x=0.5 + 0.01 * i, text=f"STATION-{i}", rank=3 - i) for i in range(3))
    assert "STATION-2" in text_rows(one_panel(stops=stops), 30, 8)[-1]


heights = st.floats(-5.0, 15.0)
places = st.floats(0.0, 1.0)


@given(
    points=st.lists(st.tuples(places, heights), min_size=2, max_size=6),
    marks=st.lists(st.tuples(places, heights, st.booleans()), max_size=12),
    width=st.integers(1, 130),
    height=st.integers(1, 40),
)
def test_cells_fill_exactly_the_room_they_are_given(
    points: list[tuple[float, float]], marks: list[tuple[float, float, bool]], width: int, height: int
):
    drawing = one_panel(
        lines=(Line(points=tuple(sorted(points)), role=Role.GRADE),),
        marks=tuple(Mark(x=x, y=y, sign="✓", label="PT-1234", role=Role.PASS, chosen=c) for x, y, c in marks),
        notes=(Note(x=0.3, y=5.0, text="a note", role=Role.STEP),),
        stops=(Stop(x=0.0, text="WELL"), Stop(x=1.0, text="TANK")),
    )
    rows = text_rows(drawing, width, height)
    assert len(rows) == height
    assert {len(row) for row in rows} == {width}


def test_cells_of_two_panels_show_the_break():
    panels = (
        Panel(low=50.0, high=60.0, share=0.7, name="head, m"),
        Panel(low=0.0, high=5.0, share=0.3, name="pipe, m"),
    )
    rows = text_rows(Drawing(start=0.0, end=1.0, panels=panels), 40, 14)
    assert [row.strip() for row in rows if "≈" in row] == ["≈"]


@pytest.mark.parametrize("size", [(10, 30), (80, 3)])
def test_cells_without_room_stay_empty(size: tuple[int, int]):
    assert "".join(text_rows(one_panel(), *size)).strip() == ""
