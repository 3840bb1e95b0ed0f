"""What a check is: which margins it asks for in a design, and how each is judged from what the lanes showed."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from ..kernel.layout import Floats
from ..primitives.signals import Row
from .factors import COMMON_PRACTICE
from .seen import Seen
from .trial import Trial
from .view import View

Mask = NDArray[np.bool_]
NOTHING = "nothing is left to bear the demand: the capability is not above zero"
Apart = tuple[tuple[Mask | None, str], ...]


@dataclass(frozen=True)
class Judged:
    """Demand, capability and margin per lane; window checks give ``value`` with its limits instead of D and C.

    ``each`` are margins of which ``margin`` is the smallest: the corners look for the worst of every one of them.
    ``outcomes`` are words for lanes where something else happened than the number says; the first that fits counts.
    ``hand`` is the margin by the hand formula, NaN where it has none; ``apart`` says where (None: everywhere) and why
    that is not to be compared. ``hand_scale``: what the stated accuracy is a share of, in margins; None: see
    :attr:`.results.CheckResult.disagrees`. ``extrapolated`` says in which lanes a figure was used beyond where it is
    given.
    """

    margin: Floats
    demand: Floats | None = None
    capability: Floats | None = None
    value: Floats | None = None
    limits: tuple[float, float] | None = None
    outcomes: tuple[tuple[Mask, str], ...] = ()
    hand: Floats | None = None
    apart: Apart = ()
    hand_scale: Floats | None = None
    each: tuple[Floats, ...] = ()
    extrapolated: tuple[tuple[Mask, str], ...] = ()

    def outcome(self, lane: int) -> str | None:
        """The words for one lane."""
        return next((words for mask, words in self.outcomes if mask[lane]), None)

    def beyond(self, lane: int) -> str | None:
        """What is extrapolated in one lane, in words."""
        return "; ".join(words for mask, words in self.extrapolated if mask[lane]) or None

    def why_apart(self, lane: int) -> str | None:
        """Why there is no hand value to compare with in one lane, in words."""
        return next((words for mask, words in self.apart if mask is None or mask[lane]), None)


def everywhere(words: str | Apart) -> Apart:
    """One reason for all lanes; none where it is empty."""
    if isinstance(words, str):
        return ((None, words),) if words else ()
    return words


def ratio(
    demand: Floats,
    capability: Floats,
    outcomes: Sequence[tuple[Mask, str]] = (),
    hand: Floats | None = None,
    apart: str | Apart = (),
) -> Judged:
    """Margin 1 - D/C; a capability that is not above zero, and every outcome, counts as -1."""
    safe = np.where(capability > 0.0, capability, 1.0)
    margin = np.where(capability > 0.0, 1.0 - demand / safe, -1.0)
    for mask, _ in outcomes:
        margin = np.where(mask, -1.0, margin)
    told = (*outcomes, (np.asarray(capability <= 0.0), NOTHING))
    return Judged(margin, demand, capability, outcomes=told, hand=hand, apart=everywhere(apart))


def window(
    value: Floats,
    low: float,
    high: float,
    outcomes: Sequence[tuple[Mask, str]] = (),
    hand: Floats | None = None,
    apart: str | Apart = (),
    of_value: bool = False,
) -> Judged:
    """Margin min(U - x, x - L) / ((U - L)/2); an outcome counts as -1. ``hand`` is a value, judged the same way;
    ``of_value``: it is as accurate as a share of the value says, else of half the window."""
    half = 0.5 * (high - low)
    margin = np.minimum(high - value, value - low) / half
    for mask, _ in outcomes:
        margin = np.where(mask, -1.0, margin)
    by_hand = None if hand is None else np.minimum(high - hand, hand - low) / half
    return Judged(
        margin,
        value=value,
        limits=(low, high),
        outcomes=tuple(outcomes),
        hand=by_hand,
        apart=everywhere(apart),
        hand_scale=np.abs(value) / half if of_value else None,
    )


@dataclass(frozen=True)
class Ask:
    """One margin of one design. ``rows`` are observed in each of ``sequences``; ``judge`` turns them into a margin.

    ``unit`` is that of the quantity where it depends on the part, else the check's own.
    ``screen`` is the knob value of the trial at which the circuit must still hold for the required margin: what random
    lanes are tried with. ``follows_knob``: the margin falls with the knob at which the circuit gives in, and is not
    decided by something else. ``missing`` names the datum without which the check is UNKNOWN; nothing is computed then.
    """

    check: Check
    stage: str
    part: str
    sequences: tuple[str, ...]
    required: float
    judge: Callable[[Seen], Judged]
    rows: tuple[Row, ...] = ()
    trial: Trial | None = None
    screen: float | None = None
    follows_knob: bool = True
    missing: str | None = None
    unit: str | None = None

    @property
    def id(self) -> str:
        """``slug:stage:part``, the name of the margin in every revision."""
        return f"{self.check.slug}:{self.stage}:{self.part}"


@dataclass(frozen=True)
class Check:
    """One entry of the catalogue. ``asks`` finds the margins of this kind in a design.

    ``source`` says where the customary required margin comes from, ``worst`` the usual worst conditions. ``by_hand`` is
    the hand formula in words, after ``hand_source``; where what it assumes holds, it agrees with the simulation within
    ``accuracy`` of the larger of demand and capability (measured, tests/engine/checks/test_hand_formulas.py). A
    ``bound`` says how bad the margin is at most, and no more. ``leaves_out`` is what may make it wrong. ``reads`` are
    the fields that it reads of a requirement of its own, each with an example.
    """

    number: int
    slug: str
    title: str
    unit: str
    required: float
    formula: str
    asks: Callable[[Check, View], Iterator[Ask]]
    words: dict[str, str] = field(default_factory=dict)
    source: str = COMMON_PRACTICE
    worst: str = ""
    reads: Mapping[str, str] = field(default_factory=dict)
    by_hand: str = ""
    accuracy: float | None = None
    bound: bool = False
    leaves_out: str = ""
    hand_source: str = COMMON_PRACTICE


def unknown(check: Check, stage: str, part: str, sequence: str, required: float, missing: str) -> Ask:
    """An ask that cannot be judged until a datum is given."""

    def judge(seen: Seen) -> Judged:
        return Judged(np.full(seen.lanes.count, np.nan))

    return Ask(check, stage, part, (sequence,), required, judge, missing=missing)
