"""The application: runs the check in a thread and puts the screen that its news calls for."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING, ClassVar, Protocol

from textual import on, work
from textual.app import App
from textual.binding import Binding, BindingType
from textual.worker import get_current_worker

from headledger.errors import HeadledgerError, JobError, NothingToCheckError
from headledger.tui.ending import Ending
from headledger.tui.messages import CheckEnded, CheckFinished, CheckProgress
from headledger.tui.screens.ended import EndedScreen
from headledger.tui.screens.working import WorkingScreen
from headledger.tui.theme import DARK_THEME, LIGHT_THEME, OTHER_THEMES_VARIABLES

if TYPE_CHECKING:
    from headledger.diagnosis.result import CheckResult

CHECK_GROUP = "check"


class FolderCheck(Protocol):
    """What judges a job folder."""

    def __call__(
        self, folder: Path, *, on_progress: Callable[[str, float], None], should_stop: Callable[[], bool]
    ) -> CheckResult:
        """The result; raises `HeadledgerError` where the job cannot be used."""


def check_late(
    folder: Path,
    *,
    on_progress: Callable[[str, float], None],
    should_stop: Callable[[], bool],
    answers: Sequence[str] = (),
) -> CheckResult:
    """The check itself, imported when it is needed: what it imports takes longer than to draw the first screen."""
    from headledger.diagnosis.check import check_folder

    return check_folder(folder, answers=answers, on_progress=on_progress, should_stop=should_stop)


class HeadledgerApp(App[None]):
    """One job on the screen.

    Parameters
    ----------
    folder : Path
        The job folder.
    check : callable, optional
        What judges it; tests hand in another.
    answers : sequence of str
        Results of actions on site that the judgement takes into account.
    """

    TITLE = "headledger"
    CSS_PATH = "app.tcss"
    HORIZONTAL_BREAKPOINTS: list[tuple[int, str]] | None = [  # noqa: RUF012 - an instance variable of the base class
        (0, "-narrow"),
        (120, "-wide"),
    ]
    BINDINGS: ClassVar[list[BindingType]] = [
        Binding("q", "quit", "Quit", id="quit"),
        Binding("question_mark", "show_help_panel", "Help", id="help", key_display="?"),
    ]

    def __init__(self, folder: Path, *, check: FolderCheck | None = None, answers: Sequence[str] = ()) -> None:
        super().__init__()
        self.folder = folder
        self.ending = Ending.STOPPED
        self._check_job: FolderCheck = check or partial(check_late, answers=tuple(answers))
        self._checking = False
        self.register_theme(DARK_THEME)
        self.register_theme(LIGHT_THEME)
        self.theme = DARK_THEME.name
        if self.no_color:
            self._drop_terminal_themes()

    def get_theme_variable_defaults(self) -> dict[str, str]:
        """Variables of our own for themes that are not ours."""
        return OTHER_THEMES_VARIABLES

    def _drop_terminal_themes(self) -> None:
        """Without colour the themes that take the terminal's own colours write black on black."""
        for theme in self.available_themes.values():
            if theme.ansi:
                self.unregister_theme(theme.name)

    def on_mount(self) -> None:
        """Show the first screen and start the check behind it."""
        self.push_screen(WorkingScreen(self.folder.name))
        self._start()

    def export_screenshot(self, *, title: str | None = None, simplify: bool = False) -> str:
        """The screen as SVG, drawn with a font of the reader's machine: nothing is fetched to look at it."""
        picture = super().export_screenshot(title=title, simplify=simplify)
        return re.sub(r"@font-face\s*\{[^}]*\}\s*|<!--.*?-->\s*", "", picture, flags=re.DOTALL)

    def check_again(self) -> None:
        """Check the job anew; while a check still runs, nothing happens."""
        if self._checking:
            self.notify("The last check is still stopping.", markup=False)
            return
        self.switch_screen(WorkingScreen(self.folder.name))
        self._start()

    def stop_check(self) -> None:
        """Ask the check to stop; it does at its next pause."""
        self.workers.cancel_group(self, CHECK_GROUP)

    def _start(self) -> None:
        self._checking = True
        self.ending = Ending.STOPPED
        self._work()

    @work(thread=True, exclusive=True, exit_on_error=False, group=CHECK_GROUP)
    def _work(self) -> None:
        worker = get_current_worker()
        news: CheckFinished | CheckEnded
        try:
            result = self._check_job(
                self.folder,
                on_progress=lambda step, fraction: self._tell(CheckProgress(step, fraction)),
                should_stop=lambda: worker.is_cancelled,
            )
            news = CheckFinished(result)
        except JobError as error:
            news = CheckEnded(Ending.REFUSED, tuple(str(problem) for problem in error.problems))
        except NothingToCheckError as error:
            news = CheckEnded(Ending.NOTHING_TO_CHECK, (str(error),))
        except HeadledgerError as error:
            news = CheckEnded(Ending.REFUSED, (str(error),))
        except Exception as error:
            from headledger.faults import fault_lines

            news = CheckEnded(Ending.FAULT, fault_lines(error))
        # What a stopped check hands back is only part of the truth.
        self._tell(CheckEnded(Ending.STOPPED, ()) if worker.is_cancelled else news)

    def _tell(self, news: CheckProgress | CheckFinished | CheckEnded) -> None:
        self.post_message(news)

    @on(CheckProgress)
    def _show_progress(self, news: CheckProgress) -> None:
        if isinstance(self.screen, WorkingScreen):
            self.screen.progress = (news.step, news.fraction)

    @on(CheckFinished)
    def _show_findings(self, news: CheckFinished) -> None:
        from headledger.tui.screens.findings import FindingsScreen

        self._checking = False
        self.ending = Ending.FOUND
        self.switch_screen(FindingsScreen(news.result))

    @on(CheckEnded)
    def _show_end(self, news: CheckEnded) -> None:
        self._checking = False
        self.ending = news.ending
        self.switch_screen(EndedScreen(self.folder.name, news.ending, news.lines))
