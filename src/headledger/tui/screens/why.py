"""Why: what a finding rests on, reading by reading, and where the uncertainty of a gauge comes from."""

from __future__ import annotations

from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import Binding, BindingType
from textual.containers import VerticalScroll
from textual.content import Content
from textual.reactive import var
from textual.screen import Screen
from textual.widgets import Footer, Static

from headledger.diagnosis.result import CauseFound, CheckResult
from headledger.sheets.columns import error_columns
from headledger.sheets.marks import CAUTIONS, verdict_label
from headledger.sheets.why import OFF, RESIDUAL_HEAD, budget_bars, finding_title, moved, with_evidence
from headledger.tui.widgets.title_line import TitleLine

_BAR_WIDTH = 16
# Columns of the table of readings that are numbers.
_NUMBERS = (1, 2, 3, 5, 6)


class WhyScreen(Screen[None]):
    """One finding after the other, beside one gauge.

    Parameters
    ----------
    result : CheckResult
    tag : str
        Of the gauge that is looked at: the first finding shown is one of its own, where it has one.
    """

    HELP = """\
What a finding rests on: by how much the readings favour it over each thing that it may be instead, and how far every reading is off
with no cause at all and with the finding. ▲ off: further than 95 % of readings in order would be; ✓ fits; – spoilt: says nothing any more.
▸ marks the gauge that you came from.

Below, or beside, is where the uncertainty of that gauge comes from: what to know better to narrow it.

- **n** and **p** to the next finding and the one before, the most probable first
- **↑ ↓** scroll, **esc** back
"""
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("escape,y", "back", "Back", id="back", key_display="esc"),
        Binding("n", "finding(1)", "Next finding", id="next-finding"),
        Binding("p", "finding(-1)", "Finding before", id="finding-before"),
    ]

    index: var[int] = var(0, init=False)

    def __init__(self, result: CheckResult, tag: str) -> None:
        super().__init__()
        self._result = result
        self._gauge = next(gauge for gauge in result.gauges if gauge.tag == tag)
        self._findings = with_evidence(result.causes)
        concerned = [result.causes[i] for i in (*self._gauge.causes, *self._gauge.given)]
        first = (number for number, one in enumerate(self._findings) if any(one is cause for cause in concerned))
        self.set_reactive(WhyScreen.index, next(first, 0))

    def compose(self) -> ComposeResult:
        """The finding, and the gauge's uncertainty below it or beside it."""
        yield TitleLine(f"{self._result.job.title}   {self._result.job.site_name}".rstrip())
        with VerticalScroll(id="why"):
            yield Static("", id="behind", markup=False)
            yield Static(self._budget(), id="budget", markup=False)
        yield Static(CAUTIONS[0], id="caution", markup=False)
        yield Footer()

    def on_mount(self) -> None:
        """Show the finding."""
        self.query_one("#why").focus()
        self.watch_index()

    def watch_index(self) -> None:
        """Show another finding."""
        self.query_one("#behind", Static).update(self._finding())
        self.query_one("#why", VerticalScroll).scroll_home(animate=False)

    def check_action(self, action: str, parameters: tuple[object, ...]) -> bool | None:
        """Only what makes sense here has a key."""
        return len(self._findings) > 1 if action == "finding" else True

    def action_back(self) -> None:
        """Back to where this was asked."""
        self.dismiss()

    def action_finding(self, by: int) -> None:
        """The next finding, or the one before."""
        self.index = (self.index + by) % len(self._findings)

    def _finding(self) -> Content:
        if not self._findings:
            return Content("No finding has weight: there is nothing to hold the readings against.")
        cause = self._findings[self.index]
        lines = [
            Content.styled(f"Finding {self.index + 1} of {len(self._findings)}", "bold $text-warning"),
            Content.styled(finding_title(cause), "bold"),
            Content(cause.says),
            Content(""),
            *self._odds(cause),
            Content(""),
            *self._readings(cause),
        ]
        return Content("\n").join(lines)

    def _odds(self, cause: CauseFound) -> list[Content]:
        says = [against.says for against in cause.evidence.against] if cause.evidence else []
        return [
            Content.styled("Against what it may be instead", "bold $text-warning"),
            *(Content(f"- {line}") for line in says),
        ]

    def _readings(self, cause: CauseFound) -> list[Content]:
        told = moved(self._result, cause)
        rows = [RESIDUAL_HEAD, *told.rows]
        widths = [max(len(row[column]) for row in rows) for column in range(len(RESIDUAL_HEAD))]

        def line(row: tuple[str, ...]) -> Content:
            mark = "▸ " if row[0] == self._gauge.tag else "  "
            cells = [
                cell.rjust(width) if column in _NUMBERS else cell.ljust(width)
                for column, (cell, width) in enumerate(zip(row, widths, strict=True))
            ]
            parts = [Content.styled(cell, "bold") if cell.startswith(OFF) else Content(cell) for cell in cells]
            return Content(mark) + Content("  ").join(parts)

        head = Content.styled("How far readings are off", "bold $text-warning")
        table = [line(RESIDUAL_HEAD).stylize("underline"), *map(line, told.rows)] if told.rows else []
        misfit = [Content(cause.evidence.says)] if cause.evidence else []
        return [head, *misfit, *table, *([Content(told.rest)] if told.rest else [])]

    def _budget(self) -> Content:
        gauge = self._gauge
        lines = [
            Content.styled(f"Uncertainty of {gauge.tag}", "bold $text-warning"),
            Content(f"{gauge.tag} at {gauge.station}   {verdict_label(gauge.verdict)}"),
        ]
        bars = budget_bars(gauge.budget, _BAR_WIDTH)
        if not bars:
            return Content("\n").join([*lines, Content("It gave no reading.")])
        error, doubt, tolerance = error_columns(gauge)
        unit = gauge.unit.as_difference().text
        lines.append(Content(f"Error {error} ± {doubt} {unit} (k = 2), tolerance ± {tolerance} {unit}."))
        lines.append(Content("Shares of the variance:"))
        width = max(len(share) for _, _, share in bars)
        lines += [Content(f"{share.rjust(width)} {bar.ljust(_BAR_WIDTH)} {what}") for what, bar, share in bars]
        return Content("\n").join(lines)
