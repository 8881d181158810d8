"""Spells and their means on timelines made by hand."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from headledger.diagnosis.averages import spell_pieces
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.readings import Timeline
from headledger.diagnosis.spells import find_spells, unread_spells
from headledger.plant.job import Job, SpellKind, StatedSpell
from headledger.statistics.series import best_cuts

from .worked_job import worked_layout

Array = NDArray[np.float64]
START_S = 1_800_000_000.0


def timeline(readings_pa: Array, flow_m3_s: Array, width_s: float = 2.0) -> Timeline:
    """A timeline of one row a block; flow on the first run."""
    blocks = readings_pa.shape[0]
    flows = np.full((blocks, 3), np.nan)
    flows[:, 0] = flow_m3_s
    return Timeline(
        width_s=width_s,
        start_s=START_S + width_s * np.arange(blocks, dtype=np.float64),
        samples=np.ones(blocks, dtype=np.int64),
        reading_pa=readings_pa,
        reading_count=np.isfinite(readings_pa).astype(np.int64),
        reading_variance_pa2=np.zeros_like(readings_pa),
        flow_m3_s=flows,
        flow_count=np.isfinite(flows).astype(np.int64),
        flow_variance=np.zeros_like(flows),
        level_m=np.full((blocks, 4), np.nan),
        run_temperature_k=np.full((blocks, 3), np.nan),
        temperature_k=np.full(blocks, np.nan),
        barometer_pa=np.full(blocks, np.nan),
        speed_ratio=np.full((blocks, 3), np.nan),
        open_fraction=np.full((blocks, 3), np.nan),
    )


def stepped(flows: list[float], each: int = 200, ramp: int = 15, seed: int = 4) -> Timeline:
    """Gauges and meter through some flows, with ramps between and white noise of 100 Pa."""
    rng = np.random.default_rng(seed)
    flow = np.concatenate([np.full(each, value) for value in flows])
    for index in range(1, len(flows)):
        at = index * each
        flow[at - ramp : at] = np.linspace(flows[index - 1], flows[index], ramp)
    level = np.array([300e3, 380e3, 340e3, 400e3])
    drop = 20e3 * (flow / 0.01) ** 2
    readings = level - drop[:, None] * np.arange(4) + 100.0 * rng.normal(size=(flow.size, 4))
    return timeline(readings, flow + 1e-5 * rng.normal(size=flow.size))


def test_find_spells_cuts_at_every_change_of_flow_and_leaves_ramps_out() -> None:
    line = stepped([0.0, 0.006, 0.010, 0.004])
    spells = find_spells(worked_layout(), line)
    assert [s.kind for s in spells] == [SpellKind.STILL, *[SpellKind.FLOWING] * 3]
    for index, spell in enumerate(spells):
        assert 200 * index <= spell.first < spell.last <= 200 * (index + 1) - 15 * (index < 3)
        assert spell.last - spell.first > 120


def test_find_spells_without_change_is_one_spell() -> None:
    assert len(find_spells(worked_layout(), stepped([0.008]))) == 1


def test_find_spells_common_rise_is_no_bar() -> None:
    """All heads climb by 20 kPa together over the log: still one still spell or several, none left out."""
    line = stepped([0.0], each=600)
    line = replace(line, reading_pa=line.reading_pa + np.linspace(0.0, 20e3, 600)[:, None])
    spells = find_spells(worked_layout(), line)
    assert {s.kind for s in spells} == {SpellKind.STILL}
    assert sum(s.last - s.first for s in spells) > 400


def test_find_spells_keeps_stated_ones_as_given() -> None:
    line = stepped([0.0, 0.006])
    stated = StatedSpell(start_s=START_S + 10.0, end_s=START_S + 110.0, kind=SpellKind.STILL)
    ignored = StatedSpell(start_s=START_S + 110.0, end_s=START_S + 400.0, kind=SpellKind.IGNORE)
    job: Job = replace(worked_layout().job, folder=Path(), spells=(stated, ignored))
    spells = find_spells(Layout(job), line)
    assert spells[0].stated == stated
    assert [s.kind for s in spells] == [SpellKind.STILL, SpellKind.FLOWING]


def test_spell_means_of_white_noise_have_its_standard_error() -> None:
    """100 Pa of noise over n rows: 100/√n, give or take what eight batches can tell, and never far below."""
    layout = worked_layout()
    ratios = []
    for seed in range(12):
        line = stepped([0.0, 0.006, 0.010, 0.004], seed=seed)
        for spell in spell_pieces(layout, line, find_spells(layout, line), most=1):
            ratios += list(spell.noise_pa / (100.0 / np.sqrt(spell.samples)))
    assert 0.8 < float(np.median(ratios)) < 1.4


def test_spell_means_common_wander_is_no_noise() -> None:
    """A wander of 3 kPa that all gauges share leaves their noise that of each alone."""
    layout = worked_layout()
    line = stepped([0.0, 0.006])
    wander = 3e3 * np.sin(np.linspace(0.0, 25.0, line.reading_pa.shape[0]))
    shared = replace(line, reading_pa=line.reading_pa + wander[:, None])
    for spell in spell_pieces(layout, shared, find_spells(layout, shared), most=1):
        assert float(np.max(spell.noise_pa)) < 60.0


def test_spell_means_gap_while_heads_wander_does_not_move_the_mean() -> None:
    """A gauge silent for the upper half of a swing still reads the others' mean of the whole."""
    layout = worked_layout()
    line = stepped([0.0], each=400)
    swing = 5e3 * np.sin(np.linspace(0.0, 2.0 * np.pi, 400))
    readings = line.reading_pa + swing[:, None]
    readings[:200, 2] = np.nan
    spells = find_spells(layout, replace(line, reading_pa=readings))
    full = spell_pieces(layout, replace(line, reading_pa=line.reading_pa + swing[:, None]), spells, most=1)
    gapped = spell_pieces(layout, replace(line, reading_pa=readings), spells, most=1)
    for whole, part in zip(full, gapped, strict=True):
        if np.isfinite(part.reading_pa[2]):
            assert part.reading_pa[2] - part.reading_pa[1] == pytest.approx(
                whole.reading_pa[2] - whole.reading_pa[1], abs=60.0
            )


