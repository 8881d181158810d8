"""A drawing in the cells of a terminal: lines in braille dots, bands and pipe as coloured ground, words where there is room."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from itertools import pairwise

from headledger.sheets.drawing import Drawing, Mark, Panel, Point, Role, Stop, tick_labels, ticks
from headledger.sheets.placing import Box, Placer

_DOTS = ((0x01, 0x08), (0x02, 0x10), (0x04, 0x20), (0x40, 0x80))
_EIGHTHS = " ▁▂▃▄▅▆▇█"
_BRAILLE = 0x2800
_BEAD = "○"
_BREAK = "≈"
_BEYOND = {1: "↑", -1: "↓"}


@dataclass(frozen=True, slots=True)
class Span:
    """Cells of one look, next to one another.

    Parameters
    ----------
    text : str
    role : Role or None
        Of what is written.
    ground : Role or None
        Of what lies behind it.
    strong : bool
        Belongs to what is chosen.
    """

    text: str
    role: Role | None = None
    ground: Role | None = None
    strong: bool = False


@dataclass(slots=True)
class _Cell:
    dots: int = 0
    dot_role: Role | None = None
    text: str = ""
    role: Role | None = None
    ground: Role | None = None
    strong: bool = False


@dataclass(frozen=True, slots=True)
class _Field:
    """Where one panel lies: its rows, and how heights and places become cells and dots."""

    panel: Panel
    left: int
    width: int
    top: int
    height: int
    start: float
    end: float

    def dot(self, point: Point) -> tuple[int, int]:
        """Column and row of dots of a point; may lie outside."""
        across = (point[0] - self.start) / (self.end - self.start)
        down = (self.panel.high - point[1]) / (self.panel.high - self.panel.low)
        return round(across * (2 * self.width - 1)), round(down * (4 * self.height - 1))

    def cell(self, point: Point) -> tuple[int, int]:
        """Column and row of cells of a point, held within the field."""
        column, row = self.dot(point)
        return (
            self.left + min(max(column // 2, 0), self.width - 1),
            self.top + min(max(row // 4, 0), self.height - 1),
        )


@dataclass(slots=True)
class _Sheet:
    """Cells being filled."""

    width: int
    height: int
    rows: list[list[_Cell]] = field(default_factory=list)

    def __post_init__(self) -> None:
        self.rows = [[_Cell() for _ in range(self.width)] for _ in range(self.height)]

    def write(self, column: int, row: int, text: str, role: Role | None, *, strong: bool = False) -> None:
        """Put words on the sheet; what reaches over its edge is cut."""
        for offset, character in enumerate(text):
            if 0 <= column + offset < self.width and 0 <= row < self.height:
                cell = self.rows[row][column + offset]
                cell.text, cell.role, cell.strong = character, role, strong

    def spans(self) -> tuple[tuple[Span, ...], ...]:
        """Rows of spans."""
        return tuple(_spans(row) for row in self.rows)


def draw_cells(drawing: Drawing, width: int, height: int) -> tuple[tuple[Span, ...], ...]:
    """A drawing as rows of spans.

    Parameters
    ----------
    drawing : Drawing
    width, height : int
        Cells. Below about 24 by 5 there is no room for a picture, and the rows stay empty.

    Returns
    -------
    tuple of tuple of Span
        `height` rows, each `width` cells wide.
    """
    sheet = _Sheet(width, height)
    if width < 24 or height < 5:
        return sheet.spans()
    feet = 2 if height >= 18 and len(drawing.stops) > 4 else 1
    labels = [
        _scale_labels(panel, rows)
        for panel, rows in zip(drawing.panels, _panel_rows(drawing, height - feet), strict=True)
    ]
    gutter = max(len(text) for scale in labels for _, text in scale) + 1
    fields = _fields(drawing, gutter, width, height - feet)
    bottom = fields[-1].top + fields[-1].height
    placer = Placer(Box(gutter, 0, width, bottom))
    for frame in fields[1:]:
        placer.take(Box(gutter, frame.top - 1, width, frame.top))
    _ground(drawing, fields, sheet)
    for line in drawing.lines:
        _draw_line(line.points, line.role, fields[line.panel], sheet)
    _soft(sheet, placer, gutter)
    _draw_scales(fields, labels, gutter, sheet)
    _draw_beads(drawing, fields, sheet)
    _draw_marks(drawing, fields, sheet, placer)
    _draw_notes(drawing, fields, sheet, placer)
    _draw_shade_names(drawing, fields[0], sheet, placer)
    _draw_panel_names(fields, sheet, placer)
    _draw_stops(drawing, fields[0], bottom, feet, sheet)
    return sheet.spans()


def _panel_rows(drawing: Drawing, height: int) -> list[int]:
    """Rows of each panel; one row between two of them for the break."""
    left = height - (len(drawing.panels) - 1)
    rows = [max(2, round(panel.share * left)) for panel in drawing.panels]
    rows[0] = left - sum(rows[1:])
    return rows


def _scale_labels(panel: Panel, rows: int) -> list[tuple[float, str]]:
    values = ticks(panel.low, panel.high, max(2, rows // 3))
    return list(zip(values, tick_labels(values), strict=True))


def _fields(drawing: Drawing, gutter: int, width: int, height: int) -> list[_Field]:
    fields, top = [], 0
    for panel, rows in zip(drawing.panels, _panel_rows(drawing, height), strict=True):
        fields.append(_Field(panel, gutter, width - gutter, top, rows, drawing.start, drawing.end))
        top += rows + 1
    return fields


def _ground(drawing: Drawing, fields: Sequence[_Field], sheet: _Sheet) -> None:
    """Shades, fills and bands: what lies behind the lines."""
    for shade in drawing.shades:
        for frame in fields:
            first, last = (frame.cell((x, frame.panel.low))[0] for x in (shade.start, shade.end))
            for row in range(frame.top, frame.top + frame.height):
                for column in range(first, last + 1):
                    sheet.rows[row][column].ground = shade.role
    for fill in drawing.fills:
        frame = fields[fill.panel]
        for column in range(frame.width):
            y = _height_at(fill.points, frame.start + (column + 0.5) / frame.width * (frame.end - frame.start))
            if y is not None:
                _fill_column(frame, column, y, fill.role, sheet)
    for band in drawing.bands:
        frame = fields[band.panel]
        lows = tuple((x, low) for x, low, _ in band.points)
        highs = tuple((x, high) for x, _, high in band.points)
        for column in range(frame.width):
            x = frame.start + (column + 0.5) / frame.width * (frame.end - frame.start)
            low, high = _height_at(lows, x), _height_at(highs, x)
            if low is not None and high is not None:
                _shade_rows(frame, column, low, high, band.role, sheet)


def _fill_column(frame: _Field, column: int, y: float, role: Role, sheet: _Sheet) -> None:
    """One column filled up to a height, to an eighth of a cell."""
    panel = frame.panel
    eighths = round(8 * frame.height * min(max((y - panel.low) / (panel.high - panel.low), 0.0), 1.0))
    full, part = divmod(eighths, 8)
    foot = frame.top + frame.height - 1
    for row in range(full):
        sheet.rows[foot - row][frame.left + column].ground = role
    if part and full < frame.height:
        cell = sheet.rows[foot - full][frame.left + column]
        cell.text, cell.role = _EIGHTHS[part], role


def _shade_rows(frame: _Field, column: int, low: float, high: float, role: Role, sheet: _Sheet) -> None:
    """Cells of one column that a band covers at least by half."""
    panel = frame.panel
    per_row = (panel.high - panel.low) / frame.height
    for row in range(frame.height):
        top = panel.high - row * per_row
        if min(high, top) - max(low, top - per_row) >= 0.5 * per_row:
            sheet.rows[frame.top + row][frame.left + column].ground = role


def _height_at(points: Sequence[Point], x: float) -> float | None:
    """A line's height at a place; None outside it."""
    for (x0, y0), (x1, y1) in pairwise(points):
        if x0 <= x <= x1:
            return y0 if x1 == x0 else y0 + (x - x0) / (x1 - x0) * (y1 - y0)
    return None


