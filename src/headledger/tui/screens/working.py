"""While the check runs: what it is doing, how far it is, and a key to stop it."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar, cast

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import Vertical
from textual.reactive import var
from textual.screen import Screen
from textual.widgets import Footer, Label, ProgressBar

from headledger.tui.widgets.title_line import TitleLine

if TYPE_CHECKING:
    from headledger.tui.app import HeadledgerApp


class WorkingScreen(Screen[None]):
    """Shown at once, before anything is read.

    Parameters
    ----------
    job_name : str
    """

    HELP = "The job is being checked. **Esc** stops it."
    BINDINGS: ClassVar[list[BindingType]] = [Binding("escape", "stop", "Stop the check", id="stop")]

    progress: var[tuple[str, float]] = var(("starting", 0.0), init=False)

    def __init__(self, job_name: str) -> None:
        super().__init__()
        self._job_name = job_name
        self._stopping = False

    def compose(self) -> ComposeResult:
        """Title, step, bar."""
        yield TitleLine(self._job_name)
        with Vertical(id="working"):
            yield Label(self._line(), id="step", markup=False)
            yield ProgressBar(total=1.0, show_eta=False, id="share")
        yield Footer()

    def watch_progress(self) -> None:
        """Show the newest step."""
        self.query_one("#step", Label).update(self._line())
        self.query_one("#share", ProgressBar).update(progress=self.progress[1])

    def action_stop(self) -> None:
        """Ask the check to stop, and say so until it has."""
        self._stopping = True
        self.query_one("#step", Label).update(self._line())
        cast("HeadledgerApp", self.app).stop_check()

    def _line(self) -> str:
        return "Stopping …" if self._stopping else f"Checking: {self.progress[0]}"
