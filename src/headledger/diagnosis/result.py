"""What a check found, frozen: the one thing that text, screen, sheet and result file are made from. SI inside."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from enum import StrEnum
from typing import TYPE_CHECKING

from headledger.plant.digest import Reject
from headledger.plant.job import Job, SpellKind
from headledger.quantities import Unit

if TYPE_CHECKING:  # the screen draws its first frame before numpy is loaded
    import numpy as np
    from numpy.typing import NDArray


class Verdict(StrEnum):
    """What is said of a gauge."""

    PASS = "pass"
    FAIL = "fail"
    UNRESOLVED = "unresolved"
    UNCHECKED = "unchecked"


class CauseKind(StrEnum):
    """Every kind of cause that the result file knows."""

    ZERO_SHIFT = "zero-shift"
    SPAN_ERROR = "span-error"
    DRIFT = "drift"
    STEP = "step"
    FROZEN = "frozen"
    SLUGGISH = "sluggish"
    NOISY = "noisy"
    AT_LIMIT = "at-limit"
    WRONG_UNIT = "wrong-unit"
    WRONG_REFERENCE = "wrong-reference"
    WRONG_ELEVATION = "wrong-elevation"
    LEG_GAS = "leg-gas"
    SWAPPED = "swapped"
    CLOCK_OFFSET = "clock-offset"
    CROSSED_LINES = "crossed-lines"
    EQUALISED = "equalised"
    ROOT = "root"
    BLOCKAGE = "blockage"
    LOW_LOSS = "low-loss"
    AIR_POCKET = "air-pocket"
    CLOSED_OFF = "closed-off"
    VAPOUR = "vapour"
    FLOW_METER_ERROR = "flow-meter-error"
    PUMP_LIFT = "pump-lift"
    DENSITY_ERROR = "density-error"
    LEAK = "leak"


SIZELESS = frozenset(
    {
        CauseKind.FROZEN,
        CauseKind.NOISY,
        CauseKind.AT_LIMIT,
        CauseKind.SWAPPED,
        CauseKind.CROSSED_LINES,
        CauseKind.EQUALISED,
        CauseKind.ROOT,
        CauseKind.CLOSED_OFF,
        CauseKind.VAPOUR,
    }
)
"""Kinds of cause that are there or not, without a size."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """Where a cause sits: at most one of gauge, gauges, run and station; none of them is the whole job.

    Parameters
    ----------
    gauge, run, station : str
        Empty where it does not apply.
    distance_m : float or None
        Along `run` from its start, where levels tell. [m]
    gauges : tuple of str
        A swapped pair, or the gauges of one late log file.
    """

    gauge: str = ""
    gauges: tuple[str, ...] = ()
    run: str = ""
    station: str = ""
    distance_m: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class FlowFound:
    """Flow of a run in a spell, metered or found. [m³/s], `u95_m3_s` with k = 2."""

    run: str
    flow_m3_s: float
    u95_m3_s: float


@dataclass(frozen=True, slots=True, kw_only=True)
class GradeStep:
    """Head that one cause takes within a run: a step in the grade line.

    Parameters
    ----------
    cause : int
        Index into the causes of the result.
    drop_m : float
        Along the run's own direction; negative where it takes less than described. [m]
    """

    cause: int
    drop_m: float


@dataclass(frozen=True, slots=True, kw_only=True)
class RunGrade:
    """The hydraulic grade line along one run in one spell, under the leading explanation. Heads above the job's datum. [m]

    Parameters
    ----------
    run : str
    is_open : bool
        False where a shut valve parts the line.
    start_m, end_m : float
        At both ends: pressure head plus elevation, with the velocity head of this run's own bore taken off the energy line.
    start_u95_m, end_u95_m : float
        With k = 2.
    steps : tuple of GradeStep
        What causes in the pipe take of it.
    """

    run: str
    is_open: bool
    start_m: float
    end_m: float
    start_u95_m: float
    end_u95_m: float
    steps: tuple[GradeStep, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class SpellFound:
    """A stretch of the log in which the flow state held steady.

    Parameters
    ----------
    id : int
        1 is the first.
    kind : SpellKind
    start_s, end_s : float
        Seconds since 1970-01-01 UTC. [s]
    samples : int
        Rows of the log within it.
    flows : tuple of FlowFound
        One for every run.
    grade : tuple of RunGrade
        One for every run.
    """

    id: int
    kind: SpellKind
    start_s: float
    end_s: float
    samples: int
    flows: tuple[FlowFound, ...] = ()
    grade: tuple[RunGrade, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class GaugeSpell:
    """What a gauge said in a spell and what it should have said. Pressures in its own reference. [Pa]

    Parameters
    ----------
    id : int
        Of the spell.
    reading_pa : float or None
        None where it gave no value.
    expected_pa, u95_pa : float or None
        Predicted from everything but this gauge under the leading explanation; None where nothing determines it.
    head_m, expected_head_m, head_u95_m : float or None
        The same as heads of the grade line at its tap, above the job's datum; None for a differential gauge. [m]
    """

    id: int
    reading_pa: float | None
    expected_pa: float | None
    u95_pa: float | None
    head_m: float | None = None
    expected_head_m: float | None = None
    head_u95_m: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class BudgetShare:
    """What one source of doubt has in the variance of a gauge's error.

    Parameters
    ----------
    what : str
        The source in words.
    percent : float
        Of the variance; the shares of a gauge sum to 100. [%]
    """

    what: str
    percent: float


@dataclass(frozen=True, slots=True, kw_only=True)
class GaugeFound:
    """The verdict on one gauge.

    Parameters
    ----------
    tag, station : str
    unit : Unit
    verdict : Verdict
    outside_probability : float
        That its own error exceeds the tolerance in some spell. [-]
    error_pa, u95_pa, tolerance_pa : float
        In the spell where the error is most probably outside, under the leading explanation. [Pa]
    spells : tuple of GaugeSpell
    causes, given : tuple of int
        Indices into the causes of the result: at this gauge, and elsewhere where the verdict leans on them.
    why : str
    budget : tuple of BudgetShare
        Where `u95_pa` comes from, the largest share first; empty for a gauge without a reading.
    """

    tag: str
    station: str
    unit: Unit
    verdict: Verdict
    outside_probability: float
    error_pa: float
    u95_pa: float
    tolerance_pa: float
    spells: tuple[GaugeSpell, ...]
    causes: tuple[int, ...] = ()
    given: tuple[int, ...] = ()
    why: str = ""
    budget: tuple[BudgetShare, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class GaugeHistory:
    """How a gauge kept to what its neighbours say over the log, by control charts, and to a straight line over the spells.

    Parameters
    ----------
    tag : str
    holds : bool
        Whether both charts stay in their limits.
    leaves_at_s : float or None
        When a chart first leaves them. [s since 1970-01-01 UTC]
    by : str or None
        `ewma` or `cusum`, whichever left first.
    spike_s : float or None
        When a stretch stood alone; it was left out of the charts. [s since 1970-01-01 UTC]
    zero_pa, zero_sd_pa : float or None
        Reading where nothing is expected, by the line through readings over what was expected, and its standard uncertainty. None
        where too few spells, or spells too much alike, tell. [Pa]
    span_ratio, span_sd_ratio : float or None
        Slope of that line and its standard uncertainty. [-]
    says : str
        What the charts show in words.
    """

    tag: str
    holds: bool
    leaves_at_s: float | None = None
    by: str | None = None
    spike_s: float | None = None
    zero_pa: float | None = None
    zero_sd_pa: float | None = None
    span_ratio: float | None = None
    span_sd_ratio: float | None = None
    says: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Rival:
    """A cause that the data cannot tell from another."""

    kind: CauseKind
    place: Place
    probability: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Against:
    """A finding held against one thing that may stand in its stead.

    Parameters
    ----------
    kind : CauseKind or None
        None for nothing at all in its stead.
    place : Place
    evidence_nats : float
        Log evidence of the best explanation that holds the finding, less that of the best with this in its stead. [nat]
    prior_nats : float
        The same of what the two are worth before any reading. [nat]
    says : str
        Both in words.
    """

    kind: CauseKind | None
    place: Place
    evidence_nats: float
    prior_nats: float
    says: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Residual:
    """How far a gauge stands in a spell from what everything else says, without a finding and with it.

    Parameters
    ----------
    tag : str
    spell : int
        Its `id`.
    before_pa, sd_before_pa : float
        With no cause, and what chance allows: everything else's doubt, the gauge's stated class and its noise. [Pa]
    after_pa, sd_after_pa : float or None
        The same with the finding's explanation and its effect taken off; None where the finding spoils the reading. [Pa]
    """

    tag: str
    spell: int
    before_pa: float
    after_pa: float | None
    sd_before_pa: float
    sd_after_pa: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Evidence:
    """The numbers behind a finding.

    Parameters
    ----------
    against : tuple of Against
        Each rival, the most probable first, and at the end nothing in its stead.
    residuals : tuple of Residual
        Every gauge in every spell in which it reads.
    misfit_before, misfit_after : float
        Sum of squares of all data in their standard deviations, with no cause and with the finding's explanation. [-]
    count : int
        Data that it sums over: readings of gauges, meters and levels, by pieces of a spell, and loops.
    says : str
        The misfit in words.
    """

    against: tuple[Against, ...]
    residuals: tuple[Residual, ...]
    misfit_before: float
    misfit_after: float
    count: int
    says: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class CauseFound:
    """One explanation that the data give weight to.

    Parameters
    ----------
    kind : CauseKind
    place : Place
    size, u95 : float or None
        In SI, or a ratio; `u95` is k = 2. None where the kind has no size.
    unit : Unit or None
        In which the size is spoken of; None for ratios and loss coefficients.
    start_s : float or None
        When a drift, step or frozen begins. [s since 1970-01-01 UTC]
    start_u95_s : float or None
        How well that is known, with k = 2. [s]
    probability : float
        Summed over every set of causes weighed. [-]
    accepted : bool
    rivals : tuple of Rival
    says : str
        The finding in words.
    evidence : Evidence or None
        The numbers behind it; None where it was not weighed against others by its marks on the spells' means.
    """

    kind: CauseKind
    place: Place
    size: float | None
    u95: float | None
    unit: Unit | None
    probability: float
    accepted: bool
    start_s: float | None = None
    start_u95_s: float | None = None
    rivals: tuple[Rival, ...] = ()
    says: str = ""
    evidence: Evidence | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class NextCheck:
    """An action on site that is worth its time.

    Parameters
    ----------
    action : str
    place : Place
    gain_bits : float
        Information between its outcome and the work to be done. [bit]
    minutes : float
        That it usually takes. [min]
    separates : tuple of (str, str)
        Kinds of cause that its outcome tells apart.
    says, caution : str
    """

    action: str
    place: Place
    gain_bits: float
    minutes: float
    separates: tuple[tuple[str, str], ...] = ()
    says: str = ""
    caution: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class InputFile:
    """A file that the result rests on.

    Parameters
    ----------
    file : str
    rows, rejected : int
    fingerprint : callable
        Its sha256 in hexadecimal, once all of it has been read.
    """

    file: str
    rows: int
    rejected: int
    fingerprint: Callable[[], str]

    @property
    def sha256(self) -> str:
        """SHA-256 of the file's bytes, in hexadecimal; waits until it is known."""
        return self.fingerprint()


