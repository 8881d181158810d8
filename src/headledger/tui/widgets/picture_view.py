"""A drawing on the screen: its caption, and under it the drawing in as many cells as there are."""

from __future__ import annotations

from typing import ClassVar

from rich.segment import Segment
from rich.style import Style
from textual.reactive import reactive
from textual.strip import Strip
from textual.widget import Widget

from headledger.sheets.cells import Span, draw_cells
from headledger.sheets.drawing import Drawing, Role


class PictureView(Widget):
    """Draws what it is given; draws it anew when it or the room for it changes."""

    COMPONENT_CLASSES: ClassVar[set[str]] = {f"picture--{role.value}" for role in Role} | {"picture--caption"}

    drawing: reactive[Drawing | None] = reactive(None)

    def __init__(self, *, id: str | None = None) -> None:
        super().__init__(id=id)
        self._drawn: tuple[Drawing | None, tuple[int, int], tuple[tuple[Span, ...], ...]] = (None, (0, 0), ())
        self._styles: dict[tuple[Role | None, Role | None, bool, bool], Style] = {}

    def render_line(self, y: int) -> Strip:
        """One line of cells."""
        width, height = self.size
        if self.drawing is None:
            return Strip.blank(width, self.rich_style)
        if y == 0:
            return self._caption(self.drawing.caption, width)
        rows = self._rows(self.drawing, width, height - 1)
        if y > len(rows):
            return Strip.blank(width, self.rich_style)
        return Strip([Segment(span.text, self._style(span)) for span in rows[y - 1]], width)

    def _rows(self, drawing: Drawing, width: int, height: int) -> tuple[tuple[Span, ...], ...]:
        """The cells, drawn once for a drawing and a size."""
        if self._drawn[0] is not drawing or self._drawn[1] != (width, height):
            self._drawn = (drawing, (width, height), draw_cells(drawing, width, max(height, 0)))
        return self._drawn[2]

    def _caption(self, text: str, width: int) -> Strip:
        text = text if len(text) <= width else text[: width - 1] + "…"
        return Strip([Segment(text.ljust(width), self.get_component_rich_style("picture--caption"))], width)

    def notify_style_update(self) -> None:
        """Another theme: the colours are looked up anew."""
        self._styles.clear()
        super().notify_style_update()

    def _style(self, span: Span) -> Style:
        """Colour of what is written on the ground that lies behind it."""
        edge = span.role is Role.PIPE and not span.text.strip("▁▂▃▄▅▆▇█")
        key = (span.role, span.ground, span.strong, edge)
        if key not in self._styles:
            self._styles[key] = self._look_up(span, edge=edge)
        return self._styles[key]

    def _look_up(self, span: Span, *, edge: bool) -> Style:
        style = self.rich_style
        if span.ground is not None:
            ground = self.get_component_rich_style(f"picture--{span.ground.value}")
            style += Style(bgcolor=ground.bgcolor)
        if span.role is not None:
            written = self.get_component_rich_style(f"picture--{span.role.value}")
            # what fills a cell in part shows the colour of the ground that it is part of
            color = written.bgcolor if edge else written.color
            style += Style(color=color, bold=written.bold, underline=written.underline)
        return style + Style(bold=True, reverse=True) if span.strong else style