def test_best_cuts_finds_steps_exactly() -> None:
    """Three levels of unit noise, steps of twenty: the cuts are where the steps are."""
    rng = np.random.default_rng(1)
    signal = np.concatenate([np.full(40, 0.0), np.full(25, 20.0), np.full(35, -20.0)])[:, None]
    assert best_cuts(signal + rng.normal(size=signal.shape), penalty=15.0) == [0, 40, 65, 100]


def test_unread_spells_names_a_stated_spell_without_a_row() -> None:
    stated = StatedSpell(start_s=START_S - 900.0, end_s=START_S - 300.0, kind=SpellKind.STILL)
    job: Job = replace(worked_layout().job, folder=Path(), spells=(stated,))
    spells = find_spells(Layout(job), stepped([0.0, 0.006]))
    assert unread_spells(job, spells) == (
        "spells: no log has a row between 2027-01-15 07:45:00 UTC and 2027-01-15 07:55:00 UTC; that spell is left out.",
    )


def test_find_spells_without_meter_tells_rest_from_flow_by_the_heads() -> None:
    """At rest the gauges agree on one head but for what each is off by; under flow the losses part them."""
    line = stepped([0.0, 0.006, 0.010])
    rest = np.array([300e3, 380e3, 340e3, 400e3])
    taps = worked_layout().taps.readings_pa(
        np.full(4, 45.0), np.zeros(3), density_kg_m3=1000.0, gravity_m_s2=worked_layout().gravity_m_s2
    )
    readings = line.reading_pa - rest + taps
    blind = replace(line, reading_pa=readings, flow_m3_s=np.full_like(line.flow_m3_s, np.nan))
    assert [s.kind for s in find_spells(worked_layout(), blind)] == [SpellKind.STILL, *[SpellKind.FLOWING] * 2]