@dataclass(frozen=True, slots=True, kw_only=True, eq=False)
class Trend:
    """What the gauges said over the whole log, by blocks of time.

    Parameters
    ----------
    start_s : ndarray, shape (blocks,)
        Start of each block that holds a row, seconds since 1970-01-01 UTC. [s]
    width_s : float
        [s]
    reading_pa : ndarray, shape (blocks, gauges)
        Block means in each gauge's own reference; nan where it gave none. [Pa]
    """

    start_s: NDArray[np.float64]
    width_s: float
    reading_pa: NDArray[np.float64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Alike:
    """A cause whose mark on the readings looks like another's.

    Parameters
    ----------
    kind : CauseKind
    place : Place
    correlation : float
        Of the two white marks, 0 to 1: at 1 no reading of the log tells them apart. [-]
    elsewhere : bool
        Whether it would send one to another place.
    """

    kind: CauseKind
    place: Place
    correlation: float
    elsewhere: bool


@dataclass(frozen=True, slots=True, kw_only=True)
class TroubleSight:
    """The smallest trouble of one kind at one place that a set of readings would show. Sizes as those of a cause, without sign.

    Parameters
    ----------
    kind : CauseKind
    place : Place
    unit : Unit or None
        As of a cause.
    seen : float or None
        The smallest that would be seen; None where the largest that is physical would not.
    placed, named : float or None
        The smallest that could be told from anything at another place, and from every other cause; None where none could.
    matters : float
        The smallest that matters: 0.3 of a tolerance at the gauge that feels it most.
    pa_per_size : float or None
        Pressure that a unit of it takes at `flow_m3_s`; None where the size is no loss. [Pa]
    flow_m3_s : float or None
        The greatest flow of its run. [m³/s]
    alike : tuple of Alike
        What it would be confused with, the likest first.
    says : str
    """

    kind: CauseKind
    place: Place
    unit: Unit | None
    seen: float | None
    placed: float | None
    named: float | None
    matters: float
    pa_per_size: float | None = None
    flow_m3_s: float | None = None
    alike: tuple[Alike, ...] = ()
    says: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class GaugeSight:
    """Whether a gauge could pass if nothing were wrong.

    Parameters
    ----------
    tag : str
    unit : Unit
    verdict : Verdict
        Of a faultless gauge: pass, unresolved where the uncertainty exceeds what the tolerance allows, or unchecked.
    u95_pa, tolerance_pa : float
        [Pa]
    says : str
    """

    tag: str
    unit: Unit
    verdict: Verdict
    u95_pa: float
    tolerance_pa: float
    says: str


@dataclass(frozen=True, slots=True, kw_only=True)
class FurtherReading:
    """One reading more, and how far it would sharpen the sight.

    Parameters
    ----------
    station : str
        Where a gauge more would hang; empty for a flow state.
    kind : SpellKind or None
        Of the flow state.
    flow_factor : float or None
        Of a flowing state: its flows as parts of the greatest ones. [-]
    sharper_ratio : float
        Geometric mean, over all troubles, of the smallest size that could be placed: before over after. [-]
    could_pass : tuple of str
        Gauges that could pass then and cannot without it.
    says : str
    """

    station: str = ""
    kind: SpellKind | None = None
    flow_factor: float | None = None
    sharper_ratio: float
    could_pass: tuple[str, ...] = ()
    says: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Sight:
    """What a set of readings could show.

    Parameters
    ----------
    states : tuple of str
        The flow states that it rests on, in words.
    troubles : tuple of TroubleSight
    gauges : tuple of GaugeSight
    further : tuple of FurtherReading
        The one that would help most first.
    assumed : tuple of str
        What was taken because nobody said it, a sentence each.
    head_weight_pa_m : float
        What a metre of head weighs. [Pa/m]
    """

    head_weight_pa_m: float
    states: tuple[str, ...]
    troubles: tuple[TroubleSight, ...]
    gauges: tuple[GaugeSight, ...]
    further: tuple[FurtherReading, ...] = ()
    assumed: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class PlanResult:
    """What a visit's readings could show, before there are any."""

    job: Job
    sight: Sight


@dataclass(frozen=True, slots=True, kw_only=True)
class CheckResult:
    """Everything a check found.

    Parameters
    ----------
    job : Job
    inputs : tuple of InputFile
    spells : tuple of SpellFound
    clean_probability : float
        That nothing is wrong. [-]
    gauges : tuple of GaugeFound
        In the order of the gauge table.
    causes : tuple of CauseFound
        The most probable first.
    rejects : tuple of Reject
    reject_count : int
    remarks : tuple of str
        What was taken for granted, converted, or could not be used, a sentence each.
    trend : Trend or None
        For the picture of a gauge over time.
    next_checks : tuple of NextCheck
        The most information a minute first.
    answers : tuple of str
        Results of actions that were taken into account, as they were given.
    sight : Sight or None
        What the readings at hand could have shown; None where it was not asked for.
    histories : tuple of GaugeHistory
        Of the gauges whose neighbours say enough for a chart, in the order of the gauge table.
    unexplained : str
        That no explanation weighed explains the readings, in words; empty where one does.
    """

    job: Job
    inputs: tuple[InputFile, ...]
    spells: tuple[SpellFound, ...]
    clean_probability: float
    gauges: tuple[GaugeFound, ...]
    causes: tuple[CauseFound, ...]
    rejects: tuple[Reject, ...] = ()
    reject_count: int = 0
    remarks: tuple[str, ...] = ()
    trend: Trend | None = None
    next_checks: tuple[NextCheck, ...] = ()
    answers: tuple[str, ...] = ()
    sight: Sight | None = None
    unexplained: str = ""
    histories: tuple[GaugeHistory, ...] = ()
