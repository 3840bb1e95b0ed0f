"""The margin sheet and the parts list of a design as CSV files, which a spreadsheet opens."""

from __future__ import annotations

import csv
from collections.abc import Iterable, Sequence
from io import StringIO
from pathlib import Path

from ..engine.design.document import Design
from ..engine.design.part import Part
from ..engine.results import CheckResult, MarginSheet
from .out_file import cell, file_name, write_file

MARGIN_HEADS = (
    "check", "stage", "part", "sequence", "verdict", "worst margin", "required", "nominal margin", "unit",
    "demand", "capability", "least", "most", "from", "to", "what happens", "worst at", "formula",
)  # fmt: skip
PART_HEADS = ("stage", "part", "kind", "value", "tolerance", "rating", "class", "role", "pins", "made of")


def margins_csv(sheet: MarginSheet) -> str:
    """One line for each margin, the one with the least slack first; margins are parts of one, quantities in SI."""
    return _csv(MARGIN_HEADS, (_margin(check) for check in sorted(sheet.checks, key=lambda check: check.slack)))


def parts_csv(design: Design) -> str:
    """One line for each part, in the order of the stages."""
    rows = ((stage.name, part, stage.roles) for stage in design.stages for part in stage.parts)
    return _csv(PART_HEADS, (_part(stage, part, roles.items()) for stage, part, roles in rows))


def write_sheets(design: Design, sheet: MarginSheet | None, folder: str) -> list[str]:
    """Write the parts list, and the margins where there are any, into a folder; return the files.

    Raises FileRefused.
    """
    texts = {} if sheet is None else {"margins": margins_csv(sheet)}
    written = []
    for what, text in {**texts, "parts": parts_csv(design)}.items():
        file = str(Path(folder).expanduser() / file_name(f"{design.name} {what}", ".csv"))
        write_file(file, text.encode())
        written.append(file)
    return written


def _margin(check: CheckResult) -> tuple[str | float | None, ...]:
    low, high = check.limits or (None, None)
    happens = check.outcome or check.reason or ""
    return (
        check.title, check.stage, check.part, check.sequence, str(check.verdict), check.margin, check.required,
        check.nominal, check.unit, check.demand, check.capability, check.low, check.high, low, high, happens,
        check.corner, check.formula,
    )  # fmt: skip


def _part(stage: str, part: Part, roles: Iterable[tuple[str, str]]) -> tuple[str | float | None, ...]:
    fills = ", ".join(role.replace("_", " ") for role, ref in roles if ref == part.ref)
    pins = ", ".join(f"{pin} {net}" for pin, net in part.pins.items())
    rating = part.rating if isinstance(part.rating, str) else None
    value, tolerance, kind = part.value, part.tolerance, part.kind.replace("_", " ")
    return stage, part.ref, kind, value, tolerance, rating, part.class_, fills, pins, part.drawer


def _csv(heads: Sequence[str], rows: Iterable[Sequence[str | float | None]]) -> str:
    """Texts as a spreadsheet may take them; numbers as they are, nothing where there is none."""
    written = StringIO()
    table = csv.writer(written, lineterminator="\n")
    table.writerow(heads)
    for row in rows:
        table.writerow(
            [cell(each) if isinstance(each, str) else "" if each is None else repr(float(each)) for each in row]
        )
    return written.getvalue()
