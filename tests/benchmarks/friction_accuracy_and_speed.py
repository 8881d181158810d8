"""The friction factor against thirty digits, one Haaland evaluation and the fluids library's own vectorised call.

python tests/benchmarks/friction_accuracy_and_speed.py
"""

from __future__ import annotations

import time
from collections.abc import Callable

import mpmath
import numpy as np
from fluids import vectorized
from numpy.typing import NDArray

from headledger.physics.friction import friction_factor

Array = NDArray[np.float64]
VALUES, ROUNDS = 1_000_000, 7


def worst_difference() -> float:
    """Largest relative difference from a forty-digit solution over Re 4e3 to 1e8 and roughness 0 to 0.05."""
    mpmath.mp.dps = 40
    worst = 0.0
    for reynolds in np.geomspace(4e3, 1e8, 41):
        for roughness in (0.0, 1e-6, 1e-5, 1e-4, 1e-3, 0.01, 0.03, 0.05):
            found = float(friction_factor(reynolds, roughness))
            re, rough = mpmath.mpf(float(reynolds)), mpmath.mpf(roughness)

            def equation(x: mpmath.mpf, re: mpmath.mpf = re, rough: mpmath.mpf = rough) -> mpmath.mpf:
                return x + 2 * mpmath.log10(rough / mpmath.mpf("3.7") + mpmath.mpf("2.51") * x / re)

            root = mpmath.findroot(equation, 1 / mpmath.sqrt(found))
            worst = max(worst, abs(float(found * root**2 - 1)))
    return worst


def best_seconds(calls: dict[str, Callable[[], object]]) -> dict[str, float]:
    """Best of several rounds, the calls taking turns."""
    best = dict.fromkeys(calls, np.inf)
    for _ in range(ROUNDS):
        for name, call in calls.items():
            start = time.perf_counter()
            call()
            best[name] = min(best[name], time.perf_counter() - start)
    return best


def haaland_in_place(reynolds: Array, relative_roughness: Array) -> Array:
    """One Haaland evaluation as lean as numpy allows: no temporary that is not needed, no second power."""
    factor = relative_roughness / 3.7
    np.power(factor, 1.11, out=factor)
    factor += 6.9 / reynolds
    np.log10(factor, out=factor)
    factor *= -1.8
    factor *= factor
    return np.divide(1.0, factor, out=factor)


def main() -> None:
    """Print the figures."""
    rng = np.random.default_rng(0)
    reynolds: Array = np.exp(rng.uniform(np.log(4e3), np.log(1e8), VALUES))
    roughness: Array = rng.uniform(0.0, 0.05, VALUES)
    some = slice(0, VALUES // 20)
    best = best_seconds(
        {
            "haaland": lambda: (-1.8 * np.log10((roughness / 3.7) ** 1.11 + 6.9 / reynolds)) ** -2.0,
            "haaland in place": lambda: haaland_in_place(reynolds, roughness),
            "ours": lambda: friction_factor(reynolds, roughness),
            "fluids": lambda: vectorized.friction_factor(  # type: ignore[attr-defined]
                Re=reynolds[some], eD=roughness[some]
            ),
        }
    )
    print(f"largest relative difference from 40 digits: {worst_difference():.1e}")
    print(
        f"{VALUES} values: {1e3 * best['ours']:.1f} ms, {best['ours'] / best['haaland']:.2f} × one Haaland evaluation, "
        f"{best['ours'] / best['haaland in place']:.2f} × one written in place"
    )
    whole = 20.0 * best["fluids"]
    print(
        f"the fluids library's vectorised call takes {whole / best['ours']:.0f} times as long (scaled from a twentieth)"
    )


if __name__ == "__main__":
    main()
