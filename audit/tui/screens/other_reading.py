"""A reading beside the round, and the correction of any reading: one question after another."""

from __future__ import annotations

from typing import TYPE_CHECKING

from audit.report.phrases import leg_words, reading_words, time_words
from audit.tui.entry.meters import Meter, meter_quantity
from audit.tui.entry.other import QUANTITY_WORDS, correctable, goes_to, legs_for, places_for, quantities_at
from audit.tui.entry.plausible import SMALL, doubt_about, unit_complaint
from audit.tui.entry.reading import Where, edit_for, reading_from, value_words
from audit.tui.entry.slots import Place, readings_of_visit
from audit.tui.messages import Refused
from audit.tui.screens import measuring
from audit.tui.screens.ask import Ask, Choice
from audit.tui.widgets.entry_strip import ENTER_AGAIN
from rules.assessment import NextReading
from rules.errors import RulesError
from rules.index import Index
from rules.record import UNIT_OF_QUANTITY, Reading

if TYPE_CHECKING:
    from audit.tui.screens.survey import SurveyScreen

NOT_RECORDED = "not recorded"
LOADS = ("on", "off")
OF_A_CLAMP = ("current", "residual")
"""What is read with the loads off too: what a clamp shows then is its own."""
_SIGNS = {"degC": "°C", "ohm": "Ω"}
_UNIT_WORDS = dict.fromkeys(SMALL, "mV or V")
"""The unit expected, where it is not that of the record alone."""


async def take(screen: SurveyScreen, place: Place) -> None:
    """Ask for quantity, place, leg and value, beginning with what is to be read next, and save the reading."""
    of = await measuring.round_at(screen, place)
    survey = screen.ohmwalk.survey
    if of is None or survey is None:
        return
    wanted = _wanted(screen, place)
    where = await _where(screen, survey.index, Where(place, of.visit, "", "", ""), wanted)
    if where is None:
        return
    meter = await measuring.meter_at_hand(screen, meter_quantity(where.quantity), of.visit)
    if meter is None:
        return
    rounds = readings_of_visit(survey.index, place, of.visit)
    last = rounds[-1].round if rounds else "1"
    hint = f"round {last}, with {meter.words(meter_quantity(where.quantity))}; a reading belongs to a load state"
    await _ask_value(screen, _words(where), hint, Where(
        place, of.visit, last, where.quantity, where.at, where.to, where.leg, meter, of.by, where.loads_off
    ))  # fmt: skip


async def correct(screen: SurveyScreen, place: Place) -> None:
    """Choose a reading and replace it for a stated reason."""
    app = screen.ohmwalk
    if app.survey is None:
        return
    readings = correctable(app.survey.index, place)
    if not readings:
        screen.say("nothing was read here that could be corrected")
        return
    by_words = {_choice_words(number, reading): reading for number, reading in enumerate(readings, start=1)}
    choices = [Choice(words, f"{value_words(reading)}, {_state(reading)}") for words, reading in by_words.items()]
    answer = await app.ask(Ask("Correct which reading?", choices=choices, free=False))
    if answer is None:
        return
    old = by_words[answer]
    who = await app.who()
    if not who:
        return
    meter = Meter(old.instrument, old.full_scale)
    where = Where(place, old.visit, old.round, old.quantity, old.at, old.to, old.leg, meter, who, old.loads_off)
    await _ask_value(
        screen, reading_words(old), f"in place of {value_words(old)}, which stays in the record", where, old
    )


def _choice_words(number: int, reading: Reading) -> str:
    return f"{number}  {reading_words(reading)}"


def _state(reading: Reading) -> str:
    return f"round {reading.round}, {reading.visit_or_default} {time_words(reading.taken_at)}".strip()


def _wanted(screen: SurveyScreen, place: Place) -> NextReading:
    """What the judgement asks to be read next on the circuit, if it asks for a reading."""
    survey = screen.ohmwalk.survey
    result = survey.results.get(place.circuit_id) if survey is not None else None
    following = result.next_reading if result is not None else None
    return following if following is not None and following.quantity else NextReading("reading")


async def _where(screen: SurveyScreen, index: Index, where: Where, wanted: NextReading) -> Where | None:
    """Everything about the reading but its value; ``None`` where she leaves."""

    async def one_of(question: str, answers: tuple[str, ...], preferred: str) -> str | None:
        if len(answers) < 2:
            return "".join(answers)
        ordered = sorted(answers, key=lambda answer: answer != preferred)
        choices = [Choice(answer, QUANTITY_WORDS.get(answer, "")) for answer in ordered]
        return await screen.ohmwalk.ask(Ask(question, choices=choices, free=False))

    place = where.place
    quantity = await one_of("Read what?", quantities_at(place), wanted.quantity)
    if quantity is None:
        return None
    at = await one_of(f"{quantity}: where?", places_for(index, place, quantity), wanted.at)
    if at is None:
        return None
    ends = goes_to(index, place, quantity, at)
    to = await one_of(f"{quantity} from {at} to", ends, wanted.to)
    if to is None:
        return None
    leg = await one_of(f"{quantity} at {at}: which leg?", legs_for(index, place, quantity, at), wanted.leg)
    if leg is None:
        return None
    loads = await one_of(f"{quantity} at {at}: the loads are", LOADS if quantity in OF_A_CLAMP else LOADS[:1], "on")
    if loads is None:
        return None
    off = "yes" if loads == "off" else ""
    return Where(place, where.visit, "", quantity, at, to, "" if leg == NOT_RECORDED else leg, loads_off=off)


def _words(where: Where) -> str:
    path = f"from {where.at} to {where.to}" if where.to else f"at {where.at}"
    of_leg = f", {leg_words(where.leg)}" if where.leg else ""
    return f"{where.quantity} {path}{of_leg}{', loads off' if where.loads_off else ''}"


async def _ask_value(
    screen: SurveyScreen, words: str, hint: str, where: Where, replaced: Reading | None = None
) -> None:
    """Ask for the value, and for the reason of a correction; a refused save asks again with the value kept."""
    app = screen.ohmwalk
    text, reason, doubted = "", "", ""
    unit = UNIT_OF_QUANTITY[where.quantity]
    hint = f"in {_UNIT_WORDS.get(where.quantity) or _SIGNS.get(unit, unit)} · {hint}"

    def complaint(answer: str) -> str:
        nonlocal doubted
        if needed := unit_complaint(answer, where.quantity):
            return needed
        try:
            reading = reading_from(answer, where, app.now())
        except RulesError as error:
            return str(error)
        doubt = doubt_about(reading, app.survey.index) if app.survey is not None else ""
        if not doubt or doubted == answer:
            return ""
        doubted = answer
        return f"{doubt} · {ENTER_AGAIN}"

    def understood(typed: str) -> str:
        if needed := unit_complaint(typed, where.quantity):
            return needed
        try:
            return f"understood: {value_words(reading_from(typed, where, app.now()))}"
        except RulesError:
            return ""  # half a value is typed

    while True:
        answer = await app.ask(Ask(words, text, hint=hint, check=complaint, echo=understood))
        if answer is None:
            return
        text = answer
        if replaced is not None and not reason:
            asked = Ask("Why?", choices=measuring.REASONS, hint="both readings stay in the record")
            why = await app.ask(asked)
            if not why:
                return
            reason = why
        edit = edit_for(reading_from(text, where, app.now()), screen.place_words(), replaced, reason)
        saved = await app.save(edit)
        if not isinstance(saved, Refused):
            screen.say(f"saved: {edit.why}")
            return
        hint = f"{saved.line} · Enter tries again"
