"""Readings of a drawn system: heads by the fluids and chemicals libraries, then what instruments make of them."""

from __future__ import annotations

from dataclasses import dataclass, field, replace
from datetime import UTC, datetime, timedelta
from pathlib import Path

import fluids
import numpy as np
from chemicals import iapws95_rho, mu_IAPWS
from numpy.typing import NDArray

from tests.benchmarks.simulator.systems import System
from tests.make_samples import AIR_PA_M, GRAVITY, Pipe, put, slow_noise

Array = NDArray[np.float64]
BAR, BAROMETER_PA = 1e5, 100_600.0
START = datetime(2026, 5, 18, 7, 30, tzinfo=UTC)
ELEVATION_SD, LOSS_SD, METER_SD, DENSITY_SD = 0.010, 0.05, 0.0075, 0.0004


@dataclass(kw_only=True)
class Faults:
    """What is wrong, as the readings feel it."""

    added_k: dict[str, float] = field(default_factory=dict)
    pocket_m: dict[str, float] = field(default_factory=dict)
    pocket_at_rest: bool = False
    density_ratio: float = 1.0
    meter_ratio: dict[str, float] = field(default_factory=dict)
    lift_ratio: float = 1.0
    shift_pa: dict[str, float] = field(default_factory=dict)
    slope: dict[str, float] = field(default_factory=dict)  # read over true, about nothing
    unit_ratio: dict[str, float] = field(default_factory=dict)
    column_m: dict[str, float] = field(default_factory=dict)  # stated too high by
    swapped: tuple[str, str] | None = None
    drift_pa_s: dict[str, tuple[float, float]] = field(default_factory=dict)  # rate, from second
    step_pa: dict[str, tuple[float, float]] = field(default_factory=dict)
    frozen_from: dict[str, float] = field(default_factory=dict)
    lag_s: dict[str, float] = field(default_factory=dict)
    noise_times: dict[str, float] = field(default_factory=dict)
    late_s: float = 0.0  # of the second file
    differential: str = ""  # crossed, equalised or root


def pipe_flows(system: System, spell: int) -> dict[str, float]:
    """True flow of every run by mass balance down the tree, m³/s."""
    metered = system.flows[spell]
    flows: dict[str, float] = {}
    for pipe in reversed(system.pipes):
        below = [flows[other.name] for other in system.pipes if other.start == pipe.end]
        flows[pipe.name] = sum(below) if below else metered.get(pipe.meter, 0.0) / 3600.0
    if len(system.flows[-1]) == 1:  # a line, its meter where it may be
        flows = dict.fromkeys(flows, next(iter(metered.values()), 0.0) / 3600.0)
    return flows


def lost_m(pipe: Pipe, flow_m3_s: float, density: float, viscosity: float, added_k: float = 0.0) -> float:
    """Head lost in a run."""
    bore = pipe.bore * 1e-3
    velocity = flow_m3_s / (np.pi * bore**2 / 4)
    k = pipe.k + added_k
    if velocity > 0.0 and pipe.length:
        friction = fluids.friction_factor(Re=density * velocity * bore / viscosity, eD=pipe.roughness_mm * 1e-3 / bore)
        k += friction * pipe.length / bore
    return float(k * velocity**2 / (2 * GRAVITY))


def water(system: System) -> tuple[float, float]:
    """Density and viscosity at the system's temperature."""
    density = float(iapws95_rho(273.15 + system.celsius, 101_325.0))
    return density, float(mu_IAPWS(273.15 + system.celsius, density))