def _draw_line(points: Sequence[Point], role: Role, frame: _Field, sheet: _Sheet) -> None:
    """A line in dots, a step as a step."""
    if role is Role.PIPE:
        return  # the edge of its fill
    dots = [frame.dot(point) for point in points]
    for (x0, y0), (x1, y1) in pairwise(dots):
        steps = max(abs(x1 - x0), abs(y1 - y0), 1)
        for step in range(steps + 1):
            _set_dot(x0 + round(step * (x1 - x0) / steps), y0 + round(step * (y1 - y0) / steps), role, frame, sheet)


def _set_dot(column: int, row: int, role: Role, frame: _Field, sheet: _Sheet) -> None:
    if 0 <= column < 2 * frame.width and 0 <= row < 4 * frame.height:
        cell = sheet.rows[frame.top + row // 4][frame.left + column // 2]
        cell.dots |= _DOTS[row % 4][column % 2]
        cell.dot_role = role


def _soft(sheet: _Sheet, placer: Placer, gutter: int) -> None:
    for row, cells in enumerate(sheet.rows):
        for column, cell in enumerate(cells):
            if column >= gutter and (cell.dots or cell.ground is Role.PIPE or cell.role is Role.PIPE):
                placer.take(Box(column, row, column + 1, row + 1), soft=True)


def _draw_scales(
    fields: Sequence[_Field], labels: Sequence[list[tuple[float, str]]], gutter: int, sheet: _Sheet
) -> None:
    for index, (frame, scale) in enumerate(zip(fields, labels, strict=True)):
        for row in range(frame.top, frame.top + frame.height):
            sheet.write(gutter - 1, row, "│", Role.AXIS)
        for value, text in scale:
            row = frame.cell((frame.start, value))[1]
            sheet.write(gutter - 1 - len(text), row, text, Role.AXIS)
            sheet.write(gutter - 1, row, "┤", Role.AXIS)
        if index:
            sheet.write(gutter - 1, frame.top - 1, _BREAK, Role.AXIS)


def _draw_beads(drawing: Drawing, fields: Sequence[_Field], sheet: _Sheet) -> None:
    for beads in drawing.beads:
        for point in beads.points:
            column, row = fields[beads.panel].cell(point)
            sheet.write(column, row, _BEAD, beads.role)


def _draw_marks(drawing: Drawing, fields: Sequence[_Field], sheet: _Sheet, placer: Placer) -> None:
    """Signs first, each in a cell of its own; then their words."""
    placed: list[tuple[Mark, int, int]] = []
    for mark in drawing.marks:
        frame = fields[mark.panel]
        column, row = frame.cell((mark.x, mark.y))
        offsets = (0, 1, -1, 2, -2) if column < frame.left + frame.width - 1 else (0, -1, -2)
        spot = placer.place([Box(column + by, row, column + by + 1, row + 1) for by in offsets])
        at = int(spot.left) if spot else column
        sheet.write(at, row, mark.sign, mark.role, strong=mark.chosen)
        placed.append((mark, at, row))
    for mark, column, row in placed:
        text = f"{_BEYOND.get(mark.beyond, '')}{mark.label}"
        # a word beside its own sign may cover a line only where the gauge is the one that is looked at, or in trouble
        insist = mark.chosen or mark.role in (Role.FAIL, Role.UNRESOLVED)
        near, far = _beside(column, row, len(text))
        spot = placer.place(near, cover_lines=insist) or placer.place(far, cover_lines=insist)
        if spot:
            sheet.write(int(spot.left), int(spot.top), text, mark.role, strong=mark.chosen)


def _beside(column: int, row: int, length: int) -> tuple[list[Box], list[Box]]:
    """Places for a word that touch its sign (right, left, above, below), and such that stand a row off."""
    columns = (column + 1, column - length, column - length // 2)
    near = [(x, row) for x in columns[:2]] + [(x, row + by) for by in (-1, 1) for x in columns]
    far = [(x, row + by) for by in (-2, 2) for x in columns]
    near_boxes, far_boxes = ([Box(x, y, x + length, y + 1) for x, y in places] for places in (near, far))
    return near_boxes, far_boxes


def _draw_notes(drawing: Drawing, fields: Sequence[_Field], sheet: _Sheet, placer: Placer) -> None:
    for note in drawing.notes:
        frame = fields[note.panel]
        column, row = frame.cell((note.x, note.y))
        length = len(note.text)
        above = [Box(column - length // 2, row - by, column - length // 2 + length, row - by + 1) for by in (1, 2)]
        places = above if note.role is Role.NAME else []
        for by in (1, -1):
            near, far = _beside(column + by, row, length)
            places += [*near, *far]
        # a word about the pipe that strayed into the heads would be taken for one about them
        spot = placer.place([box for box in places if frame.top <= box.top < frame.top + frame.height])
        if spot:
            sheet.write(int(spot.left), int(spot.top), note.text, note.role)


def _draw_panel_names(fields: Sequence[_Field], sheet: _Sheet, placer: Placer) -> None:
    """What each scale measures, in a corner that is free."""
    for frame in fields:
        text, right = frame.panel.name, frame.left + frame.width
        foot = frame.top + frame.height - 1
        corners = [
            (frame.left + 1, frame.top),
            (right - len(text), frame.top),
            (frame.left + 1, foot),
            (right - len(text), foot),
        ]
        spot = placer.place([Box(x, y, x + len(text), y + 1) for x, y in corners], cover_lines=False)
        if spot:
            sheet.write(int(spot.left), int(spot.top), text, Role.AXIS)


def _draw_stops(drawing: Drawing, frame: _Field, row: int, rows: int, sheet: _Sheet) -> None:
    """Names under the foot; those of smaller rank are placed first."""
    placer = Placer(Box(0, row, sheet.width, row + rows))
    for stop in sorted(drawing.stops, key=_rank):
        column, length = frame.cell((stop.x, frame.panel.low))[0], len(stop.text)
        left = min(max(column - length // 2, frame.left), sheet.width - length)
        # a blank on either side keeps two names apart
        roomy = [
            Box(max(left - 1, 0), row + by, min(left + length + 1, sheet.width), row + by + 1) for by in range(rows)
        ]
        spot = placer.place(roomy)
        if spot:
            sheet.write(left, int(spot.top), stop.text, Role.AXIS, strong=stop.rank == 0)


def _draw_shade_names(drawing: Drawing, frame: _Field, sheet: _Sheet, placer: Placer) -> None:
    """What each shaded stretch is, at its head."""
    for shade in drawing.shades:
        first, last = (frame.cell((x, frame.panel.low))[0] for x in (shade.start, shade.end))
        room = last - first + 1
        text = shade.label if len(shade.label) <= room else shade.label.split(" ", 1)[0]
        left = first + (room - len(text)) // 2
        if len(text) <= room and placer.place([Box(left, frame.top, left + len(text), frame.top + 1)]):
            sheet.write(left, frame.top, text, Role.AXIS, strong=shade.role is Role.CHOSEN_SPELL)


def _rank(stop: Stop) -> int:
    return stop.rank


def _spans(row: Sequence[_Cell]) -> tuple[Span, ...]:
    """Cells of one row, those of one look together."""
    spans: list[Span] = []
    for cell in row:
        if cell.text and not (cell.dots and cell.text in _EIGHTHS):
            one = Span(cell.text, cell.role, cell.ground, cell.strong)
        elif cell.dots:
            one = Span(chr(_BRAILLE + cell.dots), cell.dot_role, cell.ground)
        else:
            one = Span(" ", None, cell.ground)
        last = spans[-1] if spans else None
        if last and (last.role, last.ground, last.strong) == (one.role, one.ground, one.strong):
            spans[-1] = Span(last.text + one.text, last.role, last.ground, last.strong)
        else:
            spans.append(one)
    return tuple(spans)
