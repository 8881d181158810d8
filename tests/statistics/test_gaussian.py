"""The white residuals against published reconciliations: the same algebra that weighs causes weighs these."""

from __future__ import annotations

import tomllib
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy.special import ndtri

from headledger.statistics.gaussian import Group, Whitened, own_estimate, whiten

REFERENCE = tomllib.loads((Path(__file__).parent.parent / "reference" / "reconciliation.toml").read_text())
VDI: dict[str, Any] = REFERENCE["vdi_2048"]
EXCHANGER: dict[str, Any] = REFERENCE["narasimhan_jordache"]
EXACT = 1e-9  # noise of a balance that must hold


def reconcile(
    measured: NDArray[np.float64], root: NDArray[np.float64], balances: NDArray[np.float64]
) -> tuple[Whitened, NDArray[np.float64]]:
    """Whitened balances of measured values with covariance ``root @ root.T``, and the reconciled values."""
    rows = balances.shape[0]
    group = Group(
        residual=-balances @ measured,
        noise_sd=np.full(rows, EXACT),
        own=np.zeros((rows, 0)),
        own_sd=np.zeros(0),
        own_offset=np.zeros(0),
        shared=balances @ root,
    )
    white = whiten([group])
    return white, measured + root @ white.shared_mean()


def vdi_case(widen: bool) -> tuple[NDArray[np.float64], NDArray[np.float64], NDArray[np.float64]]:
    """Measured values, root of their covariance and balances of the VDI 2048 example."""
    names = VDI["names"]
    half = np.array(VDI["half_width"])
    if widen:
        half[[names.index(name) for name in VDI["widened"]]] = VDI["widened_half_width"]
    deviation = half / 1.96
    covariance = np.diag(deviation**2)
    for first, second, correlation in VDI["correlated"]:
        i, j = names.index(first), names.index(second)
        covariance[i, j] = covariance[j, i] = correlation * deviation[i] * deviation[j]
    balances = np.zeros((3, len(names)))
    for row, terms in enumerate(VDI["balances"]):
        for name, factor in terms.items():
            balances[row, names.index(name)] = factor
    return np.array(VDI["measured"]), np.asarray(np.linalg.cholesky(covariance), dtype=np.float64), balances


def test_whiten_vdi_2048_example_gives_its_reconciled_values_to_all_printed_decimals() -> None:
    measured, root, balances = vdi_case(widen=False)
    _, reconciled = reconcile(measured, root, balances)
    assert reconciled == pytest.approx(VDI["reconciled"], abs=0.5e-6)


def test_whiten_vdi_2048_example_gives_its_reconciled_half_widths() -> None:
    measured, root, balances = vdi_case(widen=False)
    white, _ = reconcile(measured, root, balances)
    half = 1.96 * np.sqrt(np.diag(root @ white.shared_covariance() @ root.T))
    assert half == pytest.approx(VDI["reconciled_half_width"], abs=0.5e-6)


def test_whiten_vdi_2048_example_flags_the_gross_error() -> None:
    measured, root, balances = vdi_case(widen=False)
    white, _ = reconcile(measured, root, balances)
    assert white.residual @ white.residual == pytest.approx(VDI["objective"], abs=0.5e-4)


def test_whiten_vdi_2048_second_step_is_accepted_with_its_values() -> None:
    measured, root, balances = vdi_case(widen=True)
    white, reconciled = reconcile(measured, root, balances)
    assert reconciled[:10] == pytest.approx(VDI["widened_reconciled"], abs=0.5e-6)
    assert white.residual @ white.residual == pytest.approx(VDI["widened_objective"], abs=0.5e-4)


def exchanger(measured: list[float]) -> tuple[Whitened, NDArray[np.float64], NDArray[np.float64]]:
    """Whitened balances, reconciled values and balances of the exchanger with bypass."""
    balances = np.array(EXCHANGER["nodes"], dtype=float)
    root = EXCHANGER["standard_deviation"] * np.eye(EXCHANGER["streams"])
    white, reconciled = reconcile(np.array(measured), root, balances)
    return white, reconciled, balances


