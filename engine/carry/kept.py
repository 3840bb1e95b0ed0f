"""The steps of one lane that is traced while it may be carried forward: what is taken back is not among them."""

from __future__ import annotations

from dataclasses import dataclass, field

from ..kernel.layout import Floats


@dataclass
class Kept:
    """Instants and states, piece by piece, at most ``most`` of them; ``gaps`` are the strides that stand, in s."""

    most: int
    time: list[Floats] = field(default_factory=list)
    states: list[Floats] = field(default_factory=list)
    gaps: list[tuple[float, float]] = field(default_factory=list)
    count: int = 0

    def add(self, time: Floats, states: Floats) -> None:
        """Keep some more steps."""
        self.time.append(time)
        self.states.append(states)
        self.count += len(time)

    def back_to(self, pieces: int) -> None:
        """Forget all but the first so many pieces."""
        self.count -= sum(map(len, self.time[pieces:]))
        del self.time[pieces:], self.states[pieces:]
