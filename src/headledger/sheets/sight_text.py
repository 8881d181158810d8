"""The text report of a sight: what a visit's readings could show, or what those at hand could have shown."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from typing import TextIO

from rich.console import Console
from rich.table import Table
from rich.text import Text

from headledger.diagnosis.result import PlanResult, Sight
from headledger.plant.job import Job
from headledger.sheets.cells import draw_cells
from headledger.sheets.marks import CAUTIONS
from headledger.sheets.paths import ways_through
from headledger.sheets.plain import bulleted, plain_table, print_report, print_section, section_width
from headledger.sheets.sight_picture import sight_picture
from headledger.sheets.sight_words import GAUGES_HEAD, READ_AS, TROUBLES_HEAD, SightWords, sight_words

_PICTURE_ROWS = 14
_CANNOT = "What these readings cannot do"
_RIGHT = frozenset({"± U", "Tol.", "Seen", "Placed"})


def write_plan(plan: PlanResult, stream: TextIO, *, width: int | None = None, color: bool = True) -> None:
    """Write the report of a plan.

    Parameters
    ----------
    plan : PlanResult
    stream : TextIO
    width, color
        As of `write_report`.
    """

    def body(console: Console) -> None:
        console.print(Text(plan.job.title, style="bold"))
        if plan.job.site_name:
            console.print(Text(plan.job.site_name))
        print_sight(plan.job, plan.sight, console)
        print_section(console, "Taken as given", bulleted((*plan.sight.assumed, *plan.job.remarks)))
        print_section(console, "Caution", bulleted(CAUTIONS))

    print_report(body, stream, width=width, color=color)


def print_sight(job: Job, sight: Sight, console: Console) -> None:
    """Print the sections of a sight, the picture before what follows from it."""
    for section in sight_sections(job, sight):
        if section.title == _CANNOT:
            print_section(console, "Along the pipe", _picture(job, sight, section_width(console)))
        print_section(console, section.title, section.parts)


@dataclass(frozen=True, slots=True, kw_only=True)
class Section:
    """A title and what stands under it."""

    title: str
    parts: tuple[Table | Text, ...]


def sight_sections(job: Job, sight: Sight) -> tuple[Section, ...]:
    """The words and tables of a sight, for text and screen; sections without anything are left out."""
    words = sight_words(job, sight)
    sections = (
        Section(title="Readings", parts=(Text(words.states), Text(READ_AS))),
        Section(title="Gauges", parts=(_table(GAUGES_HEAD, words.gauges),)),
        Section(
            title="Pipe, meters and liquid",
            parts=(_table(TROUBLES_HEAD, words.troubles),) if words.troubles else (),
        ),
        Section(title=_CANNOT, parts=tuple(bulleted(words.cannot))),
        Section(title="One reading more", parts=tuple(bulleted(_further(words)))),
    )
    return tuple(section for section in sections if section.parts)


def _further(words: SightWords) -> tuple[str, ...]:
    return words.further or ("No single gauge or flow state more would sharpen this much.",)


def _table(head: tuple[str, ...], rows: Iterable[tuple[str, ...]]) -> Table:
    table = plain_table(*head, right=_RIGHT)
    for row in rows:
        table.add_row(*(Text(cell) for cell in row))
    return table


def _picture(job: Job, sight: Sight, width: int) -> Iterator[Text]:
    """The picture along the way with the most gauges, as plain cells."""
    ways = ways_through(job)
    if not ways:
        return
    drawing = sight_picture(job, sight, ways[0])
    yield Text(drawing.caption)
    for row in draw_cells(drawing, width, _PICTURE_ROWS):
        yield Text("".join(span.text for span in row).rstrip(), no_wrap=True, overflow="crop")
