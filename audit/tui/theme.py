"""
Two themes, for a dark room and for bright sun, in the colours of Okabe and Ito.

Colour only helps: every status is a word with a sign, and the screens read the same in one colour.
"""

from __future__ import annotations

from textual.theme import Theme

DARK = Theme(
    name="ohmwalk-dark",
    dark=True,
    primary="#56B4E9",
    secondary="#CC79A7",
    accent="#E69F00",
    warning="#E69F00",
    error="#D55E00",
    success="#009E73",
    background="#121417",
    surface="#121417",
    panel="#1d2126",
    foreground="#e6e4df",
    variables={
        "status-act": "#f2771a",
        "status-watch": "#E69F00",
        "status-measure": "#56B4E9",
        "status-incomplete": "#CC79A7",
        "status-sound": "#1fb68b",
        "quiet": "#8f959d",
        "bar": "#aeb4bb",
        "loud": "#F0E442",
        "chosen": "#232a31",
        "cell": "#2a323a",
        "scrollbar": "#3a424b",
        "scrollbar-hover": "#56606b",
        "scrollbar-active": "#56606b",
        "scrollbar-background": "#121417",
        "scrollbar-background-hover": "#121417",
        "scrollbar-background-active": "#121417",
        "input-cursor-background": "#e6e4df",
        "input-cursor-foreground": "#121417",
        "input-selection-background": "#56B4E9 35%",
    },
)

LIGHT = Theme(
    name="ohmwalk-light",
    dark=False,
    primary="#0072B2",
    secondary="#9c4f7d",
    accent="#8a5a00",
    warning="#8a5a00",
    error="#a84300",
    success="#00664a",
    background="#ffffff",
    surface="#ffffff",
    panel="#eeeeec",
    foreground="#000000",
    variables={
        "status-act": "#a84300",
        "status-watch": "#8a5a00",
        "status-measure": "#00629a",
        "status-incomplete": "#8b3f6c",
        "status-sound": "#00664a",
        "quiet": "#5a5f66",
        "bar": "#4a5057",
        "loud": "#000000",
        "chosen": "#e3e8ec",
        "cell": "#dfe3e6",
        "scrollbar": "#b5babf",
        "scrollbar-hover": "#8f959b",
        "scrollbar-active": "#8f959b",
        "scrollbar-background": "#ffffff",
        "scrollbar-background-hover": "#ffffff",
        "scrollbar-background-active": "#ffffff",
        "input-cursor-background": "#000000",
        "input-cursor-foreground": "#ffffff",
        "input-selection-background": "#0072B2 30%",
    },
)

THEMES = (DARK, LIGHT)
