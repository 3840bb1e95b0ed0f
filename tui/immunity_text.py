"""How little charge trips an alarm, as lines: a row a net, the weakest first, and the slew of the supply. Pure."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from ..engine.quantity import write
from .shown import Line, Span, columns, fit, line
from .widgets.row_list import Row

if TYPE_CHECKING:
    from ..engine.studies.immunity import ImmunitySheet, NetImmunity

_NET, _CHARGE = 16, 12
_BAR = 12  # cells for a bar on a log scale


def charge_words(found: NetImmunity) -> str:
    """``+22 pC``; ``none`` where no charge trips an alarm, ``0 C`` where there is an alarm without any."""
    if found.charge is None:
        return "none"
    if found.charge == 0.0:
        return "0 C"
    digits = float(f"{found.charge:.2g}")
    return ("-" if found.sign == -1 else "+") + write(digits, "C")


def slew_words(sheet: ImmunitySheet) -> str:
    """The steepest supply that trips nothing, with its corner: ``97 V/ms (hot, high supply)``."""
    if sheet.slew is None:
        return sheet.slew_condition
    return f"{write(float(f'{sheet.slew:.2g}'), 'V/s')} ({sheet.slew_condition})"


def immunity_heading(width: int) -> Line:
    """The column heads."""
    bar = _bar_room(width)
    heads = columns((_NET, _CHARGE), ("net", "trips with")) + " " * (bar + 2 if bar else 1) + "worst at"
    return line(Span(heads, "strong"))


def immunity_rows(sheet: ImmunitySheet, width: int) -> list[Row]:
    """One row a net in the order of the sheet: the longer its bar the more charge it takes (a cell is a factor)."""
    bar = _bar_room(width)
    room = max(8, width - 2 - _NET - _CHARGE - 2 - (bar + 1 if bar else 0))
    charges = [found.charge for found in sheet.nets if found.charge]
    least, most = (min(charges), max(charges)) if charges else (1.0, 1.0)
    return [Row(found.net, _row(found, room, bar, _cells(found, least, most, bar))) for found in sheet.nets]


def _bar_room(width: int) -> int:
    """A narrow screen keeps its room for words."""
    return _BAR if width >= 60 else 0


def _cells(found: NetImmunity, least: float, most: float, bar: int) -> int:
    """One cell for the weakest net, all for one that nothing trips."""
    if found.charge is None:
        return bar
    if found.charge == 0.0 or not bar:
        return 0
    share = math.log(found.charge / least) / math.log(most / least) if most > least else 0.0
    return 1 + round(share * (bar - 2))


def _row(found: NetImmunity, room: int, bar: int, cells: int) -> Line:
    tone = "fail" if found.charge == 0.0 else ""
    return line(
        Span(columns((_NET, _CHARGE), (found.net, charge_words(found))) + " ", tone),
        ("#" * cells).ljust(bar + 1) if bar else "",
        fit("any" if found.charge is None else found.condition, room),
    )


def immunity_lines(found: NetImmunity) -> tuple[Line, Line]:
    """Two lines about one net: what it takes in words, and in which corner."""
    if found.charge is None:
        first = f" {found.net}: no charge up to 1 uC raises an alarm"
    elif found.charge == 0.0:
        first = f" {found.net}: there is an alarm in stand-by, without any charge"
    else:
        verb = "drawn from it" if found.sign == -1 else "put into it"
        first = f" {found.net}: {charge_words(found).lstrip('+-')} {verb} within 100 ns raise an alarm"
    return line(Span(first, "strong")), line(f" worst at: {found.condition}")
