"""What the check found: five answers, every gauge, every finding."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar, cast

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container, VerticalScroll
from textual.screen import Screen
from textual.widgets import DataTable, Footer, Static

from headledger.diagnosis.result import CheckResult
from headledger.sheets.headline import headline
from headledger.sheets.marks import CAUTIONS
from headledger.tui.widgets.answers import Answers
from headledger.tui.widgets.findings_list import FindingsList
from headledger.tui.widgets.gauge_detail import GaugeDetail
from headledger.tui.widgets.gauge_table import GaugeTable
from headledger.tui.widgets.title_line import TitleLine

if TYPE_CHECKING:
    from headledger.tui.app import HeadledgerApp


# Lines of a terminal in which the answers in full leave enough for the gauges.
_ROOM_FOR_ANSWERS = 32


class FindingsScreen(Screen[None]):
    """The first screen after a check.

    Parameters
    ----------
    result : CheckResult
    """

    HELP = """\
The answers stand at the top, every gauge below them with the worst news first.

Move through the gauges with the arrow keys: beside (or below) stands what the chosen one read and should have read,
then every finding with what the data cannot tell it from.

- **a** shows the answers in full, or a line each
- **g** to the gauges, **f** to the findings, **tab** from one part to the next
- **r** checks the job again, with what is in its folder now
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("a", "unfold", "Answers", id="unfold"),
        Binding("g", "to_gauges", "Gauges", id="to-gauges"),
        Binding("f", "to_findings", "Findings", id="to-findings"),
        Binding("r", "again", "Check again", id="again"),
    ]

    def __init__(self, result: CheckResult) -> None:
        super().__init__()
        self._result = result

    def compose(self) -> ComposeResult:
        """Answers above, gauges and findings below or side by side."""
        result = self._result
        yield TitleLine(f"{result.job.title}   {result.job.site_name}".rstrip())
        yield Answers(headline(result))
        with Container(id="body"):
            yield GaugeTable(result.gauges)
            with VerticalScroll(id="aside"):
                yield GaugeDetail(result.spells)
                yield FindingsList(result.causes)
                yield Static("\n".join(CAUTIONS[1:]), id="cautions", markup=False)
        yield Static(CAUTIONS[0], id="caution", markup=False)
        yield Footer()

    def on_mount(self) -> None:
        """Start at the worst gauge; where there is room, with the answers in full."""
        self.query_one(GaugeTable).focus()
        self.query_one(Answers).unfolded = self.app.size.height >= _ROOM_FOR_ANSWERS

    @on(DataTable.RowHighlighted)
    def _show_gauge(self, event: DataTable.RowHighlighted) -> None:
        self.query_one(GaugeDetail).gauge = self.query_one(GaugeTable).gauge_at(event.cursor_row)

    def action_unfold(self) -> None:
        """Show the answers in full, or a line each."""
        answers = self.query_one(Answers)
        answers.unfolded = not answers.unfolded

    def action_to_gauges(self) -> None:
        """Move to the table."""
        self.query_one(GaugeTable).focus()

    def action_to_findings(self) -> None:
        """Move to the findings and bring them into view."""
        aside = self.query_one("#aside", VerticalScroll)
        aside.focus()
        aside.scroll_to_widget(self.query_one(FindingsList), top=True)

    def action_again(self) -> None:
        """Check the job anew."""
        cast("HeadledgerApp", self.app).check_again()
