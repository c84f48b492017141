"""What was typed after ``ohmwalk drop``, understood as one question; all that is wrong is told in one go."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import TypeVar

from audit.drop import words
from audit.drop.words import (
    ALLOWED,
    AMBIENT,
    CURRENT,
    DUTY,
    LENGTH,
    LOWEST,
    NOMINAL,
    POWER,
    RESISTANCE,
    SIZE,
    TEMPERATURE,
)
from audit.errors import WrongUse
from rules.errors import RulesError
from rules.limits import Limits
from rules.loads import Drawn
from rules.one_run import OneRun
from rules.record import Run
from rules.text import either, quoted

T = TypeVar("T")

LOADS = (CURRENT, POWER, RESISTANCE)
"""How a load may be given; what is given stays constant whatever the voltage."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Options:
    """What is chosen by an option; empty or ``None`` for not chosen."""

    material: str = ""
    stranding: str = ""
    parallel: int | None = None
    return_size: str = ""
    return_material: str = ""
    length_by: str = ""
    insulation: str = ""
    method: str = ""
    grouped: int | None = None
    ambient: str = ""
    temperature: str = ""
    allowed: str = ""
    lowest: str = ""
    duty: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Understood:
    """The question, and what of it was typed rather than assumed."""

    asked: OneRun
    load: words.Quantity
    """One of ``LOADS``."""
    load_value: float
    typed: dict[str, str]
    """Text as typed, by the name of its quantity."""


class _Desk:
    """Takes one text after the other and keeps what is wrong with them."""

    def __init__(self) -> None:
        self.lines: list[str] = []
        self.typed: dict[str, str] = {}
        self.numbers: dict[str, float] = {}
        self.size = ""

    def attempt(self, read: Callable[[], T], option: str = "") -> T | None:
        """What reading gives; ``None`` where it complains."""
        try:
            return read()
        except (RulesError, WrongUse) as error:
            self.lines += [f"{option}{line}" for line in str(error).splitlines()]
            return None

    def word(self, text: str) -> None:
        """Take a text that is known by its unit."""
        quantity = self.attempt(lambda: words.quantity_of(text))
        if quantity is not None:
            self.take(quantity, text)

    def take(self, quantity: words.Quantity, text: str, option: str = "") -> None:
        """Take a text whose quantity is known."""
        if quantity.name in self.typed:
            before = self.typed[quantity.name]
            self.lines.append(f"two values for the {quantity.name}: {quoted(before)} and {quoted(text)}")
            return
        self.typed[quantity.name] = text
        if quantity is SIZE:
            self.size = self.attempt(lambda: words.size(text), option) or ""
        else:
            value = self.attempt(lambda: words.number(text, quantity), option)
            if value is not None:
                self.numbers[quantity.name] = value

    def number(self, quantity: words.Quantity) -> float | None:
        return self.numbers.get(quantity.name)

    def missing(self) -> Iterator[str]:
        """What has to be typed and was not, and loads beyond one."""
        for quantity in (LENGTH, SIZE, NOMINAL):
            if quantity.name not in self.typed:
                yield f"the {quantity.name} is missing; accepted is something like {quantity.example}"
        given = [load.name for load in LOADS if load.name in self.typed]
        if not given:
            examples = either([load.example for load in LOADS])
            yield f"the load is missing; accepted is its current, power or resistance: {examples}"
        elif len(given) > 1:
            yield f"the load has a {' and a '.join(given)}; accepted is the one that stays constant"


def understand(typed: Sequence[str], options: Options, limits: Limits) -> Understood:
    """
    Read what was typed.

    Parameters
    ----------
    typed : sequence of str
        Words of the command line: quantities by their units, in any order.
    options : Options
        What was chosen by options.
    limits : Limits
        Its allowed drop and ambient stand in for those that were not typed.

    Raises
    ------
    WrongUse
        A line for each thing that is wrong or missing.
    """
    desk = _Desk()
    for text in words.joined(typed):
        desk.word(text)
    for option, quantity, text in (
        ("--temperature", TEMPERATURE, options.temperature),
        ("--allowed", ALLOWED, options.allowed),
        ("--ambient", AMBIENT, options.ambient),
        ("--lowest", LOWEST, options.lowest),
        ("--duty", DUTY, options.duty),
    ):
        if text:
            desk.take(quantity, text, f"{option}: ")
    way_back = options.return_size
    return_size = desk.attempt(lambda: words.size(way_back), "--return-size: ") if way_back else ""
    desk.lines += desk.missing()
    if desk.lines:
        raise WrongUse(*desk.lines)
    load = next(load for load in LOADS if load.name in desk.typed)
    run = Run(
        id="", circuit_id="", number=1,
        one_way_length_m=desk.number(LENGTH), length_by=options.length_by, size=desk.size,
        material=options.material, stranding=options.stranding, parallel=options.parallel,
        insulation=options.insulation, method=options.method, grouped=options.grouped,
        conductor_temperature_c=desk.number(TEMPERATURE),
        return_size=return_size or "", return_material=options.return_material,
    )  # fmt: skip
    asked = OneRun(
        run=run,
        nominal_v=desk.numbers[NOMINAL.name],
        draws=_draws(load, desk.numbers[load.name]),
        allowed_percent=desk.numbers.get(ALLOWED.name, limits["drop.allowed_percent"]),
        ambient_c=desk.numbers.get(AMBIENT.name, limits["ambient.assumed_c"]),
        lowest_v=desk.number(LOWEST),
        duty=None if (duty := desk.number(DUTY)) is None else duty / 100,
    )
    return Understood(asked=asked, load=load, load_value=desk.numbers[load.name], typed=desk.typed)


def _draws(load: words.Quantity, value: float) -> Drawn:
    if load is CURRENT:
        return Drawn(current_a=value)
    return Drawn(power_w=value) if load is POWER else Drawn(conductance_s=1 / value)
