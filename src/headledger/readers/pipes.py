"""Pipe and fittings in words, from published tables."""

from __future__ import annotations

import re
from dataclasses import dataclass
from fractions import Fraction

from headledger.errors import QuantityError
from headledger.quantities import nearest

STEEL_MM: dict[int, tuple[float, dict[str, float]]] = {
    # DN: outside diameter, wall by schedule (ASME B36.10M, schedules 10, 20, 40, 80; from memory)
    15: (21.3, {"10": 2.11, "40": 2.77, "80": 3.73}),
    20: (26.7, {"10": 2.11, "40": 2.87, "80": 3.91}),
    25: (33.4, {"10": 2.77, "40": 3.38, "80": 4.55}),
    32: (42.2, {"10": 2.77, "40": 3.56, "80": 4.85}),
    40: (48.3, {"10": 2.77, "40": 3.68, "80": 5.08}),
    50: (60.3, {"10": 2.77, "40": 3.91, "80": 5.54}),
    65: (73.0, {"10": 3.05, "40": 5.16, "80": 7.01}),
    80: (88.9, {"10": 3.05, "40": 5.49, "80": 7.62}),
    90: (101.6, {"10": 3.05, "40": 5.74, "80": 8.08}),
    100: (114.3, {"10": 3.05, "40": 6.02, "80": 8.56}),
    125: (141.3, {"10": 3.40, "40": 6.55, "80": 9.53}),
    150: (168.3, {"10": 3.40, "40": 7.11, "80": 10.97}),
    200: (219.1, {"10": 3.76, "20": 6.35, "40": 8.18, "80": 12.70}),
    250: (273.0, {"10": 4.19, "20": 6.35, "40": 9.27, "80": 15.09}),
    300: (323.8, {"10": 4.57, "20": 6.35, "40": 10.31, "80": 17.48}),
    350: (355.6, {"10": 6.35, "20": 7.92, "40": 11.13, "80": 19.05}),
    400: (406.4, {"10": 6.35, "20": 7.92, "40": 12.70, "80": 21.44}),
    450: (457.0, {"10": 6.35, "20": 7.92, "40": 14.27, "80": 23.83}),
    500: (508.0, {"10": 6.35, "20": 9.53, "40": 15.09, "80": 26.19}),
    600: (610.0, {"10": 6.35, "20": 9.53, "40": 17.48, "80": 30.96}),
}

DN_OF_INCH: dict[float, int] = {
    0.5: 15, 0.75: 20, 1: 25, 1.25: 32, 1.5: 40, 2: 50, 2.5: 65, 3: 80, 3.5: 90, 4: 100, 5: 125, 6: 150, 8: 200, 10: 250,
    12: 300, 14: 350, 16: 400, 18: 450, 20: 500, 24: 600,
}  # fmt: skip

FITTINGS_K: dict[str, float] = {
    # K = (L/D) f_T with f_T = 0.017 of DN 100; entrance and exit as printed
    # (Crane, Technical Paper 410, pages, from memory)
    "elbow": 30 * 0.017,
    "45 elbow": 16 * 0.017,
    "long elbow": 14 * 0.017,
    "tee run": 20 * 0.017,
    "tee branch": 60 * 0.017,
    "gate valve": 8 * 0.017,
    "ball valve": 3 * 0.017,
    "globe valve": 340 * 0.017,
    "butterfly valve": 45 * 0.017,
    "swing check valve": 100 * 0.017,
    "entrance": 0.5,
    "exit": 1.0,
}

SYNONYMS: dict[str, str] = {
    "90 elbow": "elbow",
    "bend": "elbow",
    "long radius elbow": "long elbow",
    "run tee": "tee run",
    "branch tee": "tee branch",
    "check valve": "swing check valve",
}

_FITTING_NAMES: dict[str, str] = {name: name for name in FITTINGS_K} | SYNONYMS

EXAMPLE = "DN 100 sch 40, 4 in sch 40 or 160 SDR 11"


