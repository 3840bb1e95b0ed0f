"""Keys in the order they were typed, each meeting the screen that the key before it left.

Keys that arrive in one packet (a slow line, a quick hand) would all be sent to the widget that has the focus when
they are read. Here the next key waits until everything that the one before it set off has been handled, and until
the screen that it may have opened stands there and has its focus: on a slow machine that takes seconds.
"""

from __future__ import annotations

import asyncio
from collections import deque
from collections.abc import Awaitable, Callable

from textual import events
from textual.message_pump import MessagePump

_ROUNDS = 200
_QUIET_ROUNDS = 4
"""Turns of the event loop without a message anywhere: one may be in someone's hands for a turn or two."""
_PATIENCE = 2.0
"""Seconds after which a key no longer waits: a handler that takes longer than this waits for something else."""
_PATIENCE_FOR_A_SCREEN = 20.0
"""Seconds after which a key no longer waits for the screen in front to be there."""
_PAUSE = 0.002


class KeyOrder:
    """Hands keys on one at a time.

    Args:
        deliver: Hands one key to the screen.
        pumps: Everything whose messages a key may set off.
        stands: Whether the screen in front is there, with its focus.
    """

    def __init__(
        self,
        deliver: Callable[[events.Key], Awaitable[None]],
        pumps: Callable[[], list[MessagePump]],
        stands: Callable[[], bool],
    ) -> None:
        self._deliver = deliver
        self._pumps = pumps
        self._stands = stands
        self._waiting: deque[events.Key] = deque()
        self._task: asyncio.Task[None] | None = None

    @property
    def busy(self) -> bool:
        """Whether a key is under way."""
        return self._task is not None and not self._task.done()

    async def take(self, event: events.Key) -> None:
        """Delivers the key at once if no other is under way and the screen in front stands, else after that."""
        if self.busy:
            self._waiting.append(event)
            return
        if self._task is not None:
            self._task.result()
        if self._stands():
            await self._deliver(event)
        else:
            self._waiting.append(event)
        self._task = asyncio.create_task(self._follow())

    async def _follow(self) -> None:
        await self._settled()
        while self._waiting:
            await self._deliver(self._waiting.popleft())
            await self._settled()

    async def _settled(self) -> None:
        """Returns when the screen in front stands and no message waits anywhere, seen several times in a row."""
        loop = asyncio.get_running_loop()
        began = loop.time()
        quiet = rounds = 0
        while quiet < _QUIET_ROUNDS:
            # Rounds too, because a handler that waits for the disk lets the time pass without letting anything happen.
            patience = _PATIENCE if self._stands() else _PATIENCE_FOR_A_SCREEN
            if loop.time() - began > patience and rounds >= _ROUNDS:
                return
            await asyncio.sleep(0 if rounds < _ROUNDS else _PAUSE)
            rounds += 1
            waits = not self._stands() or any(pump.message_queue_size for pump in self._pumps())
            quiet = 0 if waits else quiet + 1
