"""Writes the sample jobs: invented systems of one invented site, with readings from physics that is not the product's own.

    python tests/make_samples.py [FOLDER]

Friction comes from the fluids library, water from the chemicals library (IAPWS-95 and its viscosity), everything else from the few lines
below. Hidden true values (losses, elevations, calibrations, meters, density) are drawn from the doubts that each job states.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from pathlib import Path

import fluids
import numpy as np
from chemicals import iapws95_rho, mu_IAPWS
from numpy.typing import NDArray

Array = NDArray[np.float64]
FOLDER = Path(__file__).parent.parent / "sample_logs"
GRAVITY, AIR_PA_M = 9.8115, 12.0  # m/s² near 51.5° north; Pa/m
PRESSURE = {"bar": 1e5, "kPa": 1e3, "psi": 6894.757293168361, "mH2O": 9806.65}
LENGTH = {"m": 1.0, "mm": 1e-3, "ft": 0.3048, "in": 0.0254}
FLOW = {"m3/h": 1 / 3600, "gpm": 3.785411784e-3 / 60, "L/s": 1e-3}
SITE = "Gullwick Terminal (invented for this sample)"


@dataclass(frozen=True, kw_only=True)
class Pipe:
    """A run: lengths in the job's own unit, bore in its small one."""

    name: str
    start: str
    end: str
    length: float
    bore: float
    roughness_mm: float = 0.045
    k: float = 0.0
    rated: tuple[float, float] | None = None  # drop and flow, in the job's units
    item: str = ""
    meter: str = ""


@dataclass(frozen=True, kw_only=True)
class Dial:
    """A gauge; its range and division in its unit."""

    tag: str
    station: str
    elevation: float | None
    unit: str  # bar, kPa, psi, mH2O with g or a behind
    high: float
    accuracy: str
    limit: float  # the accuracy as a share of span
    division: float
    tolerance: str = "1 % span"
    leg: str = ""


@dataclass(frozen=True, kw_only=True)
class Sample:
    """One job, its flows by spell and its trouble."""

    name: str
    title: str
    seed: int
    length: str
    bore: str
    flow: str
    drop: str
    stations: tuple[tuple[str, float, str], ...]
    pipes: tuple[Pipe, ...]
    dials: tuple[Dial, ...]
    flows: tuple[dict[str, float], ...]  # by meter, in the job's unit; empty when still
    heads: tuple[float, ...]  # total head at the first station, m
    celsius: float = 16.0
    step_s: int = 3
    spell_s: int = 420
    shape: str = "plain"
    shift: dict[str, float] = field(default_factory=dict)  # reads high by, in the gauge's unit
    logged_in: dict[str, str] = field(default_factory=dict)
    blocked: dict[str, float] = field(default_factory=dict)  # K added
    pocket: dict[str, float] = field(default_factory=dict)  # m of head, while flowing


def draw(sample: Sample, rng: np.random.Generator) -> dict[str, Array]:
    """Hidden true values within the stated doubts."""
    dials = len(sample.dials)
    return {
        "loss": 1 + 0.05 * rng.normal(size=len(sample.pipes)),
        "elevation": 0.010 * rng.normal(size=dials),
        "offset": rng.uniform(-1, 1, dials),
        "slope": rng.uniform(-1, 1, dials),
        "meter": 1 + 0.0075 * rng.normal(size=len(sample.pipes)),
        "density": 1 + np.array([0.0004 * rng.normal()]),
    }


def run_flows(sample: Sample, spell: int) -> dict[str, float]:
    """True flow of every run in m³/s: metered runs as stated, the others by mass balance down the tree."""
    stated = sample.flows[spell]
    flows: dict[str, float] = {}
    for pipe in reversed(sample.pipes):
        below = [flows[other.name] for other in sample.pipes if other.start == pipe.end]
        known = stated.get(pipe.meter) if pipe.meter else None
        flows[pipe.name] = sum(below) if below else (known or 0.0) * FLOW[sample.flow]
    if not any(len([p for p in sample.pipes if p.start == pipe.end]) > 1 for pipe in sample.pipes):
        only = next((value for value in stated.values()), 0.0) * FLOW[sample.flow]
        flows = {pipe.name: only for pipe in sample.pipes}
    return flows