@dataclass(frozen=True, slots=True)
class Pipe:
    """A pipe of the tables: bore and wall. [m], [m]"""

    bore_m: float
    wall_m: float


def find_pipe(text: str) -> Pipe:
    """The pipe that a text names: nominal size and schedule, or outside diameter in mm and SDR.

    Parameters
    ----------
    text : str
        For example ``DN 100 sch 40``, ``4 in sch 40``, ``160 SDR 11``.

    Returns
    -------
    Pipe

    Raises
    ------
    QuantityError
        Not in the tables.

    Notes
    -----
    SDR is outside diameter over wall (ISO 4065).
    """
    plain = " ".join(text.casefold().replace("″", '"').split())
    plastic = re.fullmatch(r"(?:de |od |d )?(\d+(?:\.\d+)?) ?(?:mm)?,? sdr ?(\d+(?:\.\d+)?)", plain)
    if plastic and float(plastic[2]) > 2.0 and float(plastic[1]) > 0.0:
        outside_mm, wall_mm = float(plastic[1]), float(plastic[1]) / float(plastic[2])
        return Pipe(bore_m=(outside_mm - 2.0 * wall_mm) / 1000.0, wall_m=wall_mm / 1000.0)
    number = r"\d+(?:\.\d+)?|\d+[ -]\d/[248]|\d/[248]"
    steel = re.fullmatch(rf'(?:dn ?(\d+)|({number}) ?(?:in|inch|"))\.?,? (?:sch|schedule)\.? ?(\d+|std|xs)s?', plain)
    if not steel:
        raise QuantityError("not a pipe in words", repr(text), f"{EXAMPLE}; or give the bore")
    size = int(steel[1]) if steel[1] else DN_OF_INCH.get(_inches(steel[2]), 0)
    outside_mm, walls = STEEL_MM.get(size, (0.0, {}))
    schedule = {"std": "40" if size <= 250 else "", "xs": "80" if size <= 200 else ""}.get(steel[3], steel[3])
    wall_mm = walls.get(schedule, 0.0)
    if not wall_mm:
        known = f"schedule {', '.join(walls)} in this size" if walls else "DN " + ", ".join(map(str, STEEL_MM))
        raise QuantityError("not a pipe of the tables", repr(text), f"{known}; or give the bore")
    return Pipe(bore_m=(outside_mm - 2.0 * wall_mm) / 1000.0, wall_m=wall_mm / 1000.0)


def _inches(text: str) -> float:
    """Inches written as 2.5, 1 1/2 or 3/4."""
    return float(sum(Fraction(part) for part in re.split(r"[ -]", text)))


def fittings_k(text: str) -> float:
    """Sum of loss coefficients of fittings in words: ``6 elbow, 2 gate valve``. [-]

    Parameters
    ----------
    text : str

    Returns
    -------
    float
        [-]

    Raises
    ------
    QuantityError
        Not in the table; names the nearest.
    """
    total = 0.0
    for part in re.split(r"[,;]", text):
        count, name = _count_and_name(part)
        if name not in _FITTING_NAMES:
            expected = nearest(name, _FITTING_NAMES) or "one of " + ", ".join(FITTINGS_K)
            raise QuantityError("not a fitting of the table", repr(part.strip()), expected)
        total += count * FITTINGS_K[_FITTING_NAMES[name]]
    return total


def _count_and_name(part: str) -> tuple[int, str]:
    """How many of what: ``6 elbows`` is six of elbow, ``45 elbow`` one of its own kind."""
    plain = " ".join(re.sub(r"°|\bdeg\b", " ", part.casefold()).split())
    plain = re.sub(r"(?<=[a-z])s$|(?<=branch)es$", "", plain)
    counted = re.fullmatch(r"(\d+)(?: ?[x×])? (.+)", plain)
    if plain in _FITTING_NAMES or not counted:
        return 1, plain
    return int(counted[1]), counted[2]
