"""Flow states of a visit from text: ``still``, ``flowing``, or the flows of some runs."""

from __future__ import annotations

from collections.abc import Sequence

from headledger.errors import JobError, Problem, QuantityError
from headledger.plant.job import Job, SpellKind, StatedFlow, StatedSpell
from headledger.quantities import Dimension, nearest, parse_quantity

EXAMPLE = '"still", "flowing", or flows such as "R1 = 20 m3/h, R3 = 4 m3/h"'


def parse_states(texts: Sequence[str], job: Job) -> tuple[StatedSpell, ...]:
    """Flow states, in the order given.

    Parameters
    ----------
    texts : sequence of str
        Each ``still``, ``flowing``, or ``RUN = VALUE UNIT`` once or more, with commas between.
    job : Job

    Returns
    -------
    tuple of StatedSpell
        Without a time of their own; each flow doubted as its run's meter is.

    Raises
    ------
    JobError
        With every problem of every text.
    """
    problems: list[Problem] = []
    states = []
    for text in texts:
        word = text.strip().casefold()
        if word in (SpellKind.STILL, SpellKind.FLOWING):
            states.append(StatedSpell(start_s=0.0, end_s=0.0, kind=SpellKind(word)))
            continue
        flows = [_flow(text, part, job, problems) for part in text.split(",")]
        known = tuple(flow for flow in flows if flow is not None)
        states.append(StatedSpell(start_s=0.0, end_s=0.0, kind=SpellKind.FLOWING, flows=known))
    if problems:
        raise JobError(problems)
    return tuple(states)


def _flow(text: str, part: str, job: Job, problems: list[Problem]) -> StatedFlow | None:
    """One run's flow; None, and a problem more, where it says something else."""
    name, equals, value = (piece.strip() for piece in part.partition("="))
    place = f"flow state {text!r}"
    if not equals:
        problems.append(Problem(place=place, fault="is no flow state", found=part.strip(), expected=EXAMPLE))
        return None
    names = [run.name for run in job.runs]
    if name not in names:
        near = nearest(name, names)
        problems.append(
            Problem(place=place, fault="names no run of the job", found=name, expected=near or ", ".join(names[:8]))
        )
        return None
    try:
        flow_m3_s = parse_quantity(value, Dimension.FLOW)
    except QuantityError as error:
        problems.append(Problem(place, error.fault, error.found, error.expected))
        return None
    return StatedFlow(run=name, flow_m3_s=flow_m3_s, doubt=job.run(name).flow_doubt)
