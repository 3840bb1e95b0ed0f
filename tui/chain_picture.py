"""The chain of stages as two lines of text: names joined by arrows, the weakest margin of each below. Pure."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from .figures import FigureRow
from .shown import MARKS, TONES, Line, Span, figure, fit, visible

_ARROW = " --> "
_WIDEST = 14
_END = 10


@dataclass(frozen=True, slots=True)
class Link:
    """One stage of the chain with its weakest check; ``weakest`` is None where no worst margin is known yet."""

    name: str
    weakest: FigureRow | None
    checked: bool


def picture(links: Sequence[Link], chosen: int, width: int) -> tuple[Line, Line]:
    """Names and figures of as many stages around the chosen one as fit ``width`` cells.

    Stages out of sight are counted at the ends, with the worst of their figures.
    """
    if not links:
        return (Span(" no stages yet", "dim"),), ()
    first, last = _window([_width(link, at == chosen) for at, link in enumerate(links)], chosen, width)
    names: list[Span] = [Span(" ")]
    figures: list[Span] = [Span(" ")]
    if first:
        _add_hidden(names, figures, f"{first} < ", links[:first])
    for at in range(first, last):
        link = links[at]
        room = _width(link, at == chosen)
        shown = f"[{visible(link.name)}]" if at == chosen else link.name
        text, tone = _figure(link)
        names.append(Span(fit(shown, room), "here" if at == chosen else "strong"))
        figures.append(Span(fit(text, room), tone))
        if at + 1 < last:
            names.append(Span(_ARROW))
            figures.append(Span(" " * len(_ARROW)))
    if last < len(links):
        _add_hidden(names, figures, f" > {len(links) - last}", links[last:])
    return tuple(names), tuple(figures)


def _width(link: Link, chosen: bool) -> int:
    name = cell_len(visible(link.name)) + (2 if chosen else 0)
    return max(min(_WIDEST, name), cell_len(_figure(link)[0]), 5)


def _figure(link: Link, width: int = 8) -> tuple[str, str]:
    if link.weakest is None:
        return ("~", "dim") if link.checked else ("-", "dim")
    row = link.weakest
    text = f"{MARKS[row.check.verdict]} {figure(row.check.margin, row.check.outcome, width)}"
    return (f"{text}~", "dim") if row.worst_old else (text, TONES[row.check.verdict])


def _window(widths: Sequence[int], chosen: int, width: int) -> tuple[int, int]:
    """First and one past the last stage in sight: grows around the chosen one, later stages first."""

    def needs(first: int, last: int) -> int:
        ends = (_END if first else 0) + (_END if last < len(widths) else 0)
        return 1 + sum(widths[first:last]) + len(_ARROW) * (last - first - 1) + ends

    first, last = chosen, chosen + 1
    while True:
        if last < len(widths) and needs(first, last + 1) <= width:
            last += 1
        elif first > 0 and needs(first - 1, last) <= width:
            first -= 1
        else:
            return first, last


def _add_hidden(names: list[Span], figures: list[Span], words: str, hidden: Sequence[Link]) -> None:
    known = [link for link in hidden if link.weakest is not None]
    worst = min(known, key=lambda link: link.weakest.check.slack if link.weakest else 0.0, default=None)
    text, tone = _figure(worst, _END - 4) if worst else ("", "")
    room = _END - 1
    names.append(Span(fit(words, room), "dim"))
    figures.append(Span(fit(text, room), tone))
    names.append(Span(" "))
    figures.append(Span(" "))
