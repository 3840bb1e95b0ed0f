"""Where one margin comes from: demand, capability, formula, corner, conditions, hand formula, spread."""

from __future__ import annotations

from collections.abc import Sequence
from textwrap import wrap
from typing import ClassVar

from textual.app import ComposeResult
from textual.binding import BindingType

from ...engine.errors import QuantityError
from ...engine.quantity import write
from ...engine.results import CheckResult
from ..actions import bindings
from ..bench_text import check_name
from ..shown import TONES, Span, fit, line, percent, verdict_words, visible
from ..widgets.lines import Lines
from ..widgets.row_list import Row, RowList
from ..widgets.rule import Rule
from .page import Page


class OriginPage(Page[None]):
    """One check's raw quantities, as rows that can be walked where the screen is low."""

    BINDINGS: ClassVar[list[BindingType]] = bindings("page")

    def __init__(self, check: CheckResult, worst_known: bool, source: str) -> None:
        super().__init__()
        self._check = check
        self._worst_known = worst_known
        self._source = source

    def compose_body(self) -> ComposeResult:
        """Title above, quantities below."""
        yield Lines(id="title")
        yield Rule()
        yield RowList(id="quantities")

    def on_resize(self) -> None:
        """Shows them, wrapped to the width there is."""
        check = self._check
        title = f" {check_name(check)}, stage {check.stage}, in {self._source}"
        self.query_one("#title", Lines).show(line(Span(title, "strong")))
        shown = self.query_one(RowList)
        shown.show(wrapped(origin_rows(check, self._worst_known), self.size.width - 2))


_LABEL = 20


def wrapped(rows: Sequence[tuple[str, str, str]], width: int) -> list[Row]:
    """Name and text side by side; what is longer than the width goes on below."""
    found: list[Row] = []
    for name, text, tone in rows:
        for at, piece in enumerate(wrap(visible(text), max(10, width - _LABEL)) or [""]):
            label = Span(fit(name if at == 0 else "", _LABEL), "strong")
            found.append(Row(str(len(found)), line(label, Span(piece, tone))))
    return found


def origin_rows(check: CheckResult, worst_known: bool) -> list[tuple[str, str, str]]:
    """Name, text and tone of everything that is known about where a margin comes from."""
    which = "worst margin" if worst_known else "margin, nominal"
    rows = [(which, f"{verdict_words(check)}   required {percent(check.required)} %", TONES[check.verdict])]
    if check.outcome:
        rows.append(("happened", check.outcome, ""))
    if check.reason:
        rows.append(("reason", check.reason, ""))
    if check.demand is not None:
        rows.append(("demand", quantity(check.demand, check.unit), ""))
    if check.capability is not None:
        rows.append(("capability", quantity(check.capability, check.unit), ""))
    if check.limits is not None:
        low, high = (quantity(limit, check.unit) for limit in check.limits)
        rows.append(("must stay in", f"{low} .. {high}", ""))
    if check.low is not None or check.high is not None:
        ends = (("?" if end is None else quantity(end, check.unit)) for end in (check.low, check.high))
        rows.append(("comes to", " .. ".join(ends), ""))
    rows.append(("formula", check.formula or "not given", ""))
    rows.append(("corner", check.corner or "-", ""))
    rows += [(f"  {name.replace('_', ' ')}", condition(name, value), "") for name, value in check.conditions.items()]
    rows.append(("sequence", check.sequence or "-", ""))
    rows.append(("nominal", f"{percent(check.nominal)} %", ""))
    hand = "no hand formula" if check.hand is None else f"{percent(check.hand)} % (cross-check, not the verdict)"
    rows.append(("by hand", hand, ""))
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


def quantity(value: float, unit: str) -> str:
    """A value in trade text with its unit; plain digits where the trade has no way of writing it."""
    try:
        return write(value, unit, 4)
    except QuantityError:
        return f"{value:.4g} {unit}".rstrip()


_UNITS = {"supply": "V", "ambient": "degC", "source_resistance": "ohm"}


def condition(name: str, value: float | str) -> str:
    """One condition of a corner with its unit."""
    return value if isinstance(value, str) else quantity(value, _UNITS.get(name, ""))
