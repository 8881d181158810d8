"""The sheets on paper: a page that sums up, and a page a gauge. The same job gives the same bytes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from io import BytesIO
from typing import Any

from reportlab import rl_config
from reportlab.lib.colors import Color, black
from reportlab.lib.enums import TA_LEFT
from reportlab.lib.pagesizes import A4, LETTER
from reportlab.lib.styles import ParagraphStyle
from reportlab.lib.units import mm
from reportlab.pdfbase.pdfmetrics import stringWidth
from reportlab.pdfgen.canvas import Canvas
from reportlab.platypus import (
    BaseDocTemplate,
    Flowable,
    Frame,
    KeepTogether,
    PageBreak,
    PageTemplate,
    Paragraph,
    Spacer,
    Table,
)

from headledger.diagnosis.result import CheckResult, GaugeFound
from headledger.sheets import content
from headledger.sheets.content import GaugePage
from headledger.sheets.fonts import BOLD, PLAIN, register_fonts
from headledger.sheets.gauge_facts import conditions
from headledger.sheets.grade_picture import best_way, grade_picture, tells_most
from headledger.sheets.headline import headline
from headledger.sheets.marks import CAUTIONS, by_trouble
from headledger.sheets.paper import PictureOnPaper
from headledger.sheets.paths import Way, way_past, ways_through
from headledger.sheets.trend_picture import trend_picture

# Pages as compressed bytes, not as letters that stand for them: a tenth quicker, and smaller.
rl_config.useA85 = 0

MARGIN = 14.0 * mm
"""Nothing is drawn nearer to the edge of the paper. [pt]"""

_HEADER, _FOOTER = 10.0 * mm, 5.0 * mm
_RULE = Color(0.6, 0.6, 0.6)
_SMALL, _TEXT, _LARGE = 6.6, 7.7, 13.0


class Paper(StrEnum):
    """Sizes of paper."""

    A4 = "a4"
    LETTER = "letter"


@dataclass(frozen=True, slots=True, kw_only=True)
class _Room:
    """What a page holds: its size, and how high the pictures may be so that a gauge keeps to one page. [pt]"""

    page: tuple[float, float]
    line: float
    trend: float

    @property
    def width(self) -> float:
        """Between the margins."""
        return float(self.page[0] - 2.0 * MARGIN)


_ROOMS: dict[Paper, _Room] = {
    Paper.A4: _Room(page=A4, line=45.0 * mm, trend=28.0 * mm),
    Paper.LETTER: _Room(page=LETTER, line=32.0 * mm, trend=19.0 * mm),
}


def sheets_to_pdf(result: CheckResult, *, paper: Paper = Paper.A4, gauges: Sequence[str] | None = None) -> bytes:
    """The sheets of a check as one PDF.

    Parameters
    ----------
    result : CheckResult
    paper : Paper
    gauges : sequence of str, optional
        Tags of the gauges that get a page; all by default.

    Returns
    -------
    bytes
        The same for the same result: it holds no time of printing.
    """
    register_fonts()
    buffer = BytesIO()
    room = _ROOMS[paper]
    document = _Document(buffer, result, room.page)
    chosen = [gauge for gauge in by_trouble(result.gauges) if gauges is None or gauge.tag in gauges]
    story = _summary(result, room)
    ways = ways_through(result.job)
    for gauge in chosen:
        story += [PageBreak(), *_gauge_page(result, gauge, ways, room)]
    document.build(story, canvasmaker=_NumberedCanvas)
    return buffer.getvalue()


class _Document(BaseDocTemplate):  # type: ignore[misc]  # the library publishes no types
    """Pages with the job above and what made them below."""

    def __init__(self, target: BytesIO, result: CheckResult, size: tuple[float, float]) -> None:
        super().__init__(
            target,
            pagesize=size,
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
            size[0] - 2.0 * MARGIN,
            size[1] - 2.0 * MARGIN - _HEADER - _FOOTER,
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
        canvas.setFont(BOLD, _TEXT)
        canvas.drawString(MARGIN, top - _TEXT, content.HEADING)
        title = f"{job.title}, {job.site_name}" if job.site_name else job.title
        room = width - 2.0 * MARGIN - stringWidth(content.HEADING, BOLD, _TEXT) - 6.0 * mm
        canvas.drawRightString(width - MARGIN, top - _TEXT, _cut(title, BOLD, _TEXT, room))
        canvas.setFont(PLAIN, _SMALL)
        canvas.drawString(MARGIN, top - _TEXT - 9.0, _cut(content.NOT_A_CERTIFICATE, PLAIN, _SMALL, width - 2 * MARGIN))
        canvas.setStrokeColor(_RULE)
        canvas.setLineWidth(0.5)
        canvas.line(MARGIN, top - _TEXT - 13.0, width - MARGIN, top - _TEXT - 13.0)
        canvas.line(MARGIN, MARGIN + _FOOTER - 3.0, width - MARGIN, MARGIN + _FOOTER - 3.0)
        canvas.drawString(MARGIN, MARGIN, content.made_by(self._result))


class _NumberedCanvas(Canvas):  # type: ignore[misc]  # the library publishes no types
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
            self.setFont(PLAIN, _SMALL)
            self.setFillColor(black)
            self.drawRightString(self._pagesize[0] - MARGIN, MARGIN, f"page {number} of {len(self._pages)}")
            super().showPage()
        super().save()


def _cut(text: str, font: str, size: float, room: float) -> str:
    """The text, shortened where it is wider than the room for it."""
    if stringWidth(text, font, size) <= room:
        return text
    while text and stringWidth(text + "…", font, size) > room:
        text = text[:-1]
    return text + "…"


def _style(size: float = _TEXT, *, bold: bool = False, before: float = 0.0, after: float = 0.0) -> ParagraphStyle:
    font = BOLD if bold else PLAIN
    return ParagraphStyle(
        f"{font}{size}{before}{after}",
        fontName=font,
        fontSize=size,
        leading=1.2 * size,
        alignment=TA_LEFT,
        spaceBefore=before,
        spaceAfter=after,
        splitLongWords=1,
    )


_BODY = _style()
_FINE = _style(_SMALL)
_PRINT = _style(5.4)
_STRONG = _style(bold=True, before=3.0)
_SECTION = _style(8.5, bold=True, before=4.0, after=1.0)
_TITLE = _style(_LARGE, bold=True)


def _words(text: str, style: ParagraphStyle = _BODY) -> Paragraph:
    """Words from files, never taken for markup."""
    safe = text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    return Paragraph(safe.replace("\n", "<br/>"), style)


def _table(
    head: Sequence[str],
    rows: Sequence[Sequence[str]],
    widths: Sequence[float],
    *,
    right: Sequence[int] = (),
    size: float = 7.2,
) -> Table:
    """A table with a head that repeats on every page; cells that are too long for their column wrap."""
    style = _style(size)
    body = [
        [
            _words(cell, style) if stringWidth(cell, PLAIN, size) > width - 5.0 else cell
            for cell, width in zip(row, widths, strict=True)
        ]
        for row in rows
    ]
    heads = [
        _words(cell, _style(size, bold=True)) if stringWidth(cell, BOLD, size) > width - 5.0 else cell
        for cell, width in zip(head, widths, strict=True)
    ]
    commands: list[tuple[Any, ...]] = [
        ("FONT", (0, 0), (-1, -1), PLAIN, size),
        ("FONT", (0, 0), (-1, 0), BOLD, size),
        ("LEADING", (0, 0), (-1, -1), 1.25 * size),
        ("LINEBELOW", (0, 0), (-1, 0), 0.6, black),
        ("LINEBELOW", (0, 1), (-1, -1), 0.25, _RULE),
        ("VALIGN", (0, 0), (-1, -1), "TOP"),
        ("LEFTPADDING", (0, 0), (-1, -1), 2),
        ("RIGHTPADDING", (0, 0), (-1, -1), 3),
        ("TOPPADDING", (0, 0), (-1, -1), 1.2),
        ("BOTTOMPADDING", (0, 0), (-1, -1), 2.2),
        *(("ALIGN", (column, 0), (column, -1), "RIGHT") for column in right),
    ]
    return Table([heads, *body], colWidths=list(widths), repeatRows=1, style=commands)


def _facts(facts: Sequence[tuple[str, str]], width: float) -> Table:
    """Labels and values below one another."""
    label = 1.0 + max(stringWidth(name, BOLD, 7.2) for name, _ in facts) + 5.0
    style = _style(7.2)
    rows = [
        [name, _words(value, style) if stringWidth(value, PLAIN, 7.2) > width - label - 5.0 else value]
        for name, value in facts
    ]
    return Table(
        rows,
        colWidths=[label, width - label],
        style=[
            ("FONT", (0, 0), (0, -1), BOLD, 7.2),
            ("FONT", (1, 0), (1, -1), PLAIN, 7.2),
            ("LEADING", (0, 0), (-1, -1), 9.0),
            ("VALIGN", (0, 0), (-1, -1), "TOP"),
            ("LEFTPADDING", (0, 0), (-1, -1), 0),
            ("RIGHTPADDING", (0, 0), (-1, -1), 2),
            ("TOPPADDING", (0, 0), (-1, -1), 0.4),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 0.8),
        ],
    )


def _summary(result: CheckResult, room: _Room) -> list[Flowable]:
    """The page that sums up."""
    width = room.width
    story: list[Flowable] = [_words(result.job.title, _TITLE)]
    beside = [
        text
        for text in (result.job.site_name, result.job.prepared_by and f"prepared by {result.job.prepared_by}")
        if text
    ]
    story += [_words(", ".join(beside))] if beside else []
    story.append(Spacer(1, 4))
    answers = [(answer.question, "\n".join(answer.lines)) for answer in headline(result)]
    story.append(_answer_table(answers, width))
    story += _way_picture(result, ways_through(result.job), room)
    story.append(_words("Gauges", _SECTION))
    shares = (0.13, 0.17, 0.17, 0.11, 0.1, 0.11, 0.09, 0.12)
    story.append(
        _table(content.GAUGES_HEAD, content.gauge_rows(result), [s * width for s in shares], right=(3, 4, 5, 7))
    )
    story += [_words("Findings", _SECTION), *_finding_lines(content.findings(result))]
    checks = content.next_checks(result)
    if checks or result.answers:
        story.append(_words("Next checks", _SECTION))
        story += [_words(f"Taken into account: {text}") for text in result.answers]
        story += [_words(f"{says} {worth}", _FINE) for says, worth in checks]
    story.append(_words(f"Spells (times in {result.job.timezone})", _SECTION))
    spell_shares = (0.07, 0.1, 0.25, 0.08, 0.5)
    story.append(_table(content.SPELLS_HEAD, content.spell_rows(result), [s * width for s in spell_shares], right=(3,)))
    if result.remarks or result.reject_count:
        story.append(_words("Taken as given, and not used", _SECTION))
        story += (
            [_words(f"{result.reject_count} entries of the logs could not be used.", _FINE)]
            if result.reject_count
            else []
        )
        story += [_words(line, _FINE) for line in result.remarks]
    under_what = [_words("Conditions", _SECTION), _facts(conditions(result.job), width)]
    signed = [_words("Caution", _SECTION), _cautions(), *_signatures(width), *_inputs(result)]
    story.append(KeepTogether([*under_what, *signed]))
    return story


def _answer_table(answers: Sequence[tuple[str, str]], width: float) -> Table:
    label = 32.0 * mm
    rows = [[question, _words(text)] for question, text in answers]
    return Table(
        rows,
        colWidths=[label, width - label],
        style=[
            ("FONT", (0, 0), (0, -1), BOLD, _TEXT),
            ("LEADING", (0, 0), (-1, -1), 10.0),
            ("VALIGN", (0, 0), (-1, -1), "TOP"),
            ("LEFTPADDING", (0, 0), (-1, -1), 3),
            ("RIGHTPADDING", (0, 0), (-1, -1), 3),
            ("TOPPADDING", (0, 0), (-1, -1), 1.5),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 2.5),
            ("BOX", (0, 0), (-1, -1), 0.6, black),
        ],
    )


def _way_picture(
    result: CheckResult, ways: Sequence[Way], room: _Room, tag: str = "", station: str = ""
) -> list[Flowable]:
    """The line along the pipe: past the leading cause, or past a gauge, which is marked."""
    if not ways or not result.spells:
        return []
    past = way_past(ways, station=station) if station else best_way(result, ways)
    spell = result.spells[tells_most(result)]
    drawing = grade_picture(result, ways[past or 0], spell, chosen=tag)
    return [Spacer(1, 5), PictureOnPaper(drawing, room.width, room.line)]


def _finding_lines(findings: Sequence[tuple[str, str]]) -> list[Flowable]:
    if not findings:
        return [_words("No cause has weight.")]
    lines: list[Flowable] = []
    for label, sentence in findings:
        lines += [_words(label, _STRONG)] if label else []
        lines.append(_words(sentence))
    return lines


def _inputs(result: CheckResult) -> list[Flowable]:
    """Every input with its fingerprint, in small print."""
    return [_words("\n".join(content.input_lines(result)), _PRINT)]


def _cautions() -> Paragraph:
    return _words(" ".join(CAUTIONS), _FINE)


def _signatures(width: float) -> list[Flowable]:
    """Room to sign."""
    blank = ["", "", ""]
    rows = [[f"{name}:", "Name", "Signature", "Date"] for name in content.SIGNATURES]
    cells: list[list[str]] = []
    for row in rows:
        cells += [["", *blank], row]
    label = 28.0 * mm
    rest = (width - label) / 3.0
    commands: list[tuple[Any, ...]] = [
        ("FONT", (0, 0), (-1, -1), PLAIN, _SMALL),
        ("FONT", (0, 0), (0, -1), BOLD, 7.2),
        ("LEFTPADDING", (0, 0), (-1, -1), 2),
        ("TOPPADDING", (0, 0), (-1, -1), 1),
        ("BOTTOMPADDING", (0, 0), (-1, -1), 1),
    ]
    for line in range(0, len(cells), 2):
        commands.append(("LINEBELOW", (1, line), (-1, line), 0.5, black))
    heights = [15.0 if line % 2 == 0 else 10.0 for line in range(len(cells))]
    return [Table(cells, colWidths=[label, rest, rest, rest], rowHeights=heights, style=commands)]


def _gauge_page(result: CheckResult, gauge: GaugeFound, ways: Sequence[Way], room: _Room) -> list[Flowable]:
    """Everything on one gauge."""
    width = room.width
    page = content.gauge_page(result, gauge)
    story: list[Flowable] = [
        _title_line(page, width),
        _words(page.why, _BODY),
        Spacer(1, 4),
        _identity(page, width),
        _words("Own error, as found", _SECTION),
        _table(page.error_head, [page.error], [width / 6.0] * 6, right=range(6)),
        _words("Spell by spell", _SECTION),
        _table(
            page.spell_head,
            page.spells,
            [s * width for s in (0.12, 0.26, 0.19, 0.13, 0.1, 0.1, 0.1)],
            right=(3, 4, 5, 6),
        ),
        *_way_picture(result, ways, room, gauge.tag, gauge.station),
    ]
    trend = trend_picture(result, gauge)
    if trend is not None:
        story += [Spacer(1, 3), PictureOnPaper(trend, width, room.trend)]
    story += [_words("Causes and what they cannot be told from", _SECTION), *_finding_lines(page.findings)]
    story.append(
        KeepTogether(
            [
                _words("As left, by hand", _SECTION),
                _as_left(width),
                _words("Caution", _SECTION),
                _cautions(),
                *_signatures(width),
                *_inputs(result),
            ]
        )
    )
    return story


def _identity(page: GaugePage, width: float) -> Table:
    """What the gauge is in two columns, what the check stands on in a third."""
    cut = (len(page.identity) + 1) // 2
    widths = [0.29 * width, 0.27 * width, 0.44 * width]
    parts = (page.identity[:cut], page.identity[cut:], page.conditions)
    return Table(
        [[_facts(facts, room - 6.0) for facts, room in zip(parts, widths, strict=True)]],
        colWidths=widths,
        style=[
            ("VALIGN", (0, 0), (-1, -1), "TOP"),
            ("LEFTPADDING", (0, 0), (-1, -1), 0),
            ("RIGHTPADDING", (0, 0), (-1, -1), 6),
            ("TOPPADDING", (0, 0), (-1, -1), 0),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 0),
        ],
    )


def _title_line(page: GaugePage, width: float) -> Table:
    verdict_width = 16.0 + stringWidth(page.verdict, BOLD, _LARGE)
    return Table(
        [[_words(page.title, _TITLE), page.verdict]],
        colWidths=[width - verdict_width, verdict_width],
        style=[
            ("FONT", (1, 0), (1, 0), BOLD, _LARGE),
            ("ALIGN", (1, 0), (1, 0), "CENTER"),
            ("VALIGN", (0, 0), (-1, -1), "MIDDLE"),
            ("LEFTPADDING", (0, 0), (0, 0), 0),
            ("BOX", (1, 0), (1, 0), 1.2, black),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 5),
        ],
    )


def _as_left(width: float) -> Table:
    """A row to be filled in by hand after an adjustment."""
    names = ("Adjusted (yes / no)", "Reads before", "Reads after", "Reference used, its certificate", "Time")
    shares = (0.17, 0.16, 0.16, 0.33, 0.18)
    return Table(
        [list(names), [""] * len(names)],
        colWidths=[s * width for s in shares],
        rowHeights=[10.0, 18.0],
        style=[
            ("FONT", (0, 0), (-1, -1), PLAIN, _SMALL),
            ("GRID", (0, 0), (-1, -1), 0.4, _RULE),
            ("LEFTPADDING", (0, 0), (-1, -1), 2),
            ("TOPPADDING", (0, 0), (-1, -1), 1),
        ],
    )
