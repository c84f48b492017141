"""Taking readings: what is asked before the first one, then each value to the file."""

from __future__ import annotations

from typing import TYPE_CHECKING

from audit.report.phrases import visit_words
from audit.tui.edits import Add, Edit, Step
from audit.tui.entry.meters import NO_METER, Meter, meter_quantity, meter_used, meters_for, only_meter
from audit.tui.entry.reading import edit_for, value_words
from audit.tui.entry.slots import Place, slots_of
from audit.tui.entry.visits import KINDS, acknowledgement, goes_on, is_old, new_visit, unread_cautions, visit_row
from audit.tui.messages import Refused
from audit.tui.screens.ask import Ask, Choice
from audit.tui.screens.cautions import CautionScreen
from audit.tui.state import Survey
from audit.tui.widgets.entry_strip import EntryStrip, RoundAt
from rules.cautions import cautions_of, highest_voltage_v

if TYPE_CHECKING:
    from audit.tui.screens.survey import SurveyScreen

GO_ON = "go on"
REASONS = (
    Choice("typing slip", "another value was typed than the meter showed"),
    Choice("wrong place", "the probe or the clamp was at another place"),
    Choice("range", "the meter was on a wrong range or leads were in a wrong jack"),
    Choice("load changed", "the load had changed within the round"),
    Choice("read again", "the display was not steady"),
)
"""Why a reading is replaced; any other reason can be typed."""


async def round_at(screen: SurveyScreen, place: Place) -> RoundAt | None:
    """
    Everything that must be known before a reading is taken on a place.

    Asks for what is not known: whether the last visit goes on, the cautions, the name, the meters. ``None`` where
    she leaves any of it.
    """
    app = screen.ohmwalk
    if app.survey is None:
        return None
    if app.survey.read_only:
        screen.say("this file may not be written: no reading can be saved", "wrong")
        return None
    visit = await _visit(screen, app.survey)
    if visit is None or not await _cautions_read(screen, visit):
        return None
    visit = app.survey.visit  # it may have begun with the cautions
    meters = await meters_at_hand(screen, place, visit)
    return None if meters is None else RoundAt(place, visit, app.settings.who, meters)


async def _visit(screen: SurveyScreen, survey: Survey) -> str | None:
    """The visit that readings go to: the one at hand, a new one where it is old; empty where there is none yet."""
    today = screen.ohmwalk.now().date()
    is_known = (survey.visit, today) in screen.ohmwalk.habits.confirmed or goes_on(survey.site, survey.visit, today)
    if is_known or not is_old(survey.site, survey.visit, today):
        return survey.visit
    row = visit_row(survey.site, survey.visit)
    assert row is not None
    choices = [Choice(GO_ON, visit_words(row)), *(Choice(kind, "a new visit, from today") for kind in KINDS)]
    question = Ask("The last visit is not of today. Readings belong to", choices=choices, free=False)
    answer = await screen.ohmwalk.ask(question)
    if answer is None:
        return None
    if answer == GO_ON:
        screen.ohmwalk.habits.confirmed.add((survey.visit, today))
        return survey.visit
    return await begin_visit(screen, answer)


async def choose_visit(screen: SurveyScreen) -> None:
    """Ask which visit readings go to: one that is there, or a new one."""
    survey = screen.ohmwalk.survey
    if survey is None:
        return
    known = {row.tag: visit_words(row) for row in survey.site.visits}
    known |= {visit: "not described" for visit in survey.read if visit not in known}
    choices = [Choice(tag, words.removeprefix(tag).strip(", ")) for tag, words in known.items()]
    choices += [Choice(kind, "a new visit, from today") for kind in KINDS if kind not in known]
    question = Ask("Readings belong to", survey.visit, choices=choices, free=False)
    answer = await screen.ohmwalk.ask(question)
    if answer in known:
        screen.ohmwalk.habits.confirmed.add((answer, screen.ohmwalk.now().date()))
        screen.ohmwalk.choose_visit(answer)
    elif answer is not None:
        await begin_visit(screen, answer)


