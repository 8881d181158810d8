"""Where an uncertainty comes from, against readings made by hand with one doubt at a time, and with all of them drawn."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from headledger.diagnosis.budget import InputKind
from headledger.diagnosis.contributions import budget_of, shares, variance_by_source
from headledger.diagnosis.estimate import Model
from headledger.diagnosis.means import SpellMeans
from headledger.diagnosis.own_error import WIDENED, own_error
from headledger.diagnosis.result import CheckResult
from headledger.diagnosis.search import Posterior, search
from headledger.diagnosis.verdicts import judge_gauge
from headledger.plant.job import Job

from .made_systems import DENSITY, GRAVITY, gauge, job, loss_m, model, run, spell, station
from .test_time_causes import found as found_in
from .test_time_causes import line as stuck_line
from .worked_job import REFERENCE, worked_model

GUM = tomllib.loads((Path(__file__).parents[1] / "reference" / "uncertainty.toml").read_text(encoding="utf-8"))

JUDGED = 1  # PT-B
FLOW_M3_S = 0.01
NOISE_PA = 100.0
CLASS_PA, RECTANGULAR = 2_500.0, 3.0**-0.5


def test_shares_of_the_gauge_block_are_squares_over_their_sum() -> None:
    """25² : 16.6² : 9.7² : 2.9² of 1003.06 nm² are 62.31 %, 27.47 %, 9.38 % and 0.84 %, which is below 1 % and told as the rest."""
    block = GUM["gauge_block"]
    squares = {name: value**2 for name, value in block["contribution_nm"].items()}
    assert sum(squares.values()) ** 0.5 == pytest.approx(block["combined_nm"], abs=0.0005)
    found = [(share.what, round(share.percent, 2)) for share in shares(squares)]
    assert found == [("standard", 62.31), ("temperature", 27.47), ("comparison", 9.38), ("the rest", 0.84)]


def test_shares_without_any_variance_are_none() -> None:
    assert shares({"class": 0.0}) == ()


def line() -> Job:
    """Three stations in a row with a gauge each, one metered flow."""
    return job(
        [station("A", 0.0, is_open=True), station("B", 4.0), station("C", 9.0, is_open=True)],
        [run("R1", "A", "B", flow_column="flow"), run("R2", "B", "C")],
        [gauge("PT-A", "A", "R1"), gauge("PT-B", "B", "R1"), gauge("PT-C", "C", "R2")],
    )


def curve_pa(kind: InputKind, reading_pa: float) -> float:
    """What a standard deviation of offset or slope does: 4/5 and 1/5 of the class, rectangular; the slope pivots at mid range."""
    if kind is InputKind.OFFSET:
        return float(0.8 * CLASS_PA * RECTANGULAR)
    return float(0.2 * CLASS_PA * RECTANGULAR * (2.0 * reading_pa / 1e6 - 1.0))


def readings(
    made: Job, inputs: Mapping[tuple[InputKind, str], float], noise: np.ndarray | None = None
) -> tuple[tuple[SpellMeans, ...], float]:
    """At rest and flowing with every doubt off by so many standard deviations, and PT-B's own error in the flowing spell.

    The true elevation, loss, density, barometer and flow are the stated ones and what is drawn; heads stay.
    """
    z = dict.fromkeys(((kind, owner) for kind in InputKind for owner in ("", "PT-A", "PT-B", "PT-C")), 0.0) | dict(
        inputs
    )
    density = DENSITY * (1.0 + 0.0005 * z[InputKind.DENSITY, ""])
    flow = FLOW_M3_S / (1.0 + 0.01 * z.get((InputKind.METER, "R1"), 0.0))
    losses = [loss_m(flow) * (1.0 + 0.05 * z.get((InputKind.LOSS, name), 0.0)) for name in ("R1", "R2")]
    velocity = flow / made.runs[0].area_m2
    found, error = [], 0.0
    for number, flows in enumerate((0.0, 1.0)):
        heads = 40.0 - flows * np.array([0.0, losses[0], losses[0] + losses[1]])
        said = []
        for index, noun in enumerate(made.gauges):
            raised = 0.005 * z.get((InputKind.ELEVATION, f"station {noun.station}"), 0.0)
            stated = made.stations[index].elevation_m
            true = density * GRAVITY * (heads[index] - stated - raised) - flows * 0.5 * density * velocity**2
            true += 101_325.0 + 100.0 * z[InputKind.BAROMETER, ""]
            off = sum(curve_pa(kind, true) * z[kind, noun.tag] for kind in (InputKind.OFFSET, InputKind.SLOPE))
            said.append(true + off)
            if index == JUDGED:
                # an elevation that is not as stated is the gauge's own error too
                error = off - density * GRAVITY * raised
        row = np.array(said) + (0.0 if noise is None else noise[number])
        metered = {"R1": FLOW_M3_S, "R2": FLOW_M3_S} if flows else None
        means = spell(made, number + 1, {"A": 40.0, "B": 40.0, "C": 40.0}, metered)
        found.append(replace(means, reading_pa=row, flow_noise_m3_s=np.full(2, 1e-9)))
    return tuple(found), error


def estimated(made: Job, spells: tuple[SpellMeans, ...]) -> tuple[Model, Posterior, float]:
    """PT-B's own error in the flowing spell as the model has it with no cause."""
    built = model(made, spells)
    posterior = search(built, kinds=())
    error = own_error(built, posterior.leading, JUDGED)
    assert error is not None
    return built, posterior, float(error.mean_pa[1])


