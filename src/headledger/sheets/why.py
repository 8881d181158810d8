"""The numbers behind a finding and behind a gauge's uncertainty, as words and rows for any report, screen or sheet."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from headledger.diagnosis import wording
from headledger.diagnosis.result import BudgetShare, CauseFound, CheckResult, GaugeFound, Residual
from headledger.quantities import Unit
from headledger.sheets.headline import cause_label
from headledger.sheets.numbers import decimals_for, fixed, percent

FITS, OFF, SPOILT = "✓ fits", "▲ off", "– spoilt"

RESIDUAL_HEAD = ("Gauge", "Spell", "No cause", "± u95", "", "With it", "± u95", "", "Unit")
"""Heads of `Moved.rows`: how far a reading is off with no cause at all and with the finding, each with its doubt and what that means."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Moved:
    """The readings that a finding concerns, and how many it does not.

    Parameters
    ----------
    rows : tuple of tuple of str
        Under `RESIDUAL_HEAD`, in the order of the gauge table.
    rest : str
        What is to be said of all others; empty where there is none.
    """

    rows: tuple[tuple[str, ...], ...]
    rest: str


def finding_title(cause: CauseFound) -> str:
    """Probability, kind and place of a finding."""
    return f"{percent(cause.probability)}  {cause_label(cause)}{' (accepted)' if cause.accepted else ''}"


def with_evidence(causes: Iterable[CauseFound]) -> tuple[CauseFound, ...]:
    """The findings whose numbers are at hand, the most probable first."""
    return tuple(cause for cause in causes if cause.evidence is not None)


def moved(result: CheckResult, cause: CauseFound) -> Moved:
    """The readings that were off without a finding, are off with it, or move by it as much as chance may.

    Parameters
    ----------
    result : CheckResult
    cause : CauseFound

    Returns
    -------
    Moved
    """
    residuals = cause.evidence.residuals if cause.evidence else ()
    units = {gauge.tag: gauge.unit for gauge in result.gauges}
    told = [residual for residual in residuals if _is_moved(residual)]
    left = len(residuals) - len(told)
    words = f"{left} {'reading fits' if left == 1 else 'readings fit'} with no cause and with it."
    return Moved(rows=tuple(_row(one, units[one.tag]) for one in told), rest=words if left else "")


def own_residuals(cause: CauseFound, gauge: GaugeFound) -> str:
    """How far one gauge is off, spell by spell, with no cause and with a finding, as a line; empty where nothing is known."""
    residuals = [one for one in cause.evidence.residuals if one.tag == gauge.tag] if cause.evidence else []
    if not residuals:
        return ""
    parts = []
    for one in residuals:
        _, _, before, doubt, label, after, doubt_after, label_after, _ = _row(one, gauge.unit)
        with_it = label_after if after == "–" else f"{after} ± {doubt_after} {label_after}"
        parts.append(f"spell {one.spell}: {before} ± {doubt} {label} → {with_it}")
    return f"{gauge.tag} off with no cause → with it, {gauge.unit.as_difference().text}: {'; '.join(parts)}."


def budget_bars(budget: Iterable[BudgetShare], width: int) -> tuple[tuple[str, str, str], ...]:
    """What, a bar as long as its share of the largest, and its percent.

    Parameters
    ----------
    budget : iterable of BudgetShare
    width : int
        Cells of the longest bar.

    Returns
    -------
    tuple of (str, str, str)
    """
    shares = tuple(budget)
    largest = max((share.percent for share in shares), default=0.0)
    return tuple(
        (share.what, "█" * max(1, round(width * share.percent / largest)), wording.percent(share.percent / 100.0))
        for share in shares
    )


def _is_moved(residual: Residual) -> bool:
    """Whether a finding concerns a reading."""
    if residual.after_pa is None or residual.sd_after_pa is None:
        return True
    return (
        _is_off(residual.before_pa, residual.sd_before_pa)
        or _is_off(residual.after_pa, residual.sd_after_pa)
        or abs(residual.after_pa - residual.before_pa) > residual.sd_before_pa
    )


def _is_off(value_pa: float, sd_pa: float) -> bool:
    """Beyond what 95 % of readings in order would be."""
    return abs(value_pa) > 2.0 * sd_pa


def _row(residual: Residual, unit: Unit) -> tuple[str, ...]:
    factor = unit.factor
    decimals = decimals_for(2.0 * residual.sd_before_pa / factor)
    before = (
        fixed(residual.before_pa / factor, decimals, signed=True),
        fixed(2.0 * residual.sd_before_pa / factor, decimals),
        OFF if _is_off(residual.before_pa, residual.sd_before_pa) else FITS,
    )
    after = ("–", "–", SPOILT)
    if residual.after_pa is not None and residual.sd_after_pa is not None:
        after = (
            fixed(residual.after_pa / factor, decimals, signed=True),
            fixed(2.0 * residual.sd_after_pa / factor, decimals),
            OFF if _is_off(residual.after_pa, residual.sd_after_pa) else FITS,
        )
    return (residual.tag, str(residual.spell), *before, *after, unit.as_difference().text)
