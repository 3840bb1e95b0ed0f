"""How figures and foreign text are written on a screen."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len

from stagebook.tui.shown import figure, fit, percent, points, visible


@given(st.text(alphabet=st.characters(codec=None), max_size=60))
def test_visible_text_holds_nothing_that_steers_a_terminal(text: str) -> None:
    # Control characters: ECMA-48; format characters: Unicode general category Cf (direction overrides and the like).
    shown = visible(text)
    assert not any(ord(c) < 0x20 or 0x7F <= ord(c) < 0xA0 or 0xD800 <= ord(c) < 0xE000 for c in shown)
    assert "\u202e" not in shown
    assert "\u200b" not in shown
    assert visible(shown) == shown


@given(st.text(max_size=40), st.integers(0, 30))
def test_fitted_text_has_exactly_its_width(text: str, width: int) -> None:
    assert cell_len(fit(text, width)) == width


@pytest.mark.parametrize(
    ("margin", "shown"),
    [(0.62, "+62"), (-0.36, "-36"), (0.0, "+0"), (-0.001, "-1"), (0.4999, "+49"), (0.29, "+29"), (None, "?")],
)
def test_percent_is_never_better_than_the_margin(margin: float | None, shown: str) -> None:
    assert percent(margin) == shown


@pytest.mark.parametrize(
    ("margin", "shown"),
    [(-9.99, "-999"), (-10.0, "<-999"), (-1135287.89, "<-999"), (9.99, "+999"), (10.0, ">+999")],
)
def test_a_margin_of_many_digits_keeps_its_place(margin: float, shown: str) -> None:
    assert percent(margin) == points(margin) == shown


def test_an_outcome_stands_in_words_where_a_number_would_mislead() -> None:
    assert figure(-1.0, "never fired", 7) == "never"
    assert figure(-1.0, "did not let go", 8) == figure(-1.0, "does not run out", 9) == "fails"
    assert figure(-1.0, "the latch lets go by itself", 8) == "fails"
    assert figure(-1.0, "oscillates", 7) == "fails"
    assert figure(1.0, "immune at any slew", 7) == "immune"
    assert figure(1.0, "immune at any slew", 5) == "+100"
    assert figure(-1.0, None, 7) == "-100"
