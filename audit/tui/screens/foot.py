"""A question at the foot of the screen: what it is about stays in sight above."""

from __future__ import annotations

from typing import TypeVar

from textual.screen import ModalScreen

R = TypeVar("R")


class Foot(ModalScreen[R]):
    """Takes as many lines at the foot as it needs."""

    CSS_PATH = "foot.tcss"
