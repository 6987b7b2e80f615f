"""The board's colours by night and by day: grey, and a few colours for what is abnormal.

The abnormal ones follow Okabe and Ito's palette, which the common deficiencies of colour vision keep apart; each
stands beside a letter or digit all the same. In a terminal of sixteen colours they fall on red, yellow, cyan or blue,
and magenta.
"""

from __future__ import annotations

from textual.theme import Theme

NIGHT = Theme(
    name="night",
    primary="#8a9199",
    secondary="#6c7279",
    foreground="#c9cdd1",
    background="#1b1d1f",
    surface="#232628",
    panel="#2c2f32",
    accent="#aab0b6",
    warning="#f0b400",
    error="#e8713a",
    success="#8a9199",
    dark=True,
    variables={
        "chosen": "#363c42",
        "chosen-away": "#2f3438",
        "head": "#26292c",
        "quiet": "#939aa0",
        "band": "#34393d",
        "on-act": "#141516",
        "act-now": "#e8713a",
        "act-soon": "#f0b400",
        "look": "#5ec8f5",
        "unknown": "#f08ae0",
        "limit": "#f39a70",
        "mark": "#b9bec4",
        "footer-key-foreground": "#c9cdd1",
        "footer-background": "#26292c",
        "footer-description-foreground": "#a2a8ae",
    },
)
DAY = Theme(
    name="day",
    primary="#5d646b",
    secondary="#80868c",
    foreground="#24282c",
    background="#e9eaeb",
    surface="#dfe1e2",
    panel="#d3d6d8",
    accent="#454b51",
    warning="#8a5a00",
    error="#b01000",
    success="#5d646b",
    dark=False,
    variables={
        "chosen": "#c4cacf",
        "chosen-away": "#d5d9dc",
        "head": "#d9dcde",
        "quiet": "#575d63",
        "band": "#cdd2d6",
        "on-act": "#ffffff",
        "act-now": "#b01000",
        "act-soon": "#8a5a00",
        "look": "#004a9c",
        "unknown": "#802080",
        "limit": "#8f1a00",
        "mark": "#3a4046",
        "footer-key-foreground": "#24282c",
        "footer-background": "#d9dcde",
        "footer-description-foreground": "#4c5258",
    },
)
