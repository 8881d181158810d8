"""Pipe and fittings in words, from published tables."""

from __future__ import annotations

import re

from headledger.errors import QuantityError
from headledger.quantities import nearest

STEEL_MM: dict[int, tuple[float, dict[str, float]]] = {
    # DN: outside diameter, wall by schedule (ASME B36.10M, from memory)
    15: (21.3, {"40": 2.77, "80": 3.73}),
    20: (26.7, {"40": 2.87, "80": 3.91}),
    25: (33.4, {"40": 3.38, "80": 4.55}),
    32: (42.2, {"40": 3.56, "80": 4.85}),
    40: (48.3, {"40": 3.68, "80": 5.08}),
    50: (60.3, {"40": 3.91, "80": 5.54}),
    65: (73.0, {"40": 5.16, "80": 7.01}),
    80: (88.9, {"40": 5.49, "80": 7.62}),
    100: (114.3, {"40": 6.02, "80": 8.56}),
    125: (141.3, {"40": 6.55, "80": 9.53}),
    150: (168.3, {"40": 7.11, "80": 10.97}),
    200: (219.1, {"20": 6.35, "40": 8.18, "80": 12.70}),
    250: (273.0, {"20": 6.35, "40": 9.27, "80": 15.09}),
    300: (323.8, {"20": 6.35, "40": 10.31, "80": 17.48}),
    350: (355.6, {"20": 7.92, "40": 11.13, "80": 19.05}),
    400: (406.4, {"20": 7.92, "40": 12.70, "80": 21.44}),
}

DN_OF_INCH: dict[float, int] = {
    0.5: 15, 0.75: 20, 1: 25, 1.25: 32, 1.5: 40, 2: 50, 2.5: 65, 3: 80, 4: 100, 5: 125, 6: 150, 8: 200, 10: 250, 12: 300,
    14: 350, 16: 400,
}  # fmt: skip

FITTINGS_K: dict[str, float] = {
    # fully turbulent, mid sizes (Crane TP-410: K = L/D f_T with f_T = 0.017 of DN 100, rounded; exits and entrances exact)
    "elbow": 0.51,
    "45 elbow": 0.27,
    "long elbow": 0.24,
    "run tee": 0.34,
    "branch tee": 1.02,
    "gate valve": 0.14,
    "ball valve": 0.05,
    "globe valve": 5.8,
    "butterfly valve": 0.77,
    "swing check valve": 1.7,
    "entrance": 0.5,
    "exit": 1.0,
}

EXAMPLE = "DN 100 sch 40, 4 in sch 40, or 160 SDR 11"


def pipe_bore_m(text: str) -> float:
    """Bore of a pipe in words. [m]

    Raises
    ------
    QuantityError
        Not in the tables.
    """
    plain = " ".join(text.casefold().split())
    plastic = re.fullmatch(r"(?:de |od )?([\d.]+)(?: mm)? sdr ?([\d.]+)", plain)
    if plastic:
        outside, ratio = float(plastic[1]), float(plastic[2])
        return outside * (1.0 - 2.0 / ratio) / 1000.0 if ratio > 2.0 else _refuse(text)
    steel = re.fullmatch(r"(?:dn ?(\d+)|([\d.]+) ?(?:in|inch|\"))(?:,)? (?:sch|schedule) ?(\d+|std)", plain)
    if not steel:
        return _refuse(text)
    size = int(steel[1]) if steel[1] else DN_OF_INCH.get(float(steel[2]), 0)
    outside, walls = STEEL_MM.get(size, (0.0, {}))
    wall = walls.get("40" if steel[3] == "std" else steel[3])
    return (outside - 2.0 * wall) / 1000.0 if wall else _refuse(text)


def _refuse(text: str) -> float:
    """Say that a pipe is not in the tables."""
    raise QuantityError("not a pipe of the tables", repr(text), EXAMPLE + "; or give the bore")


def fittings_k(text: str) -> float:
    """Sum of loss coefficients of fittings in words: ``6 elbow, 2 gate valve``. [-]

    Raises
    ------
    QuantityError
        Not in the table; names the nearest.
    """
    total = 0.0
    for part in text.split(","):
        match = re.fullmatch(r"\s*(?:(\d+)\s*(?:x\s*)?)?(.+?)\s*", part)
        name = match[2].casefold() if match else ""
        known = name if name in FITTINGS_K else name.removesuffix("s")
        if " tee" not in known and known.startswith("tee "):
            known = known.removeprefix("tee ") + " tee"
        if known.endswith("tee branch") or known == "tee branch":
            known = "branch tee"
        if not match or known not in FITTINGS_K:
            close = nearest(name, FITTINGS_K)
            expected = f"did you mean {close}?" if close else "one of " + ", ".join(FITTINGS_K)
            raise QuantityError("not a fitting of the table", repr(part.strip()), expected)
        total += int(match[1] or 1) * FITTINGS_K[known]
    return total
