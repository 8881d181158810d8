"""The sheets on paper: a page that sums up, and a page a gauge. The same job gives the same bytes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from io import BytesIO

from reportlab import rl_config
from reportlab.platypus import Flowable, KeepTogether, PageBreak, Spacer

from headledger.diagnosis.result import CheckResult, GaugeFound
from headledger.sheets import content
from headledger.sheets.content import GaugePage
from headledger.sheets.fonts import register_fonts
from headledger.sheets.gauge_facts import conditions
from headledger.sheets.grade_picture import best_way, grade_picture, tells_most
from headledger.sheets.headline import headline
from headledger.sheets.marks import by_trouble
from headledger.sheets.paper import PictureOnPaper
from headledger.sheets.paths import Way, way_past, ways_through
from headledger.sheets.pdf_paper import ROOMS, Document, NumberedCanvas, Paper, Room
from headledger.sheets.pdf_parts import (
    BODY,
    FINE,
    SECTION,
    TITLE,
    answer_table,
    as_left,
    cautions,
    finding_lines,
    height_of,
    identity,
    inputs,
    signatures,
    table,
    title_line,
    words,
)
from headledger.sheets.trend_picture import trend_picture

# Pages as compressed bytes, not as letters that stand for them: a tenth quicker, and smaller.
rl_config.useA85 = 0

LOW_SHARE = 0.65
"""Height of the summary's picture beside next checks, as a part of its usual one. [-]"""


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
    room = ROOMS[paper]
    document = Document(buffer, result, room)
    chosen = [gauge for gauge in by_trouble(result.gauges) if gauges is None or gauge.tag in gauges]
    story = _summary(result, room)
    ways = ways_through(result.job)
    for gauge in chosen:
        story += [PageBreak(), *_gauge_page(result, gauge, ways, room)]
    document.build(story, canvasmaker=NumberedCanvas)
    return buffer.getvalue()


def _summary(result: CheckResult, room: Room) -> list[Flowable]:
    """The page that sums up."""
    width = room.width
    story: list[Flowable] = [words(result.job.title, TITLE)]
    beside = [
        text
        for text in (result.job.site_name, result.job.prepared_by and f"prepared by {result.job.prepared_by}")
        if text
    ]
    story += [words(", ".join(beside))] if beside else []
    story.append(Spacer(1, 4))
    answers = [(answer.question, "\n".join(answer.lines)) for answer in headline(result)]
    story.append(answer_table(answers, width))
    # what is to be done next takes its place from the picture, so that the page stays one
    low = replace(room, line=LOW_SHARE * room.line) if result.next_checks else room
    story += _way_picture(result, ways_through(result.job), low)
    story.append(words("Gauges", SECTION))
    shares = (0.13, 0.17, 0.17, 0.11, 0.1, 0.11, 0.09, 0.12)
    story.append(
        table(content.GAUGES_HEAD, content.gauge_rows(result), [s * width for s in shares], right=(3, 4, 5, 7))
    )
    story += [words("Findings", SECTION), *finding_lines(content.findings(result))]
    checks = content.next_checks(result)
    if checks or result.answers:
        story.append(words("Next checks", SECTION))
        story += [words(f"Taken into account: {text}") for text in result.answers]
        story += [words(f"{says} {worth}", FINE) for says, worth in checks]
    story.append(words(f"Spells (times in {result.job.timezone})", SECTION))
    spell_shares = (0.07, 0.1, 0.25, 0.08, 0.5)
    story.append(table(content.SPELLS_HEAD, content.spell_rows(result), [s * width for s in spell_shares], right=(3,)))
    if result.remarks or result.reject_count:
        story.append(words("Taken as given, and not used", SECTION))
        story += (
            [words(f"{result.reject_count} entries of the logs could not be used.", FINE)]
            if result.reject_count
            else []
        )
        story += [words(line, FINE) for line in result.remarks]
    held = "; ".join(f"{label.lower()} {value}" for label, value in conditions(result.job))
    under_what = [words("Conditions", SECTION), words(held, FINE)]
    signed = [words("Caution", SECTION), cautions(), *signatures(width), *inputs(result)]
    story.append(KeepTogether([*under_what, *signed]))
    return story


def _way_picture(
    result: CheckResult, ways: Sequence[Way], room: Room, tag: str = "", station: str = ""
) -> list[Flowable]:
    """The line along the pipe: past the leading cause, or past a gauge, which is marked."""
    if not ways or not result.spells:
        return []
    past = way_past(ways, station=station) if station else best_way(result, ways)
    spell = result.spells[tells_most(result)]
    drawing = grade_picture(result, ways[past or 0], spell, chosen=tag)
    return [Spacer(1, 5), PictureOnPaper(drawing, room.width, room.line)]


def _gauge_page(result: CheckResult, gauge: GaugeFound, ways: Sequence[Way], room: Room) -> list[Flowable]:
    """Everything on one gauge, on one page: for that, pictures are drawn lower, then less is told of what findings rest on."""
    page = content.gauge_page(result, gauge)
    foot = _gauge_foot(result, room.width)
    head = _gauge_head(result, page, ways, room)
    lower = room.lower()
    for told in range(len(page.behind), -1, -1):
        findings = _gauge_findings(page, told)
        left = room.height - height_of([*findings, *foot], room.width)
        if height_of(head, room.width) <= left:
            break
        if height_of(head, room.width) - room.pictures + lower.pictures <= left:
            head = _gauge_head(result, page, ways, lower)
            break
    return [*head, *findings, KeepTogether(foot)]


def _gauge_head(result: CheckResult, page: GaugePage, ways: Sequence[Way], room: Room) -> list[Flowable]:
    """What a gauge is, its numbers and its pictures."""
    width, gauge = room.width, page.gauge
    story: list[Flowable] = [
        title_line(page, width),
        words(page.why, BODY),
        Spacer(1, 4),
        identity(page, width),
        words("Own error, as found", SECTION),
        table(page.error_head, [page.error], [width / 6.0] * 6, right=range(6)),
        *([words(page.budget, FINE)] if page.budget else []),
        words("Spell by spell", SECTION),
        table(
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
    return story


def _gauge_findings(page: GaugePage, told: int) -> list[Flowable]:
    """A gauge's findings, with what so many of them rest on."""
    return [
        words("Causes and what they cannot be told from", SECTION),
        *finding_lines(page.findings, page.behind[:told]),
        *([words(content.NUMBERS_ELSEWHERE, FINE)] if any(page.behind[told:]) else []),
    ]


def _gauge_foot(result: CheckResult, width: float) -> list[Flowable]:
    """What is filled in by hand, and what every page ends with."""
    return [
        words("As left, by hand", SECTION),
        as_left(width),
        words("Caution", SECTION),
        cautions(),
        *signatures(width),
        *inputs(result),
    ]
