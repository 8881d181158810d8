"""A drawing on paper: the same one as in the terminal's cells, in lines that black-and-white printing keeps apart."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

from reportlab.lib.colors import Color, black, white
from reportlab.pdfbase.pdfmetrics import stringWidth
from reportlab.platypus import Flowable

from headledger.sheets.drawing import Drawing, Mark, Panel, Point, Role, Stop, tick_labels, ticks
from headledger.sheets.fonts import BOLD, PLAIN
from headledger.sheets.placing import Box, Placer

_SIZE = 6.6
_LEAD = 8.0
_GAP = 9.0
_HEAD = 10.0

_GREY = Color(0.45, 0.45, 0.45)
_STROKES: dict[Role, tuple[Color, float, tuple[float, ...]]] = {
    Role.GRADE: (Color(0.0, 0.35, 0.6), 1.1, ()),
    Role.PIPE: (Color(0.3, 0.3, 0.3), 1.4, ()),
    Role.GROUND: (_GREY, 0.7, (3.0, 2.0)),
    Role.STEP: (black, 2.2, ()),
    Role.READING: (black, 0.6, ()),
    Role.FAIL: (black, 0.8, (1.2, 1.2)),
    Role.UNRESOLVED: (black, 0.8, (1.2, 1.2)),
}
_GROUNDS: dict[Role, Color] = {
    Role.BAND: Color(0.72, 0.84, 0.93),
    Role.PIPE: Color(0.9, 0.9, 0.9),
    Role.SPELL: Color(0.95, 0.95, 0.95),
    Role.CHOSEN_SPELL: Color(0.87, 0.87, 0.87),
}
_THIN = (black, 0.5, ())


@dataclass(frozen=True, slots=True)
class _Field:
    """Where one panel lies on the paper, in points; `bottom` below `top`."""

    panel: Panel
    left: float
    right: float
    bottom: float
    top: float
    start: float
    end: float

    def at(self, point: Point) -> Point:
        """A point of the drawing on the paper, held within the panel."""
        across = min(max((point[0] - self.start) / (self.end - self.start), 0.0), 1.0)
        up = min(max((point[1] - self.panel.low) / (self.panel.high - self.panel.low), 0.0), 1.0)
        return self.left + across * (self.right - self.left), self.bottom + up * (self.top - self.bottom)


class PictureOnPaper(Flowable):  # type: ignore[misc]  # the library publishes no types
    """A drawing as a part of a page.

    Parameters
    ----------
    drawing : Drawing
    width, height : float
        In points of 1/72 inch.
    """

    def __init__(self, drawing: Drawing, width: float, height: float) -> None:
        super().__init__()
        self.drawing, self.width, self.height = drawing, width, height

    def wrap(self, _available_width: float, _available_height: float) -> tuple[float, float]:
        """The room that it takes."""
        return self.width, self.height

    def draw(self) -> None:
        """Draw it, its lower left corner at the origin."""
        _draw(self.canv, self.drawing, self.width, self.height)


def _draw(canvas: Any, drawing: Drawing, width: float, height: float) -> None:
    fields, scales, gutter = _fields(drawing, width, height)
    foot = fields[-1].bottom
    canvas.setFont(PLAIN, _SIZE)
    canvas.setFillColor(black)
    canvas.drawString(0.0, height - _SIZE, drawing.caption)
    for shade in drawing.shades:
        for frame in fields:
            (x0, y0), (x1, y1) = frame.at((shade.start, frame.panel.low)), frame.at((shade.end, frame.panel.high))
            _area(canvas, [(x0, y0), (x1, y0), (x1, y1), (x0, y1)], shade.role)
    for fill in drawing.fills:
        frame = fields[fill.panel]
        edge = [frame.at(point) for point in fill.points]
        _area(canvas, [(edge[0][0], frame.bottom), *edge, (edge[-1][0], frame.bottom)], fill.role)
    for band in drawing.bands:
        frame = fields[band.panel]
        upper = [frame.at((x, high)) for x, _, high in band.points]
        lower = [frame.at((x, low)) for x, low, _ in band.points]
        _area(canvas, [*upper, *reversed(lower)], band.role)
    placer = Placer(Box(gutter, foot, width, fields[0].top), pitch=(24.0, _LEAD))
    for line in drawing.lines:
        points = [fields[line.panel].at(point) for point in line.points]
        _stroke(canvas, points, line.role)
        _take_line(placer, points)
    for beads in drawing.beads:
        canvas.setStrokeColor(black)
        canvas.setFillColor(white)
        canvas.setLineWidth(0.7)
        canvas.setDash()
        for point in beads.points:
            canvas.circle(*fields[beads.panel].at(point), 2.0, stroke=1, fill=1)
    _draw_scales(canvas, fields, scales, gutter)
    _draw_marks(canvas, drawing, fields, placer)
    _draw_notes(canvas, drawing, fields, placer)
    _draw_names(canvas, drawing, fields, placer)
    _draw_stops(canvas, drawing, fields[0], foot, width)


def _fields(drawing: Drawing, width: float, height: float) -> tuple[list[_Field], list[list[tuple[float, str]]], float]:
    """The panels, their scales, and where the panels begin."""
    foot = _LEAD * (2 if len(drawing.stops) > 6 else 1) + 4.0
    room = height - _HEAD - foot - _GAP * (len(drawing.panels) - 1)
    scales = []
    for panel in drawing.panels:
        values = ticks(panel.low, panel.high, max(2, int(room * panel.share / 18.0)))
        scales.append(list(zip(values, tick_labels(values), strict=True)))
    gutter = 5.0 + max((stringWidth(text, PLAIN, _SIZE) for scale in scales for _, text in scale), default=0.0)
    fields, top = [], height - _HEAD
    for panel in drawing.panels:
        bottom = top - panel.share * room
        fields.append(_Field(panel, gutter, width - 1.0, bottom, top, drawing.start, drawing.end))
        top = bottom - _GAP
    return fields, scales, gutter


def _area(canvas: Any, points: Sequence[Point], role: Role) -> None:
    path = canvas.beginPath()
    path.moveTo(*points[0])
    for point in points[1:]:
        path.lineTo(*point)
    path.close()
    canvas.setFillColor(_GROUNDS[role])
    canvas.drawPath(path, stroke=0, fill=1)


def _stroke(canvas: Any, points: Sequence[Point], role: Role) -> None:
    color, thickness, dash = _STROKES.get(role, _THIN)
    canvas.setStrokeColor(color)
    canvas.setLineWidth(thickness)
    canvas.setDash(*([list(dash)] if dash else []))
    path = canvas.beginPath()
    path.moveTo(*points[0])
    for point in points[1:]:
        path.lineTo(*point)
    canvas.drawPath(path, stroke=1, fill=0)
    canvas.setDash()


def _take_line(placer: Placer, points: Sequence[Point]) -> None:
    """Where a line runs, as small boxes that words had better not cover."""
    for (x0, y0), (x1, y1) in pairwise(points):
        pieces = max(1, int(max(abs(x1 - x0), abs(y1 - y0)) / 6.0))
        for piece in range(pieces):
            xs = sorted(x0 + (x1 - x0) * k / pieces for k in (piece, piece + 1))
            ys = sorted(y0 + (y1 - y0) * k / pieces for k in (piece, piece + 1))
            placer.take(Box(xs[0] - 0.5, ys[0] - 0.5, xs[1] + 0.5, ys[1] + 0.5), soft=True)


def _draw_scales(
    canvas: Any, fields: Sequence[_Field], scales: Sequence[list[tuple[float, str]]], gutter: float
) -> None:
    canvas.setStrokeColor(_GREY)
    canvas.setLineWidth(0.5)
    for index, (frame, scale) in enumerate(zip(fields, scales, strict=True)):
        canvas.line(gutter, frame.bottom, gutter, frame.top)
        canvas.line(gutter, frame.bottom, frame.right, frame.bottom)
        for value, text in scale:
            _, y = frame.at((frame.start, value))
            canvas.line(gutter - 2.0, y, gutter, y)
            _word(canvas, gutter - 3.5 - stringWidth(text, PLAIN, _SIZE), y - _SIZE / 3.0, text)
        if index:
            _word(canvas, gutter - 2.5, frame.top + 1.5, "≈")


def _word(canvas: Any, x: float, y: float, text: str, *, font: str = PLAIN, color: Color = black) -> None:
    canvas.setFont(font, _SIZE)
    canvas.setFillColor(color)
    canvas.drawString(x, y, text)


def _draw_marks(canvas: Any, drawing: Drawing, fields: Sequence[_Field], placer: Placer) -> None:
    """Signs first, none on another; then their words."""
    placed: list[tuple[Mark, float, float]] = []
    for mark in drawing.marks:
        x, y = fields[mark.panel].at((mark.x, mark.y))
        width = stringWidth(mark.sign, BOLD, _SIZE + 1.0)
        spots = [
            Box(x + by - width / 2.0, y - 3.0, x + by + width / 2.0, y + 3.0) for by in (0.0, 6.0, -6.0, 12.0, -12.0)
        ]
        inside = [
            box for box in spots if fields[mark.panel].left - 4.0 <= box.left and box.right <= fields[mark.panel].right
        ]
        free = placer.place(inside)
        middle = x if free is None else (free.left + free.right) / 2.0
        canvas.setStrokeColor(black)
        canvas.setFillColor(black if mark.chosen else white)
        canvas.setLineWidth(0.6)
        canvas.circle(middle, y, 3.6, stroke=1, fill=1)
        canvas.setFont(BOLD, _SIZE - 1.0)
        canvas.setFillColor(white if mark.chosen else black)
        canvas.drawCentredString(middle, y - 2.0, mark.sign)
        placer.take(Box(middle - 4.0, y - 4.0, middle + 4.0, y + 4.0))
        placed.append((mark, middle, y))
    for mark, x, y in placed:
        arrow = {1: "↑", -1: "↓"}.get(mark.beyond, "")
        text, font = f"{arrow}{mark.label}", BOLD if mark.chosen else PLAIN
        insist = mark.chosen or mark.role in (Role.FAIL, Role.UNRESOLVED)
        spot = placer.place(_beside(x, y, stringWidth(text, font, _SIZE)), cover_lines=insist)
        if spot:
            _word(canvas, spot.left, spot.top + 1.6, text, font=font)


def _beside(x: float, y: float, length: float) -> list[Box]:
    """Places for a word beside a sign: above, below, right, left, then further off."""
    half = length / 2.0
    corners = [(x - half, y + 4.5), (x - half, y - 12.0), (x + 5.5, y - 4.0), (x - 5.5 - length, y - 4.0)]
    for by in (4.5, -12.0, 12.0, -20.0, 20.0, -28.0):
        corners += [(x + 2.0, y + by), (x - 2.0 - length, y + by)]
    return [Box(left, bottom, left + length, bottom + _LEAD) for left, bottom in corners]


def _draw_notes(canvas: Any, drawing: Drawing, fields: Sequence[_Field], placer: Placer) -> None:
    for note in drawing.notes:
        x, y = fields[note.panel].at((note.x, note.y))
        font = BOLD if note.role in (Role.STEP, Role.POCKET) else PLAIN
        length = stringWidth(note.text, font, _SIZE)
        sides = [Box(x + 4.0, y - 4.0, x + 4.0 + length, y + 4.0), Box(x - 4.0 - length, y - 4.0, x - 4.0, y + 4.0)]
        above = _beside(x, y, length)
        spot = placer.place([*above[:1], *sides, *above] if note.role is Role.NAME else [*sides, *above])
        if spot:
            _word(canvas, spot.left, spot.top + 1.6, note.text, font=font)


def _draw_names(canvas: Any, drawing: Drawing, fields: Sequence[_Field], placer: Placer) -> None:
    """What each shaded stretch is, and what each scale measures, in a corner that is free."""
    for shade in drawing.shades:
        x0, x1 = (fields[0].at((x, 0.0))[0] for x in (shade.start, shade.end))
        long, short = shade.label, shade.label.split(" ", 1)[0]
        text = long if stringWidth(long, PLAIN, _SIZE) <= x1 - x0 else short
        length = stringWidth(text, PLAIN, _SIZE)
        left, bottom = (x0 + x1 - length) / 2.0, fields[0].top - _LEAD
        if length <= x1 - x0 and placer.place([Box(left, bottom, left + length, bottom + _LEAD)]):
            _word(canvas, left, bottom + 1.6, text)
    for frame in fields:
        length = stringWidth(frame.panel.name, PLAIN, _SIZE)
        lefts, rights = frame.left + 3.0, frame.right - length - 1.0
        corners = [(x, y) for y in (frame.top - _LEAD, frame.bottom + 1.0) for x in (lefts, rights)]
        spot = placer.place([Box(x, y, x + length, y + _LEAD) for x, y in corners], cover_lines=False)
        if spot:
            _word(canvas, spot.left, spot.top + 1.6, frame.panel.name, color=_GREY)


def _draw_stops(canvas: Any, drawing: Drawing, frame: _Field, foot: float, width: float) -> None:
    """Names under the foot, in one row or two; those of smaller rank are placed first."""
    rows = 2 if len(drawing.stops) > 6 else 1
    placer = Placer(Box(-0.5, -0.5, width + 0.5, foot), pitch=(24.0, _LEAD))
    for stop in sorted(drawing.stops, key=_rank):
        x, _ = frame.at((stop.x, frame.panel.low))
        font = BOLD if stop.rank == 0 else PLAIN
        length = stringWidth(stop.text, font, _SIZE)
        left = min(max(x - length / 2.0, 0.0), width - length)
        bottoms = [foot - 2.0 - _LEAD * (row + 1) for row in range(rows)]
        spot = placer.place(
            [Box(max(left - 2.0, -0.5), y, min(left + length + 2.0, width + 0.5), y + _LEAD) for y in bottoms]
        )
        if spot:
            _word(canvas, left, spot.top + 1.6, stop.text, font=font)


def _rank(stop: Stop) -> int:
    return stop.rank
