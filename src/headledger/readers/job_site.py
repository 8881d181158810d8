"""The optional tables: what the site knows of its spells, and the line between stations."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from itertools import pairwise
from zoneinfo import ZoneInfo

from headledger.plant.job import LevelPoint, SpellKind, StatedFlow, StatedSpell
from headledger.plant.runs import Run
from headledger.quantities import Dimension, nearest
from headledger.readers.job_settings import COVERAGE, Defaults
from headledger.readers.job_tables import flow_doubt
from headledger.readers.tables import Column, Row, Table

LEVEL_COLUMNS = {
    "run": Column(required=True),
    "distance": Column(dimension=Dimension.LENGTH, required=True),
    "elevation": Column(dimension=Dimension.LENGTH, required=True),
    "ground": Column(dimension=Dimension.LENGTH),
    "uncertainty": Column(dimension=Dimension.LENGTH),
    "level of": Column(),
}


@dataclass(frozen=True, slots=True)
class SpellContext:
    """What a row of spells needs to be understood."""

    runs: Mapping[str, Run]
    zone: ZoneInfo
    defaults: Defaults


def spell_columns(runs: Mapping[str, Run]) -> dict[str, Column]:
    """Every column that spells.csv may hold for these runs."""
    columns = {
        "start": Column(required=True),
        "end": Column(required=True),
        "kind": Column(required=True),
        "note": Column(),
    }
    for name in runs:
        columns[f"flow {name}"] = Column(dimension=Dimension.FLOW)
        columns[f"flow {name} uncertainty"] = Column()
    return columns


def read_spells(table: Table, context: SpellContext) -> list[StatedSpell]:
    """Stated spells, in the order of the table."""
    spells: dict[int, StatedSpell] = {}
    for row in table.rows:
        row.needed("start"), row.needed("end"), row.needed("kind")
        start, end = moment(row, "start", context.zone), moment(row, "end", context.zone)
        kind = row.choice("kind", ("still", "flowing", "ignore"))
        if start is None or end is None:
            continue
        if end <= start:
            row.fault("end", "is not after the start", row.text("end"), f"a time after {row.text('start')}")
            continue
        spells[row.number] = StatedSpell(
            start_s=start.timestamp(),
            end_s=end.timestamp(),
            kind=SpellKind(kind),
            flows=_flows(row, context),
            note=row.text("note"),
        )
    _check_overlap(table, spells)
    return list(spells.values())


def _check_overlap(table: Table, spells: Mapping[int, StatedSpell]) -> None:
    """Note spells that overlap, each at the later row."""
    ordered = sorted(spells.items(), key=lambda item: item[1].start_s)
    for (number, first), (later, second) in pairwise(ordered):
        if second.start_s < first.end_s:
            place = f"{table.file}, row {later}, start"
            table.problems.add(place, f"overlaps the spell of row {number}", "", "spells one after another")


def moment(row: Row, column: str, zone: ZoneInfo) -> datetime | None:
    """A time, in the job's timezone where it carries no offset; None where blank or faulty."""
    text = row.text(column)
    if not text:
        return None
    try:
        found = datetime.fromisoformat(text)
    except ValueError:
        row.fault(column, "not a time", text, "2026-03-02T08:00:00Z")
        return None
    return found if found.tzinfo else found.replace(tzinfo=zone)


def _flows(row: Row, context: SpellContext) -> tuple[StatedFlow, ...]:
    """Stated flows of one spell."""
    flows = []
    for name in context.runs:
        value = row.quantity(f"flow {name}")
        doubt = flow_doubt(row, f"flow {name} uncertainty", context.defaults)
        if value is not None:
            flows.append(StatedFlow(run=name, flow_m3_s=value, doubt=doubt))
    return tuple(flows)


def read_levels(table: Table, runs: Mapping[str, Run], defaults: Defaults) -> list[LevelPoint]:
    """Points of the line between stations, moved to the centreline."""
    points = []
    for row in table.rows:
        name = row.needed("run")
        if name and name not in runs:
            row.fault("run", "no such run", name, nearest(name, runs) or "one of " + ", ".join(runs))
            continue
        row.needed("distance"), row.needed("elevation")
        distance, elevation = row.positive("distance", zero=True), row.quantity("elevation")
        if distance is not None and name and distance > runs[name].length_m * 1.001:
            found = f"{row.text('distance')} {table.unit_text('distance')}"
            row.fault("distance", "is beyond the end of the run", found, f"at most {runs[name].length_m:g} m")
            continue
        if distance is None or elevation is None or not name:
            continue
        side = {"centreline": 0.0, "invert": 0.5, "crown": -0.5}[
            row.choice("level of", ("centreline", "invert", "crown"))
        ]
        doubt = row.positive("uncertainty", zero=True)
        points.append(
            LevelPoint(
                run=name,
                distance_m=distance,
                elevation_m=elevation + side * runs[name].bore_m,
                ground_m=row.quantity("ground"),
                elevation_sd_m=defaults.elevation_sd_m if doubt is None else doubt / COVERAGE,
            )
        )
    return points
