"""What the check found: five answers, the line drawn out along the pipe, every gauge, every finding."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar, cast

from textual import on
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Container, Vertical, VerticalScroll
from textual.reactive import var
from textual.screen import Screen
from textual.widgets import DataTable, Footer, Static

from headledger.diagnosis.result import CheckResult, GaugeFound
from headledger.sheets.grade_picture import best_way, grade_picture, tells_most
from headledger.sheets.headline import headline
from headledger.sheets.marks import CAUTIONS
from headledger.sheets.paths import way_past, ways_through
from headledger.tui.gauge_search import GaugeSearch
from headledger.tui.screens.gauge import GaugeScreen
from headledger.tui.screens.sight import SightScreen
from headledger.tui.screens.why import WhyScreen
from headledger.tui.widgets.answers import Answers
from headledger.tui.widgets.findings_list import FindingsList
from headledger.tui.widgets.gauge_detail import GaugeDetail
from headledger.tui.widgets.gauge_table import GaugeTable
from headledger.tui.widgets.next_checks_list import NextChecksList
from headledger.tui.widgets.picture_view import PictureView
from headledger.tui.widgets.title_line import TitleLine

if TYPE_CHECKING:
    from headledger.tui.app import HeadledgerApp


# Lines of a terminal in which the answers in full leave enough for picture and gauges.
_ROOM_FOR_ANSWERS = 40


class FindingsScreen(Screen[None]):
    """The first screen after a check.

    Parameters
    ----------
    result : CheckResult
    """

    HELP = """\
The answers stand at the top. Below them the line is drawn out along the pipe: the ground is the pipe, the line above it is the grade
line that the energy balance expects, and every gauge stands at the head that it read.

Marks: ▲ fail, ? unresolved, – unchecked, ✓ pass; ↑ or ↓ beside a gauge means that its head lies beyond the picture;
≈ means that the scale leaves something out; ○ is trapped air.

