"""A datum as one line of text and back. The way of writing is the project's own."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from stagebook.engine.design.datum import Datum
from stagebook.engine.design.datum_text import SOURCES, understood, written
from stagebook.engine.errors import DesignError


@pytest.mark.parametrize(
    ("text", "datum"),
    [
        ("300", {"typical": "300"}),
        ("300 (datasheet)", {"typical": "300", "source": "datasheet"}),
        ("200 .. 450", {"min": "200", "max": "450"}),
        (
            "0.58 V .. 0.64 V .. 0.70 V at 2 mA, 25 C (measured)",
            {"min": "0.58 V", "typical": "0.64 V", "max": "0.70 V", "condition": "2 mA, 25 C", "source": "measured"},
        ),
        (".. 0.1 V .. 0.25 V", {"typical": "0.1 V", "max": "0.25 V"}),
        ("<= 15 nA at 25 C (memory)", {"max": "15 nA", "condition": "25 C", "source": "memory"}),
        (">= 60", {"min": "60"}),
        ("200 K/W", {"typical": "200 K/W"}),
    ],
)
def test_a_line_is_understood_and_names_nobody_who_did_not_say_it(text: str, datum: dict[str, str]) -> None:
    assert understood(text) == datum


@pytest.mark.parametrize(
    ("text", "says"), [("1 .. 2 .. 3 .. 4", "4 numbers"), (" .. ", "no number"), ("5 (friend)", "measured")]
)
def test_a_wrong_line_is_refused_with_how_to_write_it(text: str, says: str) -> None:
    with pytest.raises(DesignError, match=says):
        understood(text)


NUMBERS = st.none() | st.sampled_from(["1", "4k7", "-3 %", "0.58 V", "1e-9 A", "200 K/W"])


@given(
    st.tuples(NUMBERS, NUMBERS, NUMBERS).filter(any),
    st.none() | st.sampled_from(["2 mA", "10 mA / 0.5 mA, 25 C"]),
    st.none() | st.sampled_from(SOURCES),
)
def test_what_is_written_is_understood_as_the_same(
    limits: tuple[str | None, str | None, str | None], condition: str | None, source: str | None
) -> None:
    given_ = dict(zip(("min", "typical", "max"), limits, strict=True)) | {"condition": condition, "source": source}
    document = {key: value for key, value in given_.items() if value is not None}
    assert understood(written(Datum.model_validate(document)), source=None) == document


def test_what_is_no_datum_stands_as_it_is() -> None:
    assert written(None) == ""
    assert written("4k7") == "4k7"
    assert written((("0 %", "6 V"), ("100 %", "9.5 V"))) == '[["0 %", "6 V"], ["100 %", "9.5 V"]]'
