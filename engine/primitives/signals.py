"""Signals and observation rows as values: what is to be watched, from when to when."""

from __future__ import annotations

from dataclasses import dataclass

from ..kernel import layout

BRANCH_CURRENT = -1
"""Kind of a term that is the current of a branch: an unknown of the kernel, whose place is known only late."""
TEMPERATURE = " temperature"
"""What the names of temperatures end in; names of nets have no spaces."""


@dataclass(frozen=True, slots=True)
class Signal:
    """A sum of terms (kind, index, factor); kinds are those of :mod:`..kernel.layout`. Unknowns are resolved late:
    a term of kind ``S_UNKNOWN`` holds a net's name, one of kind ``BRANCH_CURRENT`` the number of the branch."""

    terms: tuple[tuple[int, int | str, float], ...]

    def __add__(self, other: Signal) -> Signal:
        return Signal(self.terms + other.terms)

    def scaled(self, factor: float) -> Signal:
        """The signal times a factor."""
        return Signal(tuple((kind, index, factor * scale) for kind, index, scale in self.terms))


def voltage(net: str, against: str | None = None) -> Signal:
    """The voltage of a net against 0V or another net."""
    plus = Signal(((layout.S_UNKNOWN, net, 1.0),))
    return plus if against is None else plus + voltage(against).scaled(-1.0)


def temperature_of(ref: str) -> str:
    """The name under which a part's temperature can be watched, as a rise above its surroundings."""
    return f"{ref}{TEMPERATURE}"


@dataclass(frozen=True, slots=True)
class Anchor:
    """An instant: ``by`` seconds after the start of the sequence, or after the instant that a row finds."""

    by: float = 0.0
    row: Row | None = None


START = Anchor()


@dataclass(frozen=True, slots=True)
class Row:
    """One observation. ``kind`` is one of :mod:`..kernel.layout`; ``end`` None means the end of the sequence.

    ``crossing``: the n-th time the signal passes ``level`` (rising or falling) in the window; ``level``: the signal at
    ``start``; ``maximum`` / ``minimum`` / ``slew``: extremes in the window; ``integral``: over the window; ``lagged``:
    the largest value in the window of what follows the signal with a time constant (``level``, in s), from 0 on.
    """

    kind: int
    signal: Signal
    start: Anchor = START
    end: Anchor | None = None
    level: float = 0.0
    rising: bool = True
    nth: int = 1


def crossing(
    signal: Signal, level: float, rising: bool, start: Anchor = START, end: Anchor | None = None, nth: int = 1
) -> Row:
    """When the signal passes a level."""
    return Row(layout.R_CROSSING, signal, start, end, level, rising, nth)


def level(signal: Signal, at: Anchor) -> Row:
    """The signal at an instant."""
    return Row(layout.R_LEVEL, signal, at)


def maximum(signal: Signal, start: Anchor = START, end: Anchor | None = None) -> Row:
    """The largest value in the window."""
    return Row(layout.R_MAXIMUM, signal, start, end)


def minimum(signal: Signal, start: Anchor = START, end: Anchor | None = None) -> Row:
    """The smallest value in the window."""
    return Row(layout.R_MINIMUM, signal, start, end)


def integral(signal: Signal, start: Anchor = START, end: Anchor | None = None) -> Row:
    """The integral over the window."""
    return Row(layout.R_INTEGRAL, signal, start, end)


def slew(signal: Signal, start: Anchor = START, end: Anchor | None = None) -> Row:
    """The steepest slope in the window, per second."""
    return Row(layout.R_SLEW, signal, start, end)


def lagged(signal: Signal, seconds: float, start: Anchor = START, end: Anchor | None = None) -> Row:
    """The largest value in the window of y' = (signal - y) / seconds, y = 0 at its start: a power becomes heat."""
    return Row(layout.R_LAGGED, signal, start, end, seconds)
