"""Adding and removing rows: as little as possible is asked, and the form of the new row opens at what comes next."""

from __future__ import annotations

from dataclasses import replace

from audit.tui.drawing.rows import row_title
from audit.tui.edits import Add, Edit, Remove
from audit.tui.entry import new_rows
from audit.tui.entry.checks import complaint_about
from audit.tui.entry.fields import SITE, Field, fields_of, row_of
from audit.tui.entry.visits import KINDS, new_visit
from audit.tui.messages import Refused
from audit.tui.screens.ask import YES, Ask, Choice, confirm
from audit.tui.screens.base import OurScreen
from audit.tui.screens.form import FormScreen
from audit.tui.state import Survey
from rules.record import Row

WHAT = {
    "circuit": ("circuits", "on the board at the cursor"),
    "run": ("runs", "of the circuit at the cursor, from its last point on"),
    "load": ("loads", "on the circuit at the cursor"),
    "board": ("boards", "a distribution board, fuse panel or terminal row"),
    "source": ("sources", "a battery, rectifier, power supply, PV array or converter"),
    "meter": ("instruments", "one range of an instrument"),
    "visit": ("visits", "one survey of the site"),
}
"""What can be added, by the word that its letters choose."""
_NEXT_FIELD = {
    "circuits": "description",
    "runs": "one_way_length_m",
    "loads": "current_a",
    "boards": "fed_by",
    "sources": "kind",
    "instruments": "quantity",
    "visits": "date",
}
"""Where the form of a new row begins: what it is called is known."""


async def add(screen: OurScreen[None], row_id: str) -> str:
    """
    Ask what to add, add it with the least that must be known, and open its form.

    Parameters
    ----------
    row_id : str
        The circuit, board or source at the cursor.

    Returns
    -------
    str
        Id of the new row; empty where none was added.
    """
    app = screen.ohmwalk
    survey = app.survey
    if survey is None:
        return ""
    choices = [Choice(word, words) for word, (_, words) in WHAT.items()]
    answer = await app.ask(Ask("Add a", choices=choices, free=False))
    if answer is None:
        return ""
    table = WHAT[answer][0]
    row = await _new_row(screen, survey, table, row_id)
    while row is not None:
        answer_ = await app.save(Edit(f"{_title(table, row, survey)} added", (Add(table, row),)))
        if not isinstance(answer_, Refused):
            await app.ask(FormScreen(table, answer_.ids[0], _NEXT_FIELD[table]))
            return answer_.ids[0]
        # The tag is taken, or the file cannot be written: the tag that was typed stays.
        tag = await app.ask(Ask("Its tag", getattr(row, "tag", ""), hint=answer_.line))
        row = None if not tag or table == "runs" else replace(row, tag=tag)  # type: ignore[call-arg]
    return ""


async def _new_row(screen: OurScreen[None], survey: Survey, table: str, row_id: str) -> Row | None:
    """The row with its defaults; ``None`` where she leaves, or where there is nothing to hang it on."""
    app, index = screen.ohmwalk, survey.index
    if table in ("runs", "loads") and row_id not in index.circuits:
        screen.say(f"a {table.removesuffix('s')} needs a circuit at the cursor", "wrong")
        return None
    if table == "runs":
        return new_rows.new_run(index, row_id)
    if table == "visits":
        kind = await app.ask(Ask("A visit", choices=[Choice(kind) for kind in KINDS], free=False))
        return None if kind is None else new_visit(survey.site, kind, app.now().date(), app.settings.who)
    feed = new_rows.feed_at(index, row_id)

    def made(tag: str) -> Row:
        if table == "circuits":
            return new_rows.new_circuit(tag, feed)
        if table == "loads":
            return new_rows.new_load(index, row_id, tag)
        if table == "boards":
            return new_rows.new_board(tag, index)
        return new_rows.new_instrument(index, tag) if table == "instruments" else new_rows.new_source(tag)

    def complaint(tag: str) -> str:
        row = made("")
        return complaint_about(_tag_field(table), row, {"tag": tag}, index) if tag else "it needs a tag"

    proposed = new_rows.tag_for(table, index, feed, row_id)
    noun = next(word for word, (name, _) in WHAT.items() if name == table)
    tag = await app.ask(Ask(f"The new {noun}'s tag", proposed, hint=_hint(table, survey, feed), check=complaint))
    return None if tag is None else made(tag)


def _hint(table: str, survey: Survey, feed: object) -> str:
    if table == "circuits":
        row = survey.index.named(feed) if feed is not None else None  # type: ignore[arg-type]
        return f"on {row.tag}" if row is not None else "on no board yet: fed from can be said in the form"
    return "what it is called on its label"


def _tag_field(table: str) -> Field:
    return next(field for field in fields_of(table) if field.name == "tag")


def _title(table: str, row: Row, survey: Survey) -> str:
    return row_title(table, row, survey.index)


async def remove(screen: OurScreen[None], table: str, row_id: str) -> None:
    """Remove a row after asking; refused with what refers to it."""
    app = screen.ohmwalk
    row = None if app.survey is None else row_of(app.survey.site, table, row_id)
    if app.survey is None or row is None:
        return
    title = row_title(table, row, app.survey.index)
    if table == SITE:
        screen.say("the site itself stays", "wrong")
        return
    if await app.ask(confirm(f"Remove {title}?", "u brings it back")) != YES:
        return
    answer = await app.save(Edit(f"{title} removed", (Remove(table, row_id),)))
    if isinstance(answer, Refused):
        screen.say(answer.line, "wrong")
    else:
        screen.say(f"{title} is removed · u brings it back")
