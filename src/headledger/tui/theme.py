"""Colours that most kinds of colour blindness tell apart (Okabe and Ito, Color Universal Design, 2008)."""

from __future__ import annotations

from textual.theme import Theme

OTHER_THEMES_VARIABLES = {"pipe-ground": "#7F7F7F"}
"""What themes that are not ours lack: a grey that stands out from black and from white."""

DARK_THEME = Theme(
    name="headledger-dark",
    dark=True,
    primary="#56B4E9",
    secondary="#009E73",
    accent="#F0E442",
    warning="#E69F00",
    error="#D55E00",
    success="#56B4E9",
    foreground="#E8ECEF",
    background="#101418",
    surface="#161B20",
    panel="#222A31",
    variables={
        "text-success": "#56B4E9",
        "text-warning": "#E69F00",
        "text-error": "#FF7A1F",
        "pipe-ground": "#3D4650",
        "footer-key-foreground": "#E69F00",
        "block-cursor-background": "#2F5D7C",
        "block-cursor-foreground": "#FFFFFF",
        "block-cursor-text-style": "bold",
        "block-cursor-blurred-background": "#26323B",
        "block-cursor-blurred-foreground": "#E8ECEF",
    },
)

LIGHT_THEME = Theme(
    name="headledger-light",
    dark=False,
    primary="#0072B2",
    secondary="#009E73",
    accent="#96306A",
    warning="#8A5A00",
    error="#B34A00",
    success="#0072B2",
    foreground="#14181C",
    background="#FFFFFF",
    surface="#F6F8F9",
    panel="#E4E9ED",
    variables={
        "text-success": "#005F94",
        "text-warning": "#7A5000",
        "text-error": "#A34300",
        "pipe-ground": "#C9D1D8",
        "footer-key-foreground": "#7A5000",
        "block-cursor-background": "#BFDDF0",
        "block-cursor-foreground": "#000000",
        "block-cursor-text-style": "bold",
        "block-cursor-blurred-background": "#D9E2E8",
        "block-cursor-blurred-foreground": "#14181C",
    },
)