async def begin_visit(screen: SurveyScreen, kind: str) -> str | None:
    """Add a visit that begins today; ``None`` where it could not be saved."""
    app = screen.ohmwalk
    who = await app.who()
    if app.survey is None or not who:
        return None
    row = new_visit(app.survey.site, kind, app.now().date(), who)
    answer = await app.save(Edit(f"visit {row.tag}", (Add("visits", row),)))
    if isinstance(answer, Refused):
        screen.say(answer.line, "wrong")
        return None
    app.choose_visit(row.tag)
    return row.tag


async def _cautions_read(screen: SurveyScreen, visit: str) -> bool:
    """Whether the cautions of the site's voltages are acknowledged, now or before."""
    app = screen.ohmwalk
    assert app.survey is not None
    site = app.survey.site
    unread = unread_cautions(site, visit or "1", app.settings.who)
    if not unread:
        return True
    shown = CautionScreen(cautions_of(site), highest_voltage_v(site), visit or "first visit")
    if not await app.ask(shown):
        return False
    who = await app.who()
    if not who:
        return False
    steps: tuple[Step, ...] = ()
    if not visit:
        row = new_visit(site, KINDS[0], app.now().date(), who)
        steps, visit = (Add("visits", row),), row.tag
    answer = await app.save(acknowledgement(unread, visit, who, app.now(), *steps))
    if isinstance(answer, Refused):
        screen.say(answer.line, "wrong")
        return False
    app.choose_visit(visit)
    return True


async def meters_at_hand(screen: SurveyScreen, place: Place, visit: str) -> dict[str, Meter] | None:
    """The meters of the visit by what they measure; ``None`` where she leaves the question."""
    survey = screen.ohmwalk.survey
    assert survey is not None
    meters: dict[str, Meter] = {}
    for quantity in dict.fromkeys(meter_quantity(s.quantity) for s in slots_of(survey.index, place, visit, "")):
        meter = await meter_at_hand(screen, quantity, visit)
        if meter is None:
            return None
        meters[quantity] = meter
    return meters


async def meter_at_hand(screen: SurveyScreen, quantity: str, visit: str) -> Meter | None:
    """The meter that was chosen or used in the visit, the only one there is, or the one that she chooses."""
    app = screen.ohmwalk
    assert app.survey is not None
    index = app.survey.index
    known = (
        app.habits.meters.get((visit, quantity)) or meter_used(index, visit, quantity) or only_meter(index, quantity)
    )
    return known or await choose_meter(screen, quantity, visit)


async def choose_meters(screen: SurveyScreen) -> None:
    """Ask for the meters of the visit anew."""
    visit = screen.ohmwalk.survey.visit if screen.ohmwalk.survey is not None else ""
    for quantity in ("voltage", "current"):
        if await choose_meter(screen, quantity, visit) is None:
            return


async def choose_meter(screen: SurveyScreen, quantity: str, visit: str) -> Meter | None:
    """Ask which meter and range; kept for the visit."""
    app = screen.ohmwalk
    assert app.survey is not None
    meters = [*meters_for(app.survey.index, quantity), NO_METER]
    by_words = {meter.words(quantity): meter for meter in meters}
    hint = "a meter without a range: the smallest range that holds the value counts"
    question = Ask(
        f"Which meter reads {quantity}?", choices=[Choice(words) for words in by_words], free=False, hint=hint
    )
    answer = await app.ask(question)
    if answer is None:
        return None
    app.habits.meters[visit, quantity] = by_words[answer]
    return by_words[answer]


async def save_value(screen: SurveyScreen, strip: EntryStrip, message: EntryStrip.Accepted) -> None:
    """Save what was accepted in a cell, with the reason where it corrects a reading."""
    reason = ""
    if message.replaced is not None:
        words = f"Why in place of {value_words(message.replaced)}?"
        answer = await screen.ohmwalk.ask(Ask(words, choices=REASONS, hint="both readings stay in the record"))
        if not answer:
            strip.refuse(
                message.cell, "not saved: a correction needs a reason; Enter asks again, Esc leaves it", go_back=True
            )
            return
        reason = answer
    edit = edit_for(message.reading, screen.place_words(), message.replaced, reason)
    answer_ = await screen.ohmwalk.save(edit)
    if isinstance(answer_, Refused):
        strip.refuse(message.cell, f"{answer_.line} · the value is kept: Enter tries again")
    else:
        strip.settle(message.cell)
