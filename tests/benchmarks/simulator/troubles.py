"""Troubles, one small function a kind: each puts itself into the faults and says what is true of it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np

from headledger.diagnosis.result import CauseKind
from tests.benchmarks.simulator.readings import BAR, BAROMETER_PA, Faults, pipe_flows, true_heads, water
from tests.benchmarks.simulator.systems import System
from tests.make_samples import GRAVITY, Dial, Pipe

PSI_PA, MH2O_PA = 6894.757293168361, 9806.65


@dataclass(frozen=True, kw_only=True)
class Truth:
    """One trouble as it is: kind, place, size as the result file has it (None without one), gauges that are off by themselves, form."""

    kind: CauseKind
    place: str
    size: float | None = None
    gauges: tuple[str, ...] = ()
    form: str = ""


Trouble = Callable[[System, Faults, np.random.Generator], tuple[System, Truth] | None]


def _dial(system: System, rng: np.random.Generator) -> Dial:
    return system.dials[int(rng.integers(len(system.dials)))]


def _size(rng: np.random.Generator, least: float, most: float) -> float:
    """Log-uniform."""
    return float(least * (max(most, least * 1.01) / least) ** rng.random())


def _tolerance(dial: Dial) -> float:
    return float(dial.tolerance.split()[0]) / 100.0 * dial.high * BAR


def _sign(rng: np.random.Generator) -> float:
    return float(rng.choice((-1.0, 1.0)))


def zero_shift(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Half a tolerance to a fifth of span."""
    dial = _dial(system, rng)
    size = _sign(rng) * _size(rng, 0.5 * _tolerance(dial), 0.2 * dial.high * BAR)
    faults.shift_pa[dial.tag] = faults.shift_pa.get(dial.tag, 0.0) + size
    return system, Truth(kind=CauseKind.ZERO_SHIFT, place=dial.tag, size=size / BAR, gauges=(dial.tag,))


