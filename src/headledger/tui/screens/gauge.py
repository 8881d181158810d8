"""The page of one gauge: its verdict and why, what it read over time, and its numbers by spell."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical, VerticalScroll
from textual.reactive import var
from textual.screen import Screen
from textual.widgets import Footer, Static

from headledger.diagnosis.result import CheckResult
from headledger.sheets.gauge_facts import identity_lines
from headledger.sheets.marks import CAUTIONS, by_trouble
from headledger.sheets.trend_picture import trend_picture
from headledger.tui.screens.why import WhyScreen
from headledger.tui.widgets.findings_list import FindingsList
from headledger.tui.widgets.gauge_detail import GaugeDetail
from headledger.tui.widgets.picture_view import PictureView
from headledger.tui.widgets.title_line import TitleLine


class GaugeScreen(Screen[tuple[str, int]]):
    """One gauge; dismissed with the tag and the spell that were on it last.

    Parameters
    ----------
    result : CheckResult
    tag : str
    spell_index : int
    """

    HELP = """\
What one gauge read over the whole log, what it should have read in each spell, and its numbers.

The shaded stretches are the spells, the line across each is what everything else says the gauge should read, with its 95 % band.

- **← →** step through the spells, **n** and **p** to the next gauge and the one before, the worst news first
- **y** shows why: what its findings rest on, and where its uncertainty comes from
- **esc** back to the line along the pipe
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "back", "Back", id="back"),
        Binding("left", "spell(-1)", "Spell", id="spell-before", key_display="← →", priority=True),
        Binding("right", "spell(1)", "Spell", id="spell-after", show=False, priority=True),
        Binding("n", "gauge(1)", "Next gauge", id="next-gauge"),
        Binding("p", "gauge(-1)", "Gauge before", id="gauge-before"),
        Binding("y", "why", "Why", id="why"),
    ]

    spell_index: var[int] = var(0, init=False)
    tag: var[str] = var("", init=False)

    def __init__(self, result: CheckResult, tag: str, spell_index: int) -> None:
        super().__init__()
        self._result = result
        self._gauges = by_trouble(result.gauges)
        self.set_reactive(GaugeScreen.tag, tag)
        self.set_reactive(GaugeScreen.spell_index, spell_index)

    def compose(self) -> ComposeResult:
        """Trend above, words and numbers below; side by side where there is room."""
        yield TitleLine(f"{self._result.job.title}   {self._result.job.site_name}".rstrip())
        with Vertical(id="page"):
            yield PictureView(id="trend")
            with VerticalScroll(id="words"):
                yield GaugeDetail(self._result.spells)
                yield Vertical(id="causes")
                yield Static("", id="identity", markup=False)
        yield Static(CAUTIONS[0], id="caution", markup=False)
        yield Footer()

    async def on_mount(self) -> None:
        """Show the gauge."""
        self.query_one("#words").focus()
        await self._show()

    async def watch_tag(self) -> None:
        """Show another gauge."""
        await self._show()

    def watch_spell_index(self) -> None:
        """Show another spell."""
        self._draw()

    def action_back(self) -> None:
        """Back, with what was looked at last."""
        self.dismiss((self.tag, self.spell_index))

    def action_why(self) -> None:
        """Show what its findings rest on."""
        self.app.push_screen(WhyScreen(self._result, self.tag))

    def action_spell(self, by: int) -> None:
        """The spell before or after."""
        self.spell_index = (self.spell_index + by) % len(self._result.spells)

    def action_gauge(self, by: int) -> None:
        """The next gauge in the order of trouble, or the one before."""
        tags = [gauge.tag for gauge in self._gauges]
        self.tag = tags[(tags.index(self.tag) + by) % len(tags)]

    async def _show(self) -> None:
        gauge = self._result.gauges[[one.tag for one in self._result.gauges].index(self.tag)]
        self.query_one(GaugeDetail).gauge = gauge
        held = self.query_one("#causes", Vertical)
        await held.remove_children()
        await held.mount(FindingsList(tuple(self._result.causes[i] for i in (*gauge.causes, *gauge.given))))
        self.query_one("#identity", Static).update("\n".join(identity_lines(self._result, gauge)))
        self.query_one("#words", VerticalScroll).scroll_home(animate=False)
        self._draw()

    def _draw(self) -> None:
        gauge = self._result.gauges[[one.tag for one in self._result.gauges].index(self.tag)]
        spell_id = self._result.spells[self.spell_index].id
        self.query_one(GaugeDetail).spell_id = spell_id
        self.query_one(PictureView).drawing = trend_picture(self._result, gauge, spell_id=spell_id)