def head_lost(sample: Sample, pipe: Pipe, flow: float, density: float, viscosity: float) -> float:
    """Head lost in a run by Darcy–Weisbach, loss coefficients and rated drop, in m."""
    bore = pipe.bore * LENGTH[sample.bore]
    velocity = flow / (np.pi * bore**2 / 4)
    k = pipe.k
    if flow > 0 and pipe.length:
        reynolds = density * velocity * bore / viscosity
        k += (
            fluids.friction_factor(Re=reynolds, eD=pipe.roughness_mm * 1e-3 / bore)
            * pipe.length
            * LENGTH[sample.length]
            / bore
        )
    lost = k * velocity**2 / (2 * GRAVITY)
    if pipe.rated:
        lost += (
            pipe.rated[0]
            * PRESSURE[sample.drop]
            / (density * GRAVITY)
            * (flow / (pipe.rated[1] * FLOW[sample.flow])) ** 2
        )
    return float(lost)


def true_readings(sample: Sample, spell: int, hidden: dict[str, Array]) -> tuple[Array, Array, dict[str, float]]:
    """What perfect gauges at their true elevations would read, the part of it that goes with flow squared, Pa, and the flows, m³/s."""
    kelvin = 273.15 + sample.celsius
    density = float(iapws95_rho(kelvin, 101325.0)) * float(hidden["density"][0])
    viscosity = float(mu_IAPWS(kelvin, density))
    flows = run_flows(sample, spell)
    heads = {sample.stations[0][0]: sample.heads[spell]}
    losses = {sample.stations[0][0]: 0.0}
    for index, pipe in enumerate(sample.pipes):
        lost = head_lost(sample, pipe, flows[pipe.name], density, viscosity) * float(hidden["loss"][index])
        speed = flows[pipe.name] / (np.pi * (pipe.bore * LENGTH[sample.bore]) ** 2 / 4)
        lost += sample.blocked.get(pipe.name, 0.0) * speed**2 / (2 * GRAVITY)
        losses[pipe.end] = losses[pipe.start] + lost
        step = sample.pocket.get(pipe.name, 0.0) if flows[pipe.name] > 0 else 0.0
        heads[pipe.end] = heads[pipe.start] - lost - step
    scale = LENGTH[sample.length]
    tap = {name: z * scale for name, z, _ in sample.stations}
    out, with_flow = [], []
    for index, dial in enumerate(sample.dials):
        ending = [pipe for pipe in sample.pipes if pipe.end == dial.station]
        pipe = ending[0] if ending else next(p for p in sample.pipes if p.start == dial.station)
        velocity = flows[pipe.name] / (np.pi * (pipe.bore * LENGTH[sample.bore]) ** 2 / 4)
        stated = tap[dial.station] if dial.elevation is None else dial.elevation * scale
        height = stated + float(hidden["elevation"][index])
        column = tap[dial.station] if dial.leg == "dry" else height
        moving = 0.5 * density * velocity**2
        pressure = density * GRAVITY * (heads[dial.station] - column) - moving
        with_flow.append(-density * GRAVITY * losses[dial.station] - moving)
        out.append(pressure + (AIR_PA_M * height if dial.unit.endswith("g") else 100_600.0))
    return np.array(out), np.array(with_flow), flows


