"""Drawn systems: lines and trees of pipe with gauges, as a site would describe them."""

from __future__ import annotations

from dataclasses import dataclass, field, replace

import numpy as np

from tests.make_samples import Dial, Pipe

PREFERRED_BAR = (1.0, 1.6, 2.5, 4.0, 6.0, 10.0, 16.0, 25.0)
TYPES = (("0.25 % span", 0.0025, 1.0), ("0.5 % span", 0.005, 1.6), ("class 1.0", 0.01, 2.0), ("class 0.6", 0.006, 1.6))
GAP_BAR, LEAST_HEAD_M = 0.3, 5.0


@dataclass(frozen=True, kw_only=True)
class Pump:
    """Lift of a pump that stands in the first run: ``shut_off − slope Q²``. [m], [m/(m³/h)²]"""

    shut_off_m: float
    slope: float


@dataclass(frozen=True, kw_only=True)
class System:
    """A job before anything is wrong; pressures in bar, lengths in m, bores in mm, flows in m³/h.

    `differential` are tags of gauges across one run: (tag, run, range in kPa, limit of error as a share of span, tolerance in %).
    """

    stations: tuple[tuple[str, float, str], ...]
    pipes: tuple[Pipe, ...]
    dials: tuple[Dial, ...]
    flows: tuple[dict[str, float], ...]  # by meter; empty at rest
    heads: tuple[float, ...]  # at the first station, before a pump
    celsius: float
    pump: Pump | None = None
    differential: tuple[tuple[str, str, float, float, float], ...] = ()
    late_file: tuple[str, ...] = ()  # tags that a second logger writes
    spell_s: int = 300
    step_s: int = 2
    noise: float = 1.0
    wander_pa: float = 300.0
    barometer_stated: bool = True
    remarks: tuple[str, ...] = field(default=())

    @property
    def tags(self) -> tuple[str, ...]:
        """Of gauges with one tap."""
        return tuple(dial.tag for dial in self.dials)


def drawn_system(rng: np.random.Generator, *, awkward: bool = False) -> System:
    """A line or a tree of three to nine runs, with three to twelve gauges."""
    pipes = _tree(rng) if rng.random() < 0.4 else _line(rng)
    heights = _heights(rng, pipes)
    full = _full_flows(rng, pipes)
    states = _states(rng, full, awkward=awkward)
    base = float(max(heights.values())) + float(rng.uniform(8.0, 60.0))
    pump = None
    if rng.random() < 0.25:
        most = sum(full.values())
        shut_off = float(rng.uniform(15.0, 45.0))
        pump = Pump(shut_off_m=shut_off, slope=0.35 * shut_off / most**2)
        pipes = (Pipe(name="PU", start="S0", end="S0D", length=0.0, bore=pipes[0].bore, item="pump"), *_moved(pipes))
        heights = {"S0": heights["S0"], "S0D": heights["S0"], **{k: z for k, z in heights.items() if k != "S0"}}
    ends = {name for name in heights if sum(name in (p.start, p.end) for p in pipes) == 1}
    system = System(
        stations=tuple((name, z, "open" if name in ends else "closed") for name, z in heights.items()),
        pipes=pipes,
        dials=(),
        flows=states,
        heads=tuple(base + float(rng.normal(0.0, 1.5)) for _ in states),
        celsius=float(rng.uniform(6.0, 35.0)),
        pump=pump,
        spell_s=int(rng.choice([160, 300, 600])) if awkward else 300,
        noise=float(rng.choice([1.0, 3.0, 6.0])) if awkward else 1.0,
        wander_pa=float(rng.choice([300.0, 4000.0])) if awkward else 300.0,
        barometer_stated=not awkward or rng.random() < 0.5,
    )
    return _with_gauges(rng, _above_air(system), awkward=awkward)


def _above_air(system: System) -> System:
    """The system with heads so high that no station comes below the pressure of the air."""
    from tests.benchmarks.simulator.readings import true_heads

    heights = {name: z for name, z, _ in system.stations}
    spare = [
        min(head - heights[name] for name, head in true_heads(system, k).items()) for k in range(len(system.flows))
    ]
    lift = max(0.0, LEAST_HEAD_M - min(spare))
    return replace(system, heads=tuple(head + lift for head in system.heads))


def _moved(pipes: tuple[Pipe, ...]) -> tuple[Pipe, ...]:
    """The pipes behind a pump."""
    return tuple(replace(pipe, start="S0D") if pipe.start == "S0" else pipe for pipe in pipes)


def _pipe(rng: np.random.Generator, name: str, start: str, end: str, bore: float) -> Pipe:
    return Pipe(
        name=name,
        start=start,
        end=end,
        length=float(np.round(10.0 ** rng.uniform(1.0, 2.6))),
        bore=bore,
        roughness_mm=float(rng.choice([0.0015, 0.045, 0.15])),
        k=float(np.round(rng.uniform(1.0, 8.0), 1)),
    )


