"""What holds for every test: no animation, none of the outside world's switches, no deadline on slow machines."""

from __future__ import annotations

import os

import hypothesis
import pytest
import textual.constants

from headledger.diagnosis.result import CheckResult
from tests import made_results
from tests.sample_results import SAMPLES, sample_result


def pytest_configure() -> None:
    """Still the screen and shut out the outside world's switches, before any test module is imported."""
    os.environ["TEXTUAL_ANIMATIONS"] = "none"
    # A plugin has imported textual by now, so that the variable alone comes too late for this process.
    pytest.MonkeyPatch().setattr(textual.constants, "TEXTUAL_ANIMATIONS", "none")
    # what tests read is never kept, and what was kept is never trusted
    os.environ["HEADLEDGER_CACHE"] = ""
    for name in ("NO_COLOR", "FORCE_COLOR", "TEXTUAL_THEME", "HEADLEDGER_TRACEBACK", "COLUMNS", "LINES"):
        os.environ.pop(name, None)
    hypothesis.settings.register_profile("house", deadline=None, max_examples=60, derandomize=True)
    hypothesis.settings.load_profile("house")


@pytest.fixture(scope="session", params=SAMPLES)
def any_sample(request: pytest.FixtureRequest) -> CheckResult:
    """The check of each sample job in turn, made once."""
    return sample_result(request.param)


@pytest.fixture(scope="session")
def sound_result() -> CheckResult:
    """Every gauge passes."""
    return made_results.sound_result()


@pytest.fixture(scope="session")
def troubled_result() -> CheckResult:
    """A failed, an unresolved and an unchecked gauge; one cause accepted, one with a rival."""
    return made_results.troubled_result()
