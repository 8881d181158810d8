"""The five questions and their answers."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.containers import Grid, VerticalScroll
from textual.reactive import var
from textual.widgets import Static

from headledger.sheets.headline import Answer


class Answers(VerticalScroll):
    """Question beside answer: folded, a line each; unfolded, all that there is to say.

    Parameters
    ----------
    answers : tuple of Answer
    """

    unfolded: var[bool] = var(False, toggle_class="-unfolded", init=False)

    def __init__(self, answers: tuple[Answer, ...]) -> None:
        super().__init__()
        self._answers = answers

    def compose(self) -> ComposeResult:
        """Two columns."""
        with Grid():
            for answer in self._answers:
                yield Static(answer.question, classes="question", markup=False)
                yield Static(self._text(answer), classes="answer", markup=False)

    def watch_unfolded(self) -> None:
        """Write the answers on a line each, or in full."""
        for answer, widget in zip(self._answers, self.query(".answer").results(Static), strict=True):
            widget.update(self._text(answer))
        self.scroll_home()

    def _text(self, answer: Answer) -> str:
        return ("\n" if self.unfolded else " ").join(answer.lines)