def true_heads(
    system: System, spell: int, hidden: dict[str, Array] | None = None, faults: Faults | None = None
) -> dict[str, float]:
    """Total head of every station, m."""
    faults = faults or Faults()
    density, viscosity = water(system)
    flows = pipe_flows(system, spell)
    heads = {system.stations[0][0]: system.heads[spell]}
    for index, pipe in enumerate(system.pipes):
        loss = 1.0 if hidden is None else float(hidden["loss"][index])
        flow = flows[pipe.name]
        change = -loss * lost_m(pipe, flow, density, viscosity)
        velocity = flow / (np.pi * (pipe.bore * 1e-3) ** 2 / 4)
        change -= faults.added_k.get(pipe.name, 0.0) * velocity**2 / (2 * GRAVITY)
        if system.pump is not None and pipe.item == "pump" and flow > 0.0:
            change += loss * faults.lift_ratio * (system.pump.shut_off_m - system.pump.slope * (3600.0 * flow) ** 2)
        if flow > 0.0 or faults.pocket_at_rest:
            change -= faults.pocket_m.get(pipe.name, 0.0)
        heads[pipe.end] = heads[pipe.start] + change
    return heads


def draw_hidden(system: System, rng: np.random.Generator) -> dict[str, Array]:
    """Hidden true values within the stated doubts."""
    dials = len(system.dials) + len(system.differential)
    return {
        "loss": 1 + LOSS_SD * rng.normal(size=len(system.pipes)),
        "elevation": ELEVATION_SD * rng.normal(size=dials),
        "offset": rng.uniform(-1, 1, dials),
        "slope": rng.uniform(-1, 1, dials),
        "meter": 1 + METER_SD * rng.normal(size=len(system.pipes)),
        "density": np.array([1 + DENSITY_SD * rng.normal()]),
    }


def perfect_pa(system: System, spell: int, hidden: dict[str, Array], faults: Faults) -> tuple[Array, Array]:
    """What perfect gauges read, and the part of it that goes with flow squared, Pa; differential gauges last."""
    density = water(system)[0] * float(hidden["density"][0]) * faults.density_ratio
    flows = pipe_flows(system, spell)
    heads = true_heads(system, spell, hidden, faults)
    # the flow's flutter moves what goes with its square, not a pocket and not a pump's lift at no flow
    bare = replace(system, pump=None if system.pump is None else replace(system.pump, shut_off_m=0.0))
    rest = true_heads(bare, spell, hidden, Faults(added_k=faults.added_k))
    first = heads[system.stations[0][0]]
    tap = {name: z for name, z, _ in system.stations}
    values, moving = [], []
    for index, dial in enumerate(system.dials):
        ending = [pipe for pipe in system.pipes if pipe.end == dial.station]
        widest = (
            max(ending, key=lambda p: p.bore) if ending else next(p for p in system.pipes if p.start == dial.station)
        )
        velocity = flows[widest.name] / (np.pi * (widest.bore * 1e-3) ** 2 / 4)
        stated = tap[dial.station] if dial.elevation is None else dial.elevation
        height = stated + float(hidden["elevation"][index])
        column = tap[dial.station] if dial.leg == "dry" else height
        kinetic = 0.5 * density * velocity**2
        pressure = density * GRAVITY * (heads[dial.station] - column) - kinetic
        values.append(pressure + (AIR_PA_M * height if dial.unit.endswith("g") else BAROMETER_PA))
        moving.append(density * GRAVITY * (rest[dial.station] - first) - kinetic)
    for _, run, *_ in system.differential:
        pipe = next(p for p in system.pipes if p.name == run)
        kinetic = _kinetic_drop(system, pipe, flows, density)
        values.append(density * GRAVITY * (heads[pipe.start] - heads[pipe.end]) + kinetic)
        moving.append(density * GRAVITY * (rest[pipe.start] - rest[pipe.end]) + kinetic)
    return np.array(values), np.array(moving)


def _kinetic_drop(system: System, pipe: Pipe, flows: dict[str, float], density: float) -> float:
    """Velocity pressure at the low tap less that at the high one, each in the bore that ends there."""

    def at(station: str) -> float:
        ending = [p for p in system.pipes if p.end == station] or [p for p in system.pipes if p.start == station]
        widest = max(ending, key=lambda p: p.bore)
        return float(0.5 * density * (flows[widest.name] / (np.pi * (widest.bore * 1e-3) ** 2 / 4)) ** 2)

    return at(pipe.end) - at(pipe.start)


