"""
The thread that judges: what is on the screen first, then all the rest.

It works on the newest record alone; what was asked before and is not begun is dropped.
"""

from __future__ import annotations

import threading
import time
from collections.abc import Callable, Iterable
from dataclasses import dataclass

from textual.message import Message

from audit.tui.messages import Assessed, Crashed, Judged, Unjudged
from rules.assessment import CircuitResult
from rules.errors import RulesError
from rules.record import Site

LONGEST_WAIT_S = 2.0
"""For how long the judging of a whole site is put off while saves follow each other. [s]"""


@dataclass(frozen=True, slots=True)
class _Request:
    site: Site
    first: tuple[str, ...]
    """Ids of the circuits that are wanted first."""


class _Outdated(Exception):
    """Something newer is asked for."""


class Judge(threading.Thread):
    """Judges one record after another from ``start`` to ``stop``."""

    def __init__(self, post: Callable[[Message], object]) -> None:
        super().__init__(name="judge", daemon=True)
        self._post = post
        self._news = threading.Condition()
        self._request: _Request | None = None
        self._stopped = False
        self._last_took_s = 0.0

    # --- asked for by the event loop

    def judge(self, site: Site, first: tuple[str, ...]) -> None:
        """Have a record judged: ``Judged`` comes back for the circuits ``first``, then ``Assessed``."""
        with self._news:
            self._request = _Request(site, first)
            self._news.notify()

    def stop(self) -> None:
        """End; a judgement that has begun is not waited for."""
        with self._news:
            self._stopped = True
            self._news.notify()

    # --- in the thread

    def run(self) -> None:
        try:
            while (request := self._next()) is not None:
                self._judge(request)
        except Exception as error:
            self._post(Crashed(error))

    def _next(self) -> _Request | None:
        with self._news:
            self._news.wait_for(lambda: self._stopped or self._request is not None)
            request, self._request = self._request, None
            return None if self._stopped else request

    def _is_outdated(self, wait_s: float = 0.0) -> bool:
        """Whether something newer is asked for, or comes within a while."""
        with self._news:
            return self._news.wait_for(lambda: self._stopped or self._request is not None, wait_s)

    def _judge(self, request: _Request) -> None:
        # Here and not above: numpy takes as long to import as the first screen takes to appear.
        from rules import limits
        from rules.assess import assess_circuit, assess_prepared, prepare

        def tell(results: Iterable[CircuitResult]) -> None:
            if self._is_outdated():
                raise _Outdated
            self._post(Judged(request.site, context, {result.circuit_id: result for result in results}))

        try:
            context = prepare(request.site, limits.of(request.site))
            circuits = context.index.circuits
            tell([assess_circuit(context, circuits[id_]) for id_ in request.first if id_ in circuits])
            if not self._is_outdated(min(self._last_took_s, LONGEST_WAIT_S)):
                start = time.monotonic()
                assessment = assess_prepared(context, tell)
                self._last_took_s = time.monotonic() - start
                self._post(Assessed(request.site, context, assessment))
        except _Outdated:
            return
        except RulesError as error:
            self._post(Unjudged(request.site, str(error).replace("\n", "; ")))
