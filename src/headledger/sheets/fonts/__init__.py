"""The sheet's typeface, shipped with the tool so that every sign prints on every machine (DejaVu; its licence is beside it)."""

from __future__ import annotations

from functools import cache
from pathlib import Path

from reportlab.pdfbase import pdfmetrics
from reportlab.pdfbase.ttfonts import TTFont

PLAIN, BOLD = "SheetPlain", "SheetBold"

_FILES = {PLAIN: "DejaVuSansCondensed.ttf", BOLD: "DejaVuSansCondensed-Bold.ttf"}


@cache
def register_fonts() -> None:
    """Make the typeface known to the page maker, once."""
    for name, file in _FILES.items():
        pdfmetrics.registerFont(TTFont(name, str(Path(__file__).with_name(file))))
    pdfmetrics.registerFontFamily(PLAIN, normal=PLAIN, bold=BOLD, italic=PLAIN, boldItalic=BOLD)