def columns(system: System, faults: Faults, rng: np.random.Generator) -> tuple[Array, dict[str, Array]]:
    """Seconds from the start, and what every column logs: gauges in their units, meters in m³/h."""
    hidden = draw_hidden(system, rng)
    count = system.spell_s // system.step_s
    states = [perfect_pa(system, spell, hidden, faults) for spell in range(len(system.flows))]
    flows = [pipe_flows(system, spell) for spell in range(len(system.flows))]
    ease = np.concatenate([np.full(count, float(spell)) for spell in range(len(states))])
    for spell in range(1, len(states)):
        ramp = int(rng.integers(8, 20))
        ease[spell * count : spell * count + ramp] = spell - 1 + np.linspace(0, 1, ramp, endpoint=False)
    time_s = float(system.step_s) * np.arange(ease.size, dtype=np.float64)
    low, part = np.floor(ease).astype(int), ease - np.floor(ease)
    high = np.minimum(low + 1, len(states) - 1)
    wander = slow_noise(rng, ease.size, system.wander_pa)
    flutter = 1 + 0.006 * slow_noise(rng, ease.size, 1.0)
    clean = np.array([one[0] for one in states])
    moving = np.array([one[1] for one in states])
    found: dict[str, Array] = {}
    names = [*system.tags, *(tag for tag, *_ in system.differential)]
    for index, tag in enumerate(names):
        value = clean[low, index] * (1 - part) + clean[high, index] * part
        value = value + (moving[low, index] * (1 - part) + moving[high, index] * part) * (flutter**2 - 1)
        single = index < len(system.dials)
        value = value + (wander if single else 0.0)
        limit, span = _limit_and_span(system, index)
        curve = 0.8 * hidden["offset"][index] + 0.2 * hidden["slope"][index] * (2 * value / span - 1)
        value = _instrument(value + limit * span * curve, tag, faults, time_s, span, rng, system)
        found[tag] = value / (BAR if single else 1e3)
    if faults.swapped:
        first, second = faults.swapped
        found[first], found[second] = found[second], found[first]
    for index, pipe in enumerate(system.pipes):
        if pipe.meter:
            flow = np.array([one[pipe.name] for one in flows]) * 3600.0
            value = (flow[low] * (1 - part) + flow[high] * part) * flutter * hidden["meter"][index]
            value = value * faults.meter_ratio.get(pipe.name, 1.0)
            found[pipe.meter] = value + 0.004 * flow.max() * rng.normal(size=ease.size)
    return time_s, found


def _limit_and_span(system: System, index: int) -> tuple[float, float]:
    """Limit of error as a share of span, and the span in Pa."""
    if index < len(system.dials):
        dial = system.dials[index]
        return dial.limit, dial.high * BAR
    _, _, high, limit, _ = system.differential[index - len(system.dials)]
    return limit, high * 1e3


def _instrument(
    value: Array, tag: str, faults: Faults, time_s: Array, span: float, rng: np.random.Generator, system: System
) -> Array:
    """What an instrument makes of the pressure at it."""
    density = water(system)[0]
    value = value + faults.shift_pa.get(tag, 0.0) + density * GRAVITY * faults.column_m.get(tag, 0.0)
    rate, begin = faults.drift_pa_s.get(tag, (0.0, 0.0))
    value = value + rate * np.maximum(time_s - begin, 0.0)
    size, begin = faults.step_pa.get(tag, (0.0, 0.0))
    value = value + size * (time_s >= begin)
    value = value * faults.slope.get(tag, 1.0)
    if tag in faults.lag_s:
        value = _lagged(value, system.step_s / faults.lag_s[tag])
    if tag in faults.frozen_from:
        value = np.where(
            time_s >= faults.frozen_from[tag], value[np.searchsorted(time_s, faults.frozen_from[tag])], value
        )
    if tag.startswith("PDT") and faults.differential:
        if faults.differential == "crossed-lines":
            value = -value
        elif faults.differential == "equalised":
            value = 0.002 * span * np.ones_like(value)
        else:
            value = span * np.sqrt(np.maximum(value, 0.0) / span)
    value = value + 0.0004 * span * system.noise * faults.noise_times.get(tag, 1.0) * rng.normal(size=value.size)
    return value * faults.unit_ratio.get(tag, 1.0)


