"""What a page of the sheets is put together from: styles, words, tables, and the blocks that pages share."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from reportlab.lib.colors import black
from reportlab.lib.enums import TA_LEFT
from reportlab.lib.styles import ParagraphStyle
from reportlab.lib.units import mm
from reportlab.pdfbase.pdfmetrics import stringWidth
from reportlab.platypus import Flowable, Paragraph, Table

from headledger.diagnosis.result import CheckResult
from headledger.sheets import content
from headledger.sheets.content import GaugePage
from headledger.sheets.fonts import BOLD, PLAIN
from headledger.sheets.marks import CAUTIONS
from headledger.sheets.pdf_paper import LARGE, RULE, SMALL, TEXT


def style(size: float = TEXT, *, bold: bool = False, before: float = 0.0, after: float = 0.0) -> ParagraphStyle:
    """A way to set words."""
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


BODY = style()
FINE = style(SMALL)
PRINT = style(5.4)
STRONG = style(bold=True, before=3.0)
SECTION = style(8.5, bold=True, before=4.0, after=1.0)
TITLE = style(LARGE, bold=True)


_ENDLESS = 1e6


def words(text: str, style: ParagraphStyle = BODY) -> Paragraph:
    """Words from files, never taken for markup."""
    safe = text.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
    return Paragraph(safe.replace("\n", "<br/>"), style)


def height_of(flowables: Sequence[Flowable], width: float) -> float:
    """How high blocks stand below one another: the space between two is the larger of what both ask for. [pt]"""
    height = after = 0.0
    for flowable in flowables:
        height += flowable.wrap(width, _ENDLESS)[1] + max(flowable.getSpaceBefore() - after, 0.0)
        after = flowable.getSpaceAfter()
        height += after
    return height


def table(
    head: Sequence[str],
    rows: Sequence[Sequence[str]],
    widths: Sequence[float],
    *,
    right: Sequence[int] = (),
    size: float = 7.2,
) -> Table:
    """A table with a head that repeats on every page; cells that are too long for their column wrap."""
    plain = style(size)
    body = [
        [
            words(cell, plain) if stringWidth(cell, PLAIN, size) > width - 5.0 else cell
            for cell, width in zip(row, widths, strict=True)
        ]
        for row in rows
    ]
    heads = [
        words(cell, style(size, bold=True)) if stringWidth(cell, BOLD, size) > width - 5.0 else cell
        for cell, width in zip(head, widths, strict=True)
    ]
    commands: list[tuple[Any, ...]] = [
        ("FONT", (0, 0), (-1, -1), PLAIN, size),
        ("FONT", (0, 0), (-1, 0), BOLD, size),
        ("LEADING", (0, 0), (-1, -1), 1.25 * size),
        ("LINEBELOW", (0, 0), (-1, 0), 0.6, black),
        ("LINEBELOW", (0, 1), (-1, -1), 0.25, RULE),
        ("VALIGN", (0, 0), (-1, -1), "TOP"),
        ("LEFTPADDING", (0, 0), (-1, -1), 2),
        ("RIGHTPADDING", (0, 0), (-1, -1), 3),
        ("TOPPADDING", (0, 0), (-1, -1), 1.2),
        ("BOTTOMPADDING", (0, 0), (-1, -1), 2.2),
        *(("ALIGN", (column, 0), (column, -1), "RIGHT") for column in right),
    ]
    return Table([heads, *body], colWidths=list(widths), repeatRows=1, style=commands)


def facts(told: Sequence[tuple[str, str]], width: float) -> Table:
    """Labels and values below one another."""
    label = 1.0 + max(stringWidth(name, BOLD, 7.2) for name, _ in told) + 5.0
    plain = style(7.2)
    rows = [
        [name, words(value, plain) if stringWidth(value, PLAIN, 7.2) > width - label - 5.0 else value]
        for name, value in told
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


def answer_table(answers: Sequence[tuple[str, str]], width: float) -> Table:
    """Questions and their answers in a frame."""
    label = 32.0 * mm
    rows = [[question, words(text)] for question, text in answers]
    return Table(
        rows,
        colWidths=[label, width - label],
        style=[
            ("FONT", (0, 0), (0, -1), BOLD, TEXT),
            ("LEADING", (0, 0), (-1, -1), 10.0),
            ("VALIGN", (0, 0), (-1, -1), "TOP"),
            ("LEFTPADDING", (0, 0), (-1, -1), 3),
            ("RIGHTPADDING", (0, 0), (-1, -1), 3),
            ("TOPPADDING", (0, 0), (-1, -1), 1.5),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 2.5),
            ("BOX", (0, 0), (-1, -1), 0.6, black),
        ],
    )


def finding_lines(findings: Sequence[tuple[str, str]], behind: Sequence[str] = ()) -> list[Flowable]:
    """Findings with their sentences and, in fine print, what they rest on."""
    if not findings:
        return [words("No cause has weight.")]
    lines: list[Flowable] = []
    for index, (label, sentence) in enumerate(findings):
        lines += [words(label, STRONG)] if label else []
        lines.append(words(sentence))
        lines += [words(behind[index], FINE)] if index < len(behind) and behind[index] else []
    return lines


def inputs(result: CheckResult) -> list[Flowable]:
    """Every input with its fingerprint, in small print."""
    return [words("\n".join(content.input_lines(result)), PRINT)]


def cautions() -> Paragraph:
    """What no sheet is without."""
    return words(" ".join(CAUTIONS), FINE)


def signatures(width: float) -> list[Flowable]:
    """Room to sign."""
    blank = ["", "", ""]
    rows = [[f"{name}:", "Name", "Signature", "Date"] for name in content.SIGNATURES]
    cells: list[list[str]] = []
    for row in rows:
        cells += [["", *blank], row]
    label = 28.0 * mm
    rest = (width - label) / 3.0
    commands: list[tuple[Any, ...]] = [
        ("FONT", (0, 0), (-1, -1), PLAIN, SMALL),
        ("FONT", (0, 0), (0, -1), BOLD, 7.2),
        ("LEFTPADDING", (0, 0), (-1, -1), 2),
        ("TOPPADDING", (0, 0), (-1, -1), 1),
        ("BOTTOMPADDING", (0, 0), (-1, -1), 1),
    ]
    for line in range(0, len(cells), 2):
        commands.append(("LINEBELOW", (1, line), (-1, line), 0.5, black))
    heights = [15.0 if line % 2 == 0 else 10.0 for line in range(len(cells))]
    return [Table(cells, colWidths=[label, rest, rest, rest], rowHeights=heights, style=commands)]


def identity(page: GaugePage, width: float) -> Table:
    """What the gauge is in two columns, what the check stands on in a third."""
    cut = (len(page.identity) + 1) // 2
    widths = [0.29 * width, 0.27 * width, 0.44 * width]
    parts = (page.identity[:cut], page.identity[cut:], page.conditions)
    return Table(
        [[facts(part, room - 6.0) for part, room in zip(parts, widths, strict=True)]],
        colWidths=widths,
        style=[
            ("VALIGN", (0, 0), (-1, -1), "TOP"),
            ("LEFTPADDING", (0, 0), (-1, -1), 0),
            ("RIGHTPADDING", (0, 0), (-1, -1), 6),
            ("TOPPADDING", (0, 0), (-1, -1), 0),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 0),
        ],
    )


def title_line(page: GaugePage, width: float) -> Table:
    """What the page is about, with the verdict in a frame."""
    verdict_width = 16.0 + stringWidth(page.verdict, BOLD, LARGE)
    return Table(
        [[words(page.title, TITLE), page.verdict]],
        colWidths=[width - verdict_width, verdict_width],
        style=[
            ("FONT", (1, 0), (1, 0), BOLD, LARGE),
            ("ALIGN", (1, 0), (1, 0), "CENTER"),
            ("VALIGN", (0, 0), (-1, -1), "MIDDLE"),
            ("LEFTPADDING", (0, 0), (0, 0), 0),
            ("BOX", (1, 0), (1, 0), 1.2, black),
            ("BOTTOMPADDING", (0, 0), (-1, -1), 5),
        ],
    )


def as_left(width: float) -> Table:
    """A row to be filled in by hand after an adjustment."""
    names = ("Adjusted (yes / no)", "Reads before", "Reads after", "Reference used, its certificate", "Time")
    shares = (0.17, 0.16, 0.16, 0.33, 0.18)
    return Table(
        [list(names), [""] * len(names)],
        colWidths=[s * width for s in shares],
        rowHeights=[10.0, 18.0],
        style=[
            ("FONT", (0, 0), (-1, -1), PLAIN, SMALL),
            ("GRID", (0, 0), (-1, -1), 0.4, RULE),
            ("LEFTPADDING", (0, 0), (-1, -1), 2),
            ("TOPPADDING", (0, 0), (-1, -1), 1),
        ],
    )