def logged(sample: Sample) -> tuple[list[str], list[list[str]]]:
    """Column names and rows of text."""
    rng = np.random.default_rng(sample.seed)
    hidden = draw(sample, rng)
    count = sample.spell_s // sample.step_s
    states = [true_readings(sample, spell, hidden) for spell in range(len(sample.flows))]
    # each spell, eased in from the one before over some tens of seconds
    ease = np.concatenate([np.full(count, float(spell)) for spell in range(len(states))])
    for spell in range(1, len(states)):
        ramp = int(rng.integers(8, 24))
        ease[spell * count : spell * count + ramp] = spell - 1 + np.linspace(0, 1, ramp, endpoint=False)
    low, part = np.floor(ease).astype(int), ease - np.floor(ease)
    high = np.minimum(low + 1, len(states) - 1)
    wander = slow_noise(rng, ease.size, 300.0)
    flutter = 1 + 0.006 * slow_noise(rng, ease.size, 1.0)
    columns, names = [], []
    pressures, with_flow = np.array([state[0] for state in states]), np.array([state[1] for state in states])
    for index, dial in enumerate(sample.dials):
        clean = pressures[low, index] * (1 - part) + pressures[high, index] * part
        moving = (with_flow[low, index] * (1 - part) + with_flow[high, index] * part) * (flutter**2 - 1)
        unit = PRESSURE[dial.unit[:-1]]
        span = dial.high * unit
        curve = 0.8 * hidden["offset"][index] + 0.2 * hidden["slope"][index] * (2 * clean / span - 1)
        value = clean + moving + wander + dial.limit * span * curve + 0.0004 * span * rng.normal(size=ease.size)
        value = value / unit + sample.shift.get(dial.tag, 0.0)
        if dial.tag in sample.logged_in:
            value = value * unit / PRESSURE[sample.logged_in[dial.tag]]
        names.append(dial.tag)
        columns.append([number(v, dial.division) for v in value])
    for index, pipe in enumerate(sample.pipes):
        if pipe.meter:
            flow = np.array([state[2][pipe.name] for state in states]) / FLOW[sample.flow]
            value = (flow[low] * (1 - part) + flow[high] * part) * flutter * hidden["meter"][index]
            names.append(pipe.meter)
            columns.append([number(v, 0.01) for v in value + 0.004 * flow.max() * rng.normal(size=ease.size)])
    rows = [list(row) for row in zip(*columns, strict=True)]
    for _ in range(6):
        rows[int(rng.integers(len(rows)))][int(rng.integers(len(sample.dials)))] = ""
    for word in ("Bad", "---"):
        rows[int(rng.integers(len(rows)))][int(rng.integers(len(sample.dials)))] = word
    return names, rows


def slow_noise(rng: np.random.Generator, count: int, size: float) -> Array:
    """A slow wander of this standard deviation."""
    out, value = np.empty(count), 0.0
    for index in range(count):
        value = 0.97 * value + size * np.sqrt(1 - 0.97**2) * rng.normal()
        out[index] = value
    return out


def number(value: float, division: float) -> str:
    """A value rounded to a division."""
    places = max(0, -int(np.floor(np.log10(division) + 1e-9)))
    return f"{round(value / division) * division:.{places}f}"


def write(sample: Sample, folder: Path) -> None:
    """Write one job folder."""
    target = folder / sample.name
    target.mkdir(parents=True, exist_ok=True)
    scale = "ft" if sample.length == "ft" else "m"
    lines = ["station,elevation [" + scale + "],exchange"]
    lines += [f"{name},{z:g},{exchange}" for name, z, exchange in sample.stations]
    put(target / "stations.csv", lines)
    rough = "in" if sample.bore == "in" else "mm"
    lines = [
        f"run,from,to,length [{sample.length}],bore [{sample.bore}],roughness [{rough}],fittings K,rated drop [{sample.drop}],"
        f"rated flow [{sample.flow}],item,flow column,flow unit"
    ]
    for pipe in sample.pipes:
        drop, at = (f"{pipe.rated[0]:g}", f"{pipe.rated[1]:g}") if pipe.rated else ("", "")
        roughness = pipe.roughness_mm * 1e-3 / LENGTH[rough] if pipe.length else 0.0
        lines.append(
            f"{pipe.name},{pipe.start},{pipe.end},{pipe.length:g},{pipe.bore:g},{roughness:.4g},{pipe.k:g},{drop},{at},"
            f"{pipe.item},{pipe.meter},{sample.flow if pipe.meter else ''}"
        )
    put(target / "runs.csv", lines)
    lines = [f"tag,station,elevation [{scale}],leg,unit,range low,range high,accuracy,tolerance,division"]
    for dial in sample.dials:
        height = "" if dial.elevation is None else f"{dial.elevation:g}"
        lines.append(
            f"{dial.tag},{dial.station},{height},{dial.leg},{dial.unit},0,{dial.high:g},{dial.accuracy},{dial.tolerance},{dial.division:g}"
        )
    put(target / "gauges.csv", lines)
    put(target / "job.toml", job_file(sample))
    put(target / "log.csv", log_file(sample))


