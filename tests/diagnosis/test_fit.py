"""A trouble that no cause describes is owned up to."""

from __future__ import annotations

import numpy as np
import pytest

from headledger.diagnosis.fit import fit_of, unknown_probability
from headledger.diagnosis.search import search
from headledger.diagnosis.wording import unexplained_sentence

from .made_systems import gauge, job, loss_m, model, run, spell, station


def judged(offsets_pa: list[dict[str, float]]):
    """Five gauges in a row in six spells, each spell with errors of its own."""
    names = [f"S{n}" for n in range(5)]
    stations = [station(name, 0.0, is_open=n in (0, 4)) for n, name in enumerate(names)]
    runs = [run(f"R{n}", names[n - 1], names[n]) for n in range(1, 5)]
    runs[0] = run("R1", "S0", "S1", flow_column="FT")
    described = job(stations, runs, [gauge(f"P{n}", name, f"R{max(n, 1)}") for n, name in enumerate(names)])
    spells = []
    for number, offsets in enumerate(offsets_pa, start=1):
        flow = 0.002 * number
        heads = {name: 60.0 - n * loss_m(flow) for n, name in enumerate(names)}
        flows = {f"R{n}": flow for n in range(1, 5)}
        spells.append(spell(described, number, heads, flows, shift_pa=offsets))
    return search(model(described, spells))


def test_sound_readings_need_no_excuse():
    assert not fit_of(judged([{}] * 6)).is_poor


def test_gauges_that_each_jump_about_in_every_spell_are_explained_by_nothing():
    rng = np.random.default_rng(3)
    offsets = [{f"P{n}": float(20_000.0 * rng.choice((-1.0, 1.0))) for n in range(5)} for _ in range(6)]
    fit = fit_of(judged(offsets))
    assert fit.unknown_probability > 0.99
    assert unexplained_sentence(fit.misfit, fit.rows).startswith("Even the likeliest explanation leaves the readings")


@pytest.mark.parametrize(("tail", "odds"), [(0.05, 2.46), (0.01, 8.0), (0.001, 53.3)])
def test_tail_probability_speaks_for_the_unknown_by_the_published_bound(tail: float, odds: float):
    """Sellke, Bayarri and Berger (2001), table of −e p ln p: 0.05 → 0.407, 0.01 → 0.125, 0.001 → 0.0188 (from memory)."""
    found = unknown_probability(tail)
    assert found / (1.0 - found) == pytest.approx(odds * 1e-3 / (1.0 - 1e-3), rel=5e-3)
