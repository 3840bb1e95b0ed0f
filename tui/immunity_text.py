"""How little charge trips an alarm, as lines: a row a net, the weakest first, and the slew of the supply. Pure."""

from __future__ import annotations

import math

from ..engine.quantity import write
from ..engine.studies.immunity_sheet import MOST, ImmunitySheet, NetImmunity
from .shown import Line, Span, columns, fit, line
from .widgets.row_list import Row

_NET, _CHARGE = 16, 12
_BAR = 12  # cells for a bar on a log scale


def charge_words(found: NetImmunity) -> str:
    """``+22 pC``; ``over 1 uC`` where no charge tried trips an alarm, ``by itself`` where there is one without any."""
    if found.charge is None:
        return f"over {write(MOST, 'C')}"
    if found.charge == 0.0:
        return "by itself"
    digits = float(f"{found.charge:.2g}")
    return ("-" if found.sign == -1 else "+") + write(digits, "C")


def where_words(found: NetImmunity) -> str:
    """The corner in which it takes least."""
    if found.charge is None:
        return "nothing trips it, in any corner"
    return found.condition if found.charge else f"it alarms without any charge: {found.condition}"


def slew_words(sheet: ImmunitySheet) -> str:
    """The steepest supply that trips nothing, with its corner: ``97 V/ms (hot, high supply)``."""
    if sheet.slew is None:
        return sheet.slew_condition
    return f"{write(float(f'{sheet.slew:.2g}'), 'V/s')} ({sheet.slew_condition})"


def immunity_heading(width: int) -> Line:
    """The column heads."""
    bar = _bar_room(width)
    weak = fit("weakest", bar + 1) if bar else ""
    return line(Span(columns((_NET, _CHARGE), ("net", "trips with")) + f" {weak}worst at", "strong"))


def immunity_rows(sheet: ImmunitySheet, width: int) -> list[Row]:
    """One row a net in the order of the sheet: the longer its bar the less charge it takes (a cell is a factor).

    While corners are still to come every charge carries ``~``.
    """
    bar = _bar_room(width)
    room = max(8, width - 2 - _NET - _CHARGE - 2 - (bar + 1 if bar else 0))
    charges = [found.charge for found in sheet.nets if found.charge]
    least, most = (min(charges), max(charges)) if charges else (1.0, 1.0)
    old = sheet.unfinished
    return [Row(found.net, _row(found, room, bar, _cells(found, least, most, bar), old)) for found in sheet.nets]


def _bar_room(width: int) -> int:
    """A narrow screen keeps its room for words."""
    return _BAR if width >= 60 else 0


def _cells(found: NetImmunity, least: float, most: float, bar: int) -> int:
    """All cells for the weakest net, one for the strongest that trips, none for one that nothing trips."""
    if found.charge is None or not bar:
        return 0
    if found.charge == 0.0:
        return bar
    share = math.log(found.charge / least) / math.log(most / least) if most > least else 0.0
    return 1 + round((1.0 - share) * (bar - 2))


def _row(found: NetImmunity, room: int, bar: int, cells: int, old: bool) -> Line:
    tone = "fail" if found.charge == 0.0 else "dim" if old or found.charge is None else ""
    where = "no corner yet" if old and found.charge is None else where_words(found)
    return line(
        Span(columns((_NET, _CHARGE), (found.net, charge_words(found) + "~" * old)) + " ", tone),
        ("#" * cells).ljust(bar + 1) if bar else "",
        Span(fit(where, room), "dim" if tone == "dim" else ""),
    )


def immunity_lines(found: NetImmunity, sheet: ImmunitySheet) -> tuple[Line, Line]:
    """Two lines about one net: what it takes in words, and in which corner."""
    if found.charge is None:
        first = f" {found.net}: no charge up to {write(MOST, 'C')} raises an alarm"
    elif found.charge == 0.0:
        first = f" {found.net}: there is an alarm in stand-by, without any charge"
    else:
        verb = "drawn from it" if found.sign == -1 else "put into it"
        first = f" {found.net}: {charge_words(found).lstrip('+-')} {verb} within 100 ns raise an alarm"
    second = "" if found.charge is None else f" worst at: {found.condition}"
    more = " ~ more corners are being tried: it may turn out weaker" if sheet.unfinished else ""
    return line(Span(first, "strong")), line(second, Span(more, "dim"))