def job_file(sample: Sample) -> list[str]:
    """Lines of job.toml."""
    return [
        "# An invented job of an invented site: every name and number is made up.",
        "format = 1",
        "",
        "[job]",
        f'title = "{sample.title}"',
        f'site = "{SITE}"',
        'prepared_by = "nobody, a sample"',
        'stations = "stations.csv"',
        'runs = "runs.csv"',
        'gauges = "gauges.csv"',
        'logs = ["log.csv"]',
        'timezone = "UTC"',
        "",
        "[liquid]",
        'kind = "water"',
        f'temperature = "{sample.celsius:g} degC"',
        'temperature_uncertainty = "±1 K"',
        "",
        "[site]",
        'datum_altitude = "12 m"',
        'latitude = "51.3 deg"',
        'barometer = "100.6 kPa"',
        "",
        "[check]",
        'elevation_uncertainty = "±20 mm"',
        'loss_uncertainty = "±10 %"',
        'flow_uncertainty = "±1.5 %"',
    ]


def log_file(sample: Sample) -> list[str]:
    """Lines of the log, in one of the shapes that loggers write."""
    names, rows = logged(sample)
    start = datetime(2026, 5, 18, 7, 30, tzinfo=UTC)
    times = [start + timedelta(seconds=sample.step_s * index) for index in range(len(rows))]
    if sample.shape == "comma decimals":
        lines = ["Gullwick logger 3;export", "operator;a. nother", ";".join(["time", *names])]
        body = [[cell.replace(".", ",") for cell in row] for row in rows]
        return lines + [";".join([f"{t:%d.%m.%Y %H:%M:%S}", *row]) for t, row in zip(times, body, strict=True)]
    if sample.shape == "units row":
        units = {dial.tag: dial.unit for dial in sample.dials}
        lines = [",".join(["time", *names]), ",".join(["", *(units.get(name, sample.flow) for name in names)])]
        return lines + [",".join([f"{t:%Y-%m-%d %H:%M:%S}", *row]) for t, row in zip(times, rows, strict=True)]
    head = ",".join(["time", *names])
    return [head, *(",".join([f"{t:%Y-%m-%dT%H:%M:%SZ}", *row]) for t, row in zip(times, rows, strict=True))]


def put(path: Path, lines: list[str]) -> None:
    """Write lines, the same bytes on every system."""
    path.write_bytes(("\n".join(lines) + "\n").encode())


def riser() -> Sample:
    """A riser at rest and at three flows; the gauge on level 8 reads 0.16 bar high."""
    levels = (("LOBBY", 0.8), ("LEVEL4", 14.2), ("LEVEL8", 27.6), ("LEVEL12", 41.0))
    stations = tuple((name, z, "open" if name in ("LOBBY", "LEVEL12") else "closed") for name, z in levels)
    names = [name for name, _ in levels]
    pipes = tuple(
        Pipe(name=f"RISER-{i + 1}", start=names[i], end=names[i + 1], length=16.5 + i, bore=77.9, k=2.2 + 0.4 * i,
             meter="FT-20" if i == 0 else "")
        for i in range(3)
    )  # fmt: skip
    dials = tuple(
        Dial(
            tag=tag,
            station=station,
            elevation=z,
            unit=unit,
            high=high,
            accuracy=accuracy,
            limit=limit,
            division=step,
            leg=leg,
        )
        for tag, station, z, unit, high, accuracy, limit, step, leg in (
            ("PT-20", "LOBBY", 1.1, "barg", 10.0, "0.25 % span", 0.0025, 0.001, ""),
            ("PT-21", "LOBBY", None, "barg", 10.0, "0.25 % span", 0.0025, 0.001, ""),
            ("PT-24", "LEVEL4", 15.3, "barg", 6.0, "0.25 % span", 0.0025, 0.001, ""),
            ("PT-28", "LEVEL8", 28.4, "barg", 6.0, "0.25 % span", 0.0025, 0.001, ""),
            ("PI-28", "LEVEL8", 29.0, "barg", 6.0, "class 1.0", 0.01, 0.01, "dry"),
            ("PT-32", "LEVEL12", 42.2, "barg", 4.0, "0.25 % span", 0.0025, 0.001, ""),
        )
    )
    return Sample(
        name="riser-drift", title="Block C cold-water riser", seed=11, length="m", bore="mm", flow="m3/h", drop="kPa",
        stations=stations, pipes=pipes, dials=dials, heads=(63.0, 62.1, 60.4, 58.2), shift={"PT-28": 0.16},
        flows=({}, {"FT-20": 12.0}, {"FT-20": 20.0}, {"FT-20": 28.0}),
    )  # fmt: skip