def test_whiten_exchanger_without_bias_gives_the_published_reconciliation() -> None:
    white, reconciled, _ = exchanger(EXCHANGER["sound"])
    assert reconciled == pytest.approx(EXCHANGER["sound_reconciled"], abs=0.5e-2)
    assert white.residual @ white.residual == pytest.approx(EXCHANGER["sound_global_test"], abs=0.5e-4)


def test_whiten_exchanger_with_bias_gives_the_published_global_test_and_adjustments() -> None:
    white, reconciled, _ = exchanger(EXCHANGER["biased"])
    assert white.residual @ white.residual == pytest.approx(EXCHANGER["biased_global_test"], abs=0.5e-3)
    adjustments = np.array(EXCHANGER["biased"]) - reconciled
    assert adjustments == pytest.approx(EXCHANGER["adjustments"], abs=0.5e-4)


def test_mark_of_each_stream_gives_the_published_likelihood_ratio_and_measurement_tests() -> None:
    """A bias of one stream marks the balances by minus its column; its test statistic is the mark's share of the residual."""
    white, _, balances = exchanger(EXCHANGER["biased"])
    marks = white.mark(-balances)
    tests = (marks.T @ white.residual) ** 2 / np.einsum("ij,ij->j", marks, marks)
    assert tests == pytest.approx(EXCHANGER["likelihood_ratio_test"], abs=1.1e-3)
    assert np.sqrt(tests) == pytest.approx(EXCHANGER["measurement_test"], abs=0.55e-3)


def test_mark_of_the_biased_stream_gives_the_published_bias() -> None:
    white, _, balances = exchanger(EXCHANGER["biased"])
    mark = white.mark(-balances[:, EXCHANGER["biased_stream"] - 1])
    assert mark @ white.residual / (mark @ mark) == pytest.approx(EXCHANGER["bias_estimate"], abs=0.5e-3)


def test_whiten_own_unknown_equals_a_wide_shared_one() -> None:
    """The same unknown may be a group's own or a shared input of unit variance: evidence and residuals are the same."""
    rng = np.random.default_rng(3)
    own, shared = rng.normal(size=(6, 2)), rng.normal(size=(6, 3))
    residual, noise = rng.normal(size=6), rng.uniform(0.5, 2.0, 6)
    width = np.array([4.0, 7.0])
    first = whiten(
        [Group(residual=residual, noise_sd=noise, own=own, own_sd=width, own_offset=np.zeros(2), shared=shared)]
    )
    second = whiten(
        [
            Group(
                residual=residual,
                noise_sd=noise,
                own=np.zeros((6, 0)),
                own_sd=np.zeros(0),
                own_offset=np.zeros(0),
                shared=np.hstack([own * width, shared]),
            )
        ]
    )
    assert first.log_evidence == pytest.approx(second.log_evidence, rel=1e-12)
    assert first.operator.T @ first.operator == pytest.approx(second.operator.T @ second.operator, rel=1e-9, abs=1e-12)


def test_whiten_equals_the_density_of_the_full_covariance() -> None:
    """Against numpy on the whole covariance matrix, for two groups that share inputs."""
    rng = np.random.default_rng(5)
    groups, residual, covariance = [], [], np.zeros((9, 9))
    loadings = []
    for rows, start in ((4, 0), (5, 4)):
        own, shared = rng.normal(size=(rows, 1)), rng.normal(size=(rows, 2))
        noise, width = rng.uniform(0.2, 1.0, rows), np.array([30.0])
        data = rng.normal(size=rows)
        groups.append(
            Group(residual=data, noise_sd=noise, own=own, own_sd=width, own_offset=np.array([0.3]), shared=shared)
        )
        residual.append(data - own[:, 0] * 0.3)
        cut = slice(start, start + rows)
        covariance[cut, cut] = own * width**2 @ own.T + np.diag(noise**2)
        loadings.append(shared)
    covariance += np.vstack(loadings) @ np.vstack(loadings).T
    white = whiten(groups)
    stacked = np.concatenate(residual)
    square = stacked @ np.linalg.solve(covariance, stacked)
    expected = -0.5 * (square + np.linalg.slogdet(covariance)[1] + 9 * np.log(2 * np.pi))
    assert white.log_evidence == pytest.approx(expected, rel=1e-10)


