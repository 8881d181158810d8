"""What a gauge should read, against the same worked out from all other rows alone."""

from __future__ import annotations

import numpy as np
import pytest

from headledger.diagnosis.own_error import expected_readings, own_inputs
from headledger.diagnosis.result import CauseKind

from .test_time_causes import found, line


def test_expected_reading_of_a_stuck_gauge_has_the_doubt_of_all_other_rows() -> None:
    """By least squares on the rows of the other gauges and the priors, without the rows whose noise is a hundred spans."""
    model, spells = line()
    stuck = float(spells[1].reading_pa[1])
    for one in spells:
        one.reading_pa[1] = stuck if one.start_s >= 1225.0 else one.reading_pa[1]
    made, posterior, findings = found(model, spells)
    assert findings[0].kind is CauseKind.FROZEN
    linear = posterior.leading.frame.linear
    rows, _ = linear.gauge_rows(1)
    sizes = [group.own.shape[1] for group in linear.groups]
    unknowns = np.zeros((linear.row_count, sum(sizes)))
    for index, (place, group) in enumerate(zip(linear.rows, linear.groups, strict=True)):
        across = slice(sum(sizes[:index]), sum(sizes[: index + 1]))
        unknowns[place.start : place.start + place.count, across] = group.own * group.own_sd
    noise = np.concatenate([group.noise_sd for group in linear.groups])
    whole = np.hstack([unknowns, linear.calibration])
    others = np.setdiff1d(np.arange(linear.row_count), rows)
    stacked = np.vstack([whole[others] / noise[others, None], np.eye(whole.shape[1])])
    upper = np.asarray(np.linalg.qr(stacked, mode="r"))
    perfect = whole[rows].copy()
    columns, _ = own_inputs(linear.model, 1)
    perfect[:, unknowns.shape[1] + columns] = 0.0
    by_hand = np.linalg.norm(np.linalg.solve(upper.T, perfect.T), axis=0)
    expected = expected_readings(made, posterior.leading, 1)
    assert expected.sd_pa == pytest.approx(by_hand, rel=1e-6)
