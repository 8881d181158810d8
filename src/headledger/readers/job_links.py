"""What the tables of a job say of one another: names told twice, names of nothing, stations that nothing reaches.

Works on cells, so that a row that is faulty elsewhere is looked at too.
"""

from __future__ import annotations

from collections.abc import Iterable

from headledger.quantities import nearest
from headledger.readers.tables import Row, Table

MOST_NAMES = 12
"""So many names are listed where none is near."""


def check_links(stations: Table, runs: Table, gauges: Table) -> None:
    """Note every name that does not fit the other tables; a table or column that could not be read is left out.

    Parameters
    ----------
    stations, runs, gauges : Table
    """
    station_names = _unique(stations, "station")
    run_names = _unique(runs, "run")
    _unique(gauges, "tag")
    if station_names:
        for row in runs.rows:
            _check_name(row, "from", "no such station", station_names)
            _check_name(row, "to", "no such station", station_names)
        for row in gauges.rows:
            _check_name(row, "station", "no such station", station_names)
            _check_name(row, "low station", "no such station", station_names)
    if run_names:
        for row in gauges.rows:
            _check_name(row, "run", "no such run", run_names)
        _check_own_run(gauges, runs)
        _check_reached(stations, runs)
    for row in gauges.rows:
        if row.text("low station") and row.text("low station") == row.text("station"):
            row.fault("low station", "is the station itself", row.text("low station"), "the tap of the low side")


def _unique(table: Table, column: str) -> list[str]:
    """Names of a column in their order; notes one that stands twice."""
    first: dict[str, Row] = {}
    for row in table.rows:
        name = row.text(column)
        if not name:
            continue
        if name in first:
            row.fault(column, f"stands in row {first[name].number} already", name, "a name of its own")
        first.setdefault(name, row)
    return list(first)


def _check_name(row: Row, column: str, fault: str, known: Iterable[str]) -> None:
    """Note a name of nothing, with the nearest that there is."""
    name, known = row.text(column), list(known)
    if name and name not in known:
        several = ", ".join(known[:MOST_NAMES]) + (", …" if len(known) > MOST_NAMES else "")
        row.fault(column, fault, name, nearest(name, known) or f"one of {several}")


def _check_own_run(gauges: Table, runs: Table) -> None:
    """Note a gauge whose stated run does not touch its station."""
    ends = {row.text("run"): (row.text("from"), row.text("to")) for row in runs.rows}
    for row in gauges.rows:
        name = row.text("run")
        if name in ends and row.text("station") not in ends[name]:
            touching = [run for run, at in ends.items() if row.text("station") in at]
            row.fault("run", "does not touch the gauge's station", name, " or ".join(touching) or "a run that does")


def _check_reached(stations: Table, runs: Table) -> None:
    """Note a station that no run reaches."""
    reached = {row.text(column) for row in runs.rows for column in ("from", "to")}
    for row in stations.rows:
        name = row.text("station")
        if name and name not in reached:
            row.fault("station", "no run reaches this station", name, "a run from or to it")
