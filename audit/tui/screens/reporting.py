"""Writing the report from the interface: which file, for whom, then off the event loop."""

from __future__ import annotations

import asyncio
from pathlib import Path
from typing import TYPE_CHECKING

from audit.errors import AuditError, TargetExists
from audit.tui.screens.ask import YES, Ask, Choice, confirm

if TYPE_CHECKING:
    from audit.tui.app import OhmwalkApp

AUDIENCES = (
    Choice("inspector", "everything: record, readings, findings with numbers and sources"),
    Choice("electrician", "by board, with what to do at each place"),
    Choice("supervisor", "one page"),
)


async def write(app: OhmwalkApp) -> None:
    """Ask for the file and the reader, and write the report of what is judged now."""
    from audit.report.write import FORMS, check_target, write_report  # jinja2 takes longer than the first screen
    from rules.explain import assessment_with_facts

    survey = app.survey
    if survey is None or survey.assessment is None:
        app.say("some circuits are still being judged: try again in a moment")
        return

    def complaint(answer: str) -> str:
        try:
            check_target(Path(answer).expanduser(), overwrite=False)
        except TargetExists:
            return ""  # asked for by itself
        except AuditError as error:
            return error.lines[0]
        return ""

    proposed = str(app.site_file.with_name(f"{app.site_file.stem}-audit.html"))
    hint = f"the ending chooses the form: {' '.join(FORMS)}"
    answer = await app.ask(Ask("Report to", proposed, hint=hint, check=complaint))
    if answer is None:
        return
    target = Path(answer).expanduser()
    overwrite = target.exists()
    if overwrite and await app.ask(confirm(f"{target.name} is there already. Replace it?")) != YES:
        return
    audience = await app.ask(Ask("For the", choices=AUDIENCES, instant=True))
    if audience is None:
        return
    context, assessment = survey.context, survey.assessment
    if context is None:
        return
    made_at = app.now().strftime("%Y-%m-%d %H:%M %z")

    def written() -> None:
        told = assessment if audience == "supervisor" else assessment_with_facts(context, assessment)
        write_report(survey.site, told, target, audience, overwrite=overwrite, made_at=made_at)

    try:
        await asyncio.to_thread(written)
    except AuditError as error:
        app.say(error.lines[0], "wrong")
    else:
        app.say(f"wrote {target}")
