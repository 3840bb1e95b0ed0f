"""The figures of a part as lines: limits, test condition and who says it; what comes from memory stands out. Pure."""

from __future__ import annotations

from ..engine.design.part import Part
from ..engine.parts.class_figure import SOURCE
from ..engine.parts.made import from_memory
from ..engine.parts.part_data import NOT_SAID, PartDatum, part_data
from .bench_text import kind_words
from .shown import Line, Span, columns, counted, fit, line
from .widgets.row_list import Row

_NO_FIGURE = ("value", "tolerance", "setting")
_NAME, _LIMIT, _CONDITION = 23, 9, 14


def data_title(part: Part, name: str) -> Line:
    """What the part is, where its data are from, and how much of it comes from memory."""
    origin = f"from the drawer: {part.drawer}" if part.drawer else f"class {part.class_}" if part.class_ else "no class"
    memory = len(from_memory(part))
    unsaid = sum(datum.own and datum.source == NOT_SAID and datum.name not in _NO_FIGURE for datum in part_data(part))
    said = [f"{counted(memory, 'figure')} from {SOURCE}"] if memory else []
    said += [f"{unsaid} of source {NOT_SAID}"] if unsaid else []
    words = f"   {', '.join(said)}" if said else ""
    return line(Span(f" {name}: {kind_words(part)}, {origin}", "strong"), Span(words, "thin"))


def data_heading() -> Line:
    """The column heads."""
    heads = columns(_widths(), ("datum", "min", "typical", "max", "at", "source"), right=_FIGURES)
    return line(Span(heads.rstrip(), "strong"))


_FIGURES = frozenset({1, 2, 3})


def _widths() -> tuple[int, ...]:
    return (_NAME, _LIMIT, _LIMIT, _LIMIT, _CONDITION, 6)


def data_rows(part: Part, width: int, *, all_of_them: bool) -> list[Row]:
    """One row a datum that the part has or, with ``all_of_them``, that its kind reads."""
    rest = max(6, width - 2 - sum(_widths()[:-1]) - 5)
    rows = []
    for datum in part_data(part):
        if not (datum.source or all_of_them):
            continue
        figures = columns(
            _widths()[:-1],
            (datum.name.replace("_", " "), datum.minimum, datum.typical, datum.maximum, datum.condition),
            right=_FIGURES,
        )
        memory = datum.source.startswith(SOURCE)
        source = fit(datum.source.partition(",")[0], rest)
        rows.append(
            Row(datum.name, line(Span(figures + " ", "" if datum.source else "dim"), Span(source, _tone(memory))))
        )
    return rows


def _tone(memory: bool) -> str:
    return "thin" if memory else ""


def data_lines(datum: PartDatum) -> tuple[Line, ...]:
    """Lines about one datum: its figures in full, who says them, what it is read for, and what else is to be said."""
    limits = _limits(datum)
    join = " at" if datum.condition[:1].isdigit() else ","
    at = f"{join} {datum.condition}" if datum.condition else ""
    said = f" source: {datum.source}" if datum.source else ""
    first = f" {datum.name.replace('_', ' ')}: {limits}{at}"
    source = line(Span(said, _tone(datum.source.startswith(SOURCE))))
    return line(Span(first, "strong")), source, line(f" {datum.about}"), line(f" {datum.beside}")


def _limits(datum: PartDatum) -> str:
    """All ends that are given; one alone says which it is."""
    given = [each for each in (datum.minimum, datum.typical, datum.maximum) if each]
    if len(given) == 1 and not datum.typical:
        return f"at least {given[0]}" if datum.minimum else f"at most {given[0]}"
    return " .. ".join(given) or "not given"
