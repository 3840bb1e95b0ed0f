"""The cautions of a design in words for the screen."""

from __future__ import annotations

from ..engine.cautions import PURPOSE, Caution, cautions_of
from ..engine.design.document import Design


def new_cautions(design: Design, told: set[str]) -> str:
    """What the cautions of parts and stages that were not told yet are about; they count as told from now on.

    In few words, because the table below is what the bench is for: in full they stand where ``k`` leads.
    """
    new = [each for each in cautions_of(design) if each.key not in told and each is not PURPOSE]
    told.update(each.key for each in new)
    if not new:
        return ""
    return f"Caution: {', '.join(each.title for each in new)} (k reads)"


def caution_rows(design: Design) -> list[tuple[str, str, str]]:
    """Every caution with the parts or stages that bring it: name, text, tone."""
    rows = []
    for number, each in enumerate(cautions_of(design)):
        rows.append(("cautions" if number == 0 else "", _with_subjects(each), ""))
    return rows


def _with_subjects(caution: Caution) -> str:
    subjects = ", ".join(caution.about[:6]) + (" ..." if len(caution.about) > 6 else "")
    return f"{caution.words} ({subjects})" if subjects else caution.words