def _line(rng: np.random.Generator) -> tuple[Pipe, ...]:
    count, bore = int(rng.integers(3, 8)), float(rng.choice([52.5, 77.9, 102.3, 154.1, 202.7]))
    pipes = [_pipe(rng, f"R{n + 1}", f"S{n}", f"S{n + 1}", bore) for n in range(count)]
    pipes[0] = replace(pipes[0], meter="FT-1")
    if rng.random() < 0.4:
        at = int(rng.integers(1, count))
        pipes[at] = replace(pipes[at], length=0.0, k=float(rng.uniform(4.0, 15.0)), item="strainer")
    return tuple(pipes)


def _tree(rng: np.random.Generator) -> tuple[Pipe, ...]:
    branches = int(rng.integers(2, 4))
    pipes = [_pipe(rng, "R1", "S0", "T1", 154.1)]
    for n in range(1, branches + 1):
        here = f"T{n}"
        if n < branches:
            pipes.append(_pipe(rng, f"H{n}", here, f"T{n + 1}", 128.2))
            pipes.append(replace(_pipe(rng, f"B{n}", here, f"E{n}", 77.9), meter=f"FT-{n}"))
        else:
            pipes.append(replace(_pipe(rng, f"B{n}", here, f"E{n}", 77.9), meter=f"FT-{n}"))
    return tuple(pipes)


def _heights(rng: np.random.Generator, pipes: tuple[Pipe, ...]) -> dict[str, float]:
    names = dict.fromkeys(name for pipe in pipes for name in (pipe.start, pipe.end))
    rise = float(rng.choice([0.0, 5.0, 12.0]))
    heights = {name: float(np.round(rng.normal(10.0, rise + 0.1), 2)) for name in names}
    for pipe in pipes:
        if pipe.length == 0.0:
            heights[pipe.end] = heights[pipe.start]
        else:
            most = 0.7 * pipe.length
            heights[pipe.end] = float(
                np.clip(heights[pipe.end], heights[pipe.start] - most, heights[pipe.start] + most)
            )
    return heights


def _full_flows(rng: np.random.Generator, pipes: tuple[Pipe, ...]) -> dict[str, float]:
    metered = [pipe for pipe in pipes if pipe.meter]
    return {pipe.meter: float(rng.uniform(1.2, 2.4)) * np.pi * (pipe.bore * 1e-3) ** 2 / 4 * 3600.0 for pipe in metered}


def _states(rng: np.random.Generator, full: dict[str, float], *, awkward: bool) -> tuple[dict[str, float], ...]:
    shares = [float(share) for share in np.linspace(0.4, 1.0, int(rng.integers(2, 4)))]
    if awkward and rng.random() < 0.3:
        shares = shares[-1:]
    return ({}, *({meter: share * flow for meter, flow in full.items()} for share in shares))


def _with_gauges(rng: np.random.Generator, system: System, *, awkward: bool) -> System:
    """Gauges at most stations, some twice, ranged so that what they read lies well inside; sometimes one across a run."""
    from tests.benchmarks.simulator.readings import true_heads

    lowest, highest = _reach(system, [true_heads(system, k) for k in range(len(system.flows))])
    names = [name for name, *_ in system.stations]
    taps = [name for name in names if rng.random() < (0.5 if awkward else 0.85)] or names[:2]
    taps += [name for name in taps if rng.random() < 0.15]
    if len(taps) < 3:
        taps = names[:3]
    dials = []
    for number, station in enumerate(sorted(taps[:12], key=names.index)):
        text, limit, tolerance = TYPES[int(rng.choice([0, 0, 0, 1, 1, 2, 3]))]
        high = next((r for r in PREFERRED_BAR if r > highest[station] + GAP_BAR), 25.0)
        z = {name: z for name, z, _ in system.stations}[station]
        leg = "dry" if rng.random() < 0.1 else ""
        below = float(np.round(rng.uniform(-0.5, 3.0), 2))
        dials.append(
            Dial(
                tag=f"PT-{101 + number}",
                station=station,
                elevation=None if rng.random() < 0.2 else z - below,
                unit="bara" if rng.random() < 0.15 else "barg",
                high=high,
                accuracy=text,
                limit=limit,
                division=0.001,
                tolerance=f"{tolerance:g} % span",
                leg=leg,
            )
        )
    system = replace(system, dials=tuple(dials))
    if rng.random() < 0.3:
        lossy = [p for p in system.pipes if p.item != "pump"]
        pipe = lossy[int(rng.integers(len(lossy)))]
        drop = lowest["drop " + pipe.name]
        high = next(
            step * 10.0**power for power in range(4) for step in (1.0, 2.5, 6.0) if step * 10.0**power > 1.3 * drop
        )
        system = replace(system, differential=(("PDT-1", pipe.name, high, 0.0025, 1.0),))
    return system


def _reach(system: System, heads: list[dict[str, float]]) -> tuple[dict[str, float], dict[str, float]]:
    """Highest gauge pressure at each station in bar, and under ``drop RUN`` the greatest loss of each run in kPa."""
    heights = {name: z for name, z, _ in system.stations}
    highest = {name: max(9.81e-2 * (one[name] - z + 3.0) for one in heads) for name, z in heights.items()}
    drops = {f"drop {p.name}": max(abs(9.81 * (one[p.start] - one[p.end])) for one in heads) for p in system.pipes}
    return drops, highest
