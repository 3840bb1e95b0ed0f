"""How long a stride may be, and what it changes: projective integration of what drifts beneath an oscillation.

A stride of N periods takes every quantity that drifts N times its drift further, by the rates of the periods before it;
the rates of the periods after it tell what it missed, which the next stride mends (the trapezoidal rule). What is then
still missing is the error that lengths are chosen by.

Gear, Kevrekidis, "Projective methods for stiff differential equations", SIAM J. Sci. Comput. 24 (2003) 1091; over whole
periods: Petzold, "An efficient numerical method for highly oscillatory ordinary differential equations", SIAM J. Numer.
Anal. 18 (1981) 455. Both from memory.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..kernel import layout
from ..kernel.layout import Control, Floats, Ints, Topology
from ..kernel.linearised import linearised
from .measure import CERTAIN, Drift, mean_rate

FINE = 1e-3  # of its swing, to which a quantity need be known at best
FOLLOWS = 3.0  # times as far as what it follows
LOCKED = 0.01  # of a generator's period, by which an oscillation may be off it
STRETCH = 0.1  # of the period, by which it may change within a stride
FORESIGHT = 8.0  # times as far ahead as two rates lie apart, their line is followed
HEAL = 5.0  # tolerances by which means and extremes may lie elsewhere than the stride would have them
DIES = 0.3  # falls by so many times e in a stride are taken from what is seen before it
GROWTH = 10.0  # tolerances by which what drifts faster and faster may do so within a stride
AT_ONCE = 1.0  # V, A or K that anything may drift in a stride: laws bend on that scale
MILNE = 0.2
KEPT = 0.2
LEAK, SHORT = 1e-12, 1e-6  # S from every net, ohm in every branch: nothing is infinite
MOST_HALVINGS = 60
WEAK = 1e-7  # weight of a node without capacitance, of the largest
LONGER, SHORTER, SAFE = 4.0, 0.2, 0.85  # of strides in turn


@dataclass(frozen=True)
class Quantities:
    """What is followed: every free unknown, and the voltage of every capacitance between two of them.

    ``held`` is what each holds of charge (flux, heat) a unit: an unknown by its capacitance to what is driven.
    """

    free: int
    pairs: Ints  # (pairs, 2)
    held: Floats
    storing: Floats  # (free, free) C and G of what is linear
    leading: Floats
    spread: Floats  # (free, quantities) takes changes of quantities to those of unknowns, the heaviest charge first
    relative: Floats
    absolute: Floats

    def of(self, x: Floats) -> Floats:
        """Quantities (points, ...) of unknowns (points, ...)."""
        return np.concatenate([x[:, : self.free], x[:, self.pairs[:, 0]] - x[:, self.pairs[:, 1]]], axis=1)

    def tolerance(self, mean: Floats) -> Floats:
        """What each may be off by."""
        own = self.relative * np.abs(mean[: self.free]) + self.absolute
        return np.concatenate([own, own[self.pairs[:, 0]] + own[self.pairs[:, 1]]])

    def lasting(self, errors: Floats, seconds: float) -> Floats:
        """What errors (quantities) amount to in the unknowns ``seconds`` later: (C + t G)^-1 of their charges."""
        charges, inverse = self.held * np.abs(errors), self._inverse(seconds)
        between = np.abs(inverse[:, self.pairs[:, 0]] - inverse[:, self.pairs[:, 1]])
        found: Floats = np.abs(inverse) @ charges[: self.free] + between @ charges[self.free :]
        return found

    def keeps(self, seconds: float) -> NDArray[np.bool_]:
        """Which quantities still know, after so many seconds, a fifth of what they were."""
        inverse = self._inverse(seconds)
        own = np.abs(inverse.diagonal())
        a, b = self.pairs.T
        between = np.abs(inverse[a, a] - inverse[a, b] - inverse[b, a] + inverse[b, b])
        found: NDArray[np.bool_] = self.held * np.concatenate([own, between]) > KEPT
        return found

    def _inverse(self, seconds: float) -> Floats:
        return np.asarray(np.linalg.inv(self.storing + seconds * self.leading), dtype=np.float64)


def quantities(top: Topology, parameters: Floats, states: Floats, sources: int, control: Control) -> Quantities:
    """What is followed in a lane with these parameters; ``states`` (states, n_all) are spread evenly over a period.

    What junctions and channels conduct counts as its mean over the period, and without what they amplify.
    """
    free, nets, n_all = int(top.size[1]), int(top.size[0]), int(top.size[2])
    joined: dict[tuple[int, int], float] = {}
    grounded = np.zeros(free)
    storing, leading = np.zeros((n_all, n_all)), np.zeros((n_all, n_all))
    for family, matrix in ((layout.CAPACITANCE, storing), (layout.CONDUCTANCE, leading)):
        for element in top.element[top.group[family] : top.group[family + 1]].astype(int):
            a, b = sorted((int(element[layout.E_A]), int(element[layout.E_B])))
            value = abs(float(parameters[element[layout.E_PARAMETER]]))
            matrix[[a, b], [a, b]] += value
            matrix[[a, b], [b, a]] -= value
            if family == layout.CAPACITANCE and b < free:
                joined[a, b] = joined.get((a, b), 0.0) + value
            elif family == layout.CAPACITANCE and a < free:
                grounded[a] += value
    for element in top.element[top.group[layout.BRANCH] : top.group[layout.BRANCH + 1]].astype(int):
        a, b, own = element[layout.E_A : layout.E_C + 1]
        henry, ohms = parameters[element[layout.E_PARAMETER] : element[layout.E_PARAMETER] + 2]
        leading[a, own] += 1.0
        leading[b, own] -= 1.0
        leading[own, a] -= 1.0
        leading[own, b] += 1.0
        leading[own, own] += ohms + SHORT
        storing[own, own] += henry
        grounded[own] = henry
    leading = leading[:free, :free]
    bent = np.maximum(_passive(top, parameters, states, sources, nets) - _passive_part(leading[:nets, :nets]), 0.0)
    leading[np.arange(nets), np.arange(nets)] += bent.diagonal() + LEAK
    leading[:nets, :nets] -= bent - np.diag(bent.diagonal())
    held = np.concatenate([grounded, np.array(list(joined.values()))])
    weights = np.maximum(held / max(float(held.max(initial=0.0)), 1e-15), WEAK)
    weights[nets:free] = 1.0  # currents and temperatures stand for themselves
    pairs = np.array(list(joined), dtype=np.int64).reshape(-1, 2)
    differences = np.zeros((len(pairs), free))
    differences[np.arange(len(pairs)), pairs[:, 0]] = 1.0
    differences[np.arange(len(pairs)), pairs[:, 1]] = -1.0
    system = np.concatenate([np.eye(free), differences]) * weights[:, None]
    spread = np.linalg.pinv(system, rcond=1e-12) * weights
    return Quantities(free, pairs, held, storing[:free, :free], leading, spread, control.relative, control.absolute)


def _passive(top: Topology, parameters: Floats, states: Floats, sources: int, nets: int) -> Floats:
    """Mean conductances from each net (the diagonal) and between nets, (nets, nets), none less than 0."""
    rows = np.ascontiguousarray(np.broadcast_to(parameters, (len(states), len(parameters))))
    found = linearised(top, rows, sources, np.ascontiguousarray(states)).conductance
    finite = np.isfinite(found).all(axis=(1, 2))
    if not finite.any():
        return np.zeros((nets, nets))
    return _passive_part(found[finite].mean(axis=0)[:nets, :nets])


def _passive_part(conductance: Floats) -> Floats:
    """What conducts both ways between each two nets, and all that each net sees."""
    both = np.maximum(np.minimum(-conductance, -conductance.T), 0.0)
    np.fill_diagonal(both, np.maximum(conductance.diagonal(), 0.0))
    return both


@dataclass(frozen=True)
class Stride:
    """A stride that was taken at ``begin`` s: what the quantities changed by, and the drift before it."""

    begin: float
    seconds: float
    periods: int
    change: Floats
    before: Drift
    foreseen: bool  # whether rates before those were known


@dataclass(frozen=True)
class Judgement:
    """What the periods behind a stride say of it: whether it stands, or is only too long (``alike``: the oscillation is
    where it should be); what is to be added to the quantities, and by how much longer the next one may be."""

    stands: bool
    alike: bool
    missed: Floats
    factor: float


def change_of(
    followed: Quantities, drift: Drift, tolerance: Floats, earlier: Drift | None, begin: float, seconds: float
) -> Floats:
    """What quantities change by in a stride, by their rates now and earlier.

    What keeps nothing of where it was follows the rest by itself; it is taken along where its drift is well known.
    """
    rate = drift.rate
    if earlier is not None and FORESIGHT * (drift.middle - earlier.middle) > seconds:
        there = mean_rate((earlier.rate, drift.rate), (earlier.middle, drift.middle), begin, begin + seconds)
        # A rate may fall towards nothing, but not beyond it.
        ahead = np.where(there * rate > 0.0, there, 0.5 * rate)
        rate = np.where(earlier.drifts, np.clip(ahead, -2.0 * np.abs(rate), 2.0 * np.abs(rate)), rate)
    # What is seen to die away within the periods that were looked at does so in the stride.
    fall = np.maximum(drift.fall, 0.0)
    dies = fall * seconds > DIES
    fall = np.where(dies, fall, 1.0)
    left = np.exp(-fall * (begin - drift.middle)) * -np.expm1(-fall * seconds) / fall
    fine = np.maximum(tolerance, FINE * drift.swing)
    known = drift.drifts & (followed.keeps(seconds) | (drift.doubt * seconds <= HEAL * fine))
    return np.where(known, np.where(dies, drift.rate * left, rate * seconds), 0.0)


def longest(followed: Quantities, drift: Drift, tolerance: Floats, wanted: float) -> float:
    """The longest stride in s, up to ``wanted``, over which doubt of the drifts makes no lasting error beyond the
    tolerances, and nothing that keeps what it was moves far."""
    fine = np.maximum(tolerance, FINE * drift.swing)
    for _ in range(MOST_HALVINGS):
        keeps = followed.keeps(wanted)
        doubtful = float(np.max(followed.lasting(drift.doubt * wanted, wanted) / fine[: followed.free], initial=0.0))
        fastest = float(np.max(np.abs(drift.rate)[drift.drifts & keeps], initial=0.0)) * wanted / AT_ONCE
        growing = np.maximum(-drift.fall, 0.0) * np.abs(drift.rate) / fine
        grown = float(np.max(growing[keeps], initial=0.0)) * 0.5 * wanted * wanted / GROWTH
        most = max(doubtful, fastest, grown)
        if most <= 1.0:
            break
        wanted *= max(SAFE / most, 0.25)
    return wanted


def with_sines(sine: Floats, seconds: float, length: float) -> float:
    """The longest stride of whole periods up to ``seconds``, of generators too; 0 where these are not a period's."""
    hertz = {float(each[1]) for each in sine if each[0] != 0.0}
    if not hertz:
        return math.floor(seconds / length) * length
    own = 1.0 / max(hertz)
    turns = round(length / own)
    if len(hertz) > 1 or turns < 1 or abs(length / own - turns) > LOCKED:
        return 0.0
    return math.floor(seconds / (turns * own)) * turns * own


