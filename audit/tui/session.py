"""
The thread that owns the site file: it loads, saves, undoes, and sees what others save.

SQLite waits up to five seconds for another program and for the disk; here it may. The event loop only puts
requests into a queue and gets messages back.
"""

from __future__ import annotations

import gc
import queue
import threading
from collections.abc import Callable, Collection, Iterator, Mapping
from contextlib import contextmanager, suppress
from dataclasses import dataclass
from pathlib import Path
from typing import TypeAlias

from textual.message import Message

from audit.tui.edits import Edit
from audit.tui.messages import Crashed, Loaded, Outlined, Refused, Saved, Troubled, Undone
from audit.tui.state import read_by_visit
from db.errors import SiteError, SiteReadOnly, shown
from db.schema import SITE
from db.store import SiteStore
from rules.index import Index
from rules.record import Row, Site

POLL_S = 0.5
"""How often to ask whether someone else saved; what they saved is to be seen within two seconds. [s]"""


@dataclass(frozen=True, slots=True)
class _Write:
    edit: Edit
    who: str


@dataclass(frozen=True, slots=True)
class _Undo:
    who: str
    again: bool


@dataclass(frozen=True, slots=True)
class _Look:
    """Have the record read, if it is not."""


_Request: TypeAlias = _Write | _Undo | _Look | None

OUTLINE = ("sources", "boards", "circuits", "visits")
"""Tables that the walk is drawn from: few rows beside the readings, for which the first screenful does not wait."""


@contextmanager
def _uncollected() -> Iterator[None]:
    """
    Make a site without the garbage collector, and keep it out of its sight.

    It would look at each of a hundred thousand rows again and again, and stop the screen while it does.
    Nothing in a site refers back, so that an old one is freed all the same.
    """
    gc.disable()
    try:
        yield
    finally:
        gc.freeze()
        gc.enable()


class Session(threading.Thread):
    """Owns the store of one site file from ``start`` to ``stop``."""

    def __init__(self, path: Path, laptop: str, post: Callable[[Message], object]) -> None:
        super().__init__(name="site file", daemon=True)
        self._path = path
        self._laptop = laptop
        self._post = post
        self._requests: queue.Queue[_Request] = queue.Queue()
        self._seen: tuple[int, int] | None = None
        self._known: tuple[Site, Index] | None = None
        """The record as it was read last."""
        self._written: dict[str, set[str]] | None = {}
        """Ids of the rows written since then, by table; ``None`` where only reading all of it anew will do."""
        self._trouble = ""

    # --- asked for by the event loop

    def save(self, edit: Edit, who: str) -> None:
        """Have an edit saved: ``Saved`` or ``Refused`` comes back."""
        self._requests.put(_Write(edit, who))

    def undo(self, who: str, *, again: bool = False) -> None:
        """Have one's last save written back (or done again): ``Undone`` comes back."""
        self._requests.put(_Undo(who, again))

    def look(self) -> None:
        """Have the record read now, rather than at the next look at the file: ``Loaded`` comes back."""
        self._requests.put(_Look())

    def stop(self) -> None:
        """End once everything asked for so far is done, and wait for it."""
        self._requests.put(None)
        self.join()

    # --- in the thread

    def run(self) -> None:
        try:
            with self._opened() as store:
                self._outline(store)
                while self._serve(store):
                    pass
        except SiteError as error:
            self._post(Troubled(self._line(error)))
        except Exception as error:
            self._post(Crashed(error))

    def _opened(self) -> SiteStore:
        try:
            return SiteStore(self._path, laptop=self._laptop)
        except SiteReadOnly:
            return SiteStore(self._path, read_only=True, laptop=self._laptop)

    def _serve(self, store: SiteStore) -> bool:
        """Do what was asked for, look at the record, then answer: who is answered finds it up to date. False: the end."""
        answers: list[Message] = []
        try:
            request = self._requests.get(timeout=POLL_S)
            while request is not None:
                if not isinstance(request, _Look):
                    answers.append(self._do(store, request))
                request = self._requests.get_nowait()
        except queue.Empty:
            self._look(store)
            for answer in answers:
                self._post(answer)
            return True
        return False

    def _do(self, store: SiteStore, request: _Write | _Undo) -> Message:
        try:
            if isinstance(request, _Undo):
                self._written = None  # a row that comes back stands where it stood
                what = store.redo(request.who) if request.again else store.undo(request.who)
                return Undone(what, request.again)
            with store.save(request.who, request.edit.why) as save:
                ids = tuple(step.write(save) for step in request.edit.steps)
            self._note(save.touched)
            return Saved(request.edit, ids)
        except SiteError as error:
            line = self._line(error)
            return Refused(request.edit, line) if isinstance(request, _Write) else Troubled(line)

    def _note(self, touched: Mapping[str, Collection[str]]) -> None:
        """Keep what was written, for the next look."""
        if SITE in touched:
            self._written = None
        if self._written is not None:
            for table, ids in touched.items():
                self._written.setdefault(table, set()).update(ids)

    def _read(self, store: SiteStore, version: tuple[int, int]) -> tuple[Site, Index]:
        """The record as it stands: where no one else saved, what was written is all that is read."""
        if self._known is None or self._written is None or self._seen is None or version[0] != self._seen[0]:
            site = store.site()
            return site, Index(site)
        site, index = self._known
        for table, ids in self._written.items():
            site = site.with_rows(table, _rows_now(site.table(table), ids, store.rows(table, ids)))
        if self._written.keys() <= {"readings"}:
            return site, index.with_readings(site, self._written.get("readings", ()))
        return site, Index(site)

    def _line(self, error: SiteError) -> str:
        """What went wrong; the file, which is the one on the screen, need not be named."""
        return str(error).removeprefix(f"{shown(self._path)}: ")

    def _outline(self, store: SiteStore) -> None:
        """Read what the walk shows; all the rest is read once that is on the screen, or soon after."""
        with suppress(SiteError), _uncollected():  # the look at the whole tells what is wrong
            site = store.site(OUTLINE)
            self._post(Outlined(site, Index(site), store.read_only))

    def _look(self, store: SiteStore) -> None:
        """Load the record if anyone saved since the last look."""
        try:
            version = store.version
            if version == self._seen:
                return
            with _uncollected():
                site, index = self._known = self._read(store, version)
                loaded = Loaded(site, index, read_by_visit(site), store.read_only)
            self._written = {}
            self._seen = version
            self._trouble = ""
            self._post(loaded)
        except SiteError as error:
            if self._line(error) != self._trouble:  # said once, not twice a second
                self._trouble = self._line(error)
                self._post(Troubled(self._trouble))


def _rows_now(before: tuple[Row, ...], ids: Collection[str], found: tuple[Row, ...]) -> tuple[Row, ...]:
    """Rows with those of some ids as they were found: in their place, new ones behind all, others gone."""
    now = {row.id: row for row in found}
    kept = tuple(now.pop(row.id) if row.id in now else row for row in before if row.id in now or row.id not in ids)
    return (*kept, *now.values())
