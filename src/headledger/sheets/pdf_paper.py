"""The paper of the sheets: its sizes, what stands at the edges of every page, and the numbers of the pages."""

from __future__ import annotations

from dataclasses import dataclass, replace
from enum import StrEnum
from io import BytesIO
from typing import Any

from reportlab.lib.colors import Color, black
from reportlab.lib.pagesizes import A4, LETTER
from reportlab.lib.units import mm
from reportlab.pdfbase.pdfmetrics import stringWidth
from reportlab.pdfgen.canvas import Canvas
from reportlab.platypus import BaseDocTemplate, Frame, PageTemplate

from headledger.diagnosis.result import CheckResult
from headledger.sheets import content
from headledger.sheets.fonts import BOLD, PLAIN

MARGIN = 14.0 * mm
"""Nothing is drawn nearer to the edge of the paper. [pt]"""

_LOWER = 0.75
_HEADER, _FOOTER = 10.0 * mm, 5.0 * mm
RULE = Color(0.6, 0.6, 0.6)
SMALL, TEXT, LARGE = 6.6, 7.7, 13.0


class Paper(StrEnum):
    """Sizes of paper."""

    A4 = "a4"
    LETTER = "letter"


@dataclass(frozen=True, slots=True, kw_only=True)
class Room:
    """What a page holds: its size, and how high the pictures may be so that a gauge keeps to one page. [pt]"""

    page: tuple[float, float]
    line: float
    trend: float

    @property
    def width(self) -> float:
        """Between the margins."""
        return float(self.page[0] - 2.0 * MARGIN)

    @property
    def pictures(self) -> float:
        """Height of both pictures."""
        return self.line + self.trend

    def lower(self) -> Room:
        """The same with lower pictures, where words need the room."""
        return replace(self, line=_LOWER * self.line, trend=_LOWER * self.trend)

    @property
    def height(self) -> float:
        """Between what stands above and below on every page."""
        return float(self.page[1] - 2.0 * MARGIN - _HEADER - _FOOTER)


ROOMS: dict[Paper, Room] = {
    Paper.A4: Room(page=A4, line=45.0 * mm, trend=28.0 * mm),
    Paper.LETTER: Room(page=LETTER, line=32.0 * mm, trend=19.0 * mm),
}


class Document(BaseDocTemplate):  # type: ignore[misc]  # the library publishes no types
    """Pages with the job above and what made them below."""

    def __init__(self, target: BytesIO, result: CheckResult, room: Room) -> None:
        super().__init__(
            target,
            pagesize=room.page,
            title=f"{content.HEADING}: {result.job.title}",
            author=result.job.prepared_by,
            creator="headledger",
            invariant=1,
            leftMargin=MARGIN,
            rightMargin=MARGIN,
        )
        self._result = result
        frame = Frame(
            MARGIN,
            MARGIN + _FOOTER,
            room.width,
            room.height,
            leftPadding=0,
            rightPadding=0,
            topPadding=0,
            bottomPadding=0,
        )
        self.addPageTemplates([PageTemplate("page", [frame], onPage=self._dress)])

    def _dress(self, canvas: Any, _document: Any) -> None:
        """What every page carries."""
        width, height = self.pagesize
        job = self._result.job
        top = height - MARGIN
        canvas.setFillColor(black)
        canvas.setFont(BOLD, TEXT)
        canvas.drawString(MARGIN, top - TEXT, content.HEADING)
        title = f"{job.title}, {job.site_name}" if job.site_name else job.title
        room = width - 2.0 * MARGIN - stringWidth(content.HEADING, BOLD, TEXT) - 6.0 * mm
        canvas.drawRightString(width - MARGIN, top - TEXT, cut(title, BOLD, TEXT, room))
        canvas.setFont(PLAIN, SMALL)
        canvas.drawString(MARGIN, top - TEXT - 9.0, cut(content.NOT_A_CERTIFICATE, PLAIN, SMALL, width - 2 * MARGIN))
        canvas.setStrokeColor(RULE)
        canvas.setLineWidth(0.5)
        canvas.line(MARGIN, top - TEXT - 13.0, width - MARGIN, top - TEXT - 13.0)
        canvas.line(MARGIN, MARGIN + _FOOTER - 3.0, width - MARGIN, MARGIN + _FOOTER - 3.0)
        canvas.drawString(MARGIN, MARGIN, content.made_by(self._result))


class NumberedCanvas(Canvas):  # type: ignore[misc]  # the library publishes no types
    """Writes "page n of m" once it is known how many there are."""

    def __init__(self, *args: Any, **options: Any) -> None:
        super().__init__(*args, **options)
        self._pages: list[dict[str, Any]] = []

    def showPage(self) -> None:
        """Keep the page until the last one is known."""
        self._pages.append(dict(self.__dict__))
        self._startPage()

    def save(self) -> None:
        """Number the pages and write them."""
        for number, page in enumerate(self._pages, start=1):
            self.__dict__.update(page)
            self.setFont(PLAIN, SMALL)
            self.setFillColor(black)
            self.drawRightString(self._pagesize[0] - MARGIN, MARGIN, f"page {number} of {len(self._pages)}")
            super().showPage()
        super().save()


def cut(text: str, font: str, size: float, room: float) -> str:
    """The text, shortened where it is wider than the room for it."""
    if stringWidth(text, font, size) <= room:
        return text
    while text and stringWidth(text + "…", font, size) > room:
        text = text[:-1]
    return text + "…"
