"""A check that came to no result: every problem of the job, one below the other, or why it stopped."""

from __future__ import annotations

from typing import TYPE_CHECKING, ClassVar, cast

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import VerticalScroll
from textual.screen import Screen
from textual.widgets import Footer, Static

from headledger.tui.ending import Ending
from headledger.tui.widgets.title_line import TitleLine

if TYPE_CHECKING:
    from headledger.tui.app import HeadledgerApp

_HEADINGS = {
    Ending.REFUSED: "▲ This job cannot be used as it is.",
    Ending.NOTHING_TO_CHECK: "? Nothing can be checked.",
    Ending.STOPPED: "– The check was stopped.",
    Ending.FAULT: "▲ headledger stopped by a fault of its own.",
}


class EndedScreen(Screen[None]):
    """What to put right, and a key to try again.

    Parameters
    ----------
    job_name : str
    ending : Ending
    lines : tuple of str
        One problem each.
    """

    HELP = "Put right what is listed, in the job folder, and check again with **r**."
    BINDINGS: ClassVar[list[BindingType]] = [Binding("r", "again", "Check again", id="again")]

    def __init__(self, job_name: str, ending: Ending, lines: tuple[str, ...]) -> None:
        super().__init__()
        self._job_name = job_name
        self._ending = ending
        self._lines = lines

    def compose(self) -> ComposeResult:
        """Title, heading, the lines."""
        yield TitleLine(self._job_name)
        yield Static(self._heading(), id="heading", markup=False)
        with VerticalScroll(id="lines"):
            for line in self._lines:
                yield Static(line, classes="problem", markup=False)
        yield Footer()

    def action_again(self) -> None:
        """Check the job anew."""
        cast("HeadledgerApp", self.app).check_again()

    def _heading(self) -> str:
        heading = _HEADINGS[self._ending]
        count = len(self._lines)
        return f"{heading} {count} problems:" if self._ending is Ending.REFUSED and count > 1 else heading
