"""The simulator that the judgement is measured with: its readings against hand calculations, and its folders against the reader."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from headledger.readers.job import read_job
from tests.benchmarks.simulator.readings import BAR, Faults, draw_hidden, perfect_pa, true_heads, water, write_job
from tests.benchmarks.simulator.systems import System, drawn_system
from tests.benchmarks.simulator.troubles import TROUBLES
from tests.make_samples import AIR_PA_M, GRAVITY, Dial, Pipe

EXACT = {name: np.zeros(2) for name in ("elevation", "offset", "slope")} | {
    "loss": np.ones(1),
    "meter": np.ones(1),
    "density": np.ones(1),
}


def one_pipe(flow: float) -> System:
    """100 m of smooth 100 mm pipe with K = 2, falling 3 m, a gauge at either end."""
    pipe = Pipe(name="R1", start="S0", end="S1", length=100.0, bore=100.0, roughness_mm=0.0, k=2.0, meter="FT-1")
    dials = tuple(
        Dial(tag=tag, station=at, elevation=None, unit="barg", high=10.0, accuracy="0.25 % span", limit=0.0025, division=0.001)
        for tag, at in (("PT-101", "S0"), ("PT-102", "S1"))
    )  # fmt: skip
    stations = (("S0", 5.0, "open"), ("S1", 2.0, "open"))
    return System(
        stations=stations, pipes=(pipe,), dials=dials, flows=({}, {"FT-1": flow}), heads=(40.0, 40.0), celsius=20.0
    )


def test_column_at_rest_weighs_what_water_weighs():
    """20 °C water is 998.207 kg/m³ (IAPWS-95 as CoolProp has it), a column of 40 − 5 m; a vented gauge lacks 12 Pa a metre of air."""
    readings, _ = perfect_pa(one_pipe(36.0), 0, EXACT, Faults())
    assert readings[0] == pytest.approx(998.207 * GRAVITY * 35.0 + AIR_PA_M * 5.0, rel=2e-6)
    assert readings[1] - readings[0] == pytest.approx(998.207 * GRAVITY * 3.0 - AIR_PA_M * 3.0, rel=2e-6)


def test_smooth_pipe_loses_what_blasius_says():
    """Re = 4 Q / (π D ν) = 127 000 at 36 m³/h; Blasius f = 0.3164 Re^−1/4 holds to a few per cent for smooth pipe up to 1e5."""
    system = one_pipe(36.0)
    heads = true_heads(system, 1)
    density, viscosity = water(system)
    velocity = 0.01 / (np.pi * 0.01 / 4.0)
    friction = 0.3164 * (density * velocity * 0.1 / viscosity) ** -0.25
    by_hand = (friction * 1000.0 + 2.0) * velocity**2 / (2.0 * GRAVITY)
    assert heads["S0"] - heads["S1"] == pytest.approx(by_hand, rel=0.03)


def test_pocket_and_added_loss_take_their_head():
    system, velocity = one_pipe(36.0), 0.01 / (np.pi * 0.01 / 4.0)
    sound = true_heads(system, 1)["S1"]
    assert sound - true_heads(system, 1, faults=Faults(pocket_m={"R1": 0.7}))["S1"] == pytest.approx(0.7)
    taken = sound - true_heads(system, 1, faults=Faults(added_k={"R1": 5.0}))["S1"]
    assert taken == pytest.approx(5.0 * velocity**2 / (2.0 * GRAVITY))
    assert true_heads(system, 0, faults=Faults(pocket_m={"R1": 0.7}))["S1"] == 40.0


@pytest.mark.parametrize("seed", range(6))
def test_drawn_job_is_one_that_the_reader_takes(tmp_path: Path, seed: int):
    rng = np.random.default_rng(seed)
    system = drawn_system(rng, awkward=seed % 2 == 1)
    write_job(system, Faults(), rng, tmp_path)
    job = read_job(tmp_path)
    assert [gauge.tag for gauge in job.gauges] == [*system.tags, *(tag for tag, *_ in system.differential)]
    perfect, _ = perfect_pa(system, len(system.flows) - 1, draw_hidden(system, rng), Faults())
    for gauge, value in zip(job.gauges, perfect, strict=True):
        assert gauge.range_low_pa - 0.3 * BAR < value < gauge.range_high_pa


@pytest.mark.parametrize("kind", TROUBLES)
def test_every_trouble_changes_the_faults_and_says_what_it_is(kind):
    rng = np.random.default_rng(3)
    for _ in range(200):
        faults = Faults()
        put = TROUBLES[kind](drawn_system(rng), faults, rng)
        if put is not None:
            assert put[1].kind is kind
            assert faults != Faults()
            return
    pytest.fail("no system drawn has a place for it")