def _lagged(value: Array, share: float) -> Array:
    """A first-order lag."""
    out, now, keep = np.empty_like(value), value[0], np.exp(-share)
    for index, new in enumerate(value):
        now = keep * now + (1 - keep) * new
        out[index] = now
    return out


def write_job(system: System, faults: Faults, rng: np.random.Generator, folder: Path) -> None:
    """Write a job folder with its logs."""
    folder.mkdir(parents=True, exist_ok=True)
    put(folder / "stations.csv", ["station,elevation [m],exchange", *(f"{n},{z:g},{e}" for n, z, e in system.stations)])
    lines = [
        "run,from,to,length [m],bore [mm],roughness [mm],fittings K,item,flow column,flow unit,pump curve,pump flow unit,pump head unit"
    ]
    for pipe in system.pipes:
        curve = ",,"
        if system.pump is not None and pipe.item == "pump":
            most = sum(system.flows[-1].values())
            points = [(q, system.pump.shut_off_m - system.pump.slope * q**2) for q in (0.0, 0.6 * most, 1.2 * most)]
            curve = "; ".join(f"{q:.6g}:{h:.6g}" for q, h in points) + ",m3/h,m"
        lines.append(
            f"{pipe.name},{pipe.start},{pipe.end},{pipe.length:g},{pipe.bore:g},{pipe.roughness_mm:g},{pipe.k:g},{pipe.item},"
            f"{pipe.meter},{'m3/h' if pipe.meter else ''},{curve}"
        )
    put(folder / "runs.csv", lines)
    lines = ["tag,station,low station,elevation [m],leg,unit,range low,range high,accuracy,tolerance,division"]
    for dial in system.dials:
        height = "" if dial.elevation is None else f"{dial.elevation:g}"
        lines.append(
            f"{dial.tag},{dial.station},,{height},{dial.leg},{dial.unit},0,{dial.high:g},{dial.accuracy},{dial.tolerance},0.001"
        )
    for tag, run, high, limit, tolerance in system.differential:
        pipe = next(p for p in system.pipes if p.name == run)
        lines.append(
            f"{tag},{pipe.start},{pipe.end},,,kPa,0,{high:g},{100 * limit:g} % span,{tolerance:g} % span,0.001"
        )
    put(folder / "gauges.csv", lines)
    files = ["log.csv", "second.csv"] if system.late_file else ["log.csv"]
    site = [f'barometer = "{BAROMETER_PA / 1000:g} kPa"'] if system.barometer_stated else []
    listed = ", ".join(f'"{name}"' for name in files)
    put(folder / "job.toml", ["format = 1", "[job]", 'title = "drawn"', 'stations = "stations.csv"', 'runs = "runs.csv"',
        'gauges = "gauges.csv"', f"logs = [{listed}]", "[liquid]", 'kind = "water"',
        f'temperature = "{system.celsius:g} degC"', 'temperature_uncertainty = "±1 K"', "[site]", 'datum_altitude = "12 m"',
        'latitude = "51.3 deg"', *site, "[check]", 'elevation_uncertainty = "±20 mm"', 'loss_uncertainty = "±10 %"',
        'flow_uncertainty = "±1.5 %"'])  # fmt: skip
    time_s, found = columns(system, faults, rng)
    late = set(system.late_file)
    _log(folder / "log.csv", time_s, {name: v for name, v in found.items() if name not in late}, 0.0)
    if late:
        _log(folder / "second.csv", time_s, {name: v for name, v in found.items() if name in late}, faults.late_s)


def _log(path: Path, time_s: Array, found: dict[str, Array], late_s: float) -> None:
    """One log file."""
    cells = np.column_stack([np.char.mod("%.3f", values) for values in found.values()])
    stamps = [START + timedelta(seconds=float(t) + late_s) for t in time_s]
    rows = [f"{stamp:%Y-%m-%dT%H:%M:%S}Z," + ",".join(row) for stamp, row in zip(stamps, cells, strict=True)]
    put(path, [",".join(["time", *found]), *rows])