def span_error(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """0.5 to 20 %."""
    dial = _dial(system, rng)
    ratio = 1.0 + _sign(rng) * _size(rng, 0.01, 0.2)
    faults.slope[dial.tag] = ratio
    return system, Truth(kind=CauseKind.SPAN_ERROR, place=dial.tag, size=ratio, gauges=(dial.tag,))


def wrong_unit(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Logged in psi, or metres of water, where bar is stated."""
    dial = _dial(system, rng)
    ratio = BAR / (PSI_PA if rng.random() < 0.5 else MH2O_PA)
    faults.unit_ratio[dial.tag] = ratio
    return system, Truth(kind=CauseKind.WRONG_UNIT, place=dial.tag, size=ratio, gauges=(dial.tag,))


def wrong_reference(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Absolute where gauge is stated, or the other way round."""
    dial = _dial(system, rng)
    size = BAROMETER_PA if dial.unit == "barg" else -BAROMETER_PA
    faults.shift_pa[dial.tag] = faults.shift_pa.get(dial.tag, 0.0) + size
    return system, Truth(kind=CauseKind.WRONG_REFERENCE, place=dial.tag, size=size / BAR, gauges=(dial.tag,))


def wrong_elevation(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Half a tolerance to 12 m of column."""
    dial = _dial(system, rng)
    if dial.leg == "dry":
        return None
    least = 0.5 * _tolerance(dial) / (water(system)[0] * GRAVITY)
    size = _sign(rng) * _size(rng, least, 12.0)
    faults.column_m[dial.tag] = size
    return system, Truth(kind=CauseKind.WRONG_ELEVATION, place=dial.tag, size=size, gauges=(dial.tag,))


def leg_gas(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Part of a leg that holds more than a tolerance."""
    heights = {name: z for name, z, _ in system.stations}
    fit = [
        (dial, water(system)[0] * GRAVITY * (heights[dial.station] - dial.elevation))
        for dial in system.dials
        if dial.elevation is not None and dial.leg != "dry"
    ]
    fit = [(dial, whole) for dial, whole in fit if abs(whole) > 1.2 * _tolerance(dial)]
    if not fit:
        return None
    dial, whole = fit[int(rng.integers(len(fit)))]
    size = -float(np.sign(whole)) * _size(rng, 0.5 * _tolerance(dial), abs(whole))
    faults.shift_pa[dial.tag] = faults.shift_pa.get(dial.tag, 0.0) + size
    return system, Truth(kind=CauseKind.LEG_GAS, place=dial.tag, size=size / BAR, gauges=(dial.tag,))


def swapped(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Two gauges of one range and unit exchanged."""
    pairs = [
        (a, b)
        for n, a in enumerate(system.dials)
        for b in system.dials[n + 1 :]
        if a.unit == b.unit and a.station != b.station
    ]
    if not pairs:
        return None
    a, b = pairs[int(rng.integers(len(pairs)))]
    faults.swapped = (a.tag, b.tag)
    return system, Truth(kind=CauseKind.SWAPPED, place=f"{a.tag} {b.tag}", gauges=(a.tag, b.tag))


def _visit_s(system: System) -> float:
    return float(system.spell_s * len(system.flows))


def drift(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """One to fifteen tolerances over the visit, from somewhere in its first half."""
    dial = _dial(system, rng)
    begin = float(rng.uniform(0.0, 0.5)) * _visit_s(system)
    rate = _sign(rng) * _size(rng, 1.0, 15.0) * _tolerance(dial) / (_visit_s(system) - begin)
    faults.drift_pa_s[dial.tag] = (rate, begin)
    return system, Truth(kind=CauseKind.DRIFT, place=dial.tag, size=3600.0 * rate / BAR, gauges=(dial.tag,))


def step(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Half a tolerance to a fifth of span, within some spell."""
    dial = _dial(system, rng)
    size = _sign(rng) * _size(rng, 0.7 * _tolerance(dial), 0.2 * dial.high * BAR)
    spell = int(rng.integers(len(system.flows)))
    faults.step_pa[dial.tag] = (size, (spell + float(rng.uniform(0.3, 0.7))) * system.spell_s)
    return system, Truth(kind=CauseKind.STEP, place=dial.tag, size=size / BAR, gauges=(dial.tag,))


def frozen(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """From a moment in the first spells on."""
    dial = _dial(system, rng)
    faults.frozen_from[dial.tag] = float(rng.uniform(0.1, 0.6)) * system.spell_s
    return system, Truth(kind=CauseKind.FROZEN, place=dial.tag, gauges=(dial.tag,))


def sluggish(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """A lag of 20 to 60 s."""
    dial = _dial(system, rng)
    faults.lag_s[dial.tag] = _size(rng, 20.0, 60.0)
    return system, Truth(kind=CauseKind.SLUGGISH, place=dial.tag, size=faults.lag_s[dial.tag], gauges=(dial.tag,))


def noisy(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Ten to forty times the scatter of the others."""
    dial = _dial(system, rng)
    faults.noise_times[dial.tag] = _size(rng, 10.0, 40.0)
    return system, Truth(kind=CauseKind.NOISY, place=dial.tag, gauges=(dial.tag,))


def clock_offset(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """A second logger, 20 to 100 s off."""
    if len(system.dials) < 4 or faults.swapped:
        return None
    faults.late_s = _sign(rng) * float(np.round(_size(rng, 20.0, 100.0)))
    late = system.tags[: len(system.tags) // 2]
    return replace(system, late_file=late), Truth(kind=CauseKind.CLOCK_OFFSET, place=" ".join(late), size=faults.late_s)


def _lossy(system: System, rng: np.random.Generator) -> Pipe:
    pipes = [pipe for pipe in system.pipes if pipe.item != "pump"]
    return pipes[int(rng.integers(len(pipes)))]


def _velocity_head_pa(system: System, pipe: Pipe) -> float:
    """Of the greatest flow. [Pa]"""
    flow = pipe_flows(system, len(system.flows) - 1)[pipe.name]
    return float(0.5 * water(system)[0] * (flow / (np.pi * (pipe.bore * 1e-3) ** 2 / 4)) ** 2)


def blockage(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Half a tolerance of the best gauge to 1.5 bar at the greatest flow."""
    pipe = _lossy(system, rng)
    least = 0.5 * min(_tolerance(dial) for dial in system.dials)
    k = _size(rng, least, 1.5 * BAR) / _velocity_head_pa(system, pipe)
    faults.added_k[pipe.name] = k
    return system, Truth(kind=CauseKind.BLOCKAGE, place=pipe.name, size=k)


def low_loss(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Half to nine tenths of a run's loss is missing, where that is worth half a tolerance."""
    heads = true_heads(system, len(system.flows) - 1)
    least = 0.5 * min(_tolerance(dial) for dial in system.dials)
    weight = water(system)[0] * GRAVITY
    fit = [p for p in system.pipes if p.item != "pump" and weight * (heads[p.start] - heads[p.end]) > 2.0 * least]
    if not fit:
        return None
    pipe = fit[int(rng.integers(len(fit)))]
    missing_pa = float(rng.uniform(0.5, 0.9)) * weight * (heads[pipe.start] - heads[pipe.end])
    k = -missing_pa / _velocity_head_pa(system, pipe)
    faults.added_k[pipe.name] = k
    return system, Truth(kind=CauseKind.LOW_LOSS, place=pipe.name, size=k)


def air_pocket(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """On a run that falls by more than half a tolerance."""
    heights = {name: z for name, z, _ in system.stations}
    least = 0.5 * min(_tolerance(dial) for dial in system.dials) / (water(system)[0] * GRAVITY)
    fit = [p for p in system.pipes if heights[p.start] - heights[p.end] > max(least, 0.3)]
    if not fit:
        return None
    pipe = fit[int(rng.integers(len(fit)))]
    size = _size(rng, max(least, 0.3), heights[pipe.start] - heights[pipe.end])
    faults.pocket_m[pipe.name] = size
    faults.pocket_at_rest = bool(rng.random() < 0.3)
    form = "still" if faults.pocket_at_rest else ""
    return system, Truth(kind=CauseKind.AIR_POCKET, place=pipe.name, size=size, form=form)


def flow_meter_error(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """5 to 60 %."""
    metered = [pipe for pipe in system.pipes if pipe.meter]
    pipe = metered[int(rng.integers(len(metered)))]
    ratio = float(np.exp(_sign(rng) * _size(rng, 0.05, 0.5)))
    faults.meter_ratio[pipe.name] = ratio
    return system, Truth(kind=CauseKind.FLOW_METER_ERROR, place=pipe.name, size=ratio)


def pump_lift(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """Half to nine tenths of the curve."""
    if system.pump is None:
        return None
    faults.lift_ratio = float(rng.uniform(0.5, 0.9))
    return system, Truth(kind=CauseKind.PUMP_LIFT, place="PU", size=faults.lift_ratio)


def density_error(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
    """1 to 15 %."""
    faults.density_ratio = 1.0 + _sign(rng) * _size(rng, 0.01, 0.15)
    return system, Truth(kind=CauseKind.DENSITY_ERROR, place="", size=faults.density_ratio)


def _differential(kind: CauseKind) -> Trouble:
    def trouble(system: System, faults: Faults, rng: np.random.Generator) -> tuple[System, Truth] | None:
        if not system.differential:
            return None
        faults.differential = kind.value
        tag = system.differential[0][0]
        return system, Truth(kind=kind, place=tag, gauges=(tag,))

    return trouble


TROUBLES: dict[CauseKind, Trouble] = {
    CauseKind.ZERO_SHIFT: zero_shift,
    CauseKind.SPAN_ERROR: span_error,
    CauseKind.WRONG_UNIT: wrong_unit,
    CauseKind.WRONG_REFERENCE: wrong_reference,
    CauseKind.WRONG_ELEVATION: wrong_elevation,
    CauseKind.LEG_GAS: leg_gas,
    CauseKind.SWAPPED: swapped,
    CauseKind.DRIFT: drift,
    CauseKind.STEP: step,
    CauseKind.FROZEN: frozen,
    CauseKind.SLUGGISH: sluggish,
    CauseKind.NOISY: noisy,
    CauseKind.CLOCK_OFFSET: clock_offset,
    CauseKind.BLOCKAGE: blockage,
    CauseKind.LOW_LOSS: low_loss,
    CauseKind.AIR_POCKET: air_pocket,
    CauseKind.FLOW_METER_ERROR: flow_meter_error,
    CauseKind.PUMP_LIFT: pump_lift,
    CauseKind.DENSITY_ERROR: density_error,
    CauseKind.CROSSED_LINES: _differential(CauseKind.CROSSED_LINES),
    CauseKind.EQUALISED: _differential(CauseKind.EQUALISED),
    CauseKind.ROOT: _differential(CauseKind.ROOT),
}
