"""One small job with every intermediate number, by brute force: the reference for the core of the reasoning.

    python worked_job.py > worked_job.json        (needs numpy only)

Four gauges on a line of three runs, one still and two flowing spells. The hydraulics is trivial on purpose (each run loses
20 kPa at 36 m3/h, with flow squared; one bore), so that what is compared is the statistics: covariance, evidence, posterior, verdicts.
Everything is done the slow, plain way: full covariances, sizes integrated on a grid.
"""

import json

import numpy as np

G, RHO = 9.80665, 1000.0
Z = np.array([10.0, 2.0, 6.0, 0.0])  # m: stations A, B, C, D, a gauge at each
TAGS = ["PT-A", "PT-B", "PT-C", "PT-D"]
RUNS = ["R1", "R2", "R3"]  # A-B, B-C, C-D
FLOW = np.array([0.0, 36.0, 18.0])  # m3/h by spell, metered on R1
DROP = 20.0 * (FLOW / 36.0) ** 2  # kPa a run
BORE = 0.1
VELOCITY_HEAD = RHO * (FLOW / 3600 / (np.pi * BORE**2 / 4)) ** 2 / 2 / 1000  # kPa, alike at every tap
LOW, HIGH, LIMIT, TOLERANCE = 0.0, 600.0, 3.0, 6.0  # kPag; accuracy 0.5 % span; tolerance 1 % span
HEAD_SD, NOISE_SD = 30.0, 0.02  # m; kPa, of each spell mean
S, N = len(FLOW), len(Z)


def nominal(head_m: np.ndarray) -> np.ndarray:
    """Readings by spell and gauge for the total head at A in each spell. [kPa]"""
    cumulative = np.arange(N)[None, :] * DROP[:, None]
    return RHO * G * (head_m[:, None] - Z[None, :]) / 1000 - cumulative - VELOCITY_HEAD[:, None]


def marks(y0: np.ndarray) -> tuple[list[str], np.ndarray, np.ndarray]:
    """Names, marks (per standard unit) and standard deviations of the uncertain inputs; heads come first."""
    names, cols, sds = [], [], []

    def add(name: str, mark: np.ndarray, sd: float) -> None:
        names.append(name)
        cols.append(mark.ravel())
        sds.append(sd)

    for w in range(S):
        m = np.zeros((S, N))
        m[w] = RHO * G / 1000
        add(f"head in spell {w + 1}", m, HEAD_SD)
    for r in range(3):
        m = np.zeros((S, N))
        m[:, r + 1 :] = -DROP[:, None]
        add(f"loss of {RUNS[r]}", m, 0.075)
    for i in range(N):
        m = np.zeros((S, N))
        m[:, i] = -RHO * G / 1000
        add(f"elevation at {TAGS[i]}", m, 0.005)
    add("meter gain", -2 * -np.arange(N)[None, :] * DROP[:, None] - 2 * -VELOCITY_HEAD[:, None] * np.ones(N), 0.01)
    add("density", np.tile(-RHO * G * Z / 1000, (S, 1)) + 0 * y0, 0.0005)
    for i in range(N):
        offset, slope = np.zeros((S, N)), np.zeros((S, N))
        offset[:, i] = 0.8 * LIMIT
        slope[:, i] = 0.2 * LIMIT * (2 * (y0[:, i] - LOW) / (HIGH - LOW) - 1)
        add(f"offset of {TAGS[i]}", offset, 1 / np.sqrt(3))
        add(f"slope of {TAGS[i]}", slope, 1 / np.sqrt(3))
    return names, np.array(cols).T, np.array(sds)


def causes(y0: np.ndarray) -> list[tuple[str, str, np.ndarray, float, float, tuple[int, ...]]]:
    """Kind, place, mark per unit of size, least and greatest size, signs allowed."""
    out = []
    for i in range(N):
        m = np.zeros((S, N))
        m[:, i] = 1.0
        out.append(("zero-shift", TAGS[i], m, 0.3 * TOLERANCE, HIGH - LOW, (-1, 1)))
        out.append(("wrong-elevation", TAGS[i], m * RHO * G / 1000, 0.3 * TOLERANCE / (RHO * G / 1000), 30.0, (-1, 1)))
        m = np.zeros((S, N))
        m[:, i] = y0[:, i] - LOW
        out.append(("span-error", TAGS[i], m, 0.3 * TOLERANCE / float((y0[:, i] - LOW).max()), 0.5, (-1, 1)))
    for r in range(3):
        m = np.zeros((S, N))
        m[:, r + 1 :] = -DROP[:, None] / 20.0  # per kPa lost at 36 m3/h
        out.append(("blockage", RUNS[r], m, 0.3 * TOLERANCE, 200.0, (1,)))
    return out


def log_normal(r: np.ndarray, v: np.ndarray) -> float:
    sign, logdet = np.linalg.slogdet(v)
    return float(-0.5 * (r @ np.linalg.solve(v, r) + logdet + len(r) * np.log(2 * np.pi)))