def in_phase(
    sine: Floats, drift: Drift, earlier: Drift | None, begin: float, seconds: float, late: float
) -> tuple[float, int]:
    """A stride of about ``seconds`` that meets the oscillation in the phase it will have then, and its periods.

    The period may change: it is taken from the line through the last two. What that missed before, ``late`` s, is
    added.
    """
    length = drift.length
    periods = round(seconds / length)
    if sine[:, 0].any():
        return seconds, periods
    if earlier is not None and FORESIGHT * (drift.middle - earlier.middle) > seconds:
        slope = (length - earlier.length) / (drift.middle - earlier.middle)
        ahead = slope * (begin + 0.5 * seconds - drift.middle)
        length += float(np.clip(ahead, -STRETCH * length, STRETCH * length))
    return periods * length + late, periods


def judged(followed: Quantities, stride: Stride, after: Drift, tolerance: Floats) -> Judgement:
    """What the drift after a stride says of it."""
    before, end = stride.before, stride.begin + stride.seconds
    rates, middles = (before.rate, after.rate), (before.middle, after.middle)
    drifts = before.drifts | after.drifts
    should = np.where(drifts, mean_rate(rates, middles, stride.begin, end) * stride.seconds, 0.0)
    missed = should - stride.change
    turn = np.abs(after.rate - before.rate)
    fine = np.maximum(tolerance, FINE * after.swing)
    slow = followed.keeps(stride.seconds)
    missed = np.where(slow & (np.abs(missed) > 0.0), missed, 0.0)
    # Where the change was foreseen by two rates, what it missed is of the order of what three still miss (Milne's
    # device); else as much as an exponential and a straight line differ.
    left = MILNE * np.abs(missed)
    if not stride.foreseen:
        share = (0.5 * (stride.begin + end) - middles[0]) / (middles[1] - middles[0])
        straight = (rates[0] + share * (rates[1] - rates[0])) * stride.seconds
        left = np.where(drifts & slow, np.abs(should - straight) + 0.02 * np.abs(missed), 0.0)
    error = float(np.max(followed.lasting(left, stride.seconds) / fine[: followed.free], initial=0.0))
    # The means and extremes must be where both rates and what is still missing have them.
    span = after.middle - before.middle
    expected = np.where(slow, 0.5 * (before.rate + after.rate) * span - missed, 0.0)
    loose = HEAL * tolerance + 4.0 * (before.scatter + after.scatter) + 0.05 * np.maximum(before.swing, after.swing)
    most = np.maximum(np.abs(before.rate), np.abs(after.rate))
    # What keeps nothing follows what does, be it that this is not seen in its own noise.
    follows = FOLLOWS * float(np.max(np.abs(rates[0])[drifts & slow], initial=0.0)) * span + 0.1 * after.swing
    hidden = np.minimum(CERTAIN * before.doubt * span, follows)
    loose = loose + np.where(slow, (0.5 * turn + before.doubt) * span, np.where(drifts, 1.5 * most * span, hidden))
    off = np.abs(after.mean - before.mean - np.where(drifts, expected, 0.0))
    well = bool(np.all(off <= loose))
    for one, other, slope, later, doubt in (
        (before.low, after.low, before.lower, after.lower, before.doubt_low + after.doubt_low),
        (before.high, after.high, before.higher, after.higher, before.doubt_high + after.doubt_high),
    ):
        astray = np.abs(other - one - 0.5 * (slope + later) * span)
        well = well and bool(np.all(astray <= 2.0 * loose + (0.5 * np.abs(later - slope) + CERTAIN * doubt) * span))
    factor = LONGER if error <= 0.0 else float(np.clip(SAFE * error ** (-1.0 / 3.0), SHORTER, LONGER))
    return Judgement(well and error <= 1.0, well, missed, factor)