def test_variance_of_every_source_is_what_moving_it_alone_does() -> None:
    """Each input moved by one standard deviation in readings made by hand, those of PT-B's own class by ten."""
    made = line()
    spells, _ = readings(made, {})
    built, posterior, at_rest = estimated(made, spells)
    found = variance_by_source(built, posterior.leading, JUDGED, 1)
    by_hand: dict[str, float] = {}
    for item in built.inputs:
        own = item.owner == "PT-B" and item.kind in (InputKind.OFFSET, InputKind.SLOPE)
        # a tenth of a deviation, so that a bent curve does not tell
        moved, error = readings(made, {(item.kind, item.owner): 0.1})
        square = ((error - (estimated(made, moved)[2] - at_rest)) / 0.1 * (WIDENED if own else 1.0)) ** 2
        if item.kind in (InputKind.OFFSET, InputKind.SLOPE):
            name = f"class of {item.owner}" + (" itself" if own else "")
        else:
            name = " of ".join(part for part in (str(item.kind), item.owner.removeprefix("station ")) if part)
        by_hand[name] = by_hand.get(name, 0.0) + square
    scatter = 0.0
    for at in np.ndindex(2, 3):
        noise = np.zeros((2, 3))
        noise[at] = NOISE_PA
        scatter += (estimated(made, readings(made, {}, noise)[0])[2] - at_rest) ** 2
    by_hand["readings' scatter"] = scatter
    whole = sum(found.values())
    assert {name for name, value in by_hand.items() if value > 1e-3 * whole} == {
        name for name, value in found.items() if value > 1e-3 * whole
    }
    for name, value in by_hand.items():
        assert found[name] == pytest.approx(value, rel=0.01, abs=1e-4 * whole), name


def test_variance_of_all_sources_is_that_of_errors_drawn_and_estimated() -> None:
    """300 draws of everything at once: a standard deviation is then known to 1/√600, 4.1 %; three of these are allowed."""
    made = line()
    built, posterior, _ = estimated(made, readings(made, {})[0])
    expected = sum(variance_by_source(built, posterior.leading, JUDGED, 1).values()) ** 0.5
    draw = np.random.default_rng(20260302)
    off = []
    for _ in range(300):
        inputs = {(item.kind, item.owner): float(draw.normal()) for item in built.inputs}
        for kind in (InputKind.OFFSET, InputKind.SLOPE):
            inputs[kind, "PT-B"] *= WIDENED
        spells, error = readings(made, inputs, NOISE_PA * draw.normal(size=(2, 3)))
        off.append(error - estimated(made, spells)[2])
    assert np.std(off) == pytest.approx(expected, rel=3.0 / 600.0**0.5)
    assert abs(np.mean(off)) < 3.0 * expected / 300.0**0.5


def worked_posterior(fault: str) -> tuple[Model, Posterior]:
    """The worked job with one of its faults."""
    built = worked_model(REFERENCE[fault]["readings_kpa"])
    return built, search(built)


@pytest.mark.parametrize(
    "fault", [name for name in REFERENCE if isinstance(REFERENCE[name], dict) and "readings_kpa" in REFERENCE[name]]
)
def test_variances_sum_to_the_reported_uncertainty(fault: str) -> None:
    """To rounding where no size is in doubt, and with sizes in doubt too: what they add is told by the law of total variance."""
    built, posterior = worked_posterior(fault)
    for index in range(built.layout.gauge_count):
        judged = judge_gauge(built, posterior, index)
        variances = variance_by_source(built, posterior.leading, index, judged.spell)
        assert sum(variances.values()) == pytest.approx((judged.u95_pa / 2.0) ** 2, rel=1e-6)
        assert min(variances.values()) >= 0.0
        budget = budget_of(built, posterior.leading, index, judged.spell)
        assert sum(share.percent for share in budget) == pytest.approx(100.0, abs=1e-9)
        assert all(share.percent > 1.0 for share in budget if share.what != "the rest")


def test_budget_of_every_sample_sums_to_the_whole(any_sample: CheckResult) -> None:
    for found in any_sample.gauges:
        assert sum(share.percent for share in found.budget) == pytest.approx(100.0, abs=1e-9)
        percents = [share.percent for share in found.budget if share.what != "the rest"]
        assert percents == sorted(percents, reverse=True)


def test_budget_of_a_stuck_gauge_is_that_of_what_it_should_read() -> None:
    """Its own class has no part in it."""
    built, spells = stuck_line()
    stuck = float(spells[1].reading_pa[1])
    for one in spells:
        one.reading_pa[1] = stuck if one.start_s >= 1225.0 else one.reading_pa[1]
    built, posterior, _ = found_in(built, spells)
    judged = judge_gauge(built, posterior, 1)
    variances = variance_by_source(built, posterior.leading, 1, judged.spell)
    assert sum(variances.values()) == pytest.approx((judged.u95_pa / 2.0) ** 2, rel=1e-6)
    assert variances["class of PT-B itself"] < 1e-6 * sum(variances.values())
    assert max(variances, key=lambda name: variances[name]).startswith("class of PT-")