def cooling() -> Sample:
    """A cooling-water line whose strainer is full of weed."""
    heights = {"INTAKE": 3.0, "SCREEN": 3.4, "HALL": 3.4, "COOLER": 6.2, "OUTLET": 6.2, "RETURN": 2.1}
    names = list(heights)
    stations = tuple((name, z, "open" if name in ("INTAKE", "RETURN") else "closed") for name, z in heights.items())
    pipes = (
        Pipe(name="CW-1", start="INTAKE", end="SCREEN", length=64, bore=202.7, k=2.5, meter="FT-50"),
        Pipe(name="STR-1", start="SCREEN", end="HALL", length=0, bore=202.7, rated=(9.0, 220.0), item="strainer"),
        Pipe(name="CW-2", start="HALL", end="COOLER", length=38, bore=202.7, k=3.1),
        Pipe(name="HX-1", start="COOLER", end="OUTLET", length=0, bore=202.7, rated=(38.0, 220.0), item="exchanger"),
        Pipe(name="CW-3", start="OUTLET", end="RETURN", length=85, bore=202.7, k=3.4),
    )
    dials = tuple(
        Dial(tag=f"PT-5{i + 1}", station=name, elevation=heights[name] + 0.4, unit="kPag", high=400.0,
             accuracy="0.25 % span", limit=0.0025, division=0.1)
        for i, name in enumerate(names)
    )  # fmt: skip
    return Sample(
        name="cooling-strainer", title="Cooling water to hall 2", seed=22, length="m", bore="mm", flow="m3/h", drop="kPa",
        stations=stations, pipes=pipes, dials=dials, heads=(31.0, 33.5, 35.0, 36.0), blocked={"STR-1": 11.0},
        flows=({}, {"FT-50": 120.0}, {"FT-50": 175.0}, {"FT-50": 215.0}), shape="comma decimals",
    )  # fmt: skip


def hill() -> Sample:
    """A main over a hill, with air caught on the way down."""
    heights = {"WELL": 12.0, "FORD": 9.5, "SADDLE": 38.0, "BARN": 21.0, "MILL": 26.0, "TANK-IN": 30.5}
    names = list(heights)
    stations = tuple((name, z, "open" if name in ("WELL", "TANK-IN") else "closed") for name, z in heights.items())
    pipes = tuple(
        Pipe(name=f"M{i + 1}", start=names[i], end=names[i + 1], length=length, bore=154.1, roughness_mm=0.1, k=1.5,
             meter="FT-70" if i == 0 else "")
        for i, length in enumerate((310, 420, 260, 380, 290))
    )  # fmt: skip
    dials = tuple(
        Dial(tag=f"PT-7{i + 1}", station=name, elevation=heights[name] + (0.6 if i % 2 else -0.3), unit=unit, high=high,
             accuracy="0.2 % span", limit=0.002, division=step)
        for i, (name, unit, high, step) in enumerate(zip(
            names, ("barg", "barg", "mH2Og", "barg", "kPag", "barg"), (10.0, 10.0, 60.0, 6.0, 600.0, 6.0),
            (0.001, 0.001, 0.01, 0.001, 0.1, 0.001), strict=True))
    )  # fmt: skip
    return Sample(
        name="hill-main-air", title="Hill main, well to tank", seed=33, length="m", bore="mm", flow="L/s", drop="kPa",
        stations=stations, pipes=pipes, dials=dials, heads=(66.0, 68.0, 70.0, 72.0), pocket={"M3": 3.8}, celsius=9.0,
        flows=({}, {"FT-70": 8.0}, {"FT-70": 12.0}, {"FT-70": 16.0}),
    )  # fmt: skip


