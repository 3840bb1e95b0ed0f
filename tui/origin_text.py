"""Where a margin comes from, as rows of name, text and tone: what is stored with it, and what explains it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from ..engine.quantity import write_plain
from ..engine.results import SAME_MARGIN, CheckResult
from .shown import TONES, percent, verdict_words

if TYPE_CHECKING:
    from ..engine.studies.explanation import Explanation, Used

Rows = list[tuple[str, str, str]]
_UNITS = {"supply": "V", "ambient": "degC", "source_resistance": "ohm"}


def origin_rows(check: CheckResult, worst_known: bool) -> Rows:
    """What is known of a margin without computing anything."""
    which = "worst margin" if worst_known else "margin, nominal"
    rows = [(which, f"{verdict_words(check)}   required {percent(check.required)} %", TONES[check.verdict])]
    if check.outcome:
        rows.append(("happened", check.outcome, ""))
    if check.reason:
        rows.append(("reason", check.reason, ""))
    if check.extrapolated:
        rows.append(("extrapolated", check.extrapolated, "thin"))
    if check.demand is not None:
        rows.append(("demand", write_plain(check.demand, check.unit), ""))
    if check.capability is not None:
        rows.append(("capability", write_plain(check.capability, check.unit), ""))
    if check.limits is not None:
        rows.append(("must stay in", " .. ".join(write_plain(limit, check.unit) for limit in check.limits), ""))
    if check.low is not None or check.high is not None:
        ends = ("?" if end is None else write_plain(end, check.unit) for end in (check.low, check.high))
        rows.append(("comes to", " .. ".join(ends), ""))
    rows.append(("formula", check.formula or "not given", ""))
    rows.append(("corner", check.corner or "-", ""))
    rows += [(f"  {name.replace('_', ' ')}", condition(name, value), "") for name, value in check.conditions.items()]
    rows.append(("sequence", check.sequence or "-", ""))
    rows.append(("nominal", f"{percent(check.nominal)} %", ""))
    rows.append(("by hand", *_by_hand(check)))
    if check.disagrees:
        rows.append(("", f"trust the simulation: the formula leaves out {left_out(check)}", "thin"))
    if check.by_hand:
        rows.append(("", check.by_hand, ""))
    if check.spread is not None:
        spread = check.spread
        least, most = spread.interval
        held = f"{spread.passing * 100:.1f} % hold (95 % interval {least * 100:.1f} .. {most * 100:.1f} %)"
        rows.append(("spread", held, ""))
        if spread.p50 is not None:
            words = " / ".join(f"{percent(value)} %" for value in (spread.p05, spread.p50, spread.p95))
            rows.append(("", f"{words} at 5 / 50 / 95 % of lanes", ""))
    rows.append(("check", f"{check.id}, number {check.number} of the catalogue", ""))
    return rows


def _by_hand(check: CheckResult) -> tuple[str, str]:
    """The hand formula's margin, what it is worth, and its tone."""
    why = check.apart or check.outcome
    if check.hand is None:
        return (f"no value: {why}" if why else "no hand formula" if not check.by_hand else "no value"), ""
    found = f"{percent(check.hand)} %"
    if why:
        return f"{found}, not to be compared: {why}", ""
    if check.accuracy is None:
        return f"{found} (a bound, not the verdict)", ""
    stated = f"stated accuracy {check.accuracy * 100:.0f} %"
    if check.disagrees:
        return f"{found}: DISAGREES with the simulation beyond its {stated}", "thin"
    worth = "at worst: a bound" if check.bound else "cross-check"
    return f"{found} ({worth}, not the verdict; {stated})", ""


def left_out(check: CheckResult) -> str:
    """What a hand formula that disagrees leaves out: why the simulation is to be trusted."""
    return check.left_out or "what else there is"


def explanation_rows(check: CheckResult, found: Explanation) -> Rows:
    """What computing the corner once more adds: values put in, observations with their instants, data, sources."""
    rows: Rows = []
    if found.put_in:
        rows.append(("put in", found.put_in, ""))
    if found.margin is not None and check.margin is not None and abs(found.margin - check.margin) > SAME_MARGIN:
        here = f"{percent(found.margin)} %, computed just now in the corner above; the margin above is older"
        rows.append(("here and now", here, "thin"))
    rows.append(("required", f"{percent(found.required.value)} %, {found.required.source}", ""))
    if found.by_hand:
        rows.append(("hand formula", f"source: {found.hand_source}", ""))
    if found.usual_worst:
        rows.append(("usually worst at", found.usual_worst, ""))
    for at, seen in enumerate(found.observed):
        value = "never seen" if seen.value is None else write_plain(seen.value, seen.unit)
        when = "" if seen.at is None else f", at {write_plain(seen.at, 's', 6)}"
        rows.append(("observed" if at == 0 else "", f"{seen.what}: {value} (sequence {seen.sequence}{when})", ""))
    for words in found.carried:
        rows.append(("carried", words, ""))
    for at, used in enumerate(found.used):
        rows.append(("data" if at == 0 else "", used_words(used), ""))
    return rows


def together(stored: Rows, explained: Rows) -> Rows:
    """Both in one: the values put in stand under their formula, everything else below."""
    at = next((n for n, (name, *_) in enumerate(stored) if name == "formula"), len(stored) - 1) + 1
    put_in = [row for row in explained if row[0] == "put in"]
    return [*stored[:at], *put_in, *stored[at:], *(row for row in explained if row not in put_in)]


def used_words(used: Used) -> str:
    """One number that was put in: ``Q8 gain 200, limits 200 .. 450 (class small npn, from memory)``."""
    value = write_plain(used.value, used.unit)
    limits = ""
    if used.low is not None and used.high is not None and used.low != used.high:
        limits = f", limits {write_plain(used.low, used.unit)} .. {write_plain(used.high, used.unit)}"
    return f"{used.what} {value}{limits} ({used.source})"


def condition(name: str, value: float | str) -> str:
    """One condition of a corner with its unit."""
    return value if isinstance(value, str) else write_plain(value, _UNITS.get(name, ""))