- **← →** step through the spells, **↑ ↓** through the gauges, the worst news first
- **enter** opens the page of the chosen gauge
- **w** draws another way through the piping
- **a** shows the answers in full, or a line each
- **f** shows the findings, what the data cannot tell them from, and the next checks, and leads back; **g** leads to the gauges
- **s** shows how small a trouble these readings could have shown, and where
- **y** shows why: what a finding rests on, and where the uncertainty of the chosen gauge comes from
- **r** checks the job again, with what is in its folder now
"""
    COMMANDS: ClassVar = Screen.COMMANDS | {GaugeSearch}
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("left", "spell(-1)", "Spell", id="spell-before", key_display="← →", priority=True),
        Binding("right", "spell(1)", "Spell", id="spell-after", show=False, priority=True),
        Binding("w", "way", "Way", id="way"),
        Binding("a", "unfold", "Answers", id="unfold"),
        Binding("f", "findings", "Findings", id="findings"),
        Binding("s", "sight", "Sight", id="sight"),
        Binding("g", "gauges", "Gauges", id="gauges", show=False),
        Binding("enter", "open", "Gauge", id="open", priority=True),
        Binding("y", "why", "Why", id="why"),
        Binding(
            "r",
            "again",
            "Again",
            id="again",
            show=False,
            tooltip="Check the job again, with what is in its folder now",
        ),
    ]

    spell_index: var[int] = var(0, init=False)
    way_index: var[int] = var(0, init=False)

    def __init__(self, result: CheckResult) -> None:
        super().__init__()
        self.result = result
        self._ways = ways_through(result.job)
        self._tag = ""
        self.set_reactive(FindingsScreen.spell_index, tells_most(result))
        self.set_reactive(FindingsScreen.way_index, best_way(result, self._ways))

    def compose(self) -> ComposeResult:
        """Answers above, then the picture, then gauges and findings, side by side where there is room."""
        result = self.result
        yield TitleLine(f"{result.job.title}   {result.job.site_name}".rstrip())
        yield Answers(headline(result))
        with Container(id="body"):
            with Vertical(id="line"):
                yield PictureView(id="picture")
                yield GaugeTable(result.gauges)
            with VerticalScroll(id="aside"):
                yield GaugeDetail(result.spells)
                yield FindingsList(result.causes)
                yield NextChecksList(result)
                yield Static("\n".join(CAUTIONS[1:]), id="cautions", markup=False)
        yield Static(CAUTIONS[0], id="caution", markup=False)
        yield Footer()

    def on_mount(self) -> None:
        """Start at the worst gauge; where there is room, with the answers in full."""
        self.query_one(GaugeTable).focus()
        self.query_one(Answers).unfolded = self.app.size.height >= _ROOM_FOR_ANSWERS
        self.query_one(GaugeDetail).spell_id = self.result.spells[self.spell_index].id
        self._draw()

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Only what makes sense here has a key: another way where there is one."""
        if action == "sight":
            return self.result.sight is not None
        return len(self._ways) > 1 if action == "way" else True

    def watch_spell_index(self) -> None:
        """Another spell: the scales stay, the line moves."""
        self.query_one(GaugeDetail).spell_id = self.result.spells[self.spell_index].id
        self._draw()

    def watch_way_index(self) -> None:
        """Another way through the piping."""
        self._draw()

    @on(DataTable.RowHighlighted)
    def _choose_gauge(self, event: DataTable.RowHighlighted) -> None:
        gauge = self.query_one(GaugeTable).gauge_at(event.cursor_row)
        self.query_one(GaugeDetail).gauge = gauge
        self._tag = gauge.tag
        self._show_its_way(gauge)
        self._draw()

    @on(DataTable.RowSelected)
    def _open_gauge(self, event: DataTable.RowSelected) -> None:
        self.open_gauge(self.query_one(GaugeTable).gauge_at(event.cursor_row).tag)

    def open_gauge(self, tag: str) -> None:
        """Open the page of a gauge; coming back, it and its spell are the chosen ones."""
        self.app.push_screen(GaugeScreen(self.result, tag, self.spell_index), self._come_back)

    def _come_back(self, left_at: tuple[str, int] | None) -> None:
        if left_at is not None:
            self.query_one(GaugeTable).choose(left_at[0])
            self.spell_index = left_at[1]

    def action_spell(self, by: int) -> None:
        """The spell before or after."""
        self.spell_index = (self.spell_index + by) % len(self.result.spells)

    def action_way(self) -> None:
        """The next way through the piping."""
        self.way_index = (self.way_index + 1) % len(self._ways)

    def action_unfold(self) -> None:
        """Show the answers in full, or a line each."""
        answers = self.query_one(Answers)
        answers.unfolded = not answers.unfolded

    def action_gauges(self) -> None:
        """Move to the table."""
        self.remove_class("-findings")
        self.query_one(GaugeTable).focus()

    def action_findings(self) -> None:
        """Move to the findings, or back; where there is room for one thing only, they stand in place of the rest."""
        if self.has_class("-findings"):
            self.action_gauges()
            return
        self.add_class("-findings")
        aside = self.query_one("#aside", VerticalScroll)
        aside.focus()
        self.call_after_refresh(aside.scroll_to_widget, self.query_one(FindingsList), top=True, animate=False)

    def action_open(self) -> None:
        """Open the page of the chosen gauge."""
        if self._tag:
            self.open_gauge(self._tag)

    def action_sight(self) -> None:
        """Show what these readings could have shown."""
        if self.result.sight is not None:
            self.app.push_screen(SightScreen(self.result.job, self.result.sight, self.way_index))

    def action_why(self) -> None:
        """Show what the findings rest on, those of the chosen gauge first."""
        if self._tag:
            self.app.push_screen(WhyScreen(self.result, self._tag))

    def action_again(self) -> None:
        """Check the job anew."""
        cast("HeadledgerApp", self.app).check_again()

    def _show_its_way(self, gauge: GaugeFound) -> None:
        """Where the chosen gauge is not on the way that is drawn, draw one past it."""
        if self._ways and gauge.station not in self._ways[self.way_index].stations:
            past = way_past(self._ways, station=gauge.station)
            if past is not None:
                self.way_index = past

    def _draw(self) -> None:
        if not self._ways:
            return
        spell, way = self.result.spells[self.spell_index], self._ways[self.way_index]
        self.query_one(PictureView).drawing = grade_picture(self.result, way, spell, chosen=self._tag)
