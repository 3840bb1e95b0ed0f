"""The title of the bench: nothing in it is cut to another number. Contract of this project, no outside source."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from stagebook.engine.design.document import Design
from stagebook.storage.values import Draft
from stagebook.tui.bench_text import conditions_pieces, heading, shortened
from stagebook.tui.figures import Figures
from stagebook.tui.shown import plain

from .conftest import document

SUPPLY, AMBIENT = "11 V .. 14 V", "0 C .. 45 C"


def title(width: int, progress: str = "spread of 1000 lanes", base: int | None = 12, name: str = "flood guard") -> str:
    conditions = {
        "supply": {"min": "11 V", "nominal": "12 V", "max": "14 V"},
        "ambient": {"min": "0 C", "nominal": "20 C", "max": "45 C"},
    }
    design = Design.load({**document(), "conditions": conditions})
    draft = Draft(name, design, base, 3, "R1 4k7", None)
    return plain(heading(draft, Figures(), progress, width))


def test_what_has_no_room_is_shortened_before_conditions_go() -> None:
    wide = title(100)
    assert f"{SUPPLY}  {AMBIENT}" in wide
    assert wide.endswith(" spread of 1000 lanes ")
    narrow = title(75)
    assert f"{SUPPLY}  {AMBIENT}" in narrow
    assert narrow.endswith("  1000 lanes ")
    assert "11 .. 14 V  0 .. 45 C" in title(64)
    assert "flood guard" in title(40)


@given(st.integers(30, 120), st.sampled_from(["spread of 1000 lanes", "computing: nominal known", "spread 64/1000"]))
def test_conditions_stand_whole_or_not_at_all(width: int, progress: str) -> None:
    shown = title(width, progress)
    assert len(shown) == width
    rest = shown.replace(AMBIENT, "").replace(SUPPLY, "").replace("0 .. 45 C", "").replace("11 .. 14 V", "")
    assert not any(piece in rest for piece in ("..", " V", "45"))


@pytest.mark.parametrize(
    ("words", "short"),
    [(SUPPLY, "11 .. 14 V"), ("900 mV .. 3 V", "900 mV .. 3 V"), ("12 V", "12 V"), ("11V .. 14V", "11V .. 14V")],
)
def test_a_unit_is_written_once_where_both_ends_have_it(words: str, short: str) -> None:
    assert shortened(words) == short


def test_conditions_typed_without_a_unit_show_the_one_they_were_read_with() -> None:
    conditions = {
        "supply": {"min": "10.5", "nominal": "12", "max": "14.8 V"},
        "ambient": {"min": "-10", "nominal": "25 C", "max": "50"},
    }
    design = Design.load({**document(), "conditions": conditions})
    assert conditions_pieces(design) == ["10.5 V .. 14.8 V", "-10 C .. 50 C"]