def judge(readings: np.ndarray) -> dict:
    head0 = np.array([(readings[w] + (nominal(np.zeros(S)) * -1)[w]).mean() for w in range(S)]) / (RHO * G / 1000)
    y0 = nominal(head0)
    names, jac, sds = marks(y0)
    v = (jac * sds**2) @ jac.T + NOISE_SD**2 * np.eye(S * N)
    r = (readings - y0).ravel()
    none = log_normal(r, v)
    vi_r = np.linalg.solve(v, r)
    table = [{"kind": "none", "at": "", "log_evidence": none, "prior": 0.5}]
    grids = [None]
    listed = causes(y0)
    kinds = sorted({c[0] for c in listed})
    for kind, at, mark, least, most, signs in listed:
        u = mark.ravel()
        a, b = float(u @ np.linalg.solve(v, u)), float(u @ vi_r)
        size = np.exp(np.linspace(np.log(least), np.log(most), 200_001))
        weight = np.full(size.size, 1.0 / (size.size - 1))
        weight[[0, -1]] /= 2
        parts = [(s * size, np.log(weight / len(signs)) + b * s * size - 0.5 * a * size**2) for s in signs]
        sizes, logs = np.concatenate([p[0] for p in parts]), np.concatenate([p[1] for p in parts])
        top = logs.max()
        evidence = none + top + float(np.log(np.exp(logs - top).sum()))
        post = np.exp(logs - top)
        post /= post.sum()
        mean = float((post * sizes).sum())
        places = sum(c[0] == kind for c in listed)
        table.append(
            {
                "kind": kind,
                "at": at,
                "log_evidence": evidence,
                "prior": 0.5 / len(kinds) / places,
                "size": mean,
                "size_sd": float(np.sqrt((post * (sizes - mean) ** 2).sum())),
            }
        )
        grids.append((sizes, post, u))
    logp = np.array([t["log_evidence"] + np.log(t["prior"]) for t in table])
    p = np.exp(logp - logp.max())
    p /= p.sum()
    for t, q in zip(table, p):
        t["probability"] = float(q)
    return {
        "readings_kpa": readings.tolist(),
        "head_at_a_m": head0.tolist(),
        "nominal_kpa": y0.tolist(),
        "log_evidence_of_none": none,
        "explanations": sorted(table, key=lambda t: -t["probability"]),
        "gauges": verdicts(r, y0, names, jac, sds, table, grids, p),
    }


def verdicts(r, y0, names, jac, sds, table, grids, p) -> list[dict]:
    """P(own error beyond tolerance in some spell), averaged over explanations, own accuracy widened tenfold."""
    rng = np.random.default_rng(1)
    out = []
    for i, tag in enumerate(TAGS):
        wide = sds.copy()
        mine = [names.index(f"{what} {tag}") for what in ("offset of", "slope of", "elevation at")]
        wide[mine[:2]] *= 10
        v = (jac * wide**2) @ jac.T + NOISE_SD**2 * np.eye(len(r))
        own = np.array([jac[w * N + i, mine] for w in range(S)])  # spells x (offset, slope, elevation)
        gain = np.linalg.solve(v, jac[:, mine] * wide[mine] ** 2).T
        cov = np.diag(wide[mine] ** 2) - gain @ (jac[:, mine] * wide[mine] ** 2)
        total = 0.0
        for t, g, q in zip(table, grids, p):
            if q < 1e-6:
                continue
            if g is None:
                sizes, probs, u = np.zeros(1), np.ones(1), np.zeros(len(r))
            else:  # the size is weighed again under the widened accuracy
                sizes, _, u = g
                sizes = sizes[::50]
                a, b = float(u @ np.linalg.solve(v, u)), float(u @ np.linalg.solve(v, r))
                logs = b * sizes - 0.5 * a * sizes**2
                probs = np.exp(logs - logs.max())
                probs /= probs.sum()
            pick = rng.choice(len(sizes), 40_000, p=probs)
            size = sizes[pick]
            centre = (gain @ r)[None, :] - size[:, None] * (gain @ u)[None, :]
            theta = centre + rng.multivariate_normal(np.zeros(3), cov, 40_000)
            error = theta @ own.T
            if t["at"] == tag:
                error = error + size[:, None] * u.reshape(S, N)[:, i][None, :]
            total += q * float((np.abs(error) > TOLERANCE).any(axis=1).mean())
        word = "fail" if total >= 0.95 else "pass" if total <= 0.05 else "unresolved"
        out.append({"tag": tag, "outside_probability": round(total, 3), "verdict": word})
    return out


def main() -> None:
    rng = np.random.default_rng(20)
    truth = nominal(np.array([42.0, 41.2, 41.7]))
    _, jac, sds = marks(truth)
    sds = sds.copy()
    sds[:S] = 0  # the heads are what they are
    base = truth + (jac @ (sds * rng.normal(size=len(sds)))).reshape(S, N) + NOISE_SD * rng.normal(size=(S, N))
    shift = base.copy()
    shift[:, 2] += 14.0
    block = base.copy()
    block[:, 2:] -= 0.9 * DROP[:, None]  # 18 kPa more at 36 m3/h in R2
    small = base.copy()
    small[:, 1] += 5.0
    cases = {
        "sound": base,
        "PT-C reads 14 kPa high": shift,
        "R2 loses 18 kPa more at 36 m3/h": block,
        "PT-B reads 5 kPa high": small,
    }
    print(json.dumps({name: judge(np.round(y, 2)) for name, y in cases.items()}, indent=1))


if __name__ == "__main__":
    main()
