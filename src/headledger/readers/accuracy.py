"""Stated accuracies and tolerances: class, grade, per cent of span or reading, a pressure, or a sum of these."""

from __future__ import annotations

import re

from headledger.errors import QuantityError
from headledger.plant.gauges import ErrorLimit
from headledger.quantities import PressureKind, parse_number, parse_pressure

EXAMPLES = "class 1.6, grade 2A, 0.25 % span, 0.5 % reading, ±0.02 bar, or a sum of these joined by +"

ASME_GRADES: dict[str, tuple[float, float]] = {
    # outer quarters, middle half; % of span (ASME B40.100, Table 1; grade A read, the others from memory)
    "5A": (0.05, 0.05),
    "4A": (0.1, 0.1),
    "3A": (0.25, 0.25),
    "2A": (0.5, 0.5),
    "1A": (1.0, 1.0),
    "A": (2.0, 1.0),
    "B": (3.0, 2.0),
    "C": (4.0, 3.0),
    "D": (5.0, 5.0),
}


def parse_limit(text: str, span_pa: float) -> ErrorLimit:
    """A limit of error from its statement.

    Parameters
    ----------
    text : str
    span_pa : float
        Of the gauge. [Pa]

    Returns
    -------
    ErrorLimit

    Raises
    ------
    QuantityError
        Not such a statement, or not positive.
    """
    middle = outer = reading = 0.0
    for part in re.split(r"(?<![eE])\+(?!/?-)", text.strip()):
        one = _parse_part(part.strip(), span_pa)
        if not (one[0] > 0.0 or one[2] > 0.0):
            raise QuantityError("must be positive", repr(text.strip()), EXAMPLES)
        middle, outer, reading = middle + one[0], outer + one[1], reading + one[2]
    return ErrorLimit(limit_pa=middle, outer_limit_pa=outer, reading_fraction=reading, text=text.strip())


def _parse_part(part: str, span_pa: float) -> tuple[float, float, float]:
    """Middle limit, outer limit and reading fraction of one part. [Pa], [Pa], [-]"""
    plain = re.sub(r"^(?:±|\+/-|\+-)\s*", "", part)
    class_of = re.fullmatch(r"(?:class|cl\.?)\s*([\d.,]+)", plain, re.IGNORECASE)
    if class_of:
        limit = parse_number(class_of[1].replace(",", ".")) / 100.0 * span_pa
        return limit, limit, 0.0
    grade = re.fullmatch(r"grade\s*(\d?[A-D])", plain, re.IGNORECASE)
    if grade:
        if grade[1].upper() not in ASME_GRADES:
            raise QuantityError("unknown grade", repr(part), "grade " + ", ".join(ASME_GRADES))
        outer, middle = ASME_GRADES[grade[1].upper()]
        return middle / 100.0 * span_pa, outer / 100.0 * span_pa, 0.0
    share = re.fullmatch(r"([\d.,eE+-]+)\s*%\s*(?:of\s+)?(span|fs|full scale|reading|rdg)", plain, re.IGNORECASE)
    if share:
        value = parse_number(share[1].replace(",", ".")) / 100.0
        if share[2].casefold() in ("reading", "rdg"):
            return 0.0, 0.0, value
        return value * span_pa, value * span_pa, 0.0
    try:
        limit = parse_pressure(plain, PressureKind.DIFFERENCE)
    except QuantityError as error:
        kind = error.fault.startswith("of the wrong kind")
        fault, expected = (error.fault, error.expected) if kind else ("not a statement of accuracy", EXAMPLES)
        raise QuantityError(fault, repr(part), expected) from None
    return limit, limit, 0.0
