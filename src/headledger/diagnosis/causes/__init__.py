"""Every kind of cause that is weighed, by name; a new kind is one file here and one line in this table."""

from __future__ import annotations

from headledger.diagnosis.causes import (
    air_pocket,
    blockage,
    density_error,
    differential,
    drift,
    flow_meter_error,
    leg_gas,
    pump_lift,
    span_error,
    step,
    swapped,
    wrong_elevation,
    wrong_reference,
    wrong_unit,
    zero_shift,
)
from headledger.diagnosis.causes.base import MarkMaker
from headledger.diagnosis.result import CauseKind

MAKERS: dict[CauseKind, MarkMaker] = {
    CauseKind.ZERO_SHIFT: zero_shift.marks,
    CauseKind.SPAN_ERROR: span_error.marks,
    CauseKind.DRIFT: drift.marks,
    CauseKind.STEP: step.marks,
    CauseKind.WRONG_ELEVATION: wrong_elevation.marks,
    CauseKind.WRONG_UNIT: wrong_unit.marks,
    CauseKind.WRONG_REFERENCE: wrong_reference.marks,
    CauseKind.LEG_GAS: leg_gas.marks,
    CauseKind.SWAPPED: swapped.marks,
    CauseKind.CROSSED_LINES: differential.crossed_lines,
    CauseKind.ROOT: differential.roots,
    CauseKind.PUMP_LIFT: pump_lift.marks,
    CauseKind.BLOCKAGE: blockage.blockages,
    CauseKind.LOW_LOSS: blockage.low_losses,
    CauseKind.AIR_POCKET: air_pocket.marks,
    CauseKind.DENSITY_ERROR: density_error.marks,
    CauseKind.FLOW_METER_ERROR: flow_meter_error.marks,
}
