"""
Keys typed ahead wait until the screen that they are meant for is there.

Over a slow connection many keys arrive at once, and a person who knows the way types faster than screens open.
The toolkit gives each key to whatever is in front at that moment; here a key is given on only once the one before
it has been dealt with, and while a flow is between two questions it waits for the next one.
"""

from __future__ import annotations

import asyncio
from collections.abc import Awaitable, Callable, Coroutine
from contextlib import suppress
from contextvars import ContextVar
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, TypeVar

from textual.events import Key, Paste
from textual.message_pump import MessagePump
from textual.screen import Screen

if TYPE_CHECKING:
    from textual.app import App

R = TypeVar("R")

LONGEST_HOLD_S = 6.0
"""For how long keys wait: a save waits five seconds for another program. [s]"""
_LONGEST_HANDLING_S = 1.0
_LOOK_AGAIN_S = 0.002


@dataclass(eq=False)
class _Flow:
    """Questions and saves that follow each other."""

    answer: asyncio.Future[Any] | None = None
    """To the question on the screen; ``None`` between two questions."""

    @property
    def is_between(self) -> bool:
        return self.answer is None or self.answer.done()


_flow: ContextVar[_Flow | None] = ContextVar("flow", default=None)


class TypeAhead:
    """Holds an app's keys and runs its flows."""

    def __init__(
        self, app: App[Any], deliver: Callable[[Key | Paste], Awaitable[None]], must_wait: Callable[[], bool]
    ) -> None:
        self._app = app
        self._deliver = deliver
        self._must_wait = must_wait
        """Whether there is nothing yet that keys could act on."""
        self._keys: asyncio.Queue[Key | Paste] = asyncio.Queue()
        self._flows: list[_Flow] = []
        self.is_idle = True
        """Every key was dealt with."""

    def take(self, event: Key | Paste) -> None:
        """Keep a key until its turn."""
        self.is_idle = False
        self._keys.put_nowait(event)

    async def give(self) -> None:
        """Give the keys on, one after another, for as long as the app runs."""
        while True:
            self.is_idle = self._keys.empty()
            event = await self._keys.get()
            self.is_idle = False
            with suppress(TimeoutError):
                await asyncio.wait_for(self._ready(), LONGEST_HOLD_S)
            target = self._app.focused or self._app.screen
            await self._deliver(event)
            with suppress(TimeoutError):
                await asyncio.wait_for(self._dealt_with(target), _LONGEST_HANDLING_S)

    def flow(self, work: Coroutine[Any, Any, object]) -> None:
        """Run work that asks questions with ``ask``; from now on keys are meant for them."""
        flow = _Flow()
        self._flows.append(flow)

        async def followed() -> None:
            _flow.set(flow)
            try:
                await work
            finally:
                self._flows.remove(flow)

        self._app.run_worker(followed(), group="flow")

    async def ask(self, screen: Screen[R]) -> R | None:
        """Show a screen and wait for what it gives back; within a flow."""
        flow = _flow.get()
        answer = asyncio.ensure_future(self._app.push_screen_wait(screen))
        while screen.focused is None and not answer.done():
            await asyncio.sleep(0)
        if flow is not None:
            flow.answer = answer
        try:
            return await answer
        finally:
            if flow is not None:
                flow.answer = None

    async def _ready(self) -> None:
        while self._must_wait() or any(flow.is_between for flow in self._flows):
            await asyncio.sleep(_LOOK_AGAIN_S)

    async def _dealt_with(self, target: MessagePump) -> None:
        """A key goes to a widget, bubbles up, and comes back to the app, which looks for a binding."""
        node: MessagePump | None = target
        while node is not None and node.is_running:
            done = asyncio.Event()
            node.call_later(done.set)
            while node.is_running and not done.is_set():  # a screen that the key closed deals with nothing any more
                with suppress(TimeoutError):
                    await asyncio.wait_for(done.wait(), _LOOK_AGAIN_S)
            node = node._parent
