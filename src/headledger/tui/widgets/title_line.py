"""The line at the top: which job this is."""

from __future__ import annotations

from textual.widgets import Static


class TitleLine(Static):
    """Program and job, as one line.

    Parameters
    ----------
    job : str
        Title or folder of the job, shown as it is.
    """

    def __init__(self, job: str) -> None:
        super().__init__(f" headledger   {job}", markup=False)
