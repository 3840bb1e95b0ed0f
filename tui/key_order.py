"""Keys in the order they were typed, each meeting the screen that the key before it left.

Keys that arrive in one packet (a slow line, a quick hand) would all be sent to the widget that has the focus when
they are read. Here the next key waits until everything that the one before it set off has been handled.
"""

from __future__ import annotations

import asyncio
from collections import deque
from collections.abc import Awaitable, Callable

from textual import events
from textual.message_pump import MessagePump

_ROUNDS = 200
_PATIENCE = 0.25
"""Seconds after which a key no longer waits: a handler that takes longer than this waits for something else."""


class KeyOrder:
    """Hands keys on one at a time.

    Args:
        deliver: Hands one key to the screen.
        pumps: Everything whose messages a key may set off.
    """

    def __init__(
        self, deliver: Callable[[events.Key], Awaitable[None]], pumps: Callable[[], list[MessagePump]]
    ) -> None:
        self._deliver = deliver
        self._pumps = pumps
        self._waiting: deque[events.Key] = deque()
        self._task: asyncio.Task[None] | None = None

    @property
    def busy(self) -> bool:
        """Whether a key is under way."""
        return self._task is not None and not self._task.done()

    async def take(self, event: events.Key) -> None:
        """Delivers the key at once if no other is under way, else after the others."""
        if self.busy:
            self._waiting.append(event)
            return
        if self._task is not None:
            self._task.result()
        await self._deliver(event)
        self._task = asyncio.create_task(self._follow())

    async def _follow(self) -> None:
        await self._settled()
        while self._waiting:
            await self._deliver(self._waiting.popleft())
            await self._settled()

    async def _settled(self) -> None:
        """Returns when no message waits anywhere, seen twice because a message may be in someone's hands."""
        loop = asyncio.get_running_loop()
        end = loop.time() + _PATIENCE
        quiet = rounds = 0
        # Rounds too, because a handler that waits for the disk lets the time pass without letting anything happen.
        while quiet < 2 and (loop.time() < end or rounds < _ROUNDS):
            await asyncio.sleep(0)
            rounds += 1
            quiet = 0 if any(pump.message_queue_size for pump in self._pumps()) else quiet + 1
