"""Names of designs. The rules are the project's own."""

from __future__ import annotations

from collections.abc import Callable

import pytest
from hypothesis import given
from hypothesis import strategies as st

from stagebook.storage import NameRefused, checked_name

Plain = Callable[[BaseException], str]


@pytest.mark.parametrize("name", ["a", "flood", "path-lamp", "r2_d", "2 nd try", "Überlauf", "x" * 64, "json"])
def test_good_names_stay_as_they_are(name: str) -> None:
    assert checked_name(name) == name


@pytest.mark.parametrize(
    ("name", "says"),
    [
        ("", "needs a name"),
        ("   ", "needs a name"),
        ("x" * 65, "65 characters"),
        ("a/b", "holds a /"),
        ("flood.json", "ends in .json"),
        ("FLOOD.JSON", "ends in .json"),
        ("a.b", "holds '.'"),
        (" flood", "space"),
        ("flood ", "space"),
        ("a\tb", "control character"),
        ("a\nb", "control character"),
        ("a\x1b[31mb", "control character"),
        ("a\u202eb", "control character"),
        ("a\ud800b", "control character"),
        ("-\u2028-", "holds '\u2028'"),
    ],
)
def test_refused_names_say_why(name: str, says: str) -> None:
    with pytest.raises(NameRefused) as refusal:
        checked_name(name)
    assert says in str(refusal.value)


def test_one_word_typed_in_two_ways_is_one_name() -> None:
    # Unicode Standard Annex 15: U+0065 U+0301 composes to U+00E9 in form NFC.
    assert checked_name("caf\u0065\u0301") == "caf\u00e9"


@given(st.text(max_size=70))
def test_an_accepted_name_can_be_shown_and_names_no_file(text: str) -> None:
    try:
        name = checked_name(text)
    except NameRefused as refusal:
        message = str(refusal)
        assert all(character.isprintable() for character in message if character not in text)
        return
    assert 1 <= len(name) <= 64
    assert name.isprintable()
    assert not set(name) & set("/.\\:\x00")
    assert checked_name(name) == name