def fire() -> Sample:
    """A fire main in US units, with one transmitter logged in bar where psi is stated."""
    heights = {"PUMPROOM": 4.0, "NODE-A": 12.0, "NODE-B": 12.0, "HYDRANT": 31.0}
    names = list(heights)
    stations = tuple((name, z, "open" if name in ("PUMPROOM", "HYDRANT") else "closed") for name, z in heights.items())
    pipes = tuple(
        Pipe(
            name=f"FM-{i + 1}",
            start=names[i],
            end=names[i + 1],
            length=length,
            bore=6.065,
            k=2.0,
            meter="FT-90" if i == 0 else "",
        )
        for i, length in enumerate((260.0, 410.0, 330.0))
    )
    dials = tuple(
        Dial(tag=tag, station=station, elevation=heights[station] + 2.5, unit="psig", high=200.0, accuracy=accuracy, limit=limit,
             division=step)
        for tag, station, accuracy, limit, step in (
            ("PIT-901", "PUMPROOM", "0.25 % span", 0.0025, 0.01),
            ("PIT-902", "NODE-A", "0.25 % span", 0.0025, 0.01),
            ("PIT-903", "NODE-B", "0.25 % span", 0.0025, 0.001),
            ("PI-904", "NODE-B", "grade 2A", 0.005, 0.1),
            ("PIT-905", "HYDRANT", "0.25 % span", 0.0025, 0.01),
        )
    )  # fmt: skip
    return Sample(
        name="fire-main-units", title="Fire main, tank farm east", seed=44, length="ft", bore="in", flow="gpm", drop="psi",
        stations=stations, pipes=pipes, dials=dials, heads=(88.0, 85.0, 81.0), logged_in={"PIT-903": "bar"}, celsius=13.0,
        flows=({}, {"FT-90": 450.0}, {"FT-90": 800.0}), shape="units row",
    )  # fmt: skip


def branched() -> Sample:
    """A healthy tree: a header with three metered branches."""
    heights = {"PLANT": 2.0, "TEE-1": 6.0, "TEE-2": 9.0, "NORTH": 14.0, "EAST": 11.0, "SOUTH": 8.0}
    stations = tuple((name, z, "closed" if name.startswith("TEE") else "open") for name, z in heights.items())
    pipes = (
        Pipe(name="HDR-1", start="PLANT", end="TEE-1", length=45, bore=154.1, k=3.0),
        Pipe(name="HDR-2", start="TEE-1", end="TEE-2", length=36, bore=128.2, k=1.6),
        Pipe(name="BR-S", start="TEE-1", end="SOUTH", length=52, bore=77.9, k=4.2, meter="FT-31"),
        Pipe(name="BR-N", start="TEE-2", end="NORTH", length=61, bore=77.9, k=4.8, meter="FT-32"),
        Pipe(name="BR-E", start="TEE-2", end="EAST", length=33, bore=77.9, k=3.9, meter="FT-33"),
    )
    dials = tuple(
        Dial(tag=tag, station=station, elevation=z, unit=unit, high=high, accuracy=accuracy, limit=limit, division=step,
             tolerance="1.6 % span" if accuracy == "class 1.0" else "1 % span")
        for tag, station, z, unit, high, accuracy, limit, step in (
            ("PT-30", "PLANT", 1.2, "barg", 10.0, "0.25 % span", 0.0025, 0.001),
            ("PT-31", "TEE-1", 6.4, "barg", 6.0, "0.25 % span", 0.0025, 0.001),
            ("PT-32", "TEE-2", 9.8, "barg", 6.0, "0.25 % span", 0.0025, 0.001),
            ("PT-33", "NORTH", 14.5, "bara", 6.0, "0.25 % span", 0.0025, 0.001),
            ("PI-34", "EAST", 12.2, "barg", 6.0, "class 1.0", 0.01, 0.01),
            ("PT-35", "SOUTH", 7.1, "kPag", 600.0, "0.25 % span", 0.0025, 0.1),
        )
    )  # fmt: skip
    return Sample(
        name="branched-sound", title="Process water to three halls", seed=55, length="m", bore="mm", flow="m3/h", drop="kPa",
        stations=stations, pipes=pipes, dials=dials, heads=(48.0, 46.5, 45.0, 44.2), celsius=14.0,
        flows=({}, {"FT-31": 9.0, "FT-32": 12.0, "FT-33": 8.0}, {"FT-31": 16.0, "FT-32": 14.0, "FT-33": 15.0},
               {"FT-31": 20.0, "FT-32": 22.0, "FT-33": 18.0}),
    )  # fmt: skip


SAMPLES = (riser, cooling, hill, fire, branched)


def main(folder: Path = FOLDER) -> None:
    """Write every sample."""
    for make in SAMPLES:
        write(make(), folder)


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else FOLDER)