def test_own_estimate_without_shared_inputs_is_least_squares_with_its_prior() -> None:
    """Two readings 1 and 3 of one unknown, noise 1, prior 0 ± 1: (1 + 3) / (2 + 1)."""
    group = Group(
        residual=np.array([1.0, 3.0]),
        noise_sd=np.ones(2),
        own=np.ones((2, 1)),
        own_sd=np.ones(1),
        own_offset=np.zeros(1),
        shared=np.zeros((2, 0)),
    )
    assert own_estimate(group, np.zeros(0)) == pytest.approx([4.0 / 3.0])


RIPPS: dict[str, Any] = REFERENCE["ripps"]


def test_vdi_2048_measurement_tests_have_the_z_of_their_adjustments() -> None:
    """Z of FDKeI as worked out beside the example: 4.503; SpI −1.964, V −0.297, HK −1.748, A7 −0.225, HDNK −0.201 (own calculation)."""
    measured, root, balances = vdi_case(widen=False)
    white, reconciled = reconcile(measured, root, balances)
    before, after = root @ root.T, root @ white.shared_covariance() @ root.T
    spread = np.sqrt(np.maximum(np.diag(before - after), 1e-30))
    z = dict(zip(VDI["names"], (measured - reconciled) / spread, strict=True))
    published = {
        "FDKeI": 4.503,
        "FDKeII": 4.503,
        "SpI": -1.964,
        "V": -0.297,
        "HK": -1.748,
        "A7": -0.225,
        "HDNK": -0.201,
    }
    for name, value in published.items():
        assert z[name] == pytest.approx(value, abs=0.55e-3), name


def test_nodal_tests_of_the_biased_exchanger_are_the_published_ones() -> None:
    nodes, measured = np.array(EXCHANGER["nodes"], dtype=np.float64), np.array(EXCHANGER["biased"])
    for row, published in zip(nodes, EXCHANGER["nodal_test"], strict=True):
        white, _ = reconcile(measured, np.eye(6), row[None, :])
        assert np.sqrt(white.residual @ white.residual) == pytest.approx(published, abs=0.55e-3)


def test_only_the_biased_stream_exceeds_the_critical_value() -> None:
    """Šidák: the two-sided normal quantile of ``1 − (1 − 0.05)^(1/6)``."""
    level = 1.0 - 0.95 ** (1.0 / 6.0)
    critical = float(ndtri(1.0 - level / 2.0))
    assert critical == pytest.approx(EXCHANGER["critical_measurement_test"], abs=0.5e-4)
    over = [test > critical for test in EXCHANGER["measurement_test"]]
    assert over == [False, True, False, False, False, False]


def test_whiten_linear_set_after_ripps_gives_its_objective_and_values_and_those_without_a_stream() -> None:
    balances, measured = np.array(RIPPS["balances"]), np.array(RIPPS["measured"])
    deviation = np.sqrt(RIPPS["variances"])
    white, reconciled = reconcile(measured, np.diag(deviation), balances)
    assert white.residual @ white.residual == pytest.approx(RIPPS["objective"], abs=0.5e-4)
    assert reconciled == pytest.approx(RIPPS["reconciled"], abs=0.5e-6)
    for stream, published in enumerate(RIPPS["objective_without"]):
        wide = deviation.copy()
        wide[stream] = 1e3
        without, _ = reconcile(measured, np.diag(wide), balances)
        assert without.residual @ without.residual == pytest.approx(published, abs=0.5e-4)
