"""Whether a trouble at the edge of sight is seen: alarms on readings drawn with it.

    python -m tests.benchmarks.sight_rates [DRAWS]

For troubles of each kind of the five samples' plans: everything that the job is unsure of is drawn anew, the trouble is added at the
smallest size that sight calls seen, and the tool's own search is asked. An alarm is a probability below 0.1 that nothing is wrong, or a
cause accepted.
"""

from __future__ import annotations

import sys
from collections import Counter
from dataclasses import replace

import numpy as np

from headledger.diagnosis.causes.base import Mark, View
from headledger.diagnosis.estimate import Linear, Model
from headledger.diagnosis.findings import list_findings
from headledger.diagnosis.frame import all_marks, make_frame
from headledger.diagnosis.layout import Layout
from headledger.diagnosis.planned import plan_states
from headledger.diagnosis.search import search
from headledger.diagnosis.sight import SEEN, SIGHT_KINDS
from headledger.readers.job import read_job
from tests.benchmarks.reliability import wilson
from tests.sample_results import FOLDER, SAMPLES

LENGTHS = (0.75 * SEEN, SEEN, 1.25 * SEEN)


def drawn(model: Model, linear: Linear, mark: Mark, size: float, rng: np.random.Generator) -> Model:
    """The model's readings with every doubt drawn from its prior, and the trouble added."""
    shared = rng.standard_normal(linear.calibration.shape[1])
    spells = []
    for spell, group, place in zip(model.spells, linear.groups, linear.rows, strict=True):
        count = place.gauges.size
        noise = group.noise_sd * rng.standard_normal(place.count)
        moved = group.shared @ shared + noise + size * mark.vector[place.start : place.start + place.count]
        readings = spell.reading_pa.copy()
        readings[place.gauges] += moved[:count]
        flows = spell.flow_m3_s.copy()
        flows[place.meters] += moved[count : count + place.meters.size]
        levels = spell.level_m.copy()
        levels[place.levels] += moved[count + place.meters.size : count + place.meters.size + place.levels.size]
        start_s = 3600.0 * spell.id
        said = replace(spell, reading_pa=readings, flow_m3_s=flows, level_m=levels)
        spells.append(replace(said, start_s=start_s, end_s=start_s + 900.0))
    return Model(model.layout, spells)


def main(draws: int = 10) -> None:
    """Print alarms by kind and length of mark."""
    raised: Counter[tuple[str, float]] = Counter()
    asked: Counter[tuple[str, float]] = Counter()
    for sample in SAMPLES:
        layout = Layout(read_job(FOLDER / sample, logs_needed=False))
        planned = plan_states(layout)
        model = Model(layout, planned.spells)
        linear = model.linearise(planned.points)
        marks = [mark for mark in all_marks(View(model, linear), SIGHT_KINDS) if not mark.prior.is_point]
        lengths = np.sqrt(np.diag(make_frame(linear, marks).gram))
        rng = np.random.default_rng(7)
        for _ in range(draws):
            index = int(rng.integers(len(marks)))
            for length in LENGTHS:
                size = length / lengths[index]
                if size > marks[index].prior.most:
                    continue
                sign = 1.0 if not marks[index].prior.negative else float(rng.choice((-1.0, 1.0)))
                posterior = search(drawn(model, linear, marks[index], sign * size, rng))
                alarm = posterior.clean_probability < 0.1 or any(f.accepted for f in list_findings(posterior))
                key = (marks[index].kind.value, length)
                asked[key] += 1
                raised[key] += alarm
    for length in LENGTHS:
        hits = sum(raised[key] for key in asked if key[1] == length)
        print(f"length {length:4.1f}: alarms {wilson(hits, sum(asked[key] for key in asked if key[1] == length))}")
        for kind in sorted({key[0] for key in asked}):
            if asked[kind, length]:
                print(f"    {kind:18s} {raised[kind, length]} of {asked[kind, length]}")


if __name__ == "__main__":
    main(*(int(word) for word in sys.argv[1:2]))
