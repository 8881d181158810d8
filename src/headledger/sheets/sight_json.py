"""A sight as plain JSON values, for the result file and for a plan."""

from __future__ import annotations

import json
from typing import Any

from headledger import __version__
from headledger.diagnosis.result import Alike, FurtherReading, GaugeSight, PlanResult, Sight, TroubleSight
from headledger.plant.job import Job
from headledger.sheets.json_values import in_unit, number, place_to_json

PLAN_FORMAT = 1


def plan_to_text(plan: PlanResult, *, ascii_only: bool = False) -> str:
    """The plan as a JSON text, ending in a line feed."""
    whole = {
        "format": PLAN_FORMAT,
        "headledger": __version__,
        "job": {"title": plan.job.title},
        "sight": sight_to_json(plan.job, plan.sight),
        "remarks": list(plan.job.remarks),
    }
    return json.dumps(whole, ensure_ascii=ascii_only, indent=2, allow_nan=False) + "\n"


def sight_to_json(job: Job, sight: Sight) -> dict[str, Any]:
    """What readings could show: units of causes as in the result file, null for never."""
    return {
        "states": list(sight.states),
        "gauges": [_gauge(one) for one in sight.gauges],
        "troubles": [_trouble(job, one) for one in sight.troubles],
        "further": [_further(one) for one in sight.further],
        "assumed": list(sight.assumed),
    }


def _gauge(one: GaugeSight) -> dict[str, Any]:
    return {
        "tag": one.tag,
        "verdict": one.verdict.value,
        "u95": in_unit(one.u95_pa, one.unit),
        "tolerance": in_unit(one.tolerance_pa, one.unit),
        "unit": one.unit.text,
        "says": one.says,
    }


def _trouble(job: Job, one: TroubleSight) -> dict[str, Any]:
    factor = 1.0 if one.unit is None else one.unit.factor
    sizes = {
        name: None if size is None else number(size / factor)
        for name, size in (("seen", one.seen), ("placed", one.placed), ("named", one.named))
    }
    loss = {}
    if one.pa_per_size is not None and one.flow_m3_s is not None:
        pressure, flow = job.display.pressure, job.display.flow
        loss = {
            "drop": None if one.seen is None else in_unit(one.seen * one.pa_per_size, pressure),
            "drop_unit": pressure.text,
            "flow": in_unit(one.flow_m3_s, flow),
            "flow_unit": flow.text,
        }
    return {
        "kind": one.kind.value,
        "at": place_to_json(one.place),
        **sizes,
        "unit": "" if one.unit is None else one.unit.as_difference().text,
        **loss,
        "alike": [_alike(alike) for alike in one.alike],
        "says": one.says,
    }


def _alike(one: Alike) -> dict[str, Any]:
    return {"kind": one.kind.value, "at": place_to_json(one.place), "correlation": number(one.correlation)}


def _further(one: FurtherReading) -> dict[str, Any]:
    return {
        "station": one.station,
        "kind": None if one.kind is None else one.kind.value,
        "flow_factor": number(one.flow_factor),
        "sharper": number(one.sharper_ratio),
        "could_pass": list(one.could_pass),
        "says": one.says,
    }
