"""What a set of readings could show: the smallest trouble along the pipe, as picture and tables."""

from __future__ import annotations

from typing import ClassVar

from rich.console import Group
from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import VerticalScroll
from textual.reactive import var
from textual.screen import Screen
from textual.widgets import Footer, Static

from headledger.diagnosis.result import Sight
from headledger.plant.job import Job
from headledger.sheets.marks import CAUTIONS
from headledger.sheets.paths import ways_through
from headledger.sheets.sight_picture import sight_picture
from headledger.sheets.sight_text import sight_sections
from headledger.tui.widgets.picture_view import PictureView
from headledger.tui.widgets.title_line import TitleLine


class SightScreen(Screen[None]):
    """The sight of some readings.

    Parameters
    ----------
    job : Job
    sight : Sight
    way_index : int
        Of the way through the piping to draw first.
    """

    HELP = """\
How small a trouble these readings would show.

The lower line along a run is the smallest loss that would raise an alarm, the upper one the smallest that could be told from trouble
elsewhere. A gauge stands at the smallest zero shift that would raise one, its stem reaches up to where it could be told to be that
gauge. All of it is head, so that gauges and pipe compare.

- **↑ ↓** move through the tables
- **w** draws another way through the piping
- **esc** back
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape", "app.pop_screen", "Back", id="back"),
        Binding("w", "way", "Way", id="way"),
    ]

    way_index: var[int] = var(0, init=False)

    def __init__(self, job: Job, sight: Sight, way_index: int = 0) -> None:
        super().__init__()
        self._job, self._sight = job, sight
        self._ways = ways_through(job)
        self.set_reactive(SightScreen.way_index, way_index)

    def compose(self) -> ComposeResult:
        """Picture above, words and tables below."""
        yield TitleLine(f"{self._job.title}   {self._job.site_name}".rstrip())
        yield PictureView(id="sight-picture")
        with VerticalScroll(id="sight-words"):
            for section in sight_sections(self._job, self._sight):
                yield Static(section.title, classes="section-title", markup=False)
                yield Static(Group(*section.parts), classes="section-body", markup=False)
        yield Static(CAUTIONS[0], id="caution", markup=False)
        yield Footer()

    def on_mount(self) -> None:
        """Draw, and let the arrow keys move the tables."""
        self.query_one("#sight-words").focus()
        self._draw()

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Another way has a key only where there is one."""
        return len(self._ways) > 1 if action == "way" else True

    def action_way(self) -> None:
        """The next way through the piping."""
        self.way_index = (self.way_index + 1) % len(self._ways)

    def watch_way_index(self) -> None:
        """Another way through the piping."""
        self._draw()

    def _draw(self) -> None:
        if self._ways:
            self.query_one(PictureView).drawing = sight_picture(self._job, self._sight, self._ways[self.way_index])
