"""What to do on site next, what it settles, and what was found on site already."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.containers import Vertical
from textual.content import Content
from textual.widgets import Static

from headledger.diagnosis.result import CheckResult
from headledger.sheets.headline import check_worth


class NextChecksList(Vertical):
    """The check that settles most per minute first.

    Parameters
    ----------
    result : CheckResult
    """

    def __init__(self, result: CheckResult) -> None:
        super().__init__()
        self._result = result

    def compose(self) -> ComposeResult:
        """A block a check; nothing where there is none."""
        result = self._result
        if not result.next_checks and not result.answers:
            return
        yield Static("Next checks", classes="heading")
        for text in result.answers:
            yield Static(Content(f"Taken into account: {text}"), classes="finding")
        for check in result.next_checks:
            block = Content("\n").join([Content.styled(check.says, "bold"), Content(check_worth(check))])
            yield Static(block, classes="finding")
