"""The optional tables: what the site knows of its spells, and the line between stations."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from itertools import pairwise
from pathlib import Path
from zoneinfo import ZoneInfo

from headledger.errors import QuantityError
from headledger.plant.job import LevelPoint, SpellKind, StatedFlow, StatedSpell
from headledger.plant.runs import Doubt, Run
from headledger.quantities import Dimension, parse_unit, split_quantity
from headledger.readers.job_settings import COVERAGE, Defaults
from headledger.readers.tables import Column, Problems, Row, read_table

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


def _spell_columns(runs: Mapping[str, Run]) -> dict[str, Column]:
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


def read_spells(
    path: Path, file: str, sheet: str | None, context: SpellContext, problems: Problems
) -> list[StatedSpell]:
    """Stated spells, in the order of the table."""
    table = read_table(path, file, _spell_columns(context.runs), problems, sheet=sheet)
    spells = []
    for row in table.rows:
        start, end = _moment(row, "start", context.zone), _moment(row, "end", context.zone)
        kind = row.choice("kind", ("still", "flowing", "ignore"))
        if start is None or end is None:
            continue
        if end <= start:
            row.fault("end", "is not after the start", row.text("end"), f"a time after {row.text('start')}")
            continue
        spells.append(
            StatedSpell(
                start_s=start, end_s=end, kind=SpellKind(kind), flows=_flows(row, context), note=row.text("note")
            )
        )
    ordered = sorted(spells, key=lambda spell: spell.start_s)
    for first, second in pairwise(ordered):
        if second.start_s < first.end_s:
            problems.add(file, "two spells overlap", "", "spells one after another")
    return spells


def _moment(row: Row, column: str, zone: ZoneInfo) -> float | None:
    """A time in seconds since 1970-01-01 UTC, in the job's timezone where it carries no offset."""
    text = row.needed(column)
    if not text:
        return None
    try:
        found = datetime.fromisoformat(text)
    except ValueError:
        row.fault(column, "not a time", text, "2026-03-02T08:00:00Z")
        return None
    return (found if found.tzinfo else found.replace(tzinfo=zone)).timestamp()


def _flows(row: Row, context: SpellContext) -> tuple[StatedFlow, ...]:
    """Stated flows of one spell."""
    flows = []
    for name in context.runs:
        value = row.quantity(f"flow {name}")
        if value is not None:
            flows.append(StatedFlow(run=name, flow_m3_s=value, doubt=_doubt(row, name, context.defaults)))
    return tuple(flows)


def _doubt(row: Row, name: str, defaults: Defaults) -> Doubt:
    """Doubt of a stated flow."""
    column = f"flow {name} uncertainty"
    text = row.text(column)
    if not text:
        return Doubt(relative_fraction=defaults.flow_sd_fraction)
    try:
        number, unit = split_quantity(text)
        if unit.startswith("%"):
            return Doubt(relative_fraction=abs(number) / 100.0 / COVERAGE)
        return Doubt(absolute=abs(float(parse_unit(unit, Dimension.FLOW).to_si(number))) / COVERAGE)
    except QuantityError as error:
        row.fault(column, error.fault, error.found, "±2 % or ±0.5 m3/h")
        return Doubt()


def read_levels(
    path: Path, file: str, sheet: str | None, runs: Mapping[str, Run], defaults: Defaults, problems: Problems
) -> list[LevelPoint]:
    """Points of the line between stations, moved to the centreline."""
    table = read_table(path, file, LEVEL_COLUMNS, problems, sheet=sheet)
    points = []
    for row in table.rows:
        name = row.needed("run")
        if name and name not in runs:
            row.fault("run", "no such run", name, "one of " + ", ".join(runs))
            continue
        distance, elevation = row.positive("distance", zero=True), row.quantity("elevation")
        if distance is None or elevation is None:
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
